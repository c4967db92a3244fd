"""A model's density and projection along radius, for a few masses: what a picture of it shows."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.cosmos.concentration import concentration
from haloledger.gas.models import Model
from haloledger.gas.projection import projection

LOG_M200C = (11.0, 12.0, 13.0, 14.0, 15.0)
INNERMOST = 0.01  # r200c: further in, profiles are extrapolations
POINTS = 300


@dataclass(frozen=True)
class Curves:
    """Density and projection of one model.

    log_m200c    (n,) log10 Msun
    x            (p,) radius, and impact parameter, in r200c, up to the boundary
    density_cm3  (n, p) electron density
    impact_kpc   (n, p) impact parameter, proper
    dm_rest      (n, p) DM through the halo, rest frame [pc cm-3]
    """

    model: Model
    z: float
    log_m200c: np.ndarray
    x: np.ndarray
    density_cm3: np.ndarray
    impact_kpc: np.ndarray
    dm_rest: np.ndarray


def curves(model: Model, cosmos: Cosmos, log_m200c: Sequence[float] = LOG_M200C, z: float = 0.0) -> Curves:
    """Curves of haloes of the masses given, at one redshift, with the model's median concentration."""
    log_m = np.atleast_1d(np.asarray(log_m200c, dtype=float))
    c200c, r200c = concentration(model.concentration, log_m, z, cosmos), cosmos.r200c_kpc(log_m, z)
    x = np.geomspace(INNERMOST, model.boundary_r200c, POINTS)
    x[-1] *= 1 - 1e-9  # the last point lies inside, not on the edge
    column = (log_m[:, None], np.full((len(log_m), 1), float(z)), c200c[:, None])
    return Curves(
        model=model,
        z=float(z),
        log_m200c=log_m,
        x=x,
        density_cm3=model.density_cm3(x, *column, cosmos),
        impact_kpc=x * r200c[:, None],
        dm_rest=projection(model, cosmos).dm_rest(x[None, :], *column, r200c[:, None]),
    )
