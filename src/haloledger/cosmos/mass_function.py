"""Number of haloes by mass: Tinker et al. 2008 for M200c, from colossus, tabulated over mass and redshift."""

from __future__ import annotations

from functools import lru_cache

import numpy as np
from scipy.interpolate import RectBivariateSpline

from haloledger.cosmos.background import Cosmos, cosmology
from haloledger.cosmos.colossus_link import colossus_cosmology

LOG_M = np.arange(8.5, 16.26, 0.05)
Z = np.concatenate([np.arange(0, 1, 0.05), np.arange(1, 5.01, 0.1)])


def mass_function(log_m200c, z, cosmos: Cosmos) -> np.ndarray:
    """dn/dlog10 M [comoving Mpc-3 dex-1, no h] of M200c [log10 Msun] at z; shapes broadcast.

    Tinker et al. 2008 (ApJ 688, 709), Eisenstein & Hu 1998 transfer function. Clamped to 8.5..16.25 and z 0..5.
    """
    m, zz = np.broadcast_arrays(np.clip(log_m200c, LOG_M[0], LOG_M[-1]), np.clip(z, Z[0], Z[-1]))
    return np.exp(_table(cosmos.name).ev(m, zz))


@lru_cache(maxsize=8)
def _table(cosmology_name: str) -> RectBivariateSpline:
    from colossus.lss import mass_function as library

    cosmos = cosmology(cosmology_name)
    with colossus_cosmology(cosmos):
        rows = [
            library.massFunction(
                10**LOG_M * cosmos.h, float(z), mdef="200c", model="tinker08", q_in="M", q_out="dndlnM"
            )
            for z in Z
        ]
    # colossus counts per (Mpc/h)^3 and per e-fold of mass
    per_dex = np.maximum(np.array(rows).T, 1e-60) * cosmos.h**3 * np.log(10)
    return RectBivariateSpline(LOG_M, Z, np.log(per_dex), kx=3, ky=3)
