"""Impact parameters and the search for near haloes, against astropy and brute force."""

import astropy.units as u
import numpy as np
import pytest
from astropy.coordinates import SkyCoord

from haloledger.sightlines.geometry import impact_parameters, separation_deg, unit_vectors
from haloledger.sightlines.near import near_pairs


def _sky(n, seed):
    rng = np.random.default_rng(seed)
    return rng.uniform(0, 360, n), np.degrees(np.arcsin(rng.uniform(-1, 1, n)))


def test_separation_is_astropys():
    ra1, dec1 = _sky(200, 1)
    ra2, dec2 = ra1 + np.random.default_rng(2).normal(0, 0.01, 200), dec1 * 0.9999
    exact = SkyCoord(ra1, dec1, unit="deg").separation(SkyCoord(ra2, dec2, unit="deg")).deg
    assert separation_deg(ra1, dec1, ra2, dec2) == pytest.approx(exact, rel=1e-9)


def test_impact_of_a_published_sightline(planck):
    # FRB 20181112A and the galaxy J214923.89-525810.4 at z = 0.3674: 29 kpc, Prochaska et al. 2019, Science 366, 231
    galaxy = SkyCoord("21h49m23.89s", "-52d58m10.4s")
    separation = separation_deg(327.34846, -52.97094, galaxy.ra.deg, galaxy.dec.deg) * 3600
    line = unit_vectors(np.array([327.34846]), np.array([-52.97094]))
    distance = np.array([[planck.angular_distance_kpc(0.3674)]])
    zero = np.zeros((1, 1))
    impact, _ = impact_parameters(np.array([galaxy.ra.deg]), np.array([galaxy.dec.deg]), distance, zero, zero, line)
    assert separation == pytest.approx(5.524, abs=0.02)
    assert impact[0, 0] == pytest.approx(29.04, abs=0.1)


def test_impact_is_distance_times_sine_even_far_from_the_line():
    line = unit_vectors(np.array([0.0]), np.array([0.0]))
    ra, dec = np.array([0.0, 20.0, 120.0]), np.array([5.0, 0.0, 0.0])
    distance, zero = np.full((3, 1), 700.0), np.zeros((3, 1))
    impact, ahead = impact_parameters(ra, dec, distance, zero, zero, line)
    angle = np.radians([5.0, 20.0, 120.0])
    assert impact[:, 0] == pytest.approx(700 * np.sin(angle), rel=1e-12)
    assert ahead[:, 0] == pytest.approx(700 * np.cos(angle), rel=1e-12)
    assert ahead[2, 0] < 0  # behind us


def test_centre_offset_moves_the_centre_towards_its_sign():
    # the line passes 10 kpc east of the nominal centre; a centre moved 10 kpc east lies on it
    distance = np.full((1, 1), 1e5)
    east_deg = np.degrees(10 / 1e5)
    line = unit_vectors(np.array([east_deg]), np.array([0.0]))
    at = np.zeros(1)
    impact, _ = impact_parameters(at, at, distance, np.full((1, 1), 10.0), np.zeros((1, 1)), line)
    assert impact[0, 0] == pytest.approx(0, abs=1e-6)


def test_near_pairs_are_brute_force(planck):
    burst_ra, burst_dec = _sky(40, 3)
    halo_ra, halo_dec = _sky(3000, 4)
    radius = np.random.default_rng(5).lognormal(0, 1, 3000)
    radius[0] = 85.0  # a very near halo
    margin = np.zeros(40)
    margin[7] = 2.0
    burst, halo = near_pairs(burst_ra, burst_dec, margin, halo_ra, halo_dec, radius)
    apart = (
        SkyCoord(burst_ra, burst_dec, unit="deg")[:, None]
        .separation(SkyCoord(halo_ra, halo_dec, unit="deg")[None, :])
        .to_value(u.deg)
    )
    expected = np.argwhere(apart <= radius[None, :] + margin[:, None])
    assert np.array_equal(np.stack([burst, halo], axis=1), expected)
    assert len(expected) > 40


def test_a_pair_does_not_depend_on_its_company():
    burst_ra, burst_dec = _sky(10, 6)
    halo_ra, halo_dec = _sky(2000, 7)
    radius, margin = np.full(2000, 5.0), np.linspace(0, 3, 10)
    burst, halo = near_pairs(burst_ra, burst_dec, margin, halo_ra, halo_dec, radius)
    for i in range(10):
        _, alone = near_pairs(burst_ra[[i]], burst_dec[[i]], margin[[i]], halo_ra, halo_dec, radius)
        assert np.array_equal(alone, halo[burst == i])


def test_no_haloes_no_pairs():
    empty = np.empty(0)
    burst, halo = near_pairs(np.array([1.0]), np.array([1.0]), np.zeros(1), empty, empty, empty)
    assert len(burst) == len(halo) == 0
