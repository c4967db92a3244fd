"""What each halo contributes to the sum and to its uncertainty."""

from __future__ import annotations

import numpy as np


def mean_shares(dm: np.ndarray) -> np.ma.MaskedArray:
    """Mean DM of each entry over the mean sum; masked where the sum is zero. (n, k) in, (n,) out."""
    means = dm.mean(axis=1)
    total = means.sum()
    return np.ma.masked_array(means / total if total > 0 else means, mask=np.full(len(means), total <= 0))


def variance_shares(dm: np.ndarray, shared: list[np.ndarray]) -> tuple[np.ndarray, float]:
    """Share of the sum's variance that is each entry's own, and the rest that all of them share.

    Cov(own part of the entry, sum) / Var(sum), the own part being what a linear fit to the global nuisances leaves.
    The rows and the rest add to 1. Zero for all where the sum does not vary.

    dm      (n, k); shared: global nuisances (k,), the relation as one column a relation
    """
    total = dm.sum(axis=0)
    spread = _dot(total - total.mean(), total - total.mean())
    if dm.shape[1] < 3 or spread <= 0:
        return np.zeros(len(dm)), 0.0
    basis = _orthonormal(shared)
    own_total = _residual(total[None, :], basis)[0]
    own = (_residual(dm, basis) * own_total[None, :]).sum(axis=1) / spread
    return own, float(1 - own.sum())


def _orthonormal(columns: list[np.ndarray]) -> list[np.ndarray]:
    """Gram-Schmidt on the columns with their means taken out; columns that add nothing fall away."""
    basis: list[np.ndarray] = []
    for column in columns:
        rest = column - column.mean()
        size = _dot(rest, rest)
        for _ in range(2):  # the second pass removes what rounding left
            for q in basis:
                rest = rest - _dot(rest, q) * q
        left = _dot(rest, rest)
        if left > 1e-10 * max(size, 1e-300):
            basis.append(rest / np.sqrt(left))
    return basis


def _residual(rows: np.ndarray, basis: list[np.ndarray]) -> np.ndarray:
    rows = rows - rows.mean(axis=1, keepdims=True)
    for q in basis:
        rows = rows - (rows * q).sum(axis=1, keepdims=True) * q
    return rows


def _dot(a: np.ndarray, b: np.ndarray) -> float:
    # a plain sum: BLAS may round differently on another machine's kernel
    return float((a * b).sum())
