"""Redshift probabilities in a galaxy table, as quantiles (`z_p16`) or on a grid (`pz_0.25`), brought to one form.

One form: redshifts at the normal scores `SCORES`, so that z at score u is the quantile Phi(u). Between quantiles it
runs linearly in the score, as for a normal; beyond the outermost ones as between the last two.
"""

from __future__ import annotations

import re
from collections.abc import Iterable

import numpy as np
from scipy.special import ndtr, ndtri

from haloledger.catalogs.density_names import GRID, QUANTILE
from haloledger.catalogs.rows import Rows

SCORES = np.linspace(-3.0, 3.0, 49)
LOWEST = 1e-4
NORM_WITHIN = 0.05


def redshift_scores(rows: Rows) -> np.ndarray | None:
    """Redshifts at SCORES, shape (n, 49), NaN in rows without p(z); None where the table has no such columns.

    Rows whose quantiles do not rise, or whose density is negative or not normalised, are refused.
    """
    columns = rows.table.columns
    levels = _sorted(columns, QUANTILE)
    grid = _sorted(columns, GRID)
    if len(levels) >= 3:
        return _from_quantiles(rows, levels)
    if len(grid) >= 3:
        return _from_grid(rows, grid)
    return None


def _sorted(columns: Iterable[str], pattern: re.Pattern) -> list[tuple[float, str]]:
    return sorted((float(m.group(1)), name) for name in columns if (m := pattern.match(name)))


def _from_quantiles(rows: Rows, levels: list[tuple[float, str]]) -> np.ndarray:
    table = np.array([rows.table.columns[name] for _, name in levels]).T
    given = np.isfinite(table).any(axis=1)
    falling = given & ~(np.all(np.diff(table, axis=1) > 0, axis=1) & (table[:, 0] > 0))
    first, last = levels[0][1], levels[-1][1]
    rows.refuse(
        falling,
        first,
        lambda i: "quantiles " + ", ".join(f"{x:g}" for x in table[i]),
        f"Quantiles of one redshift rise from {first} to {last}, all above zero. Leave every cell empty for none.",
    )
    score = ndtri(np.array([level for level, _ in levels]) / 100)
    at = np.clip(np.searchsorted(score, SCORES) - 1, 0, score.size - 2)
    share = (SCORES - score[at]) / (score[at + 1] - score[at])
    z = table[:, at] * (1 - share) + table[:, at + 1] * share
    return np.where((given & ~falling)[:, None], np.maximum(z, LOWEST + 1e-6 * np.arange(SCORES.size)), np.nan)


def _from_grid(rows: Rows, grid: list[tuple[float, str]]) -> np.ndarray:
    z = np.array([at for at, _ in grid])
    table = np.array([rows.table.columns[name] for _, name in grid]).T
    given = np.isfinite(table).any(axis=1)
    density = np.nan_to_num(table, nan=0.0)
    whole = np.trapezoid(density, z, axis=1)
    name = f"{grid[0][1]} ... {grid[-1][1]}"
    rows.refuse(
        given & (density < 0).any(axis=1),
        name,
        lambda i: f"a density of {density[i].min():g}",
        "Write densities of zero or above.",
    )
    rows.refuse(
        given & (np.abs(whole - 1) > NORM_WITHIN),
        name,
        lambda i: f"a p(z) that integrates to {whole[i]:.3g}",
        "Write densities per unit redshift: their sum over the grid times its step is 1.",
    )
    good = given & rows.good
    result = np.full((len(table), SCORES.size), np.nan)
    step = 0.5 * (density[:, 1:] + density[:, :-1]) * np.diff(z)
    for i in np.flatnonzero(good).tolist():  # each row has a distribution of its own to invert
        grown = np.concatenate([[0.0], np.cumsum(step[i])])
        rising = np.concatenate([[True], np.diff(grown) > 0])
        result[i] = np.interp(ndtr(SCORES), grown[rising] / grown[-1], z[rising])
    return np.maximum(result, LOWEST + 1e-6 * np.arange(SCORES.size))
