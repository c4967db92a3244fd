"""Kept-fraction laws: published gas fractions, radii, ceilings and smoothness."""

import numpy as np
import pytest
from gas_reference import write_model

from haloledger.cosmos.mass_definitions import from_200c, r500c_over_r200c
from haloledger.gas.components import nfw_mass_share
from haloledger.gas.kept import GasFraction, Knots, PowerLaw
from haloledger.gas.kept.base import smaller
from haloledger.gas.models import load_model
from haloledger.gas.stars import star_share

# M500c -> f_gas,500, Popesso et al. 2024 and Akino et al. 2022, evaluated independently, in their own h
GAS_FRACTIONS = {
    "xray-popesso": ([13, 13.47712, 14], [0.0262, 0.0402, 0.0643], 0.6774),
    "xray-akino": ([13, 13.47712, 14], [0.0396, 0.0538, 0.0754], 0.70),
}


@pytest.mark.parametrize("name", GAS_FRACTIONS)
def test_published_gas_fractions(name, planck):
    log_m500c, expected, h = GAS_FRACTIONS[name]
    model, c = load_model(name), 5.0
    log_m500c = np.array(log_m500c) + np.log10(h / planck.h)  # from Msun of their h to ours
    log_m200c = log_m500c - from_200c(0.0, "500c", 0.0, c, planck)
    got = model.kept(log_m200c, 0.1, c, planck, r500c_over_r200c(c)) * planck.baryon_share
    # 1% below: the smooth ceiling of all baryons without stars; 3 digits given
    assert got == pytest.approx(np.array(expected) * (h / planck.h) ** 1.5, rel=0.015)
    assert np.all(got < np.array(expected) * (h / planck.h) ** 1.5 * 1.002)


def test_gas_fraction_is_held_below_baryons_without_stars(planck):
    law = GasFraction(fraction_at_pivot=0.08, pivot_log_m500c=14.0, slope=0.9, hubble=0.7)
    kept = law.value(np.array([13.0, 15.0, 16.0]), 0.0, 5.0, planck)
    available = 1 - star_share(np.array([15.0, 16.0]), planck)
    assert np.all(kept[1:] <= available)
    assert kept[2] == pytest.approx(available[1], rel=1e-3)
    assert kept[0] < 0.1


def test_power_law_and_its_ceiling():
    law = PowerLaw(kept_at_pivot=0.2, pivot_log_m200c=12.0, slope=0.3, ceiling=0.9)
    kept = law.value(np.array([11.0, 12.0, 15.0]), 0.0, 5.0, None)
    assert kept[:2] == pytest.approx([0.2 * 10**-0.3, 0.2], rel=1e-4)
    assert kept[2] == pytest.approx(0.9, rel=0.02)
    assert kept[2] < 0.9


def test_power_law_model_end_to_end(planck, tmp_path):
    body = '[shape]\nkind = "modified-nfw"\ninner_slope = 2\ninner_offset = 2\n[kept]\nlaw = "power-law"\n'
    model = write_model(tmp_path, body + "kept_at_pivot = 0.2\npivot_log_m200c = 12.0\nslope = 0.3\n")
    assert model.depends_on == ("mass", "concentration")
    got = model.gas_share(np.array([11.5, 12.5]), 0.0, 7.0, planck)
    assert got == pytest.approx(0.2 * 10 ** np.array([-0.15, 0.15]), rel=1e-3)


def test_knots_pass_through_and_stay_constant_outside():
    law = Knots(log_m200c=(11.0, 12.0, 13.0), kept=(0.3, 0.35, 0.4))
    kept = law.value(np.array([9.0, 11.0, 11.5, 12.0, 13.0, 15.0]), 0, 5, None)
    assert kept[[0, 1, 3, 4, 5]] == pytest.approx([0.3, 0.3, 0.35, 0.4, 0.4], rel=1e-12)
    assert 0.3 < kept[2] < 0.35


@pytest.mark.parametrize("radius", ["r500c", "r200c", "boundary"])
def test_the_radius_that_the_fraction_refers_to(radius, planck, tmp_path):
    body = '[shape]\nkind = "modified-nfw"\ninner_slope = 2\ninner_offset = 2\n[kept]\nlaw = "constant"\nkept = 0.5\n'
    model = write_model(tmp_path, body + f'radius = "{radius}"\n', boundary=1.6)
    c = np.array([4.0, 9.0])
    x = {"r500c": r500c_over_r200c(c), "r200c": 1.0, "boundary": 1.6}[radius]
    assert model.kept(12.0, 0.0, c, planck, x) == pytest.approx([0.5, 0.5], rel=1e-10)
    assert model.gas_share(12.0, 0.0, c, planck, x) == pytest.approx(0.5 * nfw_mass_share(x, c), rel=1e-10)


def test_smooth_minimum():
    assert smaller(0.3, 3.0) == pytest.approx(0.3, rel=1e-6)
    assert smaller(0.5, 0.5) == pytest.approx(0.5 * 2 ** (-1 / 8), rel=1e-12)


def test_stars_against_the_relations_they_come_from(planck):
    # Moster et al. 2013 at z = 0, evaluated independently: log M* = 9.0061, 10.0016, 10.5350
    log_m = np.array([11.0, 11.5, 12.0])
    expected = 10 ** (np.array([9.0061, 10.0016, 10.5350]) - log_m) / planck.baryon_share
    assert star_share(log_m, planck) == pytest.approx(expected, rel=5e-3)  # groups take over with a tail of 0.1%
    group = 0.021 * 10 ** (-0.2 * (14.5 - 0.14 - 14.0)) / planck.baryon_share
    assert float(star_share(14.5, planck)) == pytest.approx(group, rel=1e-3)
