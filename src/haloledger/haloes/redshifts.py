"""Draws of the redshift that sets a halo's distance, jointly with the stellar mass where the redshift is uncertain.

    P(z | data) ~ N(z_obs | z, err) x dV/dz x phi(y(z), z)
    y(z) = log M*_obs + 2 log10[D_L(z) / D_L(z_obs)] - zero point

phi is the number of galaxies of that stellar mass, from the same mass function and relation as the halo mass that is
drawn next: the two draws together are one draw from P(M_halo, z | data). A measured distance within 50 Mpc replaces it.

A photometric redshift may be an outlier: with the catalogue's share f its likelihood is

    (1 - f) N(z_obs | z, err) + f N(z_obs | z, 0.3 (1 + z_obs))

and which of the two holds is drawn by their evidence under the same prior. A p(z) from the catalogue takes the place of
the whole likelihood, or of the whole posterior where the catalogue says it is one.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import ndtri

from haloledger.catalogs.redshift_density import SCORES
from haloledger.cosmos.background import Cosmos
from haloledger.engine.universe import Universe
from haloledger.haloes.distances import (
    LOWEST_SHARE,
    MIN_Z,
    PECULIAR_KMS,
    SPEED_OF_LIGHT_KMS,
    by_distance,
    distance_error_share,
    point_luminosity_distance_mpc,
    point_redshift,
    z_of_luminosity_distance,
)
from haloledger.haloes.nuisances import RelationOfDraw
from haloledger.haloes.posterior import U_NODES, inverse
from haloledger.haloes.table import Haloes, has_density, rows

WIDE = 0.05  # error over redshift above which a spectroscopic redshift too is drawn with its prior: the near field
GRID = np.linspace(-5.0, 5.0, 49)  # in errors around the observed redshift
WIDE_GRID = np.linspace(0.0, 1.0, 97)
OUTLIER_WIDTH = 0.3  # of outliers, over 1 + z: ours, a broad component without a preferred place
ZERO_POINTS = np.arange(-0.4, 0.41, 0.2)


@dataclass(frozen=True)
class Redshifts:
    """Draws, shape (n, n_draws)."""

    z: np.ndarray
    distance_kpc: np.ndarray  # angular-diameter
    log_l_shift: np.ndarray  # 2 log10 of drawn over listed luminosity distance: how a mass from a flux moves


def draw_redshifts(haloes: Haloes, universe: Universe, relation: RelationOfDraw, zero: np.ndarray, cosmos: Cosmos):
    """Redshifts, distances and the shift of masses that rest on a flux."""
    n, listed = len(haloes), point_redshift(haloes, cosmos)
    listed_mpc = point_luminosity_distance_mpc(haloes, cosmos)
    score = universe.normals("redshift", haloes.id)
    z = np.empty((n, universe.n_draws))
    luminosity_mpc = np.empty_like(z)
    near = np.flatnonzero(by_distance(haloes))
    far = np.flatnonzero(~by_distance(haloes))
    share = np.where(universe.fixed, 0.0, distance_error_share(haloes))[near, None]
    luminosity_mpc[near] = haloes.distance_mpc[near, None] * np.exp(share * score[near])
    z[near] = z_of_luminosity_distance(luminosity_mpc[near], cosmos)
    z[far] = _hubble_flow(rows(haloes, far), listed[far], score[far], universe, relation, zero, cosmos)
    comoving_mpc = cosmos.comoving_distance_mpc(z[far])
    luminosity_mpc[far] = comoving_mpc * (1 + z[far])
    return Redshifts(z, 1e3 * luminosity_mpc / (1 + z) ** 2, 2 * np.log10(luminosity_mpc / listed_mpc[:, None]))


def _hubble_flow(haloes: Haloes, listed, score, universe: Universe, relation: RelationOfDraw, zero, cosmos: Cosmos):
    if universe.fixed:
        return listed[:, None] + 0 * score
    # the error of the measurement, and the speed by which the halo leaves the flow
    err = np.hypot(haloes.z_err, PECULIAR_KMS / SPEED_OF_LIGHT_KMS * (1 + listed))
    z = np.maximum(listed[:, None] + err[:, None] * score, np.maximum(LOWEST_SHARE * listed, MIN_Z)[:, None])
    galaxy = haloes.kind == "galaxy"
    given = has_density(haloes)
    as_given = np.flatnonzero(given & haloes.z_posterior)
    if as_given.size:
        z[as_given] = _at_scores(haloes.z_scores[as_given], score[as_given])
    prior = ~haloes.z_posterior & ((galaxy & haloes.photometric) | (err > WIDE * listed))
    joint = np.flatnonzero(prior)
    if joint.size:
        part = rows(haloes, joint)
        table, evidence = _quantiles(part, listed[joint], err[joint], relation, zero, cosmos, given=True)
        z[joint] = _look_up(table, score[joint], relation, zero)
        _draw_outliers(z, joint, part, listed[joint], evidence, score, universe, relation, zero, cosmos)
    return z


def _draw_outliers(z, joint, haloes: Haloes, listed, evidence, score, universe, relation, zero, cosmos: Cosmos) -> None:
    """Where the draw is an outlier, write its redshift into z, in place."""
    open_ = np.flatnonzero(haloes.photometric & (haloes.z_outlier > 0) & ~has_density(haloes))
    if not open_.size:
        return
    part, at = rows(haloes, open_), listed[open_]
    wide = OUTLIER_WIDTH * (1 + at)
    table, far_evidence = _quantiles(part, at, wide, relation, zero, cosmos, WIDE_GRID)
    f = part.z_outlier[:, None, None]
    odds = f / (1 - f) * np.exp(np.clip(far_evidence - evidence[open_], -50, 50))
    share = _look_up_share(odds / (1 + odds), relation, zero)
    out = universe.uniforms("redshift_outlier", part.id) < share
    index = joint[open_]
    z[index] = np.where(out, _look_up(table, score[index], relation, zero), z[index])


def _quantiles(haloes: Haloes, listed, err, relation: RelationOfDraw, zero, cosmos: Cosmos, nodes=None, given=False):
    """z at the normal scores U_NODES, [halo, relation, zero point, u], and ln evidence [halo, relation, zero point]."""
    nodes = np.linspace(0, 1, GRID.size) if nodes is None else nodes
    low = np.maximum(np.maximum(listed - 5 * err, LOWEST_SHARE * listed), MIN_Z)
    high = listed + 5 * err
    own = np.flatnonzero(has_density(haloes) & given)
    if own.size:
        low[own], high[own] = haloes.z_scores[own, 0], haloes.z_scores[own, -1]
    span = (high - low)[:, None]
    grid = low[:, None] + span * nodes
    shift = 2 * np.log10(cosmos.luminosity_distance_mpc(grid) / cosmos.luminosity_distance_mpc(listed)[:, None])
    ln_p = -0.5 * ((grid - listed[:, None]) / err[:, None]) ** 2
    if own.size:
        ln_p[own] = _ln_density(haloes.z_scores[own], grid[own])
    ln_p += np.log(cosmos.volume_element(grid))
    y = np.where(haloes.err_holds_z[:, None], 0.0, shift) + haloes.value[:, None]
    counted = ((haloes.mass_kind == "stellar") & ~haloes.posterior)[:, None, None]
    shape = (len(haloes), len(relation.names), ZERO_POINTS.size)
    table, evidence = np.empty((*shape, U_NODES.size)), np.empty(shape)
    for i, name in enumerate(relation.names):
        true = y[:, None] - (_centre(zero) + ZERO_POINTS)[:, None]
        ln_count = inverse(name, cosmos).ln_count(true, grid[:, None], haloes.value_err[:, None, None])
        ln_joint = ln_p[:, None] + np.where(counted, ln_count, 0.0)
        table[:, i] = quantiles_on_grid(ln_joint, grid[:, None])
        top = ln_joint.max(axis=-1)
        mean = np.exp(ln_joint - top[..., None]).mean(axis=-1)
        evidence[:, i] = top + np.log(mean * span / err[:, None])
    return table, evidence


def _at_scores(z_scores: np.ndarray, score: np.ndarray) -> np.ndarray:
    """Redshifts of tabulated p(z) at normal scores (n, k), held at the ends."""
    at = np.clip((score - SCORES[0]) / (SCORES[1] - SCORES[0]), 0, SCORES.size - 1)
    low = np.minimum(at.astype(int), SCORES.size - 2)
    row, w = np.arange(len(z_scores))[:, None], at - low
    return (1 - w) * z_scores[row, low] + w * z_scores[row, low + 1]


def _ln_density(z_scores: np.ndarray, grid: np.ndarray) -> np.ndarray:
    """ln p(z) on grids (n, k): the normal density at the score, over dz / dscore."""
    low = np.clip((z_scores[:, None, :] <= grid[:, :, None]).sum(axis=-1) - 1, 0, SCORES.size - 2)
    row = np.arange(len(z_scores))[:, None]
    step = np.maximum(z_scores[row, low + 1] - z_scores[row, low], 1e-9)
    score = SCORES[low] + (SCORES[1] - SCORES[0]) * (grid - z_scores[row, low]) / step
    return -0.5 * score**2 - np.log(step)


def _centre(zero: np.ndarray) -> float:
    # a held zero point, however large, stands on a node
    return float(zero[0]) if np.ptp(zero) == 0 else 0.0


def quantiles_on_grid(ln_p: np.ndarray, grid: np.ndarray) -> np.ndarray:
    """Quantiles at U_NODES of densities on grids (last axis); linear in the normal score, so exact for a normal."""
    p = np.exp(ln_p - ln_p.max(axis=-1, keepdims=True))
    grown = np.cumsum(0.5 * (p[..., 1:] + p[..., :-1]), axis=-1)
    grown = np.concatenate([np.zeros((*grown.shape[:-1], 1)), grown / grown[..., -1:]], axis=-1)
    score = ndtri(np.clip(grown, 1e-6, 1 - 1e-6))
    grid = np.broadcast_to(grid, score.shape)
    result = np.empty((*score.shape[:-1], U_NODES.size))
    for k, u in enumerate(U_NODES):
        low = np.clip((score <= u).sum(axis=-1) - 1, 0, score.shape[-1] - 2)[..., None]
        a, b = np.take_along_axis(score, low, -1), np.take_along_axis(score, low + 1, -1)
        share = np.clip((u - a) / np.where(b > a, b - a, 1.0), 0.0, 1.0)
        za, zb = np.take_along_axis(grid, low, -1), np.take_along_axis(grid, low + 1, -1)
        result[..., k] = (za + share * (zb - za))[..., 0]
    return result


def _zero_place(zero: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    at = np.clip((zero - _centre(zero) - ZERO_POINTS[0]) / (ZERO_POINTS[1] - ZERO_POINTS[0]), 0, ZERO_POINTS.size - 1)
    i = np.minimum(at.astype(int), ZERO_POINTS.size - 2)
    return i, at - i


def _look_up_share(share: np.ndarray, relation: RelationOfDraw, zero: np.ndarray) -> np.ndarray:
    """Linear in the zero point; (n, n_draws)."""
    i, w = _zero_place(zero)
    halo, r = np.arange(len(share))[:, None], relation.index
    return (1 - w) * share[halo, r, i] + w * share[halo, r, i + 1]


def _look_up(table: np.ndarray, score: np.ndarray, relation: RelationOfDraw, zero: np.ndarray) -> np.ndarray:
    """Bilinear in zero point and normal score; (n, n_draws)."""
    i, wi = _zero_place(zero)
    up = np.clip((score - U_NODES[0]) / (U_NODES[1] - U_NODES[0]), 0, U_NODES.size - 1)
    j = np.minimum(up.astype(int), U_NODES.size - 2)
    wj = up - j
    halo = np.arange(len(table))[:, None]
    r = relation.index
    lower = (1 - wj) * table[halo, r, i, j] + wj * table[halo, r, i, j + 1]
    upper = (1 - wj) * table[halo, r, i + 1, j] + wj * table[halo, r, i + 1, j + 1]
    return (1 - wi) * lower + wi * upper
