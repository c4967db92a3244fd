"""Pairs of rows that are close on the sky and may be at one redshift, from trees of unit vectors."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

# slices of redshift: a near halo spans degrees, and must not be compared with all far rows behind it
EDGES = np.array([0.001, 0.002, 0.004, 0.007, 0.012, 0.02, 0.035, 0.06, 0.1, 0.15, 0.2, 0.25, 0.3, 0.4, 0.5, 0.7, 1.0])


@dataclass(frozen=True)
class Places:
    """Positions [deg] and the redshifts at which a row may be."""

    ra_deg: np.ndarray
    dec_deg: np.ndarray
    z_low: np.ndarray
    z_high: np.ndarray

    def unit_vectors(self) -> np.ndarray:
        """Shape (n, 3)."""
        ra, dec = np.radians(self.ra_deg), np.radians(self.dec_deg)
        return np.stack([np.cos(dec) * np.cos(ra), np.cos(dec) * np.sin(ra), np.sin(dec)], axis=-1)


def close_pairs(a: Places, b: Places, radius_rad: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Row numbers (i of a, j of b) with separation below radius_rad[i] and overlapping redshifts."""
    from scipy.spatial import cKDTree

    va, vb = a.unit_vectors(), b.unit_vectors()
    chord = 2 * np.sin(0.5 * np.minimum(radius_rad, np.pi / 2))
    which = np.searchsorted(EDGES, 0.5 * (a.z_low + a.z_high))
    left, right = [], []
    for k in np.unique(which):
        rows_a = np.flatnonzero(which == k)
        rows_b = np.flatnonzero((b.z_high >= a.z_low[rows_a].min()) & (b.z_low <= a.z_high[rows_a].max()))
        if not rows_b.size:
            continue
        found = cKDTree(vb[rows_b]).query_ball_point(va[rows_a], chord[rows_a])
        i = np.repeat(rows_a, [len(f) for f in found])
        j = rows_b[np.concatenate([np.asarray(f, dtype=int) for f in found])]
        overlap = (a.z_low[i] <= b.z_high[j]) & (b.z_low[j] <= a.z_high[i])
        left.append(i[overlap])
        right.append(j[overlap])
    if not left:
        return np.empty(0, dtype=int), np.empty(0, dtype=int)
    return np.concatenate(left), np.concatenate(right)


def separation_rad(ra1_deg, dec1_deg, ra2_deg, dec2_deg) -> np.ndarray:
    """Angle between directions [rad], exact for small ones (haversine)."""
    ra1, dec1, ra2, dec2 = (np.radians(x) for x in (ra1_deg, dec1_deg, ra2_deg, dec2_deg))
    half = np.sin(0.5 * (dec2 - dec1)) ** 2 + np.cos(dec1) * np.cos(dec2) * np.sin(0.5 * (ra2 - ra1)) ** 2
    return 2 * np.arcsin(np.sqrt(np.clip(half, 0, 1)))
