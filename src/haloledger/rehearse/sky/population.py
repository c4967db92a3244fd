"""Universes that show the same galaxies: how many haloes each needs for its counts to say nothing of its nuisances.

With haloes from one mass function, a universe with another relation or zero point shows other numbers of galaxies, and
whoever counts them learns which universe it is. Relations were fitted to counts, so that here every universe has the
mean of them all (of the logarithms: a few universes with many heavy galaxies do not make it): a halo whose central is
measured at y stands for phi_mean(y, z) / phi_universe(y, z) haloes.
"""

from __future__ import annotations

import numpy as np
from scipy.ndimage import map_coordinates

from haloledger.cosmos.background import Cosmos
from haloledger.cosmos.mass_function import mass_function
from haloledger.rehearse.sky import relations
from haloledger.rehearse.sky.structure import median_concentration

LOG_M = np.arange(8.5, 16.0, 0.02)
Y_STEP, Z_STEP = 0.05, 0.05
Y = np.arange(7.0, 13.5, Y_STEP)
Z = np.arange(0.0, 1.51, Z_STEP)
_NODES, _WEIGHTS = np.polynomial.hermite_e.hermegauss(9)


class Population:
    """Stellar mass functions of measured masses, a relation each, and their mean over relations and zero points.

    names       relations that are drawn from
    zero_dex    spread of the zero point
    mass_err    error of a measured mass [dex]
    """

    def __init__(self, names, zero_dex: float, mass_err: float, scatter_factor: float, cosmos: Cosmos) -> None:
        self.numbers = [k for k, name in enumerate(relations.ALL) if name in names]
        self.ln_phi = {k: _counts(relations.ALL[k], mass_err, scatter_factor, cosmos) for k in self.numbers}
        shifts, weights = zero_dex * _NODES, _WEIGHTS / _WEIGHTS.sum()
        self.ln_mean = np.zeros((Z.size, Y.size))
        z, y = np.meshgrid(Z, Y, indexing="ij")
        for k in self.numbers:
            for shift, weight in zip(shifts, weights, strict=True):
                self.ln_mean += weight / len(self.numbers) * _at(self.ln_phi[k], y - shift, z)

    def weight(self, measured, z, relation, zero_point) -> np.ndarray:
        """Haloes that one halo stands for, shape (n,)."""
        result = np.empty(len(measured))
        for k in self.numbers:
            rows = np.flatnonzero(relation == k)
            y, at = measured[rows], z[rows]
            ln_own = _at(self.ln_phi[k], y - zero_point[rows], at)
            result[rows] = np.exp(_at(self.ln_mean, y, at) - ln_own)
        return result


def _counts(name: str, mass_err: float, scatter_factor: float, cosmos: Cosmos) -> np.ndarray:
    """ln of centrals [Mpc-3 per dex] measured at Y over Z."""
    rows = []
    for z in Z:
        at = np.full(LOG_M.size, z)
        mean = relations.mean_log_mstar(name, LOG_M, at, median_concentration(LOG_M, at, cosmos), cosmos)
        s = np.hypot(scatter_factor * relations.scatter_dex(name, z), mass_err)
        n = mass_function(LOG_M, z, cosmos) * (LOG_M[1] - LOG_M[0])
        seen = np.exp(-0.5 * ((Y[:, None] - mean) / s) ** 2) / (np.sqrt(2 * np.pi) * s)
        rows.append(np.log((seen * n).sum(axis=1) + 1e-40))
    return np.array(rows)


def _at(table: np.ndarray, y, z) -> np.ndarray:
    place = [np.asarray(z) / Z_STEP, (np.asarray(y) - Y[0]) / Y_STEP]
    return map_coordinates(table, place, order=1, mode="nearest")
