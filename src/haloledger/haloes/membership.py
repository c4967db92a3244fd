"""Which galaxies a listed group holds: those its catalogue puts there, and those inside its projected phase space.

Where both redshifts are sharp, errors below 300 km/s or the velocity dispersion, a galaxy is inside or not. Else, as
with photometric redshifts (within two errors), it is a member with the probability

    p / (1 - p) = delta x 2 sqrt(r200c^2 - R^2) H(z) / c x N(z_obs | z_group, err and dispersion)

that is, galaxies follow matter: the density inside a halo is delta = 200 rho_crit / rho_mean times the mean, along a
chord of the sphere, against the mean density along the whole line within the redshift's error.
"""

from __future__ import annotations

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.haloes.distances import SPEED_OF_LIGHT_KMS
from haloledger.haloes.phase_space import Extent, inside
from haloledger.haloes.table import Haloes

SHARP_KMS = 300.0
HEAVIER_DEX = 0.7  # a galaxy heavier than a group by more is not its member, whatever the sky looks like


def member_probability(galaxies: Haloes, galaxy_size: Extent, groups: Haloes, size: Extent, group_rows, cosmos: Cosmos):
    """Probability, shape (n_galaxies,), that a galaxy has no halo of its own because a group holds it.

    group_rows  every "label:id" of the listed groups, doubles and parts included
    """
    found = inside(groups, size, galaxies, galaxy_size)
    lighter = galaxy_size.log_m200c[found.j] <= size.log_m200c[found.i] + HEAVIER_DEX
    i, j = found.i[lighter], found.j[lighter]
    scale = SPEED_OF_LIGHT_KMS / (1 + size.z[i])
    err_kms = np.hypot(galaxies.z_err[j], groups.z_err[i]) * scale
    sharp = (err_kms < np.maximum(size.sigma_v_kms[i], SHARP_KMS)) & ~galaxies.photometric[j]
    odds = np.zeros(len(galaxies))
    apart_kms = (galaxies.z[j] - groups.z[i]) * scale
    np.add.at(odds, j, _odds(apart_kms, np.hypot(err_kms, size.sigma_v_kms[i]), found.radius[lighter], size, i, cosmos))
    p = odds / (1 + odds)
    p[j[sharp]] = 1.0
    # a galaxy table names its group as the group table does, with or without that table's label
    names = [*group_rows, *(row.split(":", 1)[-1] for row in group_rows)]
    p[np.isin(galaxies.listed_group.astype(str), names) & (galaxies.listed_group != "")] = 1.0
    return p


def _odds(apart_kms, err_kms, radius, size: Extent, i, cosmos: Cosmos) -> np.ndarray:
    z = size.z[i]
    chord_kpc = 2 * size.r200c_kpc[i] * np.sqrt(np.maximum(1 - radius**2, 0.0))
    hubble_kms = 0.1 * cosmos.h * cosmos.e_of_z(z) * chord_kpc  # speed across the chord in the Hubble flow
    per_kms = np.exp(-0.5 * (apart_kms / err_kms) ** 2) / (np.sqrt(2 * np.pi) * err_kms)
    return 200 / cosmos.omega_m_z(z) * hubble_kms * per_kms
