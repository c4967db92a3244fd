"""Which redshift sets the distance of a halo: a measured distance within 50 Mpc, the Hubble flow beyond."""

from __future__ import annotations

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.haloes.table import Haloes, has_density

SPEED_OF_LIGHT_KMS = 299792.458
PECULIAR_KMS = 300.0  # common practice for the field, one dimension
NEARBY_MPC = 50.0
DISTANCE_ERROR = 0.2  # share of the distance where a catalogue gives none: 0.4 mag in the modulus, common practice
LOWEST_OUTLIER = 0.4  # share of the listed redshift down to which outliers are searched
LARGEST_ERROR = 0.5  # of the distance: a velocity tells it better than a larger error; ours
LOWEST_SHARE = 0.3  # no draw and no search goes below this share of the listed redshift
MIN_Z = 1e-4


def by_distance(haloes) -> np.ndarray:
    """Where the measured distance rules: within 50 Mpc, or where there is no positive redshift. Takes Galaxies too."""
    positive = np.nan_to_num(haloes.z, nan=-1.0) > 0
    return np.isfinite(haloes.distance_mpc) & ((haloes.distance_mpc <= NEARBY_MPC) | ~positive)


def z_of_luminosity_distance(mpc, cosmos: Cosmos) -> np.ndarray:
    """Redshift of the Hubble flow at a luminosity distance [Mpc], to two parts in 1e4."""
    # the inverse in `cosmos` is linear between nodes 3 Mpc apart
    z = cosmos.z_at_comoving_distance(mpc)
    for _ in range(3):
        z = cosmos.z_at_comoving_distance(np.asarray(mpc) / (1 + z))
    return z


def point_redshift(haloes, cosmos: Cosmos) -> np.ndarray:
    """The redshift that sets the distance, without errors; shape (n,)."""
    near = by_distance(haloes)
    flow = haloes.z if haloes.z_flow is None else haloes.z_flow
    z = np.maximum(np.nan_to_num(flow, nan=MIN_Z), MIN_Z)
    z[near] = z_of_luminosity_distance(haloes.distance_mpc[near], cosmos)
    return z


def distance_error_share(haloes) -> np.ndarray:
    """Error of the measured distance over the distance, 20 per cent where it is not given, at most LARGEST_ERROR.

    Draws are log-normal: an error as large as the distance would put the object next to us in a share of them.
    """
    share = haloes.distance_err_mpc / haloes.distance_mpc
    return np.minimum(np.where(np.isfinite(share), share, DISTANCE_ERROR), LARGEST_ERROR)


def point_luminosity_distance_mpc(haloes, cosmos: Cosmos) -> np.ndarray:
    """Luminosity distance [Mpc] that belongs to `point_redshift`; shape (n,)."""
    z = point_redshift(haloes, cosmos)
    return np.where(by_distance(haloes), haloes.distance_mpc, cosmos.luminosity_distance_mpc(z))


def z_floor(haloes: Haloes, cosmos: Cosmos) -> np.ndarray:
    """A low redshift for the search of neighbours: three errors below, at least 0.3 of the redshift; shape (n,)."""
    near = by_distance(haloes)
    z = point_redshift(haloes, cosmos)
    err = np.hypot(haloes.z_err, PECULIAR_KMS / SPEED_OF_LIGHT_KMS * (1 + z))
    low = np.maximum(z - 3 * err, LOWEST_SHARE * z)
    wide = has_density(haloes)
    low[wide] = np.maximum(haloes.z_scores[wide, :1].ravel(), LOWEST_SHARE * z[wide])
    low = np.where((haloes.z_outlier > 0) & ~wide, np.minimum(low, LOWEST_OUTLIER * z), low)
    return np.where(near, z * np.maximum(np.exp(-3 * distance_error_share(haloes)), LOWEST_SHARE), low)
