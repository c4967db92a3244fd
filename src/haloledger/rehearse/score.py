"""How well draws hold the truth: rank of the truth, calibration of intervals, bias, scores."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

LEVELS = (0.50, 0.68, 0.90, 0.95)


def ranks(draws: np.ndarray, truth: np.ndarray, rng: np.random.Generator) -> np.ndarray:
    """Rank of each truth among its draws, in (0, 1): uniform where calibrated; random among equal values.

    draws (n, k), truth (n,)
    """
    truth = truth.astype(draws.dtype)  # a sum that is exactly zero has to meet its equals
    below = (draws < truth[:, None]).sum(axis=1)
    equal = (draws == truth[:, None]).sum(axis=1)
    return (below + rng.random(len(truth)) * (equal + 1)) / (draws.shape[1] + 1)


@dataclass(frozen=True)
class Calibration:
    """Share of truths inside central intervals, for one set of lines."""

    name: str
    n: int
    held: tuple[float, ...]  # at LEVELS
    error: tuple[float, ...]  # binomial standard error of a calibrated one
    mean_truth: float
    mean_predicted: float
    bias_error: float  # standard error of the mean difference

    @property
    def bias(self) -> float:
        """Mean of prediction minus truth, over the mean truth."""
        return (self.mean_predicted - self.mean_truth) / self.mean_truth if self.mean_truth else np.nan

    @property
    def worst(self) -> float:
        """Largest departure in standard errors."""
        return max(
            (abs(h - level) / e for h, e, level in zip(self.held, self.error, LEVELS, strict=True)), default=np.nan
        )


def calibration(name: str, rank: np.ndarray, draws_mean: np.ndarray, truth: np.ndarray, where) -> Calibration:
    """Calibration of the lines `where`."""
    u, predicted, true = rank[where], draws_mean[where], truth[where]
    n = len(u)
    if not n:
        return Calibration(name, 0, (np.nan,) * 4, (np.nan,) * 4, np.nan, np.nan, np.nan)
    held = tuple(float(np.mean(np.abs(u - 0.5) < level / 2)) for level in LEVELS)
    error = tuple(float(np.sqrt(level * (1 - level) / n)) for level in LEVELS)
    spread = float(np.std(predicted - true) / np.sqrt(n))
    return Calibration(name, n, held, error, float(true.mean()), float(predicted.mean()), spread)


def tables(rank: np.ndarray, sums: np.ndarray, truth: np.ndarray) -> list[Calibration]:
    """All lines, those probably crossed, those probably not, and quintiles of the predicted mean."""
    mean = sums.mean(axis=1)
    crossed = (sums > 0).mean(axis=1) > 0.5
    rows = [("all", np.ones(len(mean), bool)), ("crossed", crossed), ("not crossed", ~crossed)]
    edges = np.quantile(mean, (0.2, 0.4, 0.6, 0.8))
    fifth = np.searchsorted(edges, mean)
    rows += [(f"fifth {k + 1}", fifth == k) for k in range(5)]
    return [calibration(name, rank, mean, truth, where) for name, where in rows]


def crps(draws: np.ndarray, truth: np.ndarray) -> np.ndarray:
    """Continuous ranked probability score of each line [pc cm-3]: mean |x - t| - mean |x - x'| / 2; small is good."""
    k = draws.shape[1]
    ordered = np.sort(draws, axis=1).astype(float)
    weight = 2 * np.arange(1, k + 1) - k - 1
    pairs = (ordered * weight).sum(axis=1) / k**2
    return np.abs(draws - truth[:, None]).mean(axis=1) - pairs


def median_width(draws: np.ndarray) -> float:
    """Median over lines of the 16-84 per cent width [pc cm-3]."""
    low, high = np.quantile(draws, (0.16, 0.84), axis=1)
    return float(np.median(high - low))
