"""The kept fraction of a draw: a shared part for the whole universe and a part of each halo's own."""

from __future__ import annotations

from functools import lru_cache

import numpy as np

from haloledger.cosmos.background import Cosmos, cosmology
from haloledger.cosmos.concentration import concentration
from haloledger.engine.universe import Universe
from haloledger.gas.models import Model
from haloledger.reach.census import LOG_M

LN10 = np.log(10.0)
GRID = np.arange(9.0, 16.51, 0.1)
Z_TYPICAL = 0.2


def kept_factor(log_m200c, halo_ids, model: Model, universe: Universe, cosmos: Cosmos) -> np.ndarray:
    """Factor on the gas of each halo (n_haloes, n_draws): log-normal of mean 1.

    The shared part is one number a universe (or held, in dex), the own part one a halo and universe. It is capped where
    a halo would hold more than its share of the baryons.
    """
    factor = _shared(log_m200c, model, universe)
    if model.spread_own_dex and not universe.fixed:
        dex = np.interp(log_m200c, model.spread.log_m200c, model.spread.own_dex)
        factor = factor * _mean_one(dex, universe.normals("kept own", halo_ids))
    return np.minimum(factor, np.interp(log_m200c, GRID, ceiling(model, cosmos)))


def census_factor(model: Model, universe: Universe, cosmos: Cosmos) -> np.ndarray:
    """The shared factor with its cap, by mass bin of the census (n_mass, n_draws)."""
    factor = _shared(LOG_M[:, None], model, universe)
    return np.minimum(factor, np.interp(LOG_M, GRID, ceiling(model, cosmos))[:, None])


def _shared(log_m200c, model: Model, universe: Universe) -> np.ndarray:
    held = universe.held.get("kept")
    if held is not None:
        return np.full(np.broadcast_shapes(np.shape(log_m200c), (universe.n_draws,)), 10.0 ** float(held))
    dex = np.interp(log_m200c, model.spread.log_m200c, model.spread.shared_dex)
    return _mean_one(dex, universe.shared_normal("kept"))


def ceiling(model: Model, cosmos: Cosmos) -> np.ndarray:
    """Largest factor over GRID: the kept fraction may not pass 1, nor be pulled below the model's own."""
    return _ceiling(model, cosmos.name)


@lru_cache(maxsize=32)
def _ceiling(model: Model, cosmology_name: str) -> np.ndarray:
    cosmos = cosmology(cosmology_name)
    c200c = concentration(model.concentration, GRID, Z_TYPICAL, cosmos)
    kept = model.kept(GRID, Z_TYPICAL, c200c, cosmos, model.boundary_r200c)
    return np.maximum(1.0, 1.0 / np.maximum(kept, 1e-6))


def _mean_one(dex, score: np.ndarray) -> np.ndarray:
    s = LN10 * dex
    return np.exp(s * score - s * s / 2)
