"""Terms at the two ends, localisation and redshift draws."""

import numpy as np
import pytest

from haloledger.catalogs.canonical import Bursts
from haloledger.cosmos.mean_dm import mean_cosmic_dm
from haloledger.cosmos.scatter import relative_dm
from haloledger.engine.universe import Universe
from haloledger.errors import InputError
from haloledger.sightlines.draws import directions, given_redshift
from haloledger.sightlines.electron_model import electron_model
from haloledger.sightlines.geometry import local_axes, unit_vectors
from haloledger.sightlines.redshift import redshift_from_dm
from haloledger.sightlines.terms import defaults, host_obs, mw_disc, mw_halo

UNIVERSE = Universe(seed=2, n_draws=20_000)


def bursts(**given) -> Bursts:
    """One burst with everything missing but what is given."""
    values = {"burst": "A", "ra_deg": 30.0, "dec_deg": 50.0, "z": 0.3, "z_err": 0.0, "dm": 400.0, "dm_err": 0.0}
    values |= {"host": "", "note": ""} | given
    names = [f for f in Bursts.__dataclass_fields__ if f not in ("notes", "refused")]
    return Bursts(**{n: np.array([values.get(n, np.nan)]) for n in names})


def test_localisation_ellipse_has_its_axes_and_angle():
    table = bursts(loc_major_arcsec=30.0, loc_minor_arcsec=10.0, loc_pa_deg=30.0)
    draws = directions(table, 0, UNIVERSE)
    east, north = local_axes(table.ra_deg, table.dec_deg)
    offset = draws - unit_vectors(table.ra_deg, table.dec_deg)
    e, n = np.degrees(offset @ east[0]) * 3600, np.degrees(offset @ north[0]) * 3600
    covariance = np.cov(e, n)
    values, vectors = np.linalg.eigh(covariance)
    # 20,000 draws know a standard deviation to 0.5%; 3 sigma
    assert np.sqrt(values) == pytest.approx([10.0, 30.0], rel=0.02)
    # the long axis points 30 deg from north towards east
    assert np.degrees(np.arctan2(vectors[0, 1], vectors[1, 1])) % 180 == pytest.approx(30.0, abs=1.0)


def test_no_localisation_is_exact():
    assert np.ptp(directions(bursts(), 0, UNIVERSE), axis=0).max() == 0


def test_redshift_draws_hold_the_peculiar_velocity():
    z = given_redshift(bursts(z_err=0.0), 0, UNIVERSE)
    assert z.std() == pytest.approx(1.3 * 300 / 299792.458, rel=0.03)
    assert given_redshift(bursts(), 0, Universe(fixed=True)) == pytest.approx([0.3], abs=1e-15)


def test_disc_from_the_table_wins():
    value, said = mw_disc(bursts(dm_disc=55.0, dm_disc_err=5.0), 0, UNIVERSE)
    assert "from the table of bursts" in said
    assert np.median(value) == pytest.approx(55.0, rel=0.01)
    assert np.quantile(value, 0.84) - 55 == pytest.approx(5.0, rel=0.05)


def test_disc_fallback_at_the_pole_and_near_the_plane():
    pole, said = mw_disc(bursts(ra_deg=192.85948, dec_deg=27.12825), 0, Universe(fixed=True))  # galactic north pole
    assert pole[0] == pytest.approx(defaults()["mw_disc_plane"]["pole"], rel=1e-6)
    assert "factor two" not in said
    low, said = mw_disc(bursts(ra_deg=266.4, dec_deg=-28.9), 0, UNIVERSE)
    assert "factor two" in said
    assert "give dm_disc" in said
    assert np.quantile(low, 0.84) / np.median(low) == pytest.approx(2.0, rel=0.05)


def test_milky_way_halo_default_is_at_least_three_tenths_dex():
    value, _ = mw_halo(bursts(), 0, UNIVERSE)
    assert np.log10(value).std() >= 0.29
    assert np.median(value) == pytest.approx(40.0, rel=0.03)


def test_milky_way_is_one_for_all_sightlines():
    first, _ = mw_halo(bursts(burst="A"), 0, UNIVERSE)
    other, _ = mw_halo(bursts(burst="B", ra_deg=200.0), 0, UNIVERSE)
    assert np.array_equal(first, other)


def test_held_terms():
    universe = Universe(n_draws=10, held={"mw_halo": "25", "mw_disc": "0.5", "host_rest": "80"})
    assert np.all(mw_halo(bursts(), 0, universe)[0] == 25)
    assert np.all(mw_disc(bursts(dm_disc=40.0), 0, universe)[0] == 20)
    assert host_obs(bursts(), 0, np.full(10, 0.6), universe)[0] == pytest.approx(np.full(10, 50.0))


def test_host_frames():
    z = np.full(UNIVERSE.n_draws, 0.5)
    default, said = host_obs(bursts(), 0, z, UNIVERSE)
    # Sang & Lin 2025: median 153, sigma 0.96 in the rest frame
    assert np.median(default) == pytest.approx(152.9 / 1.5, rel=0.03)
    assert "sang-lin-2025" in said
    rest, _ = host_obs(bursts(dm_host_rest=90.0), 0, z, UNIVERSE)
    seen, _ = host_obs(bursts(dm_host_obs=90.0), 0, z, UNIVERSE)
    assert np.all(rest == 60.0)
    assert np.all(seen == 90.0)


def test_redshift_from_dm_recovers_truth(planck):
    # simulated bursts with known z: the 68% interval of the ensemble holds the truth about 68% of the time
    rng = np.random.default_rng(4)
    universe = Universe(seed=9, n_draws=400)
    inside, n = 0, 150
    for i in range(n):
        z = rng.uniform(0.002, 4.0)  # the prior
        host = 152.9 * np.exp(0.96 * rng.standard_normal())
        dm = 80 + mean_cosmic_dm(z, planck) * relative_dm(z, rng.standard_normal()) + host / (1 + z)
        hosts = 152.9 * np.exp(0.96 * universe.normals("h", [str(i)])[0])
        draws = redshift_from_dm(str(i), np.full(400, float(dm)), np.full(400, 80.0), hosts, universe, planck)
        low, high = np.quantile(draws, [0.16, 0.84])
        inside += low <= z <= high
    # truth is drawn from the prior, so the calibration is exact up to the 5% kernel; binomial error 3.8%
    assert 0.57 < inside / n < 0.79


def test_unknown_disc_model_says_what_to_write():
    with pytest.raises(InputError, match="Write one of plane, ne2001, ne2025"):
        electron_model("ne1999")


def test_electron_model_value():
    # NE2025 towards l = 180, b = -20 to 30 kpc: 67.022 (mwprop 2.0.5)
    pytest.importorskip("mwprop", reason="the optional electron model (extra 'milkyway') is not installed")
    model = electron_model("ne2025")
    assert model(180.0, -20.0) == pytest.approx(67.022, rel=0.01)


def test_a_burst_below_the_milky_way_is_next_door(planck):
    universe = Universe(seed=3, n_draws=300)
    hosts = 152.9 * np.exp(0.96 * universe.normals("h", ["x"])[0])
    drawn = redshift_from_dm("x", np.full(300, 50.0), np.full(300, 60.0), hosts, universe, planck)
    assert np.quantile(drawn, 0.84) < 0.05
