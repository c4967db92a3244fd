"""Masses of groups: the direction of each relation, definitions, bias."""

from __future__ import annotations

import numpy as np
import pytest

from haloledger.cosmos.concentration import concentration
from haloledger.cosmos.mass_definitions import from_200c, to_200c
from haloledger.cosmos.mass_function import mass_function
from haloledger.engine.universe import Universe
from haloledger.errors import InputError
from haloledger.haloes.build import halo_list, point_mass
from haloledger.haloes.conversion import to_200c_fast
from haloledger.haloes.draws import draw_haloes
from haloledger.haloes.listing import group_haloes
from haloledger.haloes.relations import load_relation


def sky_of_haloes(planck, n, lowest, seed=4):
    """Masses drawn from the mass function at z = 0.1, above `lowest`."""
    grid = np.arange(lowest, 15.6, 0.002)
    grown = np.cumsum(mass_function(grid, 0.1, planck))
    return np.interp(np.random.default_rng(seed).random(n), grown / grown[-1], grid)


def draws_of(groups, planck, n=400, **universe):
    haloes = group_haloes(groups, 0, planck)
    return haloes, draw_haloes(haloes, np.arange(len(haloes)), Universe(2, n, **universe), "dutton2014", planck)


def share_within(truth, drawn, level=0.68):
    low, high = np.quantile(drawn, [0.5 - level / 2, 0.5 + level / 2], axis=1)
    return np.mean((truth > low) & (truth < high))


@pytest.mark.parametrize("proxy", ["sigma_v", "lx", "likelihood"])
def test_truth_comes_back_where_the_proxy_hangs_on_the_mass(proxy, make_groups, planck):
    n = 60_000
    truth, rng = sky_of_haloes(planck, n, 12.5), np.random.default_rng(8)
    if proxy == "sigma_v":
        relation, members = load_relation("evrard2008"), 15
        err = 0.91 / np.sqrt(members - 1) / np.log(10)
        seen = relation.mean(truth, 0.1, planck) + np.hypot(relation.scatter_dex[0], err) * rng.standard_normal(n)
        columns = {"sigma_v_kms": 10**seen, "n_members": members, "proxy": "sigma_v"}
        chosen, naive = (seen > 2.65) & (seen < 2.75), (seen - np.log10(1082.9)) / 0.3361 + 15
    elif proxy == "lx":
        relation = load_relation("pratt2009")
        m500 = from_200c(truth, "500c", 0.1, concentration("dutton2014", truth, 0.1, planck), planck)
        # the relation speaks of hydrostatic masses, 0.8 of the true ones
        seen = relation.mean(m500 + np.log10(0.8), 0.1, planck) + 0.2 * rng.standard_normal(n)
        columns = {"lx_1e44_erg_s": 10**seen, "proxy": "lx"}
        chosen, naive = (seen > -0.6) & (seen < 0.0), None
    else:
        seen = truth + 0.3 * rng.standard_normal(n)
        columns = {"log_mass": seen, "log_mass_err": 0.3, "mass_is": "likelihood"}
        chosen, naive = (seen > 13.5) & (seen < 14.0), seen
    rows = np.flatnonzero(chosen)[:1500]
    columns = {k: v[rows] if isinstance(v, np.ndarray) else v for k, v in columns.items()}
    _, drawn = draws_of(make_groups("s", rows.size, **columns), planck, n=300)
    # haloes were chosen by what is seen of them, never by their mass: then the posterior is calibrated
    offset = np.mean(truth[rows] - drawn.log_m200c.mean(axis=1))
    assert abs(offset) < 0.03
    assert share_within(truth[rows], drawn.log_m200c) == pytest.approx(0.68, abs=0.04)
    if naive is not None:
        assert np.mean(naive[rows] - truth[rows]) > 0.08  # what reading backwards would do


def test_richness_gives_the_published_mean_mass(make_groups, planck):
    haloes, drawn = draws_of(make_groups("s", 1, z=0.35, richness=40.0, proxy="richness"), planck, n=20_000)
    c = concentration("dutton2014", drawn.log_m200c, drawn.z, planck) * 10**drawn.log_c_offset
    m200m = from_200c(drawn.log_m200c, "200m", drawn.z, c, planck)
    # the relation is one of mean masses: the median lies 0.0136 dex below
    assert np.log10(np.mean(10**m200m)) == pytest.approx(np.log10(3.081e14), abs=0.003)
    assert m200m.mean() == pytest.approx(np.log10(3.081e14) - 0.0136, abs=0.003)
    assert m200m.std() == pytest.approx(0.25 / np.log(10), rel=0.03)
    assert "mcclintock2019" in haloes.note[0]


