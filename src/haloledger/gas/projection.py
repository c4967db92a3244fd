"""Columns of halo gas: tables per model, made by quadrature, looked up by the one kernel.

The column through a sphere of radius B = boundary (in r200c) at impact parameter b is, with u = b/B,

    DM_rest = unit f_b M200c / r200c^2 sqrt(1 - u^2)  sum of A T over the model's components
    T = (2 B / 4 pi)  integral of density(sqrt(b^2 + (B^2 - b^2) s^2)) ds over s from 0 to 1

density being the component's shape, A its amplitude (normalisation, kept fraction, weight in a mixture) and `unit` that
of DM. The square root is the edge of the sphere; T is smooth and above 0 from the centre to the boundary. So ln T and
ln A are tabulated and interpolated linearly over sqrt(u), log M, ln(1+z) and ln c, in those that they depend on, and
power laws in mass, redshift or concentration are exact. Each axis gets as many points as its curvature asks for.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from haloledger.cosmos import electrons
from haloledger.cosmos.background import Cosmos
from haloledger.gas.kernel import CHUNK, Axis, Table, columns
from haloledger.gas.models import Model
from haloledger.gas.quadrature import along_line, crowded_rule
from haloledger.gas.shapes import AXES

DM_UNIT = electrons.PER_PROTON * electrons.CM3_PER_MSUN_KPC3 * electrons.PC_PER_KPC

# The finest grids; every second, fourth, ... point is taken as curvature allows. Haloes outside take the edge's shape.
FINEST = {
    "mass": Axis(9.0, 16.0, 897),
    "redshift": Axis(0.0, float(np.log(6.0)), 97, np.log1p),
    "concentration": Axis(0.0, float(np.log(40.0)), 257, np.log),
    "u": Axis(0.0, 1.0, 513),
}
TOLERANCE = {"mass": 1.5e-4, "redshift": 1.5e-4, "concentration": 6e-5, "u": 1e-4}  # of the value, from each axis
N_NODES = 96


@dataclass(frozen=True, eq=False)
class Projection:
    """The table of one model in one cosmology. Made by `projection`."""

    model: Model
    cosmos: Cosmos
    axes: dict[str, Axis]
    terms: list[list[Table]]

    def dm_rest(self, impact_r200c, log_m200c, z, c200c, r200c_kpc) -> np.ndarray:
        """Rest-frame column [pc cm-3] of whole haloes; divide by 1 + z for the observed DM.

        impact_r200c  distance of the line from the centre over r200c, not negative;  r200c_kpc  proper kpc
        Arguments broadcast. Zero, never NaN, at and beyond the boundary. Masses beyond 1e9..1e16, redshifts above 5 and
        concentrations beyond 1..40 take the shape at the table's edge.
        """
        shape, flat = _flat(impact_r200c, log_m200c, z, c200c, r200c_kpc)
        return self._whole(*flat).reshape(shape)

    def dm_rest_between(
        self, impact_r200c, log_m200c, z, c200c, r200c_kpc, from_r200c, to_r200c, n_nodes: int = 64
    ) -> np.ndarray:
        """Rest-frame column [pc cm-3] of the part of a halo between two depths along the line.

        from_r200c, to_r200c  depth relative to the closest approach, in r200c, growing away from the observer; infinite
                              ones are allowed; the rest as in `dm_rest`
        The part's share of the whole column is integrated by Gauss-Legendre from the closest approach to either side,
        with nodes crowding there, so cusps are met; parts that join add up to the whole.
        """
        shape, flat = _flat(impact_r200c, log_m200c, z, c200c, r200c_kpc, from_r200c, to_r200c)
        out = self._whole(*flat[:5])
        for start in range(0, out.size, CHUNK // n_nodes):  # in cache, nodes included
            part = slice(start, start + CHUNK // n_nodes)
            impact, log_m, z, c, _, near, far = (a[part] for a in flat)
            out[part] *= self._share_between(impact, log_m, z, c, near, far, n_nodes)
        return out.reshape(shape)

    def _whole(self, impact, log_m, z, c, r200c) -> np.ndarray:
        given = {"impact": impact, "mass": log_m, "redshift": z, "concentration": c}
        return columns(self.terms, self.axes, self.model.boundary_r200c, given, r200c)

    def _share_between(self, impact, log_m, z, c, near, far, n_nodes: int) -> np.ndarray:
        half_chord = np.sqrt(np.maximum(self.model.boundary_r200c**2 - impact**2, 0.0))
        density = self._density_along(log_m, z, c)
        near, far = (np.clip(d, -half_chord, half_chord) for d in (near, far))
        to_near, to_far, half = (along_line(density, impact, depth, n_nodes) for depth in (near, far, half_chord))
        return np.maximum(to_far - to_near, 0.0) / np.where(half > 0, 2 * half, 1.0)

    def _density_along(self, log_m, z, c):
        """The relative density of these haloes as a function of x with a trailing axis, amplitudes worked out once."""
        parts = [
            ((weight * part.amplitude(log_m, z, c, self.cosmos))[..., None], part.shape)
            for weight, part in zip(self.model.weights(log_m), self.model.components, strict=True)
        ]
        args = tuple(a[..., None] for a in (log_m, z, c))

        def density(x):
            return sum(scale * shape.density(np.maximum(x, 1e-9), *args) for scale, shape in parts)

        return density


def projection(model: Model, cosmos: Cosmos) -> Projection:
    """The tables of `model` in `cosmos`, made once a process, in about half a second at most."""
    key = (model.sha256, cosmos.name)  # not the objects: they may have come from another process
    if key not in _MADE:
        terms = [factors(model, k, cosmos) for k in range(len(model.components))]
        axes = choose_axes([factor for term in terms for factor in term])
        _MADE[key] = Projection(model, cosmos, axes, [[factor.pack(axes) for factor in term] for term in terms])
    return _MADE[key]


_MADE: dict[tuple[str, str], Projection] = {}


@dataclass(frozen=True)
class _Factor:
    """One factor of a column, to be tabulated: its axes, and its logarithm at any place."""

    axes: tuple[str, ...]
    log_value: Callable[..., np.ndarray]  # of u, log_m200c, z, c200c, which broadcast; and the number of nodes

    def pack(self, axes: dict[str, Axis]) -> Table:
        """The table over an open grid of the axes; one point of u at a time, so that nodes stay in cache."""
        m, z, c = _grid(axes, self.axes)
        u = axes["u"].points ** 2 if "u" in self.axes else np.zeros(1)
        size = np.broadcast_shapes(m.shape, z.shape, c.shape)
        values = np.stack([np.broadcast_to(self.log_value(one, m, z, c, N_NODES), size) for one in u], axis=-1)
        return Table.pack(self.axes, values.reshape([axes[a].size for a in self.axes]))

    def along(self, name: str, places: int = 40) -> np.ndarray:
        """The logarithm on the finest grid of one axis, at fixed places spread over the others: (places, points)."""
        spread = (np.arange(1, places + 1)[:, None] * np.array([0.8192, 0.6711, 0.5497, 0.4503])) % 1
        at = {a: FINEST[a].low + (FINEST[a].high - FINEST[a].low) * spread[:, [k]] for k, a in enumerate(FINEST)}
        at[name] = FINEST[name].points[None, :]
        z, c = np.expm1(at["redshift"]), np.exp(at["concentration"])
        return self.log_value(at["u"] ** 2, at["mass"], z, c, N_NODES // 2)


def factors(model: Model, k: int, cosmos: Cosmos) -> list[_Factor]:
    """ln T and ln A of component k: one factor where A has no axis that T has not, else two."""
    part = model.components[k]
    unit = np.log(DM_UNIT * cosmos.baryon_share)
    shape_axes = part.shape.depends_on or ("concentration",)
    amplitude_axes = set(part.depends_on) | ({"mass"} if len(model.components) > 1 else set())

    def log_column(u, m, z, c, n_nodes):
        return unit + np.log(_projected(part.shape, model.boundary_r200c, u, m, z, c, n_nodes))

    def log_amplitude(u, m, z, c, n_nodes):
        return model.log_weight(k, m) + np.log(part.amplitude(m, z, c, cosmos))

    def both(*args):
        return log_column(*args) + log_amplitude(*args)

    if amplitude_axes <= set(shape_axes):
        return [_Factor((*shape_axes, "u"), both)]
    wanted = amplitude_axes | {"mass", "concentration"}  # two axes at least, for packing
    return [_Factor((*shape_axes, "u"), log_column), _Factor(tuple(a for a in AXES if a in wanted), log_amplitude)]


def choose_axes(factors: list[_Factor]) -> dict[str, Axis]:
    """The axes of a model's tables, each just fine enough for linear interpolation of all factors along it."""
    axes = {}
    for name, fine in FINEST.items():
        curves = [factor.along(name) for factor in factors if name in factor.axes]
        if curves:
            stride = min(_coarsest(curve, TOLERANCE[name]) for curve in curves)
            axes[name] = Axis(fine.low, fine.high, (fine.size - 1) // stride + 1, fine.transform)
    return axes


def _coarsest(curves: np.ndarray, tolerance: float) -> int:
    """Largest stride, a power of two, at which the points between are met by linear interpolation."""
    stride, last = 1, curves.shape[-1] - 1
    while last % (2 * stride) == 0:
        knots, middle = curves[:, :: 2 * stride], curves[:, stride :: 2 * stride]
        if np.max(np.abs(middle - 0.5 * (knots[:, :-1] + knots[:, 1:]))) > tolerance:
            break
        stride *= 2
    return stride


def _grid(axes: dict[str, Axis], names: tuple[str, ...]) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Mass, redshift and concentration as an open grid of three dimensions; axes not named have one point."""
    points = []
    for k, name in enumerate(AXES):
        values = axes[name].points if name in names else np.array([0.5 * (FINEST[name].low + FINEST[name].high)])
        points.append(values.reshape([-1 if j == k else 1 for j in range(3)]))
    return points[0], np.expm1(points[1]), np.exp(points[2])


def _projected(shape, boundary: float, u, log_m, z, c, n_nodes: int) -> np.ndarray:
    """T of the module's first lines for a shape; arguments broadcast."""
    nodes, weights = crowded_rule(n_nodes, 4)
    u, log_m, z, c = (np.asarray(a, dtype=float)[..., None] for a in (u, log_m, z, c))
    x = boundary * np.sqrt(u**2 + (1 - u**2) * nodes**2)
    return boundary / (2 * np.pi) * np.sum(shape.density(x, log_m, z, c) * weights, axis=-1)


def _flat(*arrays) -> tuple[tuple[int, ...], list[np.ndarray]]:
    """The common shape, and the arrays broadcast to it, flat, contiguous and double."""
    full = np.broadcast_arrays(*arrays)
    return full[0].shape, [np.ascontiguousarray(a, dtype=float).ravel() for a in full]
