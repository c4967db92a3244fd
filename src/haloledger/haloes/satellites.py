"""How many galaxies of a stellar mass are centrals and how many satellites, and in what haloes the satellites live.

    phi_central(y, z)   = integral of n(M, z) N(y | y(M), scatter) dlogM
    phi_satellite(y, z) = integral of n(M, z) dN(y | M) dlogM
    dN(y | M)           = -dS/dy x Phi((y(M) - y) / scatter)

A host that no list has comes in with the first of its satellites that is listed, the heaviest: those are the fraction
exp(-S) of the satellites, and P(M_host | first satellite of y) ~ n(M, z) dN(y | M) exp(-S(y | M)).

S is the occupation of `satellites.toml`. Tables of log10 stellar mass y as it is measured, with the error folded in,
averaged over the relations that the nuisance `relation` chooses from.
"""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path
from typing import Any

import numpy as np
from scipy.ndimage import gaussian_filter1d
from scipy.special import ndtr

from haloledger.cosmos.background import Cosmos, cosmology
from haloledger.cosmos.mass_function import mass_function
from haloledger.haloes.interpolate import multilinear, place, uniform_place
from haloledger.haloes.posterior import U_NODES, mean_of_200c
from haloledger.haloes.relations import STELLAR_TO_HALO, Relation, load_relation

Z_NODES = np.array([0.0, 0.1, 0.2, 0.3, 0.45, 0.6, 0.8, 1.0, 1.4, 2.0])
ERR_NODES = np.array([0.0, 0.1, 0.2, 0.3, 0.5])
Y_STEP = 0.05
Y_NODES = 6.0 + Y_STEP * np.arange(129)
LOG_M = 9.0 + 0.05 * np.arange(141)
LN_LEAST = -60.0


@dataclass(frozen=True, eq=False)
class Occupation:
    """Tables over (z, err, y), and host mass or normal score where named; ln of numbers."""

    ln_central: np.ndarray  # [z, err, y], Mpc-3 (comoving) per dex of y
    ln_satellite: np.ndarray  # the same for satellites
    ln_first: np.ndarray  # the same for satellites that are the heaviest of their halo
    ln_central_of: np.ndarray  # [z, err, y, M]: per dex of y in one halo
    ln_satellites_of: np.ndarray  # the same for its satellites
    ln_above_of: np.ndarray  # [z, err, y, M]: number of its satellites that show more than y
    host_mass: np.ndarray  # [z, err, y, u]: log10 M200c of a first satellite's host at normal score u

    def numbers(self, y, z, err) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
        """Centrals, satellites and first satellites [comoving Mpc-3 per dex of y] that show y with error `err`."""
        at = _places(y, z, err)
        central, satellite, first = (
            np.exp(multilinear(t, at)) for t in (self.ln_central, self.ln_satellite, self.ln_first)
        )
        return central, satellite, first

    def in_host(self, y, z, err, log_m200c) -> tuple[np.ndarray, np.ndarray]:
        """Central and satellites [per dex of y] of one halo that show y."""
        at = [*_places(y, z, err), uniform_place(LOG_M, log_m200c)]
        return np.exp(multilinear(self.ln_central_of, at)), np.exp(multilinear(self.ln_satellites_of, at))

    def above(self, y, z, err, log_m200c) -> np.ndarray:
        """Number of satellites of one halo that show more than y."""
        return np.exp(multilinear(self.ln_above_of, [*_places(y, z, err), uniform_place(LOG_M, log_m200c)]))

    def host(self, y, z, err, u) -> np.ndarray:
        """log10 M200c of the host of a first satellite that shows y, at normal score u."""
        return multilinear(self.host_mass, [*_places(y, z, err), uniform_place(U_NODES, u)])


def numbers_of_nature() -> dict[str, Any]:
    """The numbers of `satellites.toml`."""
    return _read()


@lru_cache(maxsize=1)
def _read() -> dict[str, Any]:
    return tomllib.loads((Path(__file__).parent / "satellites.toml").read_text(encoding="utf-8"))


def occupation(cosmos: Cosmos) -> Occupation:
    """The tables in this cosmology; made at the first call, about half a second."""
    return _tabulate(cosmos.name)