def test_posterior_mass_is_used_as_it_stands_and_converted_draw_by_draw(make_groups, planck):
    groups = make_groups("s", 1, log_mass=14.2, log_mass_err=0.15, mass_def=np.array(["500c"], dtype=object))
    _, drawn = draws_of(groups, planck, n=20_000)
    c = concentration("dutton2014", drawn.log_m200c, drawn.z, planck) * 10**drawn.log_c_offset
    own = from_200c(drawn.log_m200c, "500c", drawn.z, c, planck)
    assert own.mean() == pytest.approx(14.2, abs=0.005)
    assert own.std() == pytest.approx(0.15, rel=0.03)
    # a concentrated halo has less mass outside r500c
    assert np.corrcoef(drawn.log_m200c[0] - own[0], drawn.log_c_offset[0])[0, 1] < -0.9


def test_definitions_row_by_row(make_groups, planck):
    names = np.array(["200c", "500c", "200m", "180m", "vir"], dtype=object)
    groups = make_groups("s", 5, ra_deg=np.arange(5) * 20.0, log_mass=14.0, log_mass_err=0.2, mass_def=names)
    got = point_mass(group_haloes(groups, 0, planck), planck)
    expected = [float(to_200c(14.0, d, 0.1, "dutton2014", planck)) for d in names]
    assert got == pytest.approx(expected, abs=3e-4)
    assert got[1] > got[0] > got[4] > got[2] > got[3]


@pytest.mark.parametrize("mass_def", ["500c", "200m", "180m", "vir"])
@pytest.mark.parametrize("relation", ["dutton2014", "diemer2019", 5.0])
def test_fast_conversion_follows_the_exact_one(mass_def, relation, planck):
    rng = np.random.default_rng(1)
    mass, z, offset = rng.uniform(10, 15.6, 400), rng.uniform(0, 1.5, 400), 0.11 * rng.standard_normal(400)
    exact = to_200c(mass, mass_def, z, relation, planck, offset)
    fast = to_200c_fast(mass, mass_def, z, relation, planck, offset)
    assert fast == pytest.approx(exact, abs=4e-4)  # the tables' steps; a tenth of a per cent of the mass


def test_one_bias_for_all_catalogues_of_a_universe(make_groups, planck):
    columns = {"log_mass": 14.5, "log_mass_err": 0.0, "one_minus_b": (0.8, 0.07)}
    one = make_groups("x", 1, ra_deg=10.0, **columns)
    other = make_groups("y", 1, ra_deg=90.0, **columns)
    haloes = halo_list([], [one, other], planck)
    drawn = draw_haloes(haloes, [0, 1], Universe(1, 5000), "dutton2014", planck).log_m200c
    assert drawn[0] == pytest.approx(drawn[1])
    bias = 10 ** (14.5 - drawn[0])
    assert bias.mean() == pytest.approx(0.8, abs=0.005)
    assert bias.std() == pytest.approx(0.07, abs=0.006)  # a little less: cut at 1
    assert np.all((bias >= 0.5) & (bias <= 1.0))


def test_bias_held_and_fixed(make_groups, planck):
    groups = make_groups("x", 1, log_mass=14.5, log_mass_err=0.1, one_minus_b=(0.8, 0.07))
    _, held = draws_of(groups, planck, n=4000, held={"hydrostatic_bias": "0.7"})
    assert held.log_m200c.mean() == pytest.approx(14.5 - np.log10(0.7), abs=0.01)
    _, fixed = draws_of(groups, planck, fixed=True)
    assert fixed.log_m200c == pytest.approx(14.5, abs=1e-12)
    with pytest.raises(InputError, match=r"hydrostatic_bias=-1.*such as 0.8"):
        draws_of(groups, planck, held={"hydrostatic_bias": "-1"})


def test_mass_and_proxy_of_one_row_count_once(make_groups, planck):
    groups = make_groups("x", 1, log_mass=14.0, log_mass_err=0.1, lx_1e44_erg_s=30.0, proxy="lx")
    haloes, drawn = draws_of(groups, planck)
    assert haloes.mass_kind[0] == "mass"
    assert drawn.log_m200c.mean() == pytest.approx(14.0, abs=0.03)


def test_few_members_say_little(make_groups, planck):
    groups = make_groups("x", 2, sigma_v_kms=900.0, n_members=np.array([3.0, 100.0]), proxy="sigma_v")
    _, drawn = draws_of(groups, planck, n=4000)
    few, many = drawn.log_m200c.mean(axis=1)
    assert few < many - 0.7  # three velocities over 900 km/s: more often a group and bad luck than a cluster


def test_listed_halo_mass_of_a_galaxy(make_galaxies, planck):
    galaxies = make_galaxies("g", 1, log_m200c=12.3, log_m200c_err=0.25, log_mstar=9.0)
    haloes = halo_list([galaxies], [], planck)
    drawn = draw_haloes(haloes, [0], Universe(1, 20_000), "dutton2014", planck).log_m200c
    assert drawn.mean() == pytest.approx(12.3, abs=0.01)
    assert drawn.std() == pytest.approx(0.25, rel=0.03)
