"""Scatter of the total cosmic DM at fixed redshift: the one-parameter form of the field.

p(D) = A D^-3 exp[-(D^-3 - C0)^2 / (18 sigma^2)] for D = DM / <DM>, sigma = F z^-1/2; <D> = 1 fixes C0.
It describes the total, haloes included. Its variance is infinite (the tail falls as D^-3), so widths are quantiles.
Form: Miralda-Escude, Haehnelt & Rees 2000; used for DM by Macquart et al. 2020, Nature 581, 391, eq. 4.
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np
from scipy.optimize import brentq
from scipy.special import gamma, pbdv

FEEDBACK_F = 0.32
"""F of sigma = F z^-1/2, the common working value; from memory (Macquart et al. 2020; James et al. 2022)."""

SIGMA = np.exp(np.linspace(np.log(0.02), np.log(6.0), 160))
NORMAL_SCORE = np.linspace(-5.0, 5.0, 401)


def centre(sigma: float) -> float:
    """C0 that makes the mean 1; closed form in parabolic cylinder functions, 1 + 9 sigma^2 below sigma = 0.05."""
    if sigma < 0.05:
        return 1 + 9 * sigma**2

    def off(c0: float) -> float:
        x = -c0 / (3 * sigma)
        first = (3 * sigma) ** (1 / 3) * gamma(1 / 3) * pbdv(-1 / 3, x)[0]
        return first - (3 * sigma) ** (2 / 3) * gamma(2 / 3) * pbdv(-2 / 3, x)[0]

    # C0 lies in 0.9..2.6 up to sigma = 2 and falls below zero beyond
    low = 0.5 if sigma < 1.9 else -60.0 * sigma
    return brentq(off, low, 3.0 if sigma > 0.2 else 1.5, xtol=1e-14, rtol=1e-14)


def norm(sigma: float, c0: float | None = None) -> float:
    """A that makes the integral 1; 1 / (sigma sqrt(2 pi)) below sigma = 0.05."""
    if sigma < 0.05:
        return 1 / (sigma * np.sqrt(2 * np.pi))
    c0 = centre(sigma) if c0 is None else c0
    root = (3 * sigma) ** (2 / 3) * gamma(2 / 3) * np.exp(-(c0**2) / (36 * sigma**2))
    return 3 / (root * pbdv(-2 / 3, -c0 / (3 * sigma))[0])


def sigma_of(z, feedback_f: float = FEEDBACK_F) -> np.ndarray:
    """sigma = F z^-1/2, kept inside the tabulated 0.02..6 (z above 0.003 for F = 0.32)."""
    return np.clip(feedback_f / np.sqrt(np.maximum(z, 1e-6)), SIGMA[0], SIGMA[-1])


def relative_dm(z, score, feedback_f: float = FEEDBACK_F) -> np.ndarray:
    """D = DM / <DM> at a normal score (0 the median, +-1 the 16 and 84% points); shapes broadcast."""
    s, q = np.broadcast_arrays(np.log(sigma_of(z, feedback_f)), np.clip(score, NORMAL_SCORE[0], NORMAL_SCORE[-1]))
    return np.exp(_quantiles()(np.stack([s, q], axis=-1))).reshape(s.shape)


@lru_cache(maxsize=1)
def _quantiles():
    """ln D over (ln sigma, normal score)."""
    from scipy.interpolate import RegularGridInterpolator

    rows = np.array([_quantile_row(s) for s in SIGMA])
    return RegularGridInterpolator((np.log(SIGMA), NORMAL_SCORE), rows)


def _quantile_row(sigma: float) -> np.ndarray:
    from scipy.special import ndtri

    # p(D) dD is smooth in ln D: integrate there, and turn each share into a normal score from its nearer end
    ln_d = np.linspace(-3.0, 12.0, 30001)
    d = np.exp(ln_d)
    density = d**-2 * np.exp(-((d**-3 - centre(sigma)) ** 2) / (18 * sigma**2))
    steps = (density[1:] + density[:-1]) / 2
    below = np.concatenate([[0.0], np.cumsum(steps)])
    above = np.concatenate([np.cumsum(steps[::-1])[::-1], [0.0]])
    below, above = below / below[-1], above / above[0]
    score = np.where(below < 0.5, ndtri(below), -ndtri(above))
    inside = np.isfinite(score)
    score, ln_d = score[inside], ln_d[inside]
    fine = np.concatenate([[True], np.diff(score) > 0])
    return np.interp(NORMAL_SCORE, score[fine], ln_d[fine])
