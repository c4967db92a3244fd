"""Places in a halo that follow an NFW profile inside r200c: drawn radii, and the projected density."""

from __future__ import annotations

from functools import lru_cache

import numpy as np

from haloledger.haloes.interpolate import multilinear, uniform_place

LOG_C = np.linspace(-0.3, 2.0, 47)
ROOT = np.linspace(0.0, 1.0, 201)  # square root of the enclosed share: radius runs linearly in it near the centre
SURFACE_X = np.linspace(0.0, 1.0, 101)  # projected radius in r200c, square root spaced


def radius_r200c(share, c200c) -> np.ndarray:
    """Radius [r200c] that encloses this share of the mass inside r200c; shapes broadcast."""
    return multilinear(_radii(), [uniform_place(LOG_C, np.log10(c200c)), uniform_place(ROOT, np.sqrt(share))])


def surface_per_r200c2(x, c200c) -> np.ndarray:
    """Share of the members per area [r200c-2] at projected radius x [r200c]; finite at the centre, 0 beyond 1."""
    ln_surface = multilinear(
        _surfaces(), [uniform_place(LOG_C, np.log10(c200c)), uniform_place(SURFACE_X, np.sqrt(np.clip(x, 0, 1)))]
    )
    return np.where(np.asarray(x) <= 1, np.exp(ln_surface), 0.0)


def _enclosed(y):
    return np.log1p(y) - y / (1 + y)


@lru_cache(maxsize=1)
def _radii() -> np.ndarray:
    x = np.concatenate([[0.0], np.geomspace(1e-5, 1.0, 2000)])
    c = 10 ** LOG_C[:, None]
    share = np.sqrt(np.maximum(_enclosed(c * x) / _enclosed(c), 0.0))
    return np.array([np.interp(ROOT, row, x) for row in share])


@lru_cache(maxsize=1)
def _surfaces() -> np.ndarray:
    """ln of the projected density, averaged over the step around each node so that the centre is finite."""
    edges = np.clip(np.concatenate([[0.0], 0.5 * (SURFACE_X[1:] + SURFACE_X[:-1]), [1.0]]), 0, 1) ** 2
    table = np.empty((LOG_C.size, SURFACE_X.size))
    for k, c in enumerate(10**LOG_C):
        inside = np.array([_cylinder(b, c) for b in edges])
        table[k] = np.log(np.maximum(np.diff(inside) / (np.pi * np.diff(edges**2)), 1e-12))
    return table


def _cylinder(b: float, c: float) -> float:
    """Share of the sphere's mass within projected radius b: all of r < b, and of each shell beyond the two caps."""
    if b <= 0:
        return 0.0
    t, w = _nodes()
    # in s = sqrt(r2 - b2) the cap's share 1 - s / r is smooth
    s = 0.5 * (t + 1) * np.sqrt(1 - b * b)
    r = np.sqrt(b * b + s * s)
    density = 1 / (c * r * (1 + c * r) ** 2)
    shell = 4 * np.pi * r * r * density * (1 - s / r) * s / r
    beyond = np.sum(0.5 * w * np.sqrt(1 - b * b) * shell)
    whole = 4 * np.pi * _enclosed(c) / c**3
    return float(_enclosed(c * b) / _enclosed(c) + beyond / whole)


@lru_cache(maxsize=1)
def _nodes() -> tuple[np.ndarray, np.ndarray]:
    return np.polynomial.legendre.leggauss(64)
