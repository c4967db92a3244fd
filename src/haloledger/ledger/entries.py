"""The DM of each halo on one sightline, draw by draw."""

from __future__ import annotations

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.engine.universe import Universe
from haloledger.gas.models import Model
from haloledger.gas.projection import projection
from haloledger.ledger.crossing import Crossing
from haloledger.ledger.kept import kept_factor

LN10 = np.log(10.0)


def halo_dm(crossing: Crossing, halo_ids: np.ndarray, model: Model, universe: Universe, cosmos: Cosmos) -> np.ndarray:
    """Observer-frame DM draws [pc cm-3] of every halo, (n_haloes, n_draws); zero where it is not crossed.

    DM = kept factor x shape factor x integral of n_e dl / (1 + z_halo), the integral between us and the burst and
    inside the boundary. Haloes the burst sits in are included: the caller keeps them out of the foreground sum.
    """
    b = crossing.impact_r200c
    table = projection(model, cosmos)
    half_kpc = np.sqrt(np.maximum(model.boundary_r200c**2 - b**2, 0)) * crossing.r200c_kpc
    inside = crossing.own & (half_kpc > 0) & (crossing.behind_kpc > -half_kpc) & (crossing.ahead_kpc > -half_kpc)
    cut = inside & ((crossing.behind_kpc < half_kpc) | (crossing.ahead_kpc < half_kpc))
    whole = inside & ~cut
    dm = np.zeros_like(b)
    arguments = (b, crossing.log_m200c, crossing.z, crossing.c200c, crossing.r200c_kpc)
    dm[whole] = table.dm_rest(*(a[whole] for a in arguments))
    if cut.any():
        start = np.maximum(-crossing.ahead_kpc, -half_kpc)[cut] / crossing.r200c_kpc[cut]
        stop = np.minimum(crossing.behind_kpc, half_kpc)[cut] / crossing.r200c_kpc[cut]
        impact, log_m, z, c200c, r200c = (a[cut] for a in arguments)
        dm[cut] = table.dm_rest_between(impact, log_m, z, c200c, r200c, start, stop)
    factor = kept_factor(crossing.log_m200c, halo_ids, model, universe, cosmos) * _shape_factor(
        b, halo_ids, model, universe
    )
    return dm * factor / (1 + crossing.z)


def _shape_factor(b_over_r200c, halo_ids, model: Model, universe: Universe) -> np.ndarray:
    """Log-normal factor of mean 1 for triaxiality and clumps; one score a halo and draw."""
    s = LN10 * model.shape_scatter_dex(b_over_r200c)
    if universe.fixed or not np.any(s):
        return np.ones_like(b_over_r200c)
    return np.exp(s * universe.normals("shape", halo_ids) - s * s / 2)
