"""Redshift frames against astropy and against a pair of columns of the same published table."""

import csv

import astropy.units as u
import numpy as np
import pytest
from astropy.coordinates import SkyCoord

from haloledger.catalogs.frames import APEX, C_KM_S, apex_velocity, to_heliocentric
from haloledger.errors import InputError

SKY = np.random.default_rng(5)
RA = SKY.uniform(0, 360, 200)
DEC = np.degrees(np.arcsin(SKY.uniform(-1, 1, 200)))


@pytest.mark.parametrize("frame", APEX)
def test_velocity_toward_the_apex_against_astropy(frame):
    apex = APEX[frame]
    toward = SkyCoord(l=apex.l_deg * u.deg, b=apex.b_deg * u.deg, frame="galactic")
    expected = apex.speed_km_s * np.cos(SkyCoord(RA, DEC, unit="deg").separation(toward).rad)
    # astropy goes through FK5, whose axes lie 0.02 arcsec off: 4e-5 km/s of 370
    np.testing.assert_allclose(apex_velocity(RA, DEC, frame), expected, atol=1e-4)


def test_cmb_dipole_in_equatorial_coordinates():
    # Planck 2018 I (A&A 641, A1), table 3: the dipole's apex at RA 167.942, Dec -6.944
    v = apex_velocity(np.array([167.942]), np.array([-6.944]), "cmb")
    assert v[0] == pytest.approx(369.82, abs=1e-4)  # cos(0.001 deg) leaves 1e-7 of it


@pytest.mark.parametrize("frame", APEX)
def test_there_and_back(frame):
    z = np.linspace(0.001, 0.1, 200)
    beta = apex_velocity(RA, DEC, frame) / C_KM_S
    np.testing.assert_allclose(to_heliocentric((1 + z) * (1 + beta) - 1, RA, DEC, frame), z, atol=1e-15)
    np.testing.assert_allclose(to_heliocentric(z + beta, RA, DEC, frame, "velocities"), z, atol=1e-15)
    assert np.abs(to_heliocentric(z, RA, DEC, frame) - z).max() > 2e-4  # and it does something


def test_heliocentric_is_left_alone_and_unknown_frames_are_told():
    np.testing.assert_array_equal(to_heliocentric(RA / 1e4, RA, DEC, "heliocentric"), RA / 1e4)
    with pytest.raises(InputError, match="no redshift frame 'galactocentric'; there are heliocentric, cmb"):
        to_heliocentric(RA, RA, DEC, "galactocentric")


def test_both_velocities_of_2mpp_groups(shared_data):
    """The table lists heliocentric and CMB velocities: one must follow from the other."""
    with open(shared_data / "groups/2mpp_groups.csv", newline="") as f:
        rows = list(csv.DictReader(f))
    ra, dec, helio, cmb = (
        np.array([float(r[k]) for r in rows]) for k in ("ra_deg", "dec_deg", "v_helio_kms", "v_cmb_kms")
    )
    got = to_heliocentric(cmb / C_KM_S, ra, dec, "cmb", "velocities") * C_KM_S
    # they used the 371 km/s of COBE and rounded to 1 km/s: at most 1.2 + 1 km/s
    assert np.abs(got - helio).max() < 3.0


def test_local_sheet_velocities_against_heliocentric_ones(shared_data):
    """Single galaxies of Kourkchi & Tully (Local Sheet) that 50MGC lists with a heliocentric velocity."""
    from astropy.io import fits

    with open(shared_data / "groups/kourkchi_tully_2017.txt") as f:
        rows = [line.split("|") for line in f][1:]
    single = [r for r in rows if int(r[20]) == 1]
    ra, dec, vls = (np.array([float(r[k]) for r in single]) for k in (2, 3, 10))
    with fits.open(shared_data / "galaxies/50mgc.fits") as hdus:
        table = hdus[1].data
        ra2, dec2, v_h = (np.asarray(table[k], dtype=float) for k in ("ra", "dec", "v_h"))
    there = SkyCoord(ra2, dec2, unit="deg")
    near, separation, _ = SkyCoord(ra, dec, unit="deg").match_to_catalog_sky(there)
    pair = (separation.arcsec < 5) & np.isfinite(v_h[near])
    assert pair.sum() > 6000
    ours = to_heliocentric(vls / C_KM_S, ra, dec, "local sheet", "velocities")[pair] * C_KM_S
    # other measurements of the same galaxy differ; the typical one agrees to the rounding of both tables
    assert np.median(np.abs(ours - v_h[near][pair])) < 2.0


def test_cmb_frame_of_a_card_and_of_a_bare_table():
    from astropy.table import Table

    from haloledger.catalogs import read_galaxies
    from haloledger.catalogs.frames import to_cmb

    # the apex itself, l = 264.021, b = 48.253: 167.94, -6.94; there the Sun's 369.82 km/s are taken off in full
    assert to_cmb(np.array([0.0]), np.array([167.942]), np.array([-6.944]))[0] * 299792.458 == pytest.approx(
        369.82, abs=0.01
    )
    bare = Table({"id": ["a"], "ra": [10.0], "dec": [20.0], "z": [0.01], "log_mstar": [10.0]})
    assert read_galaxies(bare).z_flow is None
