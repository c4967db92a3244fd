"""One mass from several catalogues of one halo."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from haloledger.cosmos.mass_function import mass_function
from haloledger.engine.universe import Universe
from haloledger.errors import InputError
from haloledger.haloes.build import halo_list, point_mass
from haloledger.haloes.draws import draw_haloes

M200C = np.array(["200c"], dtype=object)


def lists(make_groups, **by_label):
    """One group a catalogue: label=(log_mass, error, mass_from, mass_is)."""
    made = []
    for k, (label, (mass, err, origin, kind)) in enumerate(by_label.items()):
        group = make_groups(label, 1, log_mass=mass, log_mass_err=err, precedence=10 * k)
        made.append(replace(group, mass_from=origin, mass_is=kind))
    return made


def test_independent_masses_are_averaged_by_their_errors(make_groups, planck):
    groups = lists(
        make_groups,
        x=(14.3, 0.10, "lx", "likelihood"),
        s=(14.5, 0.20, "sz", "likelihood"),
        o=(14.2, 0.2, "", "likelihood"),
    )
    haloes = halo_list([], groups, planck)
    w = np.array([100.0, 25.0, 25.0])
    assert haloes.value[0] == pytest.approx((w * [14.3, 14.5, 14.2]).sum() / w.sum())
    assert haloes.value_err[0] == pytest.approx(w.sum() ** -0.5)
    assert haloes.source_rows[0] == "x:000000;o:000000;s:000000"
    assert "mass from x:000000, s:000000, o:000000 together" in haloes.note[0]
    # by hand, with the mass function once
    m = np.arange(13.0, 15.5, 0.001)
    p = mass_function(m, 0.1, planck) * np.exp(-0.5 * w.sum() * (m - haloes.value[0]) ** 2)
    drawn = draw_haloes(haloes, [0], Universe(1, 20_000), "dutton2014", planck).log_m200c
    assert drawn.mean() == pytest.approx((m * p).sum() / p.sum(), abs=0.004)


def test_posteriors_get_the_prior_once(make_groups, planck):
    # two posteriors of one prior: N(14.3) each; together the prior counts once, not twice
    groups = lists(make_groups, x=(14.3, 0.2, "lx", "posterior"), s=(14.3, 0.2, "richness", "posterior"))
    m = np.arange(13.0, 15.6, 0.001)
    prior = mass_function(m, 0.1, planck)
    p = np.exp(-0.5 * ((m - 14.3) / 0.2) ** 2) ** 2 / prior
    drawn = draw_haloes(halo_list([], groups, planck), [0], Universe(1, 20_000), "dutton2014", planck).log_m200c
    # the prior's slope is taken at the mass: it steepens upward, which costs 0.01 dex
    assert drawn.mean() == pytest.approx((m * p).sum() / p.sum(), abs=0.015)
    assert drawn.mean() > 14.33


def test_two_masses_from_one_measurement_count_once(make_groups, planck):
    groups = lists(make_groups, a=(14.3, 0.2, "luminosity", "posterior"), b=(14.6, 0.1, "luminosity", "posterior"))
    haloes = halo_list([], groups, planck)
    assert (haloes.value[0], haloes.value_err[0]) == (14.3, 0.2)
    assert "together" not in haloes.note[0]
    assert haloes.source_rows[0] == "a:000000;b:000000"


def test_disagreement_widens_the_error(make_groups, planck):
    groups = lists(make_groups, x=(14.0, 0.1, "lx", "likelihood"), s=(14.6, 0.1, "sz", "likelihood"))
    haloes = halo_list([], groups, planck)
    # chi2 = 2 x 9 on one degree of freedom
    assert haloes.value_err[0] == pytest.approx(0.1 / np.sqrt(2) * np.sqrt(18.0))


def test_hydrostatic_bias_is_shared_by_its_weight(make_groups, planck):
    x, s, o = lists(
        make_groups,
        x=(14.3, 0.1, "lx", "likelihood"),
        s=(14.3, 0.1, "sz", "likelihood"),
        o=(14.4, 0.1, "richness", "likelihood"),
    )
    x, s = (replace(g, one_minus_b=(0.8, 0.07)) for g in (x, s))
    haloes = halo_list([], [x, s, o], planck)
    assert haloes.bias_share[0] == pytest.approx(2 / 3)
    low, high = (
        draw_haloes(haloes, [0], Universe(1, 10, held={"hydrostatic_bias": b}), "dutton2014", planck).log_m200c
        for b in ("0.7", "0.9")
    )
    # the prior's slope changes little over this step
    assert (low - high).mean() == pytest.approx(2 / 3 * np.log10(0.9 / 0.7), abs=0.004)
    fixed = draw_haloes(haloes, [0], Universe(fixed=True), "dutton2014", planck).log_m200c
    assert fixed == pytest.approx(14.3 + 0.1 / 3, abs=1e-6)


def test_precedence_on_demand(make_groups, planck):
    groups = lists(make_groups, x=(14.3, 0.1, "lx", "likelihood"), s=(14.5, 0.2, "sz", "likelihood"))
    haloes = halo_list([], groups, planck, combine="precedence")
    assert (haloes.value[0], haloes.value_err[0]) == (14.3, 0.1)
    with pytest.raises(InputError, match=r"combine 'mean' is not known. Write one of weighted, precedence"):
        halo_list([], groups, planck, combine="mean")


def test_dispersion_and_mass_in_another_definition(make_groups, planck):
    # both put the halo at 10^14.2, in their own ways: so does the whole
    sigma = 10 ** float(np.log10(1082.9) + 0.3361 * (14.2 - 15 + np.log10(planck.h * planck.e_of_z(0.1))))
    dynamic = make_groups("d", 1, sigma_v_kms=sigma, n_members=50, proxy="sigma_v")
    from haloledger.cosmos.concentration import concentration
    from haloledger.cosmos.mass_definitions import from_200c

    m500 = float(from_200c(14.2, "500c", 0.1, concentration("dutton2014", 14.2, 0.1, planck), planck))
    xray = replace(
        make_groups("x", 1, log_mass=m500, log_mass_err=0.1, mass_def=np.array(["500c"], dtype=object)),
        mass_is="likelihood",
        mass_from="lx",
    )
    haloes = halo_list([], [dynamic, xray], planck)
    assert haloes.value[0] == pytest.approx(14.2, abs=2e-3)
    err = np.hypot(0.0217, 0.91 / 7 / np.log(10)) / 0.3361
    assert haloes.value_err[0] == pytest.approx((1 / err**2 + 1 / 0.01) ** -0.5, rel=1e-3)
    assert point_mass(haloes, planck)[0] < 14.2
