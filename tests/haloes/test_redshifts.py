"""Draws of redshift and mass together."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.special import ndtr

from haloledger.catalogs.redshift_density import SCORES
from haloledger.cosmos.mass_function import mass_function
from haloledger.engine.universe import Universe
from haloledger.haloes.build import halo_list
from haloledger.haloes.distances import z_floor, z_of_luminosity_distance
from haloledger.haloes.draws import draw_haloes
from haloledger.haloes.posterior import inverse, mean_of_200c
from haloledger.haloes.relations import load_relation

HELD = {"relation": "moster2013", "zero_point": "0", "membership": "0"}


def draws(galaxies, planck, n=20_000, held=HELD, groups=()):
    haloes = halo_list([galaxies] if galaxies is not None else [], list(groups), planck)
    return draw_haloes(haloes, np.arange(len(haloes)), Universe(5, n, held=held), "dutton2014", planck)


def by_grid(planck, name, z_obs, z_err, log_mstar, err, follows=True, zero=0.0):
    """Mean and sd of z and of log M, and their correlation, from P(M, z | data) on a plain 2-D grid."""
    relation = load_relation(name)
    z = np.linspace(max(0.002, z_obs - 6 * z_err), z_obs + 6 * z_err, 601)[:, None]
    m = np.arange(9.5, 16.0, 0.02)
    shift = 2 * np.log10(planck.luminosity_distance_mpc(z) / planck.luminosity_distance_mpc(z_obs))
    y = log_mstar + (shift if follows else 0 * shift) - zero
    sigma = np.hypot(relation.scatter(z), err)
    ln_p = -0.5 * ((z - z_obs) / z_err) ** 2 + np.log(planck.volume_element(z) * mass_function(m, z, planck))
    ln_p = ln_p - 0.5 * ((y - mean_of_200c(relation, m, z, planck)) / sigma) ** 2 - np.log(sigma)
    p = np.exp(ln_p - ln_p.max())
    p /= p.sum()
    mean_z, mean_m = (p * z).sum(), (p * m).sum()
    sd_z, sd_m = np.sqrt((p * (z - mean_z) ** 2).sum()), np.sqrt((p * (m - mean_m) ** 2).sum())
    return mean_z, sd_z, mean_m, sd_m, (p * (z - mean_z) * (m - mean_m)).sum() / (sd_z * sd_m)


CASES = [
    ("moster2013", 0.12, 0.03, 10.3, 0.15, True),
    ("moster2013", 0.30, 0.05, 11.4, 0.20, True),
    ("behroozi2019", 0.25, 0.06, 10.9, 0.20, False),
    ("kravtsov2018", 0.15, 0.04, 9.6, 0.10, True),
]


@pytest.mark.parametrize(("name", "z", "z_err", "log_mstar", "err", "follows"), CASES)
def test_photometric_redshift_and_mass_as_on_a_grid(name, z, z_err, log_mstar, err, follows, make_galaxies, planck):
    galaxies = make_galaxies(
        "g", 1, z=z, z_err=z_err, photometric=True, log_mstar=log_mstar, log_mstar_err=err, mass_err_holds_z=not follows
    )
    drawn = draws(galaxies, planck, held={"relation": name, "zero_point": "0", "membership": "0"})
    mean_z, sd_z, mean_m, sd_m, r = by_grid(planck, name, z, z_err, log_mstar, err, follows)
    # 20,000 draws know a mean to 0.7 per cent of the sd; redshifts are drawn from 49 points
    assert drawn.z.mean() == pytest.approx(mean_z, abs=0.03 * sd_z)
    assert drawn.z.std() == pytest.approx(sd_z, rel=0.03)
    assert drawn.log_m200c.mean() == pytest.approx(mean_m, abs=0.015)
    assert drawn.log_m200c.std() == pytest.approx(sd_m, abs=0.015)
    assert np.corrcoef(drawn.z[0], drawn.log_m200c[0])[0, 1] == pytest.approx(r, abs=0.03)


def test_prior_moves_a_faint_galaxy_outward_and_a_bright_one_inward(make_galaxies, planck):
    # volume grows outward; the number of galaxies falls steeply where moving outward makes them too massive
    galaxies = make_galaxies(
        "g", 2, z=0.15, z_err=0.04, photometric=True, log_mstar=np.array([9.0, 11.7]), log_mstar_err=0.1
    )
    z = draws(galaxies, planck).z.mean(axis=1)
    assert z[0] > 0.155
    assert z[1] < 0.14


def test_held_zero_point_acts_as_a_lighter_galaxy(make_galaxies, planck):
    common = {"z": 0.2, "z_err": 0.04, "photometric": True, "log_mstar_err": 0.15}
    moved = draws(make_galaxies("g", 1, log_mstar=11.3, **common), planck, held=HELD | {"zero_point": "0.5"})
    light = draws(make_galaxies("g", 1, log_mstar=10.8, **common), planck)
    # same random numbers; the two differ only by rounding in the table's place
    assert moved.z == pytest.approx(light.z, abs=1e-8)
    assert moved.log_m200c == pytest.approx(light.log_m200c, abs=1e-6)


def test_posterior_redshift_takes_no_prior(make_galaxies, planck):
    galaxies = make_galaxies(
        "g", 1, z=0.3, z_err=0.03, photometric=True, log_mstar=9.0, log_mstar_err=0.1, z_is="posterior"
    )
    z = draws(galaxies, planck).z
    assert z.mean() == pytest.approx(0.3, abs=1e-3)
    assert z.std() == pytest.approx(0.03, rel=0.03)


def test_posterior_stellar_mass_takes_no_second_prior(make_galaxies, planck):
    # P(M*) is given: masses are then the relation's own inversion at each M*, heavier than the joint posterior
    likelihood, posterior = (
        draws(make_galaxies("g", 1, log_mstar=11.3, log_mstar_err=0.2, mass_is=m), planck).log_m200c
        for m in ("likelihood", "posterior")
    )
    assert posterior.mean() > likelihood.mean() + 0.3


def test_spectroscopic_redshift_has_the_peculiar_velocity(make_galaxies, planck):
    drawn = draws(make_galaxies("g", 1, z=0.1, z_err=0.0005, log_mstar=10.0, log_mstar_err=0.1), planck)
    assert drawn.z.mean() == pytest.approx(0.1, abs=3e-5)
    assert drawn.z.std() == pytest.approx(np.hypot(0.0005, 300 / 299792.458 * 1.1), rel=0.02)
    assert drawn.distance_kpc == pytest.approx(planck.angular_distance_kpc(drawn.z), rel=1e-9)


def test_measured_distance_rules_within_50_mpc(make_galaxies, planck):
    galaxies = make_galaxies(
        "g",
        3,
        z=np.array([-0.001, 0.004, 0.03]),
        distance_mpc=np.array([0.76, 16.0, 60.0]),
        distance_err_mpc=np.array([0.02, 1.6, 6.0]),
        log_mstar=10.5,
        log_mstar_err=0.1,
    )
    drawn = draws(galaxies, planck)
    assert np.median(drawn.distance_kpc, axis=1)[:2] == pytest.approx([760, 16_000], rel=0.01)
    assert np.std(np.log(drawn.distance_kpc[:2]), axis=1) == pytest.approx([0.02 / 0.76, 0.1], rel=0.03)
    # beyond 50 Mpc the redshift rules: 60 Mpc were wrong by a factor of two
    assert np.median(drawn.distance_kpc[2]) == pytest.approx(planck.angular_distance_kpc(0.03), rel=0.01)


def test_a_distance_error_larger_than_the_distance_is_cut(make_galaxies, planck):
    # 1.1 +- 4.6 Mpc stands in a published table: as a log-normal it would put the galaxy next to us
    galaxies = make_galaxies(
        "g", 1, distance_mpc=1.1, distance_err_mpc=4.6, z=-0.0006, log_mstar=8.0, log_mstar_err=0.1
    )
    drawn = draws(galaxies, planck)
    assert np.std(np.log(drawn.distance_kpc[0])) == pytest.approx(0.5, rel=0.05)


def test_mass_follows_the_drawn_distance(make_galaxies, planck):
    galaxies = make_galaxies(
        "g", 1, distance_mpc=20.0, distance_err_mpc=4.0, z=0.004, log_mstar=9.5, log_mstar_err=0.05
    )
    drawn = draws(galaxies, planck)
    slope = np.polyfit(np.log10(drawn.distance_kpc[0]), drawn.log_m200c[0], 1)[0]
    # log M* goes with 2 log D, and d log M / d log M* is 0.45 at 9.5 in this relation (G7: 11.28 at 9.5; 11.97 at 10.5)
    assert 0.7 < slope < 1.2


def test_near_redshift_without_distance_is_drawn_with_volume(make_galaxies, planck):
    # 300 km/s at 600 km/s: the volume pulls outward
    drawn = draws(make_galaxies("g", 1, z=0.002, z_err=1e-4, log_mstar=8.5, log_mstar_err=0.1), planck)
    assert drawn.z.mean() > 0.0023
    assert drawn.z.min() > 0


def test_luminosity_distance_and_back(planck):
    mpc = np.array([0.05, 1.0, 16.0, 50.0, 400.0])
    # the inverse of the distance is linear between nodes 3 Mpc apart
    assert planck.luminosity_distance_mpc(z_of_luminosity_distance(mpc, planck)) == pytest.approx(mpc, rel=3e-4)


def test_floor_of_redshift(make_galaxies, planck):
    z = np.array([0.1, 0.1, 0.02, -0.001])
    galaxies = make_galaxies(
        "g",
        4,
        ra_deg=np.array([10.0, 60.0, 120.0, 200.0]),
        z=z,
        z_err=np.array([0.0, 0.02, 0.02, 0.0]),
        distance_mpc=np.array([np.nan] * 3 + [0.76]),
        log_mstar=10.0,
    )
    floor = z_floor(halo_list([galaxies], [], planck), planck)
    assert floor[0] == pytest.approx(0.1 - 3 * 1.1 * 300 / 299792.458)
    assert floor[1] == pytest.approx(0.04, abs=3e-4)
    assert floor[2] == pytest.approx(0.006)
    assert 0 < floor[3] < z_of_luminosity_distance(0.76, planck)


def test_outliers_as_on_a_grid(make_galaxies, planck):
    # the mixture of a narrow and a broad likelihood under one prior, against its sum on a plain grid
    name, z_obs, err, log_mstar, m_err, f = "moster2013", 0.3, 0.03, 10.2, 0.15, 0.2
    galaxies = make_galaxies(
        "g", 1, z=z_obs, z_err=err, photometric=True, log_mstar=log_mstar, log_mstar_err=m_err, z_outlier=f
    )
    drawn = draws(galaxies, planck, n=60_000, held=HELD)
    relation = load_relation(name)
    # outliers are drawn between 0.3 z and five of their widths
    z = np.linspace(0.3 * z_obs, z_obs + 5 * 0.3 * (1 + z_obs), 4001)[:, None]
    m = np.arange(9.5, 16.0, 0.02)
    y = log_mstar + 2 * np.log10(planck.luminosity_distance_mpc(z) / planck.luminosity_distance_mpc(z_obs))
    sigma = np.hypot(relation.scatter(z), m_err)
    number = mass_function(m, z, planck) * np.exp(-0.5 * ((y - mean_of_200c(relation, m, z, planck)) / sigma) ** 2)
    prior = planck.volume_element(z)[:, 0] * (number / sigma).sum(axis=1)
    narrow, broad = (
        np.exp(-0.5 * ((z[:, 0] - z_obs) / s) ** 2) / s
        for s in (np.hypot(err, 1.3 * 300 / 299792.458), 0.3 * (1 + z_obs))
    )
    p = prior * ((1 - f) * narrow + f * broad)
    for low, high in ((0, 0.2), (0.2, 0.25), (0.25, 0.35), (0.35, 0.45), (0.45, 0.7), (0.7, 3)):
        expected = p[(z[:, 0] >= low) & (z[:, 0] < high)].sum() / p.sum()
        # 60,000 draws know a share of 0.1 to 0.0012
        assert np.mean((drawn.z >= low) & (drawn.z < high)) == pytest.approx(expected, abs=0.006), (low, high)
    without = draws(make_galaxies("g", 1, z=z_obs, z_err=err, photometric=True, log_mstar=log_mstar), planck)
    assert np.mean(np.abs(without.z - z_obs) > 0.15) < 1e-3
    assert np.mean(np.abs(drawn.z - z_obs) > 0.15) > 0.05


def test_fixed_has_no_outliers(make_galaxies, planck):
    haloes = halo_list(
        [make_galaxies("g", 1, z=0.3, z_err=0.03, photometric=True, log_mstar=10.0, z_outlier=0.9)], [], planck
    )
    assert draw_haloes(haloes, [0], Universe(fixed=True), "dutton2014", planck).z[0, 0] == 0.3


def test_outliers_are_searched_at_lower_redshift(make_galaxies, planck):
    galaxies = make_galaxies(
        "g",
        2,
        ra_deg=np.array([10.0, 90.0]),
        z=0.3,
        z_err=0.01,
        photometric=np.array([True, False]),
        log_mstar=10.0,
        z_outlier=0.05,
    )
    assert z_floor(halo_list([galaxies], [], planck), planck) == pytest.approx([0.12, 0.27], abs=5e-3)


def test_distance_follows_the_flow_and_comparisons_the_listed_redshift(make_galaxies, planck):
    galaxies = make_galaxies("g", 1, z=0.006, z_err=1e-4, log_mstar=9.5, z_flow=np.array([0.0072]))
    haloes = halo_list([galaxies], [], planck)
    assert haloes.z[0] == 0.006
    drawn = draw_haloes(haloes, [0], Universe(fixed=True), "dutton2014", planck)
    assert drawn.z[0, 0] == 0.0072
    assert drawn.distance_kpc[0, 0] == pytest.approx(planck.angular_distance_kpc(0.0072))


def test_group_near_the_observer_is_drawn_with_volume(make_groups, planck):
    groups = make_groups("s", 1, z=0.0025, z_err=3e-4, log_mass=12.5, log_mass_err=0.2)
    z = draws(None, planck, groups=[groups]).z
    floor = 0.3 * 0.0025
    assert np.mean(z <= floor * 1.001) < 1e-3  # nothing piles up there
    assert z.mean() > 0.0027


def two_peaks(z):
    p = 0.7 * np.exp(-0.5 * ((z - 0.3) / 0.03) ** 2) / 0.03 + 0.3 * np.exp(-0.5 * ((z - 0.6) / 0.04) ** 2) / 0.04
    return p / p.sum()


def scores_of(z, p):
    return np.interp(ndtr(SCORES), np.cumsum(p), z)[None, :]


def test_density_of_a_catalogue_is_drawn_as_it_stands_or_with_the_prior(make_galaxies, planck):
    z = np.arange(0.05, 1.0, 0.0005)
    common = {"z": 0.3, "z_err": 0.03, "photometric": True, "log_mstar": 10.6, "log_mstar_err": 0.15}
    common["z_scores"] = scores_of(z, two_peaks(z))
    taken, joint = (draws(make_galaxies("g", 1, z_is=s, **common), planck).z for s in ("posterior", "likelihood"))
    # between scores z runs straight, so that the gap between the peaks holds part of one step
    assert np.mean(taken < 0.45) == pytest.approx(0.7, abs=0.02)
    y = 10.6 + 2 * np.log10(planck.luminosity_distance_mpc(z) / planck.luminosity_distance_mpc(0.3))
    p = two_peaks(z) * planck.volume_element(z) * np.exp(inverse("moster2013", planck).ln_count(y, z, 0.15))
    assert np.mean(joint < 0.45) == pytest.approx(p[z < 0.45].sum() / p.sum(), abs=0.03)
    assert abs(np.mean(taken < 0.45) - np.mean(joint < 0.45)) > 0.1
    assert joint[joint < 0.45].mean() == pytest.approx((p * z)[z < 0.45].sum() / p[z < 0.45].sum(), abs=0.005)
    haloes = halo_list([make_galaxies("g", 1, **common)], [], planck)
    assert z_floor(haloes, planck)[0] == pytest.approx(common["z_scores"][0, 0])
