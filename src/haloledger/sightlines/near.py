"""Which haloes could touch which sightlines: pairs, found with a tree and a radius for each halo."""

from __future__ import annotations

import numpy as np
from scipy.spatial import cKDTree

from haloledger.sightlines.geometry import unit_vectors


def near_pairs(
    burst_ra_deg,
    burst_dec_deg,
    burst_margin_deg,
    halo_ra_deg,
    halo_dec_deg,
    halo_radius_deg,
) -> tuple[np.ndarray, np.ndarray]:
    """Pairs (burst, halo) closer on the sky than halo_radius_deg + burst_margin_deg.

    Whether a pair is in the list depends on that pair alone, never on its company.
    All inputs (n,) in degrees; returns two index arrays sorted by burst, then halo.
    """
    bursts = unit_vectors(np.asarray(burst_ra_deg), np.asarray(burst_dec_deg))
    haloes = unit_vectors(np.asarray(halo_ra_deg), np.asarray(halo_dec_deg))
    if not len(bursts) or not len(haloes):
        return np.empty(0, int), np.empty(0, int)
    margin = np.asarray(burst_margin_deg)
    widest = _chord(halo_radius_deg + margin.max())
    found = cKDTree(bursts).query_ball_point(haloes, widest * (1 + 1e-12))
    counts = np.fromiter((len(f) for f in found), int, len(found))
    halo = np.repeat(np.arange(len(haloes)), counts)
    burst = np.fromiter((b for f in found for b in f), int, counts.sum())
    gap = bursts[burst] - haloes[halo]
    own = _chord(halo_radius_deg[halo] + margin[burst])
    keep = np.sqrt(gap[:, 0] ** 2 + gap[:, 1] ** 2 + gap[:, 2] ** 2) <= own
    burst, halo = burst[keep], halo[keep]
    order = np.lexsort((halo, burst))
    return burst[order], halo[order]


def _chord(angle_deg) -> np.ndarray:
    return 2 * np.sin(np.radians(np.minimum(angle_deg, 90.0)) / 2)
