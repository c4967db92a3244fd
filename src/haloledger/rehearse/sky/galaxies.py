"""Galaxies of haloes: one central each, and satellites.

"occupation"  satellites above a stellar mass: (M / Msat) exp(-Mcut / M), with Msat and Mcut power laws in the halo mass
              Mh of a central of that stellar mass (Leauthaud et al. 2011, ApJ 738, 45, eq. 12-14; values for z 0.22 to
              0.48 of Leauthaud et al. 2012, ApJ 744, 159, table 5, from memory); rarely one heavier than the central
"subhaloes"   subhaloes are Poisson around amplitude x psi^-0.91 exp(-6 psi^3) and hold what the relation gives at their
              mass of infall; the amplitude is set by the share of galaxies of 1e10 Msun that are satellites

Satellites follow NFW inside r200c and move with the halo's velocity dispersion.
"""

from __future__ import annotations

from dataclasses import dataclass

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


@dataclass(frozen=True)
class Light:
    """How halo mass becomes a measured stellar mass; arrays a halo (n,)."""

    relation: np.ndarray  # number of the relation that holds
    zero_point: np.ndarray
    scatter_factor: float
    mass_err: float

    def part(self, index) -> Light:
        """The haloes `index`, repeated or left out."""
        return Light(self.relation[index], self.zero_point[index], self.scatter_factor, self.mass_err)


def stellar_masses(log_m, z, light: Light, cosmos: Cosmos, rng) -> tuple[np.ndarray, np.ndarray]:
    """True and measured log10 M* of galaxies formed in haloes of these masses."""
    spread = light.scatter_factor * _scatter(z, light.relation)
    true = _mean(log_m, z, light.relation, cosmos) + spread * rng.standard_normal(len(log_m))
    return true, true + light.zero_point + light.mass_err * rng.standard_normal(len(log_m))


def _mean(log_m, z, relation, cosmos: Cosmos) -> np.ndarray:
    c200c = median_concentration(log_m, z, cosmos)
    result = np.empty(len(log_m))
    for k, name in enumerate(relations.ALL):
        rows = np.flatnonzero(relation == k)
        result[rows] = relations.mean_log_mstar(name, log_m[rows], z[rows], c200c[rows], cosmos)
    return result


def _scatter(z, relation) -> np.ndarray:
    return np.choose(relation, [relations.scatter_dex(name, z) for name in relations.ALL])


def centrals(haloes: Haloes, masses: tuple[np.ndarray, np.ndarray]) -> Galaxies:
    """One galaxy at the centre of each halo; `masses` are true and measured."""
    n = len(haloes)
    return Galaxies(
        halo=np.arange(n),
        central=np.ones(n, dtype=bool),
        log_mstar=masses[0],
        measured=masses[1],
        z_seen=haloes.z_seen,
        east_mpc=haloes.east_mpc,
        north_mpc=haloes.north_mpc,
    )


SATELLITES = ("occupation", "subhaloes", "none")
MSAT, MSAT_SLOPE, MCUT, MCUT_SLOPE = 12 + np.log10(10.62), 0.859, 12 + np.log10(1.47), -0.13


def satellites(haloes: Haloes, light: Light, kind: str, share: float, z: float, cosmos: Cosmos, rng) -> Galaxies:
    """Satellites of all haloes, by one of SATELLITES; `share` of the galaxies of 1e10 Msun at z, for subhaloes."""
    if kind == "occupation":
        owner, true, measured = _by_occupation(haloes, light, cosmos, rng)
    else:
        amount = amplitude(share, z, cosmos) if kind == "subhaloes" else 0.0
        owner, true, measured = _by_subhaloes(haloes, light, amount, cosmos, rng)
    east, north, velocity = _orbits(haloes, owner, cosmos, rng)
    return Galaxies(
        halo=owner,
        central=np.zeros(len(owner), dtype=bool),
        log_mstar=true,
        measured=measured,
        z_seen=(1 + haloes.z_seen[owner]) * (1 + velocity / LIGHT_KMS) - 1,
        east_mpc=haloes.east_mpc[owner] + east,
        north_mpc=haloes.north_mpc[owner] + north,
    )


def _by_subhaloes(haloes: Haloes, light: Light, amount: float, cosmos: Cosmos, rng):
    floor = SUBHALO_LEAST - haloes.log_m200c
    owner = np.repeat(np.arange(len(haloes)), rng.poisson(amount * subhaloes_above(floor)))
    mass = haloes.log_m200c[owner] + draw_log_psi(floor[owner], rng)
    return owner, *stellar_masses(mass, haloes.z[owner], light.part(owner), cosmos, rng)


def _by_occupation(haloes: Haloes, light: Light, cosmos: Cosmos, rng):
    """Candidates without the cut fall as Mh^-0.859; each is kept with the share that the cut leaves there."""
    log_m = haloes.log_m200c
    most = 10 ** (log_m - MSAT - MSAT_SLOPE * (SUBHALO_LEAST - 12))
    owner = np.repeat(np.arange(len(haloes)), rng.poisson(most))
    mh = SUBHALO_LEAST - np.log10(1 - rng.random(len(owner))) / MSAT_SLOPE
    cut = 10 ** (MCUT + MCUT_SLOPE * (mh - 12) - log_m[owner])
    left = np.exp(-cut) * np.maximum(1 + MCUT_SLOPE / MSAT_SLOPE * cut, 0.0)
    keep = rng.random(len(owner)) < left
    owner, mh = owner[keep], mh[keep]
    part, z = light.part(owner), haloes.z[owner]
    true, limit = (_mean(m, z, part.relation, cosmos) for m in (mh, log_m[owner]))
    spread = light.scatter_factor * _scatter(z, part.relation)
    keep = (limit - true) > spread * rng.standard_normal(len(owner))
    owner, true = owner[keep], true[keep]
    noise = light.mass_err * rng.standard_normal(len(owner))
    return owner, true, true + light.zero_point[owner] + noise


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
