"""How much gas a model holds, against what there is to hold: the table that `models` prints."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.cosmos.concentration import concentration
from haloledger.cosmos.mass_definitions import r500c_over_r200c
from haloledger.gas.models import Model
from haloledger.gas.stars import star_share

RADII = ("r500c", "r200c", "2 r200c")
LOG_M200C = np.arange(10.5, 15.51, 0.5)


@dataclass(frozen=True)
class Inventory:
    """Kept fractions of one model over mass.

    log_m200c    (n,) log10 Msun
    c200c        (n,) the model's concentration
    kept         radius name -> (n,) M_gas(<radius) / (f_b M_total(<radius)); gas beyond the boundary is not counted
    available    (n,) 1 - M_star / (f_b M): what the gas can be at most if no baryons come in from outside
    over         radius name -> (n,) True where the model holds more than that
    outside      (n,) True outside the model's stated range of validity
    """

    model: Model
    z: float
    log_m200c: np.ndarray
    c200c: np.ndarray
    kept: dict[str, np.ndarray]
    available: np.ndarray
    over: dict[str, np.ndarray]
    outside: np.ndarray


def inventory(model: Model, cosmos: Cosmos, log_m200c=LOG_M200C, z: float = 0.0) -> Inventory:
    """Kept fractions inside RADII for the masses given, at one redshift, with the model's median concentration."""
    log_m = np.atleast_1d(np.asarray(log_m200c, dtype=float))
    c200c = concentration(model.concentration, log_m, z, cosmos)
    radii = dict(zip(RADII, (r500c_over_r200c(c200c), np.ones_like(c200c), np.full_like(c200c, 2.0)), strict=True))
    kept = {name: model.kept(log_m, z, c200c, cosmos, x) for name, x in radii.items()}
    available = 1 - star_share(log_m, cosmos)
    over = {name: value > available for name, value in kept.items()}
    return Inventory(model, z, log_m, c200c, kept, available, over, model.outside_validity(log_m, z))
