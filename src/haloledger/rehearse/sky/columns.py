"""True columns of the textbook's modified NFW: kept x f_b M200c inside r200c, density y / (2 + y)^4, y = c r / r200c.

The line integral is done by Gauss-Legendre between the two ends of the line inside the sphere, or the burst.
"""

from __future__ import annotations

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.cosmos.electrons import CM3_PER_MSUN_KPC3, PC_PER_KPC, PER_PROTON
from haloledger.errors import InputError

OFFSET = 2.0
KEPT = 0.75
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(48)


MODELS = ("textbook-modified-nfw",)


def known_model(name: str) -> None:
    """InputError where the sky has no columns for this model."""
    if name not in MODELS:
        raise InputError(f"--model {name}: the true sky has no gas of that kind. Write one of {', '.join(MODELS)}.")


def enclosed(c200c) -> np.ndarray:
    """Integral of y^2 x y/(2+y)^4 from 0 to c: ln(t/a) + 3a/t - 3a^2/(2t^2) + a^3/(3t^3) - 11/6, t = a + c, a = 2."""
    a, t = OFFSET, OFFSET + np.asarray(c200c)
    return np.log(t / a) + 3 * a / t - 1.5 * (a / t) ** 2 + (a / t) ** 3 / 3 - 11 / 6


def column_rest(impact_kpc, r200c_kpc, log_m200c, c200c, stop_kpc, cosmos: Cosmos) -> np.ndarray:
    """Rest-frame DM [pc cm-3]; `stop_kpc` is the burst's depth behind the closest approach, inf where it is far."""
    half = np.sqrt(np.maximum(r200c_kpc**2 - impact_kpc**2, 0.0))
    end = np.clip(stop_kpc, -half, half)
    # two pieces, so that the bend at the closest approach lies on an edge
    first = np.minimum(end, 0.0)
    total = _piece(impact_kpc, r200c_kpc, c200c, -half, first) + _piece(impact_kpc, r200c_kpc, c200c, first, end)
    scale = r200c_kpc / c200c
    density = KEPT * cosmos.baryon_share * 10**log_m200c / (4 * np.pi * scale**3 * enclosed(c200c))
    return PER_PROTON * CM3_PER_MSUN_KPC3 * PC_PER_KPC * density * total


def _piece(impact_kpc, r200c_kpc, c200c, start, stop) -> np.ndarray:
    middle, half = 0.5 * (start + stop), 0.5 * (stop - start)
    depth = middle[:, None] + half[:, None] * _NODES
    y = (c200c / r200c_kpc)[:, None] * np.sqrt(impact_kpc[:, None] ** 2 + depth**2)
    return half * ((y / (OFFSET + y) ** 4) * _WEIGHTS).sum(axis=1)
