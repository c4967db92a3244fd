"""The disc law of foreground galaxies against an integral through a disc, and its limits."""

import numpy as np
import pytest
from scipy.integrate import quad

from haloledger.sightlines.disc import disc_column, gas_poor_share, law, reach_kpc

PIVOT = law()["column"]["pivot_log_mstar"]


def slanted(b, cos_i, turn, central, scale, height):
    """Column of n0 exp(-R / scale - |z| / height) along a line at `b` from the centre; numerical."""
    sin_i = np.sqrt(1 - cos_i**2)
    x0, y0 = b * np.cos(turn), b * np.sin(turn)

    def density(s):
        y, z = y0 * cos_i + s * sin_i, -y0 * sin_i + s * cos_i
        return np.exp(-np.hypot(x0, y) / scale - abs(z) / height)

    middle = y0 * sin_i / cos_i
    parts = [(-60, middle), (middle, 60)]
    total = sum(quad(density, lo, hi, limit=300)[0] for lo, hi in parts)
    return central / (2 * height) * total


@pytest.mark.parametrize(("cos_i", "turn"), [(1.0, 0.3), (0.8, 0.0), (0.6, 1.2), (0.4, np.pi / 2)])
def test_thin_disc_is_the_limit_of_a_slanted_integral(cos_i, turn):
    b, scale = 5.0, law()["scale"]["kpc"]
    expected = slanted(b, cos_i, turn, law()["column"]["central"], scale, 0.02)
    # a disc of 20 pc: what is left is its height over its scale
    assert disc_column(b, PIVOT, cos_i, turn, False, 0.0) == pytest.approx(expected, rel=0.01)


def test_milky_way_at_the_sun():
    # 22 pc cm-3 to one side (19.6 to 21.7 of three published models, 23.5 of the thick disc)
    assert disc_column(8.2, PIVOT, 1.0, 0.0, False, 0.0) / 2 == pytest.approx(22.0, abs=2.5)


def test_light_galaxies_have_little_and_small_discs():
    at = [float(disc_column(5.0, m, 1.0, 0.0, False, 0.0)) for m in (7.0, 9.0, 10.78)]
    assert at[0] < 0.1 < at[1] < at[2]
    assert float(disc_column(0.3, 7.0, 1.0, 0.0, False, 0.0)) < 60


def test_edge_on_is_bounded_and_heavy_galaxies_are_poor_in_gas():
    assert disc_column(1.0, PIVOT, 0.0, 0.0, False, 0.0) == disc_column(1.0, PIVOT, 0.15, 0.0, False, 0.0)
    assert gas_poor_share(9.0) < 0.02 < 0.4 < gas_poor_share(PIVOT) < 0.6 < 0.9 < gas_poor_share(12.0)
    assert disc_column(1.0, 11.5, 1.0, 0.0, True, 0.0) < 0.2 * disc_column(1.0, 11.5, 1.0, 0.0, False, 0.0)


def test_optical_radius_widens_the_reach_and_never_narrows_it():
    assert reach_kpc(np.array([np.nan, 5.0, 22.0])).tolist() == [15.0, 15.0, 22.0]


def test_every_number_names_its_source():
    assert all(rule["source"] for rule in law().values())
