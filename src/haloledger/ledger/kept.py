"""The kept fraction of a draw: a shared part for the whole universe and a part of each halo's own.

A model states the mean kept fraction k of its boundary and spreads in dex. A log-normal would let some haloes hold more
than their share of the baryons, and cutting it there would lower the mean: so the draws are logit-normal,
k' = 1 / (1 + exp(-(mu + s_shared g + s_own n))), with mu such that the mean of k' is k. Where k is small it is the
log-normal; k' never passes 1, and the mean factor k'/k is 1, in the entries as in the census.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from scipy.special import expit, logit

from haloledger.cosmos.background import Cosmos, cosmology
from haloledger.cosmos.concentration import concentration
from haloledger.engine.universe import Universe
from haloledger.gas.models import Model
from haloledger.reach.census import LOG_M

LN10 = np.log(10.0)
GRID = np.arange(9.0, 16.51, 0.1)
Z_TYPICAL = 0.2
FULLEST = 0.98
"""A model that keeps this much or more has no room to spread: its factor is 1."""
NODES, WEIGHTS = np.polynomial.hermite_e.hermegauss(41)
WEIGHTS = WEIGHTS / WEIGHTS.sum()


@dataclass(frozen=True)
class KeptLaw:
    """Logit-normal law of the kept fraction over GRID: mean, centre in logit, spreads in logit."""

    mean: np.ndarray
    centre: np.ndarray
    shared: np.ndarray
    own: np.ndarray

    def factor(self, log_m200c, shared_score, own_score) -> np.ndarray:
        """Factor on the gas, k' / k; arguments broadcast."""
        mean, centre, shared, own = (
            np.interp(log_m200c, GRID, a) for a in (self.mean, self.centre, self.shared, self.own)
        )
        return np.where(shared + own > 0, expit(centre + shared * shared_score + own * own_score) / mean, 1.0)


def kept_factor(log_m200c, halo_ids, model: Model, universe: Universe, cosmos: Cosmos) -> np.ndarray:
    """Factor on the gas of each halo (n_haloes, n_draws), of mean 1; exactly the held one where everything is fixed."""
    held = _held(universe)
    if universe.fixed or not model.spread_shared_dex + model.spread_own_dex:
        return np.full(np.shape(log_m200c), 10.0**held)
    own = universe.normals("kept own", halo_ids) if model.spread_own_dex else 0.0
    return 10.0**held * _law(model, cosmos.name, held, "kept" in universe.held).factor(log_m200c, _score(universe), own)


def census_factor(model: Model, universe: Universe, cosmos: Cosmos) -> np.ndarray:
    """Mean factor of each mass bin of the census in each universe (n_mass, n_draws), over the haloes' own part."""
    held = _held(universe)
    if universe.fixed or not model.spread_shared_dex + model.spread_own_dex:
        return np.full((len(LOG_M), universe.n_draws), 10.0**held)
    law = _law(model, cosmos.name, held, "kept" in universe.held)
    score = _score(universe)[None, :, None]
    return 10.0**held * (law.factor(LOG_M[:, None, None], score, NODES[None, None, :]) * WEIGHTS).sum(axis=-1)


def _held(universe: Universe) -> float:
    return float(universe.held.get("kept", 0.0))


def _score(universe: Universe) -> np.ndarray:
    return np.zeros(universe.n_draws) if "kept" in universe.held else universe.shared_normal("kept")


@lru_cache(maxsize=64)
def _law(model: Model, cosmology_name: str, held_dex: float, shared_is_held: bool) -> KeptLaw:
    cosmos = cosmology(cosmology_name)
    c200c = concentration(model.concentration, GRID, Z_TYPICAL, cosmos)
    mean = model.kept(GRID, Z_TYPICAL, c200c, cosmos, model.boundary_r200c) * 10.0**held_dex
    room = mean < FULLEST
    mean = np.clip(mean, 1e-6, FULLEST)
    spread = model.spread
    shared, own = (np.interp(GRID, spread.log_m200c, dex) * LN10 * room for dex in (spread.shared_dex, spread.own_dex))
    if shared_is_held:
        shared = np.zeros_like(shared)
    return KeptLaw(mean, _centre(mean, np.hypot(shared, own)), shared, own)


def _centre(mean: np.ndarray, spread: np.ndarray) -> np.ndarray:
    """Logit centre whose logit-normal of this spread has this mean; bisection."""
    low, high = logit(mean) - 6 * spread**2 - 1, logit(mean) + 6 * spread**2 + 1
    for _ in range(60):
        middle = (low + high) / 2
        below = (expit(middle[:, None] + spread[:, None] * NODES) * WEIGHTS).sum(axis=1) < mean
        low, high = np.where(below, middle, low), np.where(below, high, middle)
    return (low + high) / 2
