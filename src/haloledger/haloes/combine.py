"""One mass from several measurements of a halo: inverse variances, in log10 M200c.

    log M = sum w_i x_i / sum w_i,   w_i = 1 / err_i^2,   err = (sum w_i)^-1/2 x max(1, (chi2 / (n - 1))^1/2)

x_i is what each row measures (its likelihood): a mass that is a posterior already is moved back by the mass function's
slope, err^2 ln(10) d log n / d log M, so that the prior acts once, on the whole. Rows that rest on one kind of
measurement (light, dispersion, richness, X-rays, SZ) are not independent: the first counts. The hydrostatic bias is
shared: the sum carries the weight of the masses that have it. Measurements that disagree widen the error.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.cosmos.mass_function import mass_function
from haloledger.haloes.distances import point_redshift
from haloledger.haloes.masses import State, naive_log_m200c
from haloledger.haloes.nuisances import RelationOfDraw
from haloledger.haloes.posterior import MASS_RELATION
from haloledger.haloes.relations import load_relation
from haloledger.haloes.table import Haloes

STEP = 0.05


@dataclass(frozen=True)
class Measured:
    """What each row measures; shape (n,)."""

    log_m200c: np.ndarray  # without the hydrostatic bias taken out
    err: np.ndarray
    origin: np.ndarray  # kind of measurement
    biased: np.ndarray  # bool: hydrostatic
    z: np.ndarray


@dataclass(frozen=True)
class Combined:
    """One mass; `used` are the rows it rests on."""

    log_m200c: float
    err: float
    bias_share: float
    used: np.ndarray


def measured(groups: Haloes, cosmos: Cosmos) -> Measured:
    """Each row's mass as a measurement, M200c, with its error."""
    n = len(groups)
    z = point_redshift(groups, cosmos)
    column = np.zeros((n, 1))
    state = State(column, column, z[:, None], column, column, column)
    picked = RelationOfDraw(("moster2013",), np.zeros(1, dtype=int))
    mass = naive_log_m200c(groups, state, picked, MASS_RELATION, cosmos)[:, 0]
    err, step = groups.value_err.copy(), np.zeros(n)
    posterior = groups.posterior.copy()
    for name in sorted(set(groups.relation.astype(str)) - {""}):
        relation, rows = load_relation(name), groups.relation == name
        slope = relation.parameters.get("slope", 1.0)
        spread = relation.scatter(z[rows])
        by_mass = np.hypot(spread, groups.value_err[rows]) / slope
        err[rows] = by_mass if relation.needs_prior else np.hypot(spread, slope * groups.value_err[rows])
        posterior[rows] = not relation.needs_prior
        step[rows] = 0.0 if relation.needs_prior else relation.median_step
    high, low = (np.log10(mass_function(mass + s, z, cosmos)) for s in (STEP, -STEP))
    back = -np.log(10) * err**2 * (high - low) / (2 * STEP)
    biased = (groups.one_minus_b != 1.0) | (groups.one_minus_b_err > 0)
    return Measured(mass + step + np.where(posterior, back, 0.0), err, groups.origin.astype(str), biased, z)


def combined(measures: Measured, rows: np.ndarray, one_minus_b: np.ndarray) -> Combined | None:
    """The mass that `rows` give together, first row first; None where they are one measurement."""
    _, first = np.unique(measures.origin[rows], return_index=True)
    used = rows[np.sort(first)]
    used = used[measures.err[used] > 0]
    if used.size < 2:
        return None
    w = 1 / measures.err[used] ** 2
    share = w / w.sum()
    x = measures.log_m200c[used]
    true = x - np.where(measures.biased[used], np.log10(one_minus_b[used]), 0.0)
    chi2 = float(np.sum(w * (true - np.sum(share * true)) ** 2))
    widen = max(1.0, chi2 / (used.size - 1)) ** 0.5
    return Combined(
        float(np.sum(share * x)), float(w.sum() ** -0.5 * widen), float(np.sum(share * measures.biased[used])), used
    )
