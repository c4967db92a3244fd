"""Columns of halo gas: one table per model, made by quadrature, and one kernel that looks all of them up.

The column through a sphere of radius B = boundary r200c at impact parameter b is, with u = b/B,

    DM_rest = unit f_b M200c / r200c^2 sqrt(1 - u^2) T,    T = (1/4 pi) 2 B  integral_0^1 density(sqrt(b^2 + (B^2 - b^2) s^2)) ds,

density being the model's relative density. The square root is the edge of the sphere; T is smooth and above 0 from the
centre to the boundary, so ln T is tabulated and interpolated linearly over sqrt(u), log M, ln(1+z) and ln c, in the
dimensions the model depends on. Power laws in mass, redshift or concentration are thereby exact.

Every step of the kernel acts on one element alone, on contiguous buffers: results do not hang on how rows are grouped.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from haloledger.cosmos import electrons
from haloledger.cosmos.background import Cosmos
from haloledger.gas.models import Model
from haloledger.gas.quadrature import along_line, crowded_rule
from haloledger.gas.shapes import AXES

CHUNK = 8192
N_U = 257
LOG_M = (9.0, 16.0, 141)  # from, to, number of points; a halo outside takes the edge's shape
LN_1Z = (0.0, float(np.log(6.0)), 25)
LN_C = (0.0, float(np.log(40.0)), 49)
GRIDS = dict(zip(AXES, (LOG_M, LN_1Z, LN_C), strict=True))
DM_UNIT = electrons.PER_PROTON * electrons.CM3_PER_MSUN_KPC3 * electrons.PC_PER_KPC
LN_10 = float(np.log(10.0))


@dataclass(frozen=True)
class Projection:
    """The table of one model in one cosmology. Made by `projection`."""

    model: Model
    cosmos: Cosmos
    axes: tuple[str, ...]
    table: np.ndarray  # ln T (+ constants), over (axes..., u), flattened

    def dm_rest(self, impact_r200c, log_m200c, z, c200c, r200c_kpc) -> np.ndarray:
        """Rest-frame column [pc cm-3] of whole haloes; divide by 1 + z for the observed DM.

        impact_r200c  distance of the line from the centre over r200c;  r200c_kpc  proper kpc
        Arguments broadcast. Zero, never NaN, at and beyond the boundary. Masses beyond 1e9..1e16, redshifts above 5 and
        concentrations beyond 1..40 take the table's edge.
        """
        args = np.broadcast_arrays(impact_r200c, log_m200c, z, c200c, r200c_kpc)
        flat = [np.ascontiguousarray(a, dtype=float).ravel() for a in args]
        out = np.empty(flat[0].size)
        for start in range(0, out.size, CHUNK):
            part = slice(start, start + CHUNK)
            out[part] = self._look_up(*(a[part] for a in flat))
        return out.reshape(args[0].shape)

    def _look_up(self, impact, log_m, z, c, r200c) -> np.ndarray:
        u = impact / self.model.boundary_r200c
        edge = np.maximum(1 - u * u, 0.0)
        coordinates = {"mass": lambda: log_m, "redshift": lambda: np.log1p(z), "concentration": lambda: np.log(c)}
        places = [_place(coordinates[a](), GRIDS[a]) for a in self.axes]
        places.append(_place(np.sqrt(u), (0.0, 1.0, N_U)))
        ln_t = _interpolate(self.table, places, [GRIDS[a][2] for a in self.axes] + [N_U])
        return np.exp(ln_t + LN_10 * log_m) * np.sqrt(edge) / (r200c * r200c)

    def dm_rest_between(
        self, impact_r200c, log_m200c, z, c200c, r200c_kpc, from_r200c, to_r200c, n_nodes: int = 64
    ) -> np.ndarray:
        """Rest-frame column [pc cm-3] of the part of a halo between two depths along the line.

        from_r200c, to_r200c  depth relative to the closest approach, in r200c, growing away from the observer; -inf and
                              inf are allowed; the rest as in `dm_rest`
        The share of the whole column is integrated by Gauss-Legendre from the closest approach to either side, with nodes
        crowding there, so cusps are met; parts that join add up to the whole.
        """
        args = np.broadcast_arrays(impact_r200c, log_m200c, z, c200c, r200c_kpc, from_r200c, to_r200c)
        flat = [np.ascontiguousarray(a, dtype=float).ravel() for a in args]
        out = np.empty(flat[0].size)
        for start in range(0, out.size, CHUNK):
            part = slice(start, start + CHUNK)
            out[part] = self._between(*(a[part] for a in flat), n_nodes)
        return out.reshape(args[0].shape)

    def _between(self, impact, log_m, z, c, r200c, start, stop, n_nodes: int) -> np.ndarray:
        whole = self._look_up(impact, log_m, z, c, r200c)
        half_chord = np.sqrt(np.maximum(self.model.boundary_r200c**2 - impact**2, 0.0))
        density = self._along(log_m, z, c)
        start, stop = (np.clip(d, -half_chord, half_chord) for d in (start, stop))
        columns = [along_line(density, impact, depth, n_nodes) for depth in (start, stop, half_chord)]
        half = np.where(columns[2] > 0, columns[2], 1.0)
        return whole * np.maximum(columns[1] - columns[0], 0.0) / (2 * half)

    def _along(self, log_m, z, c):
        m, z, c = (a[..., None] for a in (log_m, z, c))
        scales = [
            w * part.amplitude(log_m, z[..., 0], c[..., 0], self.cosmos)
            for w, part in zip(self.model.weights(log_m), self.model.components, strict=True)
        ]
        parts = list(zip(scales, self.model.components, strict=True))

        def density(x):
            x = np.maximum(x, 1e-9)
            return sum(np.asarray(s)[..., None] * part.shape.density(x, m, z, c) for s, part in parts)

        return density


def projection(model: Model, cosmos: Cosmos) -> Projection:
    """The table of `model` in `cosmos`, made once a process (about a second at most)."""
    return _projection(model, cosmos)


@lru_cache(maxsize=32)
def _projection(model: Model, cosmos: Cosmos) -> Projection:
    table = make_table(model, cosmos)
    return Projection(model, cosmos, model.depends_on, np.ascontiguousarray(table.ravel()))


def make_table(model: Model, cosmos: Cosmos, n_nodes: int = 96) -> np.ndarray:
    """ln(unit f_b T) over (the axes the model depends on..., u)."""
    total = 0.0
    for weight, part in zip(_weights(model), model.components, strict=True):
        kept = part.amplitude(*_grid(part.depends_on), cosmos)
        total = total + (weight * kept)[..., None] * _projected_shape(part.shape, model.boundary_r200c, n_nodes)
    shape = [GRIDS[a][2] for a in model.depends_on]
    return np.log(DM_UNIT * cosmos.baryon_share * total).reshape(*shape, N_U)


def _grid(axes: tuple[str, ...]) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Mass, redshift and concentration as a 3-d open grid; axes not named have one point, in the middle."""
    points = []
    for k, axis in enumerate(AXES):
        low, high, n = GRIDS[axis]
        values = np.linspace(low, high, n) if axis in axes else np.array([0.5 * (low + high)])
        points.append(values.reshape([-1 if j == k else 1 for j in range(3)]))
    return points[0], np.expm1(points[1]), np.exp(points[2])


