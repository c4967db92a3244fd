"""The diffuse term: what is left of the mean cosmic DM when the haloes' gas is taken out, and its scatter.

Gas is conserved: diffuse = total - haloes, in every draw. The named scatter describes the total, so the diffuse width
is solved, per model and redshift, such that diffuse + haloes on random lines has the total's 16-84 width.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.cosmos.mean_dm import mean_cosmic_dm
from haloledger.cosmos.scatter import relative_dm
from haloledger.reach.census import Census

FLOOR_LN = 0.05
"""Least log-normal width of the diffuse term, used where haloes alone already spread more than the named total."""
Z_NODES = np.array(
    [0.003, 0.01, 0.02, 0.04, 0.07, 0.1, 0.15, 0.2, 0.3, 0.4, 0.5, 0.7, 0.9, 1.2, 1.6, 2.0, 2.5, 3.0, 4.0]
)
LEAST_SHARE = 0.02
"""The diffuse mean never falls below this share of the total."""


@dataclass(frozen=True)
class DiffuseWidth:
    """Log-normal width of the diffuse term over redshift, and where the floor stands in for it."""

    width_ln: np.ndarray  # at Z_NODES
    floored: np.ndarray  # bool at Z_NODES

    def at(self, z) -> np.ndarray:
        """Width at z (k,)."""
        return np.interp(np.log(np.maximum(z, 1e-6)), np.log(Z_NODES), self.width_ln)

    def floored_at(self, z: float) -> bool:
        """Whether the nearest solved redshift used the floor."""
        return bool(self.floored[int(np.argmin(np.abs(np.log(Z_NODES) - np.log(max(z, 1e-6)))))])


def solve_width(census: Census, cosmos: Cosmos) -> DiffuseWidth:
    """Diffuse width such that diffuse + haloes has the named total's 16-84 width."""
    lines = np.arange(len(census.sums))
    scores = np.random.default_rng(20260102).standard_normal(len(lines))
    ones = np.ones((census.mean_by_mass.shape[0], 1))
    solved = [_solve_at(z, census, lines, scores, ones, cosmos) for z in Z_NODES]
    return DiffuseWidth(np.array([s[0] for s in solved]), np.array([s[1] for s in solved]))


def _solve_at(z, census, lines, scores, ones, cosmos) -> tuple[float, bool]:
    total = float(mean_cosmic_dm(z, cosmos))
    wanted = total * float(np.subtract(*relative_dm(z, np.array([1.0, -1.0]))))
    haloes = census.lines(np.full(len(lines), z), lines)
    mean = max(total - float(census.mean(np.array([z]), ones)[0]), LEAST_SHARE * total)

    def width(s: float) -> float:
        low, high = np.quantile(haloes + mean * np.exp(s * scores - s * s / 2), [0.158655, 0.841345])
        return high - low

    if width(FLOOR_LN) >= wanted:
        return FLOOR_LN, True
    low, high = FLOOR_LN, 1.5
    if width(high) < wanted:
        return high, False
    for _ in range(40):
        middle = (low + high) / 2
        low, high = (middle, high) if width(middle) < wanted else (low, middle)
    return (low + high) / 2, False


def diffuse_draws(z, halo_mean, width: DiffuseWidth, score, cosmos: Cosmos) -> np.ndarray:
    """Diffuse DM draws [pc cm-3]: log-normal of mean (total - haloes); all (k,).

    halo_mean  mean halo DM of each draw's own kept fraction
    score      standard normals keyed by the sightline
    """
    total = mean_cosmic_dm(z, cosmos)
    s = width.at(z)
    return np.maximum(total - halo_mean, LEAST_SHARE * total) * np.exp(s * score - s * s / 2)