def _places(y, z, err):
    return [place(Z_NODES, z), place(ERR_NODES, err), uniform_place(Y_NODES, y)]


@lru_cache(maxsize=4)
def _tabulate(cosmology_name: str) -> Occupation:
    cosmos = cosmology(cosmology_name)
    shape = (Z_NODES.size, ERR_NODES.size, Y_NODES.size, LOG_M.size)
    central, satellites, first = np.zeros(shape), np.zeros(shape), np.zeros(shape)
    for name in STELLAR_TO_HALO:
        relation = load_relation(name)
        for i, z in enumerate(Z_NODES):
            of_central, of_satellites, of_first = galaxies_of_host(relation, float(z), cosmos)
            for j, err in enumerate(ERR_NODES):
                central[i, j] += _blurred(of_central, err) / len(STELLAR_TO_HALO)
                satellites[i, j] += _blurred(of_satellites, err) / len(STELLAR_TO_HALO)
                first[i, j] += _blurred(of_first, err) / len(STELLAR_TO_HALO)
    step = LOG_M[1] - LOG_M[0]
    number = mass_function(LOG_M, Z_NODES[:, None], cosmos)[:, None, None, :] * step
    return Occupation(
        ln_central=_ln((number * central).sum(axis=-1)),
        ln_satellite=_ln((number * satellites).sum(axis=-1)),
        ln_first=_ln((number * first).sum(axis=-1)),
        ln_central_of=_ln(central),
        ln_satellites_of=_ln(satellites),
        ln_above_of=_ln(np.cumsum(satellites[:, :, ::-1], axis=2)[:, :, ::-1] * Y_STEP),
        host_mass=_quantiles(number * first),
    )


def galaxies_of_host(relation: Relation, z: float, cosmos: Cosmos) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """The central, the satellites and the first satellite of a halo per dex of true stellar mass; (Y_NODES, LOG_M)."""
    p = numbers_of_nature()["occupation"]
    mean = np.maximum.accumulate(mean_of_200c(relation, LOG_M, z, cosmos))
    s = float(relation.scatter(z))
    y = Y_NODES[:, None]
    # the cells are narrower than the scatter by three, so that the values at their middles will do
    central = np.exp(-0.5 * ((y - mean) / s) ** 2) / (np.sqrt(2 * np.pi) * s)
    rising = np.concatenate([[True], np.diff(mean) > 0])
    log_mh = np.interp(Y_NODES, mean[rising], LOG_M[rising])
    steep = np.maximum(np.gradient(log_mh, Y_STEP), 0.0)
    log_msat = np.log10(p["msat"]) + p["msat_slope"] * (log_mh - 12)
    cut = 10 ** (np.log10(p["mcut"]) + p["mcut_slope"] * (log_mh - 12))[:, None] / 10**LOG_M
    above = 10 ** (p["slope"] * (LOG_M - log_msat[:, None])) * np.exp(-cut)
    falling = above * np.log(10) * steep[:, None] * (p["slope"] * p["msat_slope"] + p["mcut_slope"] * cut)
    satellites = np.maximum(falling, 0.0) * ndtr((mean - y) / s)
    return central, satellites, satellites * np.exp(-above)


def _blurred(density: np.ndarray, err: float) -> np.ndarray:
    return gaussian_filter1d(density, err / Y_STEP, axis=0, mode="nearest") if err else density


def _ln(x: np.ndarray) -> np.ndarray:
    return np.log(np.maximum(x, np.exp(LN_LEAST)))


def _quantiles(hosts: np.ndarray) -> np.ndarray:
    """log10 host mass at U_NODES; where there are no satellites, the heaviest halo of the table's last that has."""
    grown = np.cumsum(hosts, axis=-1)
    flat, total = grown.reshape(-1, LOG_M.size), grown[..., -1].ravel()
    level = ndtr(U_NODES)
    result = np.empty((len(flat), U_NODES.size))
    edges = LOG_M + 0.5 * (LOG_M[1] - LOG_M[0])
    for k, row in enumerate(flat):
        result[k] = np.interp(level, row / total[k], edges) if total[k] > 0 else result[k - 1]
    return result.reshape(*hosts.shape[:-1], U_NODES.size)