def _weights(model: Model) -> list[np.ndarray]:
    axes = ("mass",) if len(model.components) > 1 else ()
    return model.weights(_grid(axes)[0])


def _projected_shape(shape, boundary: float, n_nodes: int) -> np.ndarray:
    nodes, weights = crowded_rule(n_nodes, 4)
    m, z, c = (a[..., None] for a in _grid(shape.depends_on))
    columns = []
    for u in np.linspace(0.0, 1.0, N_U) ** 2:
        x = boundary * np.sqrt(u**2 + (1 - u**2) * nodes**2)
        columns.append(np.sum(shape.density(x, m, z, c) * weights, axis=-1))
    return 2 * boundary * np.stack(np.broadcast_arrays(*columns), axis=-1) / (4 * np.pi)


def _place(value: np.ndarray, grid: tuple[float, float, int]) -> tuple[np.ndarray, np.ndarray]:
    """Index of the cell below and the place inside it, 0..1, on a uniform grid; clamped to the grid."""
    low, high, n = grid
    t = np.clip((value - low) * ((n - 1) / (high - low)), 0.0, n - 1)
    cell = np.minimum(t.astype(np.int32), n - 2)
    return cell, t - cell


def _interpolate(table: np.ndarray, places, sizes: list[int]) -> np.ndarray:
    """Multilinear interpolation, the last axis fastest."""
    base = places[0][0]
    for (cell, _), size in zip(places[1:], sizes[1:], strict=True):
        base = base * size + cell
    steps = np.cumprod([1, *sizes[:0:-1]])[::-1]
    return _corner(table, base, [f for _, f in places], steps, 0)


def _corner(table, base, fractions, steps, offset: int) -> np.ndarray:
    if not fractions:
        return np.take(table[offset:], base, mode="clip")
    low = _corner(table, base, fractions[1:], steps[1:], offset)
    high = _corner(table, base, fractions[1:], steps[1:], offset + int(steps[0]))
    return low + fractions[0] * (high - low)
