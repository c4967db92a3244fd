"""The one kernel: many columns out of packed tables, in pieces that stay in cache.

A table holds the logarithm of a factor over some axes. It is packed by cells: the numbers a, b, c, d of
a + b f + g (c + d f) over the two last axes lie side by side in single precision, so one gather of 16 bytes brings a
whole cell. Axes before those are interpolated linearly between cells. Single precision costs about 3e-6 of the value
(near the centre 6e-8/u times the log slope there, 3e-5 at most), a tenth of what the grid costs.

Every step acts on one element alone, on contiguous buffers: the result does not hang on how rows are grouped.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

F = np.float32
CHUNK = 16384
LN_10 = F(np.log(10.0))


@dataclass(frozen=True)
class Axis:
    """A uniform grid in a coordinate; `transform(values, out=)` turns what callers give into that coordinate."""

    low: float
    high: float
    size: int
    transform: Callable[..., np.ndarray] | None = None

    @property
    def points(self) -> np.ndarray:
        return np.linspace(self.low, self.high, self.size)


@dataclass(frozen=True, eq=False)
class Table:
    """Packed cells over named axes, the last fastest."""

    axes: tuple[str, ...]
    sizes: tuple[int, ...]
    cells: np.ndarray

    @classmethod
    def pack(cls, axes: tuple[str, ...], values: np.ndarray) -> Table:
        """Pack values over two axes or more. Upper edges are repeated, so that a value on them has a cell."""
        t = np.pad(values, [(0, 1)] * values.ndim, mode="edge")
        a = t[..., :-1, :-1]
        b = t[..., :-1, 1:] - a
        c = t[..., 1:, :-1] - a
        d = t[..., 1:, 1:] - t[..., 1:, :-1] - b
        cells = np.stack([a, b, c, d], axis=-1).astype(F)
        return cls(axes, a.shape, cells.reshape(-1, 4).view(np.complex128).ravel())


class Buffers:
    """Memory for one piece of a call, cut to the length of the piece."""

    def __init__(self, size: int, axes: dict[str, Axis]) -> None:
        self.memory: dict[str, np.ndarray] = {
            "wide": np.empty(size),
            "cell": np.empty(size, np.int32),
            "base": np.empty(size, np.intp),
            "cells": np.empty(size, np.complex128),
            **{name: np.empty(size, F) for name in ("edge", "scratch", "value", "slope", "log", "total")},
            **{f"{name} place": np.empty(size, F) for name in axes},
            **{f"{name} cell": np.empty(size, np.int32) for name in axes},
            **{f"level {k}": np.empty(size, F) for k in range(len(axes))},
        }
        self.cut(size)

    def cut(self, size: int) -> None:
        self.now = {name: memory[:size] for name, memory in self.memory.items()}

    def __getitem__(self, name: str) -> np.ndarray:
        return self.now[name]


def columns(terms, axes: dict[str, Axis], boundary: float, given: dict[str, np.ndarray], r200c) -> np.ndarray:
    """Sum over terms of exp(sum of a term's tables) x 10^mass sqrt(1 - u^2) / r200c^2; 0 at u = impact / boundary >= 1.

    terms  a list of lists of Table
    axes   the axes of all tables by name; "u" is an axis in sqrt(u)
    given  "impact", "mass" [log10] and the coordinate of each further axis: flat contiguous doubles, like r200c
    """
    out = np.empty(r200c.size)
    buffers = Buffers(min(CHUNK, out.size), axes)
    with np.errstate(invalid="ignore"):  # a NaN that comes in goes out as NaN
        _fill(out, buffers, terms, axes, boundary, given, r200c)
    return out


def _fill(out, buffers: Buffers, terms, axes: dict[str, Axis], boundary: float, given, r200c) -> None:
    for start in range(0, out.size, CHUNK):
        part = slice(start, start + CHUNK)
        buffers.cut(out[part].size)
        edge = _edge(buffers, given["impact"][part], boundary, axes["u"])
        for name, axis in axes.items():
            if name != "u":
                _to_grid(buffers, name, axis, given[name][part])
            _split(buffers, name)
        total = _sum_of_terms(terms, buffers, given["mass"][part])
        scratch = buffers["scratch"]
        np.copyto(scratch, r200c[part])
        scratch *= scratch
        edge /= scratch
        total *= edge
        np.copyto(out[part], total)


def _edge(buffers: Buffers, impact, boundary: float, axis: Axis) -> np.ndarray:
    """sqrt(1 - u^2), and the place of sqrt(u) on its axis, both from the distance to the boundary, d = 1 - u."""
    wide, place, d, edge = buffers["wide"], buffers["u place"], buffers["scratch"], buffers["edge"]
    np.subtract(boundary, impact, out=wide)  # in double precision: near the boundary nearly all digits cancel
    np.copyto(d, wide)
    d *= F(1 / boundary)
    np.maximum(d, F(0), out=d)
    np.subtract(F(1), d, out=place)
    np.sqrt(place, out=place)
    place *= F(axis.size - 1)
    np.subtract(F(2), d, out=edge)
    edge *= d
    return np.sqrt(edge, out=edge)


def _to_grid(buffers: Buffers, name: str, axis: Axis, values) -> None:
    """The place of a coordinate on its axis in cells from 0, clamped."""
    place = buffers[f"{name} place"]
    np.copyto(place, values)
    if axis.transform is not None:
        axis.transform(place, out=place)
    if axis.low:
        place -= F(axis.low)
    place *= F((axis.size - 1) / (axis.high - axis.low))
    np.clip(place, F(0), F(axis.size - 1), out=place)


def _split(buffers: Buffers, name: str) -> None:
    """A place into its cell and the fraction of the cell."""
    place, cell, scratch = buffers[f"{name} place"], buffers[f"{name} cell"], buffers["scratch"]
    np.copyto(cell, place, casting="unsafe")
    np.copyto(scratch, cell, casting="unsafe")
    place -= scratch


def _sum_of_terms(terms, buffers: Buffers, log_mass) -> np.ndarray:
    total, log, mass = buffers["total"], buffers["log"], buffers["scratch"]
    np.copyto(mass, log_mass)
    mass *= LN_10
    for k, tables in enumerate(terms):
        sink = total if k == 0 else log
        np.copyto(sink, mass)
        for table in tables:
            sink += _look_up(table, buffers)
        np.exp(sink, out=sink)
        if k:
            total += sink
    return total


def _look_up(table: Table, buffers: Buffers) -> np.ndarray:
    cell = buffers["cell"]
    np.copyto(cell, buffers[f"{table.axes[0]} cell"])
    for name, size in zip(table.axes[1:], table.sizes[1:], strict=True):
        cell *= np.int32(size)
        cell += buffers[f"{name} cell"]
    np.copyto(buffers["base"], cell)
    return _corner(table, buffers, 0, 0)


def _corner(table: Table, buffers: Buffers, level: int, offset: int) -> np.ndarray:
    """Between the two neighbours along axis `level`, or from one packed cell where only two axes are left."""
    if level == len(table.axes) - 2:
        return _from_cells(table, buffers, offset)
    low = buffers[f"level {level}"]
    np.copyto(low, _corner(table, buffers, level + 1, offset))
    stride = int(np.prod(table.sizes[level + 1 :]))
    high = _corner(table, buffers, level + 1, offset + stride)
    high -= low
    high *= buffers[f"{table.axes[level]} place"]
    high += low
    return high


def _from_cells(table: Table, buffers: Buffers, offset: int) -> np.ndarray:
    cells, value, slope = buffers["cells"], buffers["value"], buffers["slope"]
    np.take(table.cells[offset:], buffers["base"], out=cells, mode="clip")
    abcd = cells.view(F).reshape(-1, 4)
    g, f = (buffers[f"{name} place"] for name in table.axes[-2:])
    np.multiply(abcd[:, 3], f, out=slope)
    slope += abcd[:, 2]
    slope *= g
    np.multiply(abcd[:, 1], f, out=value)
    value += abcd[:, 0]
    value += slope
    return value
