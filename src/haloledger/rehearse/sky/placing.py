"""Haloes along lines of sight that run at random through the box.

A line is a tube of patches: a disc around the line, then sectors of two rings, each 3 Mpc deep (comoving). In each
patch the haloes of each class of mass are Poisson around mass function x volume x density of the class's bias.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.cosmos.mass_function import mass_function
from haloledger.rehearse.sky.matter import Box, halo_bias

STEP_MPC = 3.0
LOG_M_LEAST = 10.6
CLASS_EDGES = np.array([LOG_M_LEAST, 11.3, 12.0, 12.6, 13.1, 13.6, 14.1, 15.6])
RINGS = ((0.0, 1.6, 1), (1.6, 2.6, 4), (2.6, 4.5, 6))  # inner and outer radius [Mpc], sectors
RINGS_OF_CLASS = (1, 1, 2, 3, 3, 3, 3)  # lighter haloes cannot be crossed from farther away
Z_NODES = np.arange(0.0, 1.21, 0.04)
CHUNK = 100  # lines at a time


@dataclass(frozen=True)
class Placed:
    """Haloes on lines (n,)."""

    line: np.ndarray
    log_m200c: np.ndarray
    distance_mpc: np.ndarray  # comoving
    east_mpc: np.ndarray
    north_mpc: np.ndarray


def class_of(log_m200c) -> np.ndarray:
    """Number of the class of each mass."""
    return np.clip(np.searchsorted(CLASS_EDGES, log_m200c, side="right") - 1, 0, len(CLASS_EDGES) - 2)


def class_bias(z: float, cosmos: Cosmos) -> np.ndarray:
    """Mean bias of each class, over its haloes."""
    means = []
    for low, high in pairwise(CLASS_EDGES):
        m = np.linspace(low, high, 30)
        means.append(np.average(halo_bias(m, z, cosmos), weights=mass_function(m, z, cosmos)))
    return np.array(means)


def place_haloes(box: Box, first_mpc, last_mpc, boost, cosmos: Cosmos, rng: np.random.Generator) -> Placed:
    """Haloes of all lines between two distances [comoving Mpc] a line, each class `boost` times as many; (n,)."""
    lines = np.arange(len(last_mpc))
    parts = []
    for start in range(0, len(lines), CHUNK):
        part = lines[start : start + CHUNK]
        frame = _Frame(part, first_mpc[part], last_mpc[part], rng, box)
        for k in range(len(CLASS_EDGES) - 1):
            for inner, outer, sectors in RINGS[: RINGS_OF_CLASS[k]]:
                parts.append(_ring(box, k, frame, inner, outer, sectors, boost[k], cosmos, rng))
    columns = (np.concatenate(c) for c in zip(*parts, strict=True))
    return Placed(*columns)


class _Frame:
    """Random origin and axes of each line in the box, and its steps."""

    def __init__(self, lines, first_mpc, last_mpc, rng: np.random.Generator, box: Box) -> None:
        n = len(lines)
        self.line = lines
        side = box.cell_mpc * box.densities[0].shape[0]
        self.origin = side * rng.random((n, 3))
        axis = rng.standard_normal((n, 3, 3))
        self.along = axis[:, 0] / np.linalg.norm(axis[:, 0], axis=1, keepdims=True)
        across = axis[:, 1] - (axis[:, 1] * self.along).sum(axis=1, keepdims=True) * self.along
        self.east = across / np.linalg.norm(across, axis=1, keepdims=True)
        self.north = np.cross(self.along, self.east)
        steps = np.arange(0.0, last_mpc.max(), STEP_MPC)
        self.distance = steps + STEP_MPC / 2
        self.used = (self.distance[None] > first_mpc[:, None]) & (self.distance[None] < last_mpc[:, None])

    def points(self, east_mpc: float, north_mpc: float) -> np.ndarray:
        """Places in the box (n_lines, n_steps, 3)."""
        start = self.origin + east_mpc * self.east + north_mpc * self.north
        return start[:, None] + self.distance[None, :, None] * self.along[:, None]


def _ring(box: Box, k: int, frame: _Frame, inner, outer, sectors, boost, cosmos, rng):
    """Haloes of class k in one ring: line, log mass, distance, east, north."""
    number, masses = _class(k, cosmos)
    z = cosmos.z_at_comoving_distance(frame.distance)
    volume = np.pi * (outer**2 - inner**2) / sectors * STEP_MPC
    mean = boost * np.interp(z, Z_NODES, number) * volume
    middle = np.sqrt(0.5 * (inner**2 + outer**2)) if inner else 0.0
    found = []
    for s in range(sectors):
        angle = 2 * np.pi * (s + 0.5) / sectors
        points = frame.points(middle * np.cos(angle), middle * np.sin(angle))
        density = box.at(k, points[..., 0], points[..., 1], points[..., 2])
        counts = rng.poisson(mean[None, :] * density * frame.used)
        row, step = np.nonzero(counts)
        again = counts[row, step]
        row, step = np.repeat(row, again), np.repeat(step, again)
        n = len(row)
        turn = 2 * np.pi * (s + rng.random(n)) / sectors
        radius = np.sqrt(inner**2 + (outer**2 - inner**2) * rng.random(n))
        distance = frame.distance[step] + STEP_MPC * (rng.random(n) - 0.5)
        column = np.clip(np.rint(z[step] / Z_NODES[1]).astype(int), 0, len(Z_NODES) - 1)
        log_m = _from_quantiles(masses, column, rng.random(n))
        found.append((frame.line[row], log_m, distance, radius * np.cos(turn), radius * np.sin(turn)))
    return tuple(np.concatenate(c) for c in zip(*found, strict=True))


QUANTILES = np.linspace(0.0, 1.0, 257)


def _class(k: int, cosmos: Cosmos) -> tuple[np.ndarray, np.ndarray]:
    """Number density [Mpc-3] of class k over Z_NODES, and log masses at QUANTILES (z, quantile)."""
    fine = np.linspace(CLASS_EDGES[k], CLASS_EDGES[k + 1], 400)
    density = mass_function(fine[None, :], Z_NODES[:, None], cosmos)
    steps = 0.5 * (density[:, 1:] + density[:, :-1]) * (fine[1] - fine[0])
    grown = np.concatenate([np.zeros((len(Z_NODES), 1)), np.cumsum(steps, axis=1)], axis=1)
    masses = np.array([np.interp(QUANTILES, g / g[-1], fine) for g in grown])
    return grown[:, -1], masses


def _from_quantiles(masses: np.ndarray, row: np.ndarray, share: np.ndarray) -> np.ndarray:
    at = share * (len(QUANTILES) - 1)
    low = np.minimum(at.astype(int), len(QUANTILES) - 2)
    return masses[row, low] + (at - low) * (masses[row, low + 1] - masses[row, low])
