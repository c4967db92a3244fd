"""Haloes along an average line of sight: their mean DM, and their sums along random lines.

Mean: <DM_haloes>(z) = P x (1/f_d-free prefactor) x integral of (1+z)/E(z) F(z) dz with
F(z) = (1/rho_b0) integral of dn/dM M_gas(M, z) dM, over haloes above a stated mass. Nothing here knows a catalogue.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.cosmos.concentration import SCATTER_DEX, concentration
from haloledger.cosmos.mass_function import mass_function
from haloledger.cosmos.mean_dm import dm_per_unit_integral
from haloledger.gas.models import Model
from haloledger.gas.projection import projection

LOG_M_LEAST = 10.5
"""Haloes below this mass [log10 Msun] belong to the diffuse term."""
LOG_M_STEP = 0.1
LOG_M = np.arange(LOG_M_LEAST + LOG_M_STEP / 2, 16.0, LOG_M_STEP)
Z_EDGES = np.concatenate([np.linspace(0, 0.1, 21), np.linspace(0.12, 1.0, 45), np.linspace(1.05, 4.0, 60)])
Z = (Z_EDGES[1:] + Z_EDGES[:-1]) / 2
LINES = 4000


@dataclass(frozen=True)
class Census:
    """Halo DM along average and random lines, for one gas model.

    mean_by_mass  mean DM to the redshift edge, by mass bin (n_mass, n_edges) [pc cm-3]
    sums          DM of all haloes to the redshift edge on random lines (n_lines, n_edges) [pc cm-3]
    """

    mean_by_mass: np.ndarray
    sums: np.ndarray

    def mean(self, z, factor_by_mass: np.ndarray) -> np.ndarray:
        """Mean halo DM to z (k,) when the gas of each mass bin is scaled by (n_mass, k) factors."""
        edge, share = _between(z)
        low, high = self.mean_by_mass[:, edge], self.mean_by_mass[:, edge + 1]
        return ((low + share * (high - low)) * factor_by_mass).sum(axis=0)

    def share_before(self, z: float, deepest: np.ndarray) -> float:
        """Share of the mean halo DM to z in haloes nearer than `deepest`, a redshift for each mass bin (n_mass,)."""
        edge, share = _between(np.minimum(z, deepest))
        row = np.arange(len(self.mean_by_mass))
        low, high = self.mean_by_mass[row, edge], self.mean_by_mass[row, edge + 1]
        whole = self.mean(np.array([z]), np.ones((len(row), 1)))[0]
        return float((low + share * (high - low)).sum() / max(whole, 1e-12))

    def lines(self, z, pick: np.ndarray) -> np.ndarray:
        """Halo DM to z (k,) on the random lines `pick` (k,)."""
        edge, share = _between(z)
        low, high = self.sums[pick, edge], self.sums[pick, edge + 1]
        return low + share * (high - low)


def take_census(model: Model, cosmos: Cosmos, seed: int = 1, n_lines: int = LINES) -> Census:
    """The census of one model; its random lines depend on the seed alone, so models are compared on the same lines."""
    return Census(_mean_by_mass(model, cosmos), _random_lines(model, cosmos, seed, n_lines))


def _between(z) -> tuple[np.ndarray, np.ndarray]:
    z = np.clip(z, 0, Z_EDGES[-1] * (1 - 1e-12))
    edge = np.searchsorted(Z_EDGES, z, side="right") - 1
    return edge, (z - Z_EDGES[edge]) / (Z_EDGES[edge + 1] - Z_EDGES[edge])


def _mean_by_mass(model: Model, cosmos: Cosmos) -> np.ndarray:
    log_m, z = LOG_M[:, None], Z[None, :]
    c200c = concentration(model.concentration, log_m, z, cosmos)
    gas = cosmos.baryon_share * 10**log_m * model.gas_share(log_m, z, c200c, cosmos)
    rho_b0 = cosmos.omega_b * cosmos.critical_density(0.0) * 1e9  # Msun Mpc-3, comoving
    share = mass_function(log_m, z, cosmos) * LOG_M_STEP * gas / rho_b0
    steps = share * (1 + z) / cosmos.e_of_z(z) * np.diff(Z_EDGES)
    total = dm_per_unit_integral(cosmos.name) * np.cumsum(steps, axis=1)
    return np.concatenate([np.zeros((len(LOG_M), 1)), total], axis=1)


def _random_lines(model: Model, cosmos: Cosmos, seed: int, n_lines: int) -> np.ndarray:
    """A compound Poisson sum: haloes placed at random along lines, each crossed at a random impact parameter."""
    rng = np.random.default_rng([seed, 20260101])
    expected = _expected_crossings(cosmos)  # per line, inside two r200c, whatever the model's boundary
    cells = rng.poisson(n_lines * expected)
    n = int(cells.sum())
    cell = np.repeat(np.arange(cells.size), cells.ravel())
    mass, slab = np.unravel_index(cell, cells.shape)
    line = rng.integers(0, n_lines, n)
    log_m = LOG_M[mass] + LOG_M_STEP * (rng.random(n) - 0.5)
    z = Z_EDGES[slab] + rng.random(n) * np.diff(Z_EDGES)[slab]
    impact_r200c = WIDEST_R200C * np.sqrt(rng.random(n))
    offset = SCATTER_DEX * rng.standard_normal(n)
    if not isinstance(model.concentration, str):
        offset = np.zeros(n)
    c200c = concentration(model.concentration, log_m, z, cosmos) * 10**offset
    table = projection(model, cosmos)
    dm = table.dm_rest(impact_r200c, log_m, z, c200c, cosmos.r200c_kpc(log_m, z)) / (1 + z)
    sums = np.zeros((n_lines, len(Z_EDGES)))
    np.add.at(sums, (line, slab + 1), dm)
    return np.cumsum(sums, axis=1)


WIDEST_R200C = 3.0
"""Random lines meet haloes out to here, in r200c; models may not reach farther."""


def _expected_crossings(cosmos: Cosmos) -> np.ndarray:
    """Haloes per line by mass bin and redshift slab (n_mass, n_slabs), inside WIDEST_R200C."""
    log_m, z = LOG_M[:, None], Z[None, :]
    radius_mpc = WIDEST_R200C * cosmos.r200c_kpc(log_m, z) / 1e3 * (1 + z)  # comoving
    length_mpc = np.diff(cosmos.comoving_distance_mpc(Z_EDGES))
    return mass_function(log_m, z, cosmos) * LOG_M_STEP * np.pi * radius_mpc**2 * length_mpc
