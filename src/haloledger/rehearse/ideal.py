"""The best that could be known of each sum: every halo's central and group known as such, and the sky's own numbers.

P(M | y, z) ~ n(M, z) N(y | y(M, z) + zero point, scatter and error) x P(no group listed | M, z) for a central without a
group, on a grid of masses, for each draw of relation and zero point; the group's own mass where it is listed. For skies
whose universes all show the same galaxies (`population`) and surveys with spectra: counts then tell nothing more.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.cosmos.mass_function import mass_function
from haloledger.rehearse.score import crps, median_width
from haloledger.rehearse.sky import columns, relations
from haloledger.rehearse.sky.galaxies import MCUT, MCUT_SLOPE, MSAT, MSAT_SLOPE
from haloledger.rehearse.sky.simulate import Truth
from haloledger.rehearse.sky.structure import (
    CONCENTRATION_DEX,
    LIGHT_KMS,
    PECULIAR_KMS,
    median_concentration,
)
from haloledger.rehearse.sky.truth import Sky
from haloledger.rehearse.survey import Seen, Survey, flux_limit

LOG_M = np.arange(9.5, 15.8, 0.025)
WIDEST_MPC = 4.0  # comoving; no halo is crossed farther out
HEAVIEST_AT_DEX = 2.2  # a halo is crossed at most at the radius of one this much heavier than its true mass


@dataclass(frozen=True)
class Ideal:
    """Draws of the sums (n_lines, n_draws) and their scores."""

    sums: np.ndarray
    crps: float
    width: float


def ideal_posterior(
    sky: Sky, seen: Seen, survey: Survey, truth: Truth, true_sums: np.ndarray, draws: int, cosmos: Cosmos, seed: int
) -> Ideal:
    """Ideal draws of all foreground sums, for a spectroscopic survey of a simulated sky."""
    rng = np.random.default_rng([seed, 11])
    rows = _haloes_in_play(sky, seen, cosmos)
    names = (truth.relation,) if truth.relation else relations.NAMES
    relation = rng.integers(0, len(names), draws)
    zero = truth.zero_point_dex * rng.standard_normal(draws)
    sums = np.zeros((len(sky.lines), draws))
    central = _central_of(sky, seen)
    for start in range(0, len(rows), 400):
        part = rows[start : start + 400]
        log_m = np.empty((len(part), draws))
        for k, name in enumerate(names):
            own = np.flatnonzero(relation == k)
            log_m[:, own] = _masses(sky, seen, survey, truth, part, central[part], name, zero[own], cosmos, rng)
        np.add.at(sums, sky.haloes.line[part], _columns(sky, part, log_m, cosmos, rng))
    return Ideal(sums, float(crps(sums, true_sums).mean()), median_width(sums))


def _central_of(sky: Sky, seen: Seen) -> np.ndarray:
    """Listed central galaxy of each halo, -1 where there is none."""
    rows = seen.rows[sky.galaxies.central[seen.rows]]
    result = np.full(len(sky.haloes), -1)
    result[sky.galaxies.halo[rows]] = rows
    return result


def _haloes_in_play(sky: Sky, seen: Seen, cosmos: Cosmos) -> np.ndarray:
    h = sky.haloes
    impact = np.hypot(h.east_mpc, h.north_mpc)
    widest = cosmos.r200c_kpc(h.log_m200c + HEAVIEST_AT_DEX, h.z) * (1 + h.z) / 1e3
    known = seen.grouped | (_central_of(sky, seen) >= 0)
    return np.flatnonzero(known & ~h.holds_burst & (impact < np.minimum(widest, WIDEST_MPC)))


def _masses(sky: Sky, seen: Seen, survey: Survey, truth: Truth, rows, central, name: str, zero, cosmos: Cosmos, rng):
    """Masses of haloes `rows` in the universes of one relation; (n_rows, n)."""
    z, n = sky.haloes.z_seen[rows], len(zero)
    result = np.empty((len(rows), n))
    grouped = seen.grouped[rows] & (survey.groups == "true")
    at = rows[grouped]
    result[grouped] = sky.haloes.log_m200c[at][:, None] + survey.group_err * rng.standard_normal((len(at), n))
    lone = np.flatnonzero(~grouped)
    y = sky.galaxies.measured[central[lone]]
    for i, k in enumerate(lone):
        full = np.full(LOG_M.size, max(z[k], 1e-4))
        mean = relations.mean_log_mstar(name, LOG_M, full, median_concentration(LOG_M, full, cosmos), cosmos)
        s = np.hypot(truth.scatter_factor * relations.scatter_dex(name, full[0]), truth.mass_err)
        ln_p = np.log(mass_function(LOG_M, full[0], cosmos)) - 0.5 * ((y[i] - zero[:, None] - mean) / s) ** 2
        if survey.groups == "true":
            ln_p = ln_p - _listed_satellites(mean, full[0], zero, survey, cosmos)
        grown = np.cumsum(np.exp(ln_p - ln_p.max(axis=1, keepdims=True)), axis=1)
        wanted = rng.random(n) * grown[:, -1]
        result[k] = LOG_M[np.minimum((grown < wanted[:, None]).sum(axis=1), LOG_M.size - 1)]
    return result + 0.025 * (rng.random(result.shape) - 0.5)


def _listed_satellites(mean, z: float, zero, survey: Survey, cosmos: Cosmos) -> np.ndarray:
    """Mean number of satellites above the survey's limit in haloes LOG_M; (n_zero, n_mass)."""
    rising = np.maximum.accumulate(mean) + 1e-9 * np.arange(mean.size)
    mh = np.interp(flux_limit(z, survey, cosmos) - zero, rising, LOG_M)[:, None]
    cut = 10 ** (MCUT + MCUT_SLOPE * (mh - 12) - LOG_M)
    return 10 ** (LOG_M - MSAT - MSAT_SLOPE * (mh - 12)) * np.exp(-cut)


def _columns(sky: Sky, rows, log_m, cosmos: Cosmos, rng) -> np.ndarray:
    """DM draws (n_rows, n) of haloes at their listed places; distances by a peculiar velocity."""
    h = sky.haloes
    speed = PECULIAR_KMS / LIGHT_KMS * rng.standard_normal(log_m.shape)
    z = np.maximum((1 + h.z_seen[rows])[:, None] * (1 + speed) - 1, 1e-3)
    angle = np.hypot(h.east_mpc[rows], h.north_mpc[rows]) / cosmos.comoving_distance_mpc(h.z[rows])
    impact = angle[:, None] * cosmos.angular_distance_kpc(z)
    r200c = cosmos.r200c_kpc(log_m, z)
    c200c = median_concentration(log_m, z, cosmos) * 10 ** (CONCENTRATION_DEX * rng.standard_normal(log_m.shape))
    z_burst = sky.lines.z_seen[h.line[rows]]
    burst = z_burst[:, None] + (1 + z_burst)[:, None] * PECULIAR_KMS / LIGHT_KMS * rng.standard_normal(log_m.shape)
    behind = (cosmos.comoving_distance_mpc(burst) - cosmos.comoving_distance_mpc(z)) * 1e3 / (1 + z)
    dm = np.zeros(log_m.shape)
    inside = impact < r200c
    b, radius, m, c, stop = (a[inside] for a in (impact, r200c, log_m, c200c, behind))
    dm[inside] = columns.column_rest(b, radius, m, c, stop, cosmos)
    return dm / (1 + z)
