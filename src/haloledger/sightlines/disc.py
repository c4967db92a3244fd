"""Interstellar medium of a galaxy whose disc the line crosses: an exponential disc, randomly inclined.

N = central 10^(slope (log M* - pivot)) exp(-R / scale) / cos i
R = b sqrt(cos^2 t + sin^2 t / cos^2 i)        radius in the disc's plane at turn t from the line of nodes
"""

from __future__ import annotations

import tomllib
from functools import lru_cache
from pathlib import Path
from typing import Any

import numpy as np

LN10 = np.log(10.0)


@lru_cache(maxsize=1)
def law() -> dict[str, Any]:
    """The numbers of disc.toml with their sources."""
    return tomllib.loads((Path(__file__).parent / "disc.toml").read_text(encoding="utf-8"))


def reach_kpc(optical_radius_kpc: np.ndarray) -> np.ndarray:
    """Impact parameter below which a disc is met [kpc]; NaN radius: not known."""
    return np.fmax(law()["reach"]["kpc"], optical_radius_kpc)


def gas_poor_share(log_mstar) -> np.ndarray:
    """Share of galaxies of this stellar mass with little interstellar medium."""
    rule = law()["gas_poor"]
    return 1 / (1 + np.exp(-(np.asarray(log_mstar) - rule["half_log_mstar"]) / rule["width_dex"]))


def disc_column(impact_kpc, log_mstar, cos_i, turn, gas_poor, score) -> np.ndarray:
    """DM of the disc in the galaxy's rest frame [pc cm-3]; all arguments broadcast.

    cos_i     cosine of the inclination, 1 is face-on
    turn      angle between impact vector and line of nodes [rad]
    gas_poor  bool: little interstellar medium
    score     normal score of the scatter from line to line
    """
    rules = law()
    dex = np.asarray(log_mstar) - rules["column"]["pivot_log_mstar"]
    cos_i = np.maximum(cos_i, rules["inclination"]["least_cos"])
    radius = impact_kpc * np.sqrt(np.cos(turn) ** 2 + (np.sin(turn) / cos_i) ** 2)
    scale = rules["scale"]["kpc"] * 10 ** (rules["scale"]["slope"] * dex)
    central = rules["column"]["central"] * 10 ** (rules["column"]["slope"] * dex)
    factor = np.where(gas_poor, rules["gas_poor"]["factor"], 1.0)
    return factor * central * np.exp(LN10 * rules["column"]["scatter_dex"] * score - radius / scale) / cos_i
