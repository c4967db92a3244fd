"""Is a row inside the projected phase space of a halo: R < r200c, |dv| < 3 sigma_v and errors, distances that agree."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.haloes.distances import (
    SPEED_OF_LIGHT_KMS,
    by_distance,
    distance_error_share,
    point_redshift,
)
from haloledger.haloes.neighbours import Places, close_pairs, separation_rad
from haloledger.haloes.relations import load_relation
from haloledger.haloes.table import Haloes

N_SIGMA = 3.0  # of the velocity dispersion and the redshift errors, in quadrature
N_SIGMA_DISTANCE = 4.0  # errors of distances are often understated: what looks like one object is one until then
SAME_PLACE_ARCMIN = 1.0  # within 50 Mpc, where distances of one object differ most
SAME_PLACE_KPC = 20.0
SAME_PLACE_KMS = 300.0
DISTANCE_SCALE = 0.07  # by which two catalogues' distance scales may differ; common practice
N_SIGMA_PHOTOMETRIC = 2.0
BLANK_KMS = 500.0  # a row without redshift of its own: distance and peculiar velocity say no more


@dataclass(frozen=True)
class Extent:
    """Size of each halo in phase space; shape (n,)."""

    log_m200c: np.ndarray
    z: np.ndarray  # sets the distance
    kpc_per_rad: np.ndarray
    r200c_kpc: np.ndarray
    sigma_v_kms: np.ndarray


@dataclass(frozen=True)
class Inside:
    """Pairs (halo i, row j) with row j inside halo i."""

    i: np.ndarray
    j: np.ndarray
    radius: np.ndarray  # projected, in r200c
    depth: np.ndarray  # redshift difference over its window, 1 at the edge


def extent(haloes: Haloes, log_m200c: np.ndarray, cosmos: Cosmos) -> Extent:
    """r200c and the velocity dispersion (Evrard et al. 2008) of haloes with these masses."""
    z = point_redshift(haloes, cosmos)
    sigma = 10 ** load_relation("evrard2008").mean(log_m200c, z, cosmos)
    return Extent(log_m200c, z, cosmos.angular_distance_kpc(z), cosmos.r200c_kpc(log_m200c, z), sigma)


def inside(haloes: Haloes, size: Extent, others: Haloes, other_extent: Extent, farthest: float = 1.0) -> Inside:
    """All pairs of a halo and a row of `others` inside it; a centre error widens the circle by one sigma.

    farthest  largest depth, over the usual window
    """
    reach_kpc = size.r200c_kpc + haloes.centre_err_kpc
    window = farthest * N_SIGMA * size.sigma_v_kms / SPEED_OF_LIGHT_KMS
    places = _places(haloes, window, farthest), _places(others, np.zeros(len(others)), farthest)
    i, j = close_pairs(*places, reach_kpc / size.kpc_per_rad)
    radians = separation_rad(haloes.ra_deg[i], haloes.dec_deg[i], others.ra_deg[j], others.dec_deg[j])
    radius = radians * size.kpc_per_rad[i] / reach_kpc[i]
    depth = _depth(haloes, size, i, others, j)
    agree = _distances_agree(haloes, size, i, others, other_extent, j) | _same_place(
        radians, haloes, size, i, others, j
    )
    keep = (radius < 1) & (depth <= farthest) & agree
    return Inside(i[keep], j[keep], radius[keep], depth[keep])


def same_place(haloes: Haloes, size: Extent, others: Haloes, found: Inside) -> np.ndarray:
    """Pairs that are one object by position and velocity, whatever their distances say; shape (n_pairs,)."""
    i, j = found.i, found.j
    radians = separation_rad(haloes.ra_deg[i], haloes.dec_deg[i], others.ra_deg[j], others.dec_deg[j])
    return _same_place(radians, haloes, size, i, others, j)


def _same_place(radians, haloes: Haloes, size: Extent, i, others: Haloes, j) -> np.ndarray:
    kms = np.abs(others.z[j] - haloes.z[i]) * SPEED_OF_LIGHT_KMS / (1 + size.z[i])
    near = by_distance(haloes)[i] | by_distance(others)[j]
    allowed = np.maximum(SAME_PLACE_KPC / size.kpc_per_rad[i], np.where(near, np.radians(SAME_PLACE_ARCMIN / 60), 0.0))
    return (radians < allowed) & (kms < SAME_PLACE_KMS) & ~others.photometric[j]


def _places(haloes: Haloes, extra: np.ndarray, farthest: float) -> Places:
    err = farthest * N_SIGMA * np.maximum(haloes.z_err, BLANK_KMS / SPEED_OF_LIGHT_KMS) + extra
    z = np.maximum(haloes.z, -0.01)
    return Places(haloes.ra_deg, haloes.dec_deg, z - err, z + err)


def _depth(haloes: Haloes, size: Extent, i, others: Haloes, j) -> np.ndarray:
    scale = SPEED_OF_LIGHT_KMS / (1 + size.z[i])
    own = haloes.z_err[i] * scale
    other = others.z_err[j] * scale
    wide = N_SIGMA * np.sqrt(size.sigma_v_kms[i] ** 2 + own**2 + other**2)
    # a photometric redshift is compared at two of its errors
    n_other = np.where(others.photometric[j], N_SIGMA_PHOTOMETRIC, N_SIGMA)
    wide = np.minimum(wide, np.hypot(N_SIGMA * np.hypot(size.sigma_v_kms[i], own), n_other * other))
    return np.abs(others.z[j] - haloes.z[i]) * scale / wide


def _distances_agree(haloes: Haloes, size: Extent, i, others: Haloes, other_extent: Extent, j) -> np.ndarray:
    both = by_distance(haloes)[i] & by_distance(others)[j]
    d1, d2 = haloes.distance_mpc[i], others.distance_mpc[j]
    err = np.hypot(d1 * distance_error_share(haloes)[i], d2 * distance_error_share(others)[j])
    err = np.hypot(err, DISTANCE_SCALE * d1)
    agree = np.abs(d1 - d2) <= N_SIGMA_DISTANCE * err + size.r200c_kpc[i] / 1e3
    return ~both | agree
