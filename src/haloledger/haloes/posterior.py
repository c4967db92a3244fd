"""Mass of a halo given what is seen of it: P(M | y, z) ~ dn/dlogM(M, z) x N(y | y(M, z), sigma), tabulated once.

y is the log10 of a stellar mass, a velocity dispersion, a luminosity or a catalogue's own mass; sigma is scatter and
measurement error in quadrature. The table holds log M200c against (z, sigma, y, u), u the normal score of the
cumulative probability: a draw with normal u is a look-up. Quantiles run smoothly in u, so that a step of 0.3 is enough
(0.002 dex). The table's second part is the number of haloes that would show y, which a photometric redshift needs.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import ndtr

from haloledger.cosmos.background import Cosmos
from haloledger.cosmos.concentration import concentration
from haloledger.cosmos.mass_definitions import from_200c
from haloledger.cosmos.mass_function import mass_function
from haloledger.haloes.interpolate import Place, multilinear, place, uniform_place
from haloledger.haloes.relations import Relation, load_relation

LOG_M = np.arange(8.5, 16.005, 0.02)
Z_NODES = np.array([0.0, 0.1, 0.2, 0.3, 0.45, 0.6, 0.8, 1.0, 1.4, 2.0, 3.0, 4.0])
SIGMA_NODES = np.concatenate([np.arange(0.05, 0.501, 0.025), [0.55, 0.6, 0.7, 0.85, 1.0]])
U_NODES = np.arange(-4.2, 4.21, 0.3)
MASS_RELATION = "dutton2014"  # maps a relation's own mass definition to M200c
Y_NODES = {
    "log_mstar": np.concatenate([np.arange(5.0, 9.0, 0.25), np.arange(9.0, 12.61, 0.05)]),
    "log_sigma_v_kms": np.arange(1.2, 3.56, 0.04),
    "log_lx_1e44_erg_s": np.arange(-6.0, 2.6, 0.1),
    "log_mass": np.arange(8.5, 16.01, 0.1),
}


@dataclass(frozen=True, eq=False)
class Inverse:
    """Tables of one relation in one cosmology; see the module."""

    relation: Relation
    y: np.ndarray
    sigma: np.ndarray
    log_m200c: np.ndarray  # [z, sigma, y, u]
    ln_number: np.ndarray  # [z, sigma, y]: ln of Mpc-3 (comoving) per dex of y

    def mass(self, y, z, err, u) -> np.ndarray:
        """log10 M200c at normal score u, for y measured with error `err` [dex] at z; shapes broadcast."""
        return multilinear(self.log_m200c, [*self._places(y, z, err), uniform_place(U_NODES, u)])

    def ln_count(self, y, z, err) -> np.ndarray:
        """ln of the number of haloes [Mpc-3 dex-1] that show y, measured with error `err`; shapes broadcast."""
        return multilinear(self.ln_number, self._places(y, z, err))

    def _places(self, y, z, err) -> list[Place]:
        sigma = np.hypot(
            self.relation.scatter(z) if self.relation.scatter_dex[1] else self.relation.scatter_dex[0], err
        )
        return [place(Z_NODES, z), place(self.sigma, sigma), place(self.y, y)]


_TABLES: dict[tuple[str, str], Inverse] = {}


def inverse(relation: str, cosmos: Cosmos) -> Inverse:
    """The tables of a relation that gives the proxy at fixed mass; made at the first call, about 0.3 s."""
    key = (relation, cosmos.name)
    if key not in _TABLES:
        _TABLES[key] = _tabulate(load_relation(relation), cosmos)
    return _TABLES[key]


def _tabulate(relation: Relation, cosmos: Cosmos) -> Inverse:
    y = Y_NODES[relation.proxy]
    sigma = SIGMA_NODES * relation.parameters.get("slope", 1.0)
    masses = np.empty((Z_NODES.size, sigma.size, y.size, U_NODES.size))
    number = np.empty(masses.shape[:3])
    level = ndtr(U_NODES)
    for i, z in enumerate(Z_NODES):
        ln_prior = np.log(mass_function(LOG_M, z, cosmos))
        distance2 = (y[:, None] - mean_of_200c(relation, LOG_M, z, cosmos)) ** 2
        for j, s in enumerate(sigma):
            ln_p = ln_prior - 0.5 * distance2 / s**2
            top = ln_p.max(axis=1, keepdims=True)
            p = np.exp(ln_p - top)
            grown = np.cumsum(0.5 * (p[:, 1:] + p[:, :-1]), axis=1)
            total = grown[:, -1]
            step = LOG_M[1] - LOG_M[0]
            number[i, j] = top[:, 0] + np.log(total * step) - np.log(np.sqrt(2 * np.pi) * s)
            for k in range(y.size):
                masses[i, j, k] = np.interp(level, grown[k] / total[k], LOG_M[1:])
    return Inverse(relation, y, sigma, masses, number)


def mean_of_200c(relation: Relation, log_m200c, z, cosmos: Cosmos) -> np.ndarray:
    """What the relation gives for a halo of M200c, whatever its own mass definition."""
    c200c = concentration(MASS_RELATION, log_m200c, z, cosmos)
    return relation.mean(from_200c(log_m200c, relation.mass_def, z, c200c, cosmos), z, cosmos)
