"""Galaxies of haloes: one central each, and satellites that follow the same relation at their mass of infall.

Subhaloes are Poisson around amplitude x psi^-0.91 exp(-6 psi^3); the amplitude is set so that the wanted share of
galaxies of 1e10 Msun are satellites. Satellites follow NFW inside r200c and move with the halo's velocity dispersion.
"""

from __future__ import annotations

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.cosmos.mass_function import mass_function
from haloledger.rehearse.sky import relations
from haloledger.rehearse.sky.structure import (
    LIGHT_KMS,
    draw_log_psi,
    median_concentration,
    nfw_radius,
    subhaloes_above,
    velocity_dispersion_kms,
)
from haloledger.rehearse.sky.truth import Galaxies, Haloes

PIVOT_LOG_MSTAR = 10.0
SUBHALO_LEAST = 10.8


def amplitude(share: float, z: float, cosmos: Cosmos) -> float:
    """Amplitude of the subhalo mass function for which `share` of the galaxies of 1e10 Msun are satellites.

    Both satellites and centrals of one stellar mass come from one infall mass, so the ratio is taken there: the mass at
    which moster2013 gives 1e10 Msun.
    """
    m = np.arange(9.5, 15.6, 0.02)
    mean = relations.moster2013(m, z)
    at = float(np.interp(PIVOT_LOG_MSTAR, mean, m))
    host = np.arange(at, 15.6, 0.01)
    number = mass_function(host, z, cosmos)
    step = 0.01
    per_dex = (subhaloes_above(at - host - step) - subhaloes_above(at - host + step)) / (2 * step)
    satellites = float(np.sum(number * per_dex) * 0.01)
    return share / (1 - share) * float(mass_function(at, z, cosmos)) / satellites


def make_galaxies(
    haloes: Haloes, relation_of_halo, host_distance_mpc, subhaloes: float, scatter_factor: float, cosmos: Cosmos, rng
) -> Galaxies:
    """All galaxies of these haloes; the first len(haloes) rows are the centrals, in order.

    relation_of_halo   number of the relation that holds for each
    subhaloes          amplitude of the subhalo mass function
    """
    n = len(haloes)
    floor = SUBHALO_LEAST - haloes.log_m200c
    owner = np.repeat(np.arange(n), rng.poisson(subhaloes * subhaloes_above(floor)))
    log_psi = draw_log_psi(floor[owner], rng)
    halo = np.concatenate([np.arange(n), owner])
    mass = np.concatenate([haloes.log_m200c, haloes.log_m200c[owner] + log_psi])
    mstar = _stellar(mass, haloes.z[halo], relation_of_halo[halo], scatter_factor, cosmos, rng)
    east, north, velocity = _orbits(haloes, owner, cosmos, rng)
    zero = np.zeros(n)
    scale = 1 + np.concatenate([zero, velocity]) / LIGHT_KMS
    return Galaxies(
        halo=halo,
        central=np.arange(len(halo)) < n,
        log_mstar=mstar,
        z_seen=(1 + haloes.z_seen[halo]) * scale - 1,
        east_mpc=haloes.east_mpc[halo] + np.concatenate([zero, east]),
        north_mpc=haloes.north_mpc[halo] + np.concatenate([zero, north]),
    )


def _stellar(log_m, z, relation, scatter_factor, cosmos: Cosmos, rng) -> np.ndarray:
    """Stellar masses, with the scatter of the relation times `scatter_factor`."""
    c200c = median_concentration(log_m, z, cosmos)
    result = np.empty(len(log_m))
    for k, name in enumerate(relations.NAMES):
        rows = np.flatnonzero(relation == k)
        mean = relations.mean_log_mstar(name, log_m[rows], z[rows], c200c[rows], cosmos)
        spread = scatter_factor * relations.scatter_dex(name, z[rows])
        result[rows] = mean + spread * rng.standard_normal(len(rows))
    return result


def _orbits(haloes: Haloes, owner, cosmos: Cosmos, rng):
    """Offsets [comoving Mpc] and velocities [km/s] of satellites."""
    n = len(owner)
    log_m, z = haloes.log_m200c[owner], haloes.z[owner]
    r200c_mpc = cosmos.r200c_kpc(log_m, z) * (1 + z) / 1e3
    radius = r200c_mpc * nfw_radius(rng.random(n), haloes.c200c[owner])
    cosine, turn = 2 * rng.random(n) - 1, 2 * np.pi * rng.random(n)
    across = radius * np.sqrt(1 - cosine**2)
    velocity = velocity_dispersion_kms(log_m, z, cosmos) * rng.standard_normal(n)
    return across * np.cos(turn), across * np.sin(turn), velocity
