"""Redshift draws of a burst that has none, from its DM.

P(z | DM) is proportional to P(DM | z) with a uniform prior in z. P(DM | z) is the chance that Milky Way + cosmic + host
reach the observed DM, cosmic from the one-parameter form around the mean, host log-normal. Nothing that compares the
observed DM with the expected one may be printed for such a burst: it would be circular.
"""

from __future__ import annotations

import numpy as np
from scipy.special import ndtr, ndtri

from haloledger.cosmos.background import Cosmos
from haloledger.cosmos.mean_dm import mean_cosmic_dm
from haloledger.cosmos.scatter import relative_dm
from haloledger.engine.universe import Universe
from haloledger.sightlines.draws import Z_LEAST
from haloledger.sightlines.terms import defaults

N_Z = 240
SHARES = (np.arange(80) + 0.5) / 80
"""Equal shares of the cosmic and the host distribution over which the likelihood is summed."""


def redshift_from_dm(
    burst: str, dm: np.ndarray, milky_way: np.ndarray, host_rest: np.ndarray, universe: Universe, cosmos: Cosmos
) -> np.ndarray:
    """Redshift draws (n_draws,) given observed DM, Milky Way and host rest-frame DM draws, all [pc cm-3].

    Draw k uses the Milky Way of universe k; host and cosmic scatter are integrated over, since both are weighed by how
    well they explain the DM.
    """
    z = np.linspace(0.002, defaults()["redshift"]["z_max"], N_Z)
    likelihood = _likelihood(np.maximum(dm - milky_way, 1.0), z, host_rest, cosmos)
    cdf = np.cumsum(likelihood + 1e-300, axis=0)
    cdf /= cdf[-1]
    wanted = ndtr(universe.normals("redshift from dm", [burst])[0])
    above = np.argmax(cdf >= wanted[None, :], axis=0)
    low = np.where(above > 0, np.take_along_axis(cdf, np.maximum(above - 1, 0)[None, :], 0)[0], 0.0)
    high = np.take_along_axis(cdf, above[None, :], 0)[0]
    drawn = np.maximum(z[above] - (z[1] - z[0]) * (high - wanted) / np.maximum(high - low, 1e-300), Z_LEAST)
    # where the Milky Way leaves less than any host and cosmos give, the burst is next door
    return np.where(likelihood.sum(axis=0) > 0, drawn, Z_LEAST)


def _likelihood(extragalactic: np.ndarray, z: np.ndarray, host_rest: np.ndarray, cosmos: Cosmos) -> np.ndarray:
    """P(DM | z) up to a factor (n_z, n_draws): share of cosmic + host values within a few per cent of the DM."""
    kernel = defaults()["redshift"]["kernel"]
    mean = mean_cosmic_dm(z, cosmos)
    hosts = np.quantile(host_rest, SHARES)
    rows = np.empty((len(z), len(extragalactic)))
    for j in range(len(z)):
        cosmic = mean[j] * relative_dm(z[j], ndtri(SHARES))
        values = np.sort((cosmic[:, None] + hosts[None, :] / (1 + z[j])).ravel())
        high, low = (np.searchsorted(values, extragalactic * (1 + s * kernel)) for s in (1, -1))
        rows[j] = high - low
    return rows
