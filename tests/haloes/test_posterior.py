"""Halo mass given stellar mass: published inversions, and a direct integration."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.special import ndtr

from haloledger.cosmos.concentration import concentration
from haloledger.cosmos.mass_definitions import from_200c
from haloledger.cosmos.mass_function import mass_function
from haloledger.engine.universe import Universe
from haloledger.haloes.build import halo_list
from haloledger.haloes.draws import draw_haloes
from haloledger.haloes.posterior import inverse, mean_of_200c
from haloledger.haloes.relations import load_relation

# relation, total scatter [dex], log M*, mean and sd of log Mh: Tinker et al. 2008 x relation on a fine grid, z = 0.1
INVERSIONS = [
    ("moster2013", 0.15, 9.5, 11.2773, 0.0741),
    ("moster2013", 0.15, 10.5, 11.9798, 0.1869),
    ("moster2013", 0.15, 11.0, 12.7631, 0.3414),
    ("moster2013", 0.15, 11.3, 13.4401, 0.3816),
    ("moster2013", 0.20, 9.5, 11.2718, 0.0992),
    ("moster2013", 0.20, 10.5, 11.9760, 0.2401),
    ("moster2013", 0.20, 11.0, 12.6381, 0.3961),
    ("moster2013", 0.20, 11.3, 13.1928, 0.4662),
    ("kravtsov2018", 0.20, 9.5, 11.2499, 0.0874),
    ("kravtsov2018", 0.20, 10.5, 11.8402, 0.1760),
    ("kravtsov2018", 0.20, 11.0, 12.3553, 0.2684),
    ("kravtsov2018", 0.20, 11.3, 12.7647, 0.3218),
    ("moster2013", np.hypot(0.2, 0.2), 11.3, 12.843, None),
    ("kravtsov2018", np.hypot(0.2, 0.2), 11.3, 12.615, None),
]


@pytest.mark.parametrize(("relation", "total", "log_mstar", "mean", "sd"), INVERSIONS)
def test_drawn_masses_have_the_published_mean_and_spread(relation, total, log_mstar, mean, sd, make_galaxies, planck):
    intrinsic = load_relation(relation).scatter_dex[0]
    err = np.sqrt(max(total**2 - intrinsic**2, 0.0))
    galaxies = make_galaxies("g", 1, log_mstar=log_mstar, log_mstar_err=float(err))
    universe = Universe(seed=7, n_draws=100_000, held={"relation": relation, "zero_point": "0", "membership": "0"})
    drawn = draw_haloes(halo_list([galaxies], [], planck), [0], universe, "dutton2014", planck).log_m200c
    # 1e5 draws know the mean to 0.0015; the rest is the table's step and 300 km/s in the distance
    assert drawn.mean() == pytest.approx(mean, abs=0.01)
    if sd is not None:
        assert drawn.std() == pytest.approx(sd, abs=0.01)


def test_virial_relation_agrees_in_its_own_definition(planck):
    # 13.2275 +- 0.3692 is for the virial mass of the relation; ours is M200c, mapped before the prior is applied
    u = np.random.default_rng(3).standard_normal(100_000)
    mass = inverse("behroozi2019", planck).mass(11.3, 0.1, 0.0, u)
    virial = from_200c(mass, "vir", 0.1, concentration("dutton2014", mass, 0.1, planck), planck)
    assert virial.mean() == pytest.approx(13.2275, abs=0.02)  # the prior is that of M200c there, too
    assert virial.std() == pytest.approx(0.3692, abs=0.02)


# between the nodes of every axis, on both sides of the knee
OFF_NODES = [
    ("moster2013", 10.877, 0.257, 0.137),
    ("moster2013", 8.62, 0.013, 0.4),
    ("behroozi2013", 11.123, 0.71, 0.11),
    ("kravtsov2018", 11.611, 0.043, 0.29),
    ("behroozi2019", 10.333, 1.21, 0.09),
    ("evrard2008", 2.613, 0.047, 0.13),
    ("pratt2009", 0.234, 0.333, 0.05),
    ("same-500c", 14.213, 0.268, 0.187),
]


@pytest.mark.parametrize(("name", "y", "z", "err"), OFF_NODES)
def test_quantiles_and_number_match_direct_integration(name, y, z, err, planck):
    relation, grid = load_relation(name), np.arange(8.5, 16.0, 0.001)
    sigma = np.hypot(relation.scatter(z), err)
    like = np.exp(-0.5 * ((y - mean_of_200c(relation, grid, z, planck)) / sigma) ** 2) / (np.sqrt(2 * np.pi) * sigma)
    density = like * mass_function(grid, z, planck)
    grown = np.cumsum(density) / density.sum()
    u = np.array([-3.0, -1.0, -0.1, 0.1, 1.0, 2.0, 3.0])
    expected = np.interp(ndtr(u), grown, grid)
    got = inverse(name, planck).mass(y, z, err, u)
    # steps of the table: 0.05 in log M*, 0.1 to 0.2 in z, 0.025 in sigma, 0.3 in u
    assert got[1:5] == pytest.approx(expected[1:5], abs=0.012)
    assert got == pytest.approx(expected, abs=0.03)
    number = np.log(density.sum() * 0.001)
    assert inverse(name, planck).ln_count(y, z, err) == pytest.approx(number, abs=0.03)


def test_forgetting_the_prior_would_show(planck):
    # the reason for all this: at log M* = 11.3 with 0.2 dex error the mass read backwards is 0.4 to 1 dex too heavy
    mass = inverse("moster2013", planck).mass(11.3, 0.1, 0.2, 0.0)
    assert 13.8632 - mass > 0.5
