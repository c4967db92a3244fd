"""Which galaxies a listed group holds: those its catalogue puts there, and those inside its projected phase space.

With a spectroscopic redshift a galaxy is inside or not. A photometric one within two errors is a member with the
probability

    p / (1 - p) = delta x 2 sqrt(r200c^2 - R^2) H(z) / c x N(z_obs | z_group, err)

that is, galaxies follow matter: the density inside a halo is delta = 200 rho_crit / rho_mean times the mean, along a
chord of the sphere, against the mean density along the whole line within the redshift's error.
"""

from __future__ import annotations

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.haloes.distances import SPEED_OF_LIGHT_KMS
from haloledger.haloes.phase_space import Extent, Inside, inside
from haloledger.haloes.table import Haloes

HEAVIER_DEX = 0.7  # a galaxy heavier than a group by more is not its member, whatever the sky looks like


def member_probability(galaxies: Haloes, galaxy_size: Extent, groups: Haloes, size: Extent, group_rows, cosmos: Cosmos):
    """Probability, shape (n_galaxies,), that a galaxy has no halo of its own because a group holds it.

    group_rows  every "label:id" of the listed groups, doubles and parts included
    """
    p = np.zeros(len(galaxies))
    found = inside(groups, size, galaxies, galaxy_size)
    lighter = galaxy_size.log_m200c[found.j] <= size.log_m200c[found.i] + HEAVIER_DEX
    odds = np.zeros(len(galaxies))
    np.add.at(odds, found.j[lighter], _odds(found, galaxies, groups, size, cosmos)[lighter])
    photometric = galaxies.photometric
    p[photometric] = (odds / (1 + odds))[photometric]
    p[~photometric & (odds > 0)] = 1.0
    p[np.isin(galaxies.listed_group.astype(str), list(group_rows))] = 1.0
    return p


def _odds(found: Inside, galaxies: Haloes, groups: Haloes, size: Extent, cosmos: Cosmos) -> np.ndarray:
    i, j = found.i, found.j
    z = size.z[i]
    hubble_mpc = SPEED_OF_LIGHT_KMS / (100 * cosmos.h)
    chord_mpc = 2e-3 * size.r200c_kpc[i] * np.sqrt(np.maximum(1 - found.radius**2, 0.0)) * (1 + z)
    delta = 200 / cosmos.omega_m_z(z)
    err = np.maximum(np.hypot(galaxies.z_err[j], groups.z_err[i]), 1e-4)
    density = np.exp(-0.5 * ((galaxies.z[j] - groups.z[i]) / err) ** 2) / (np.sqrt(2 * np.pi) * err)
    return np.maximum(delta * chord_mpc * cosmos.e_of_z(z) / hubble_mpc * density, 1e-9)
