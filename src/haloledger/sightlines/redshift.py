"""Redshift draws of a burst that has none, from its DM.

P(z | DM) is proportional to P(DM | z) with a uniform prior in z. P(DM | z) is the chance that Milky Way + cosmic + host
reach the observed DM, cosmic from the one-parameter form around the mean, host log-normal. Nothing that compares the
observed DM with the expected one may be printed for such a burst: it would be circular.
"""

from __future__ import annotations

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.cosmos.mean_dm import mean_cosmic_dm
from haloledger.cosmos.scatter import relative_dm
from haloledger.engine.universe import Universe
from haloledger.sightlines.draws import Z_LEAST
from haloledger.sightlines.terms import defaults

N_Z = 240


def redshift_from_dm(
    burst: str, dm: np.ndarray, milky_way: np.ndarray, host_rest: np.ndarray, universe: Universe, cosmos: Cosmos
) -> np.ndarray:
    """Redshift draws (n_draws,) given observed DM, Milky Way and host rest-frame DM draws, all [pc cm-3].

    Draw k uses the Milky Way of universe k; the host and the cosmic scatter are averaged over.
    """
    law = defaults()["redshift"]
    z = np.linspace(0.002, law["z_max"], N_Z)
    score = universe.normals("cosmic for redshift", [burst])[0]
    scores = np.linspace(-3, 3, 61)
    weights = np.exp(-0.5 * scores**2)
    mean = mean_cosmic_dm(z, cosmos)
    cosmic = mean[:, None] * relative_dm(z[:, None], scores[None, :])
    # the host of universe k and the cosmic term over its whole distribution
    extragalactic = np.maximum(dm - milky_way, 1.0)
    cdf = np.empty((N_Z, universe.n_draws))
    for j in range(N_Z):
        left = extragalactic[None, :] - host_rest[None, :] / (1 + z[j])
        gap = (left - cosmic[j][:, None]) / (law["kernel"] * extragalactic[None, :])
        cdf[j] = (weights[:, None] * np.exp(-0.5 * np.minimum(gap**2, 200.0))).sum(axis=0)
    cdf = np.cumsum(cdf + 1e-300, axis=0)
    cdf /= cdf[-1]
    # a normal score turned into a uniform keeps the row keyed by the burst alone
    from scipy.special import ndtr

    wanted = ndtr(score)
    above = np.argmax(cdf >= wanted[None, :], axis=0)
    low = np.where(above > 0, np.take_along_axis(cdf, np.maximum(above - 1, 0)[None, :], 0)[0], 0.0)
    high = np.take_along_axis(cdf, above[None, :], 0)[0]
    step = z[1] - z[0]
    return np.maximum(z[above] - step * (high - wanted) / np.maximum(high - low, 1e-300), Z_LEAST)
