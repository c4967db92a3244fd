"""Gauss-Legendre rules that stay right for cuspy gas: the nodes crowd towards the centre of the halo."""

from __future__ import annotations

from functools import lru_cache

import numpy as np


@lru_cache(maxsize=16)
def crowded_rule(n_nodes: int, power: int) -> tuple[np.ndarray, np.ndarray]:
    """Nodes v^power and weights on 0..1, with v the Gauss-Legendre nodes: exact for smooth functions of v.

    A core or cusp of relative size e is met by about n e^(1/power) nodes.
    """
    v, w = np.polynomial.legendre.leggauss(n_nodes)
    v, w = 0.5 * (v + 1), 0.5 * w
    return v**power, w * power * v ** (power - 1)


def enclosed(density, radius, n_nodes: int = 96) -> np.ndarray:
    """Integral of x^2 density(x) dx from 0 to `radius`.

    density  function of x; x comes with one trailing axis of nodes, which the result no longer has
    radius   array or number, in the unit of x
    """
    nodes, weights = crowded_rule(n_nodes, 3)
    radius = np.asarray(radius, dtype=float)[..., None]
    x = radius * nodes
    return np.sum(x**2 * density(x) * weights, axis=-1) * radius[..., 0]


def along_line(density, impact, depth, n_nodes: int = 96) -> np.ndarray:
    """Integral of density dl from the closest approach to `depth` (negative towards the observer, result signed).

    density  function of x, called with one trailing axis of nodes
    impact, depth  distance of the line from the centre and along the line, in the unit of x; they broadcast
    """
    nodes, weights = crowded_rule(n_nodes, 4)
    impact, depth = np.broadcast_arrays(np.asarray(impact, dtype=float), np.asarray(depth, dtype=float))
    s = depth[..., None] * nodes
    return np.sum(density(np.sqrt(impact[..., None] ** 2 + s**2)) * weights, axis=-1) * depth
