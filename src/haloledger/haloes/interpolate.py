"""Multilinear look-up in tables, element by element: how rows are grouped changes no bit."""

from __future__ import annotations

from itertools import product

import numpy as np

Place = tuple[np.ndarray, np.ndarray]  # lower node, share of the upper node


def place(nodes: np.ndarray, x) -> Place:
    """Place of x among increasing nodes, clamped at the ends."""
    x = np.asarray(x, dtype=float)
    low = np.clip(np.searchsorted(nodes, x, side="right") - 1, 0, nodes.size - 2)
    return low, np.clip((x - nodes[low]) / (nodes[low + 1] - nodes[low]), 0.0, 1.0)


def uniform_place(nodes: np.ndarray, x) -> Place:
    """The same for nodes with equal steps, without a search."""
    at = np.clip((np.asarray(x, dtype=float) - nodes[0]) / (nodes[1] - nodes[0]), 0.0, nodes.size - 1.0)
    low = np.minimum(at.astype(np.intp), nodes.size - 2)
    return low, at - low


def multilinear(table: np.ndarray, places: list[Place]) -> np.ndarray:
    """Linear in every axis; `places` give a lower node and a share for each axis and broadcast."""
    flat = table.ravel()
    strides = np.cumprod((1, *table.shape[:0:-1]))[::-1]
    base = sum(low * stride for (low, _), stride in zip(places, strides, strict=True))
    result = np.zeros(np.shape(base))
    for corner in product((0, 1), repeat=len(places)):
        weight: np.ndarray | float = 1.0
        for up, (_, share) in zip(corner, places, strict=True):
            weight = weight * (share if up else 1.0 - share)
        result += weight * flat.take(base + sum(up * stride for up, stride in zip(corner, strides, strict=True)))
    return result
