"""Rows that are no galaxies of their own: a galaxy twice in one list, and pieces of a large one.

Twice    within 2 arcsec at redshifts that agree, or within 5 kpc (and 15 arcsec) and 300 km/s, and of like brightness:
         the row with the sharper redshift stays.
Pieces   rows with a photometric redshift inside the optical radius of a galaxy that would outshine them by ten at one
         distance: star-forming knots and halves of a shredded galaxy.
"""

from __future__ import annotations

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.haloes.distances import SPEED_OF_LIGHT_KMS, point_luminosity_distance_mpc, point_redshift
from haloledger.haloes.neighbours import Places, close_pairs, separation_rad
from haloledger.haloes.table import Haloes, change, rows

TWICE_ARCSEC = 2.0
TWICE_KPC = 5.0
TWICE_ARCSEC_AT_MOST = 15.0
TWICE_KMS = 300.0
LIKE_DEX = 1.0  # in light
PIECE_DEX = 1.0


def without_twins(galaxies: Haloes, cosmos: Cosmos) -> tuple[Haloes, int]:
    """The galaxies of one list, each once, and how many rows were copies."""
    kpc_per_rad = cosmos.angular_distance_kpc(point_redshift(galaxies, cosmos))
    physical = np.minimum(TWICE_KPC / kpc_per_rad, np.radians(TWICE_ARCSEC_AT_MOST / 3600))
    close = np.radians(TWICE_ARCSEC / 3600)
    i, j = close_pairs(_everywhere(galaxies), _everywhere(galaxies), np.maximum(physical, close))
    i, j = i[i < j], j[i < j]
    apart = separation_rad(galaxies.ra_deg[i], galaxies.dec_deg[i], galaxies.ra_deg[j], galaxies.dec_deg[j])
    kms = np.abs(galaxies.z[i] - galaxies.z[j]) * SPEED_OF_LIGHT_KMS / (1 + galaxies.z[i])
    err_kms = np.hypot(galaxies.z_err[i], galaxies.z_err[j]) * SPEED_OF_LIGHT_KMS / (1 + galaxies.z[i])
    same = ((apart < close) & (kms < TWICE_KMS + 3 * err_kms)) | (kms < TWICE_KMS)
    same &= ~(np.abs(galaxies.log_mstar[i] - galaxies.log_mstar[j] + _dimming(galaxies, i, j, cosmos)) > LIKE_DEX)
    if not same.any():
        return galaxies, 0
    order = np.lexsort((galaxies.id.astype(str), -np.nan_to_num(galaxies.log_mstar), galaxies.z_err))
    rank = np.empty(len(galaxies), dtype=int)
    rank[order] = np.arange(len(galaxies))
    head = np.arange(len(galaxies))
    pairs = sorted(zip(i[same].tolist(), j[same].tolist(), strict=True), key=lambda p: sorted((rank[p[0]], rank[p[1]])))
    for a, b in pairs:
        keep, lose = (a, b) if rank[a] < rank[b] else (b, a)
        if head[lose] == lose and head[keep] == keep:
            head[lose] = keep
    return _absorbed(galaxies, head, "listed again as {}"), int((head != np.arange(len(galaxies))).sum())


def without_pieces(galaxies: Haloes, cosmos: Cosmos) -> tuple[Haloes, int]:
    """Galaxies without the pieces of larger ones, and how many those were."""
    large = np.flatnonzero(np.isfinite(galaxies.optical_radius_kpc) & ~galaxies.photometric)
    small = np.flatnonzero(galaxies.photometric)
    if not large.size or not small.size:
        return galaxies, 0
    a, b = rows(galaxies, large), rows(galaxies, small)
    radius = a.optical_radius_kpc / cosmos.angular_distance_kpc(point_redshift(a, cosmos))
    i, j = close_pairs(_everywhere(a), _everywhere(b), radius)
    i, j = large[i], small[j]
    lighter = galaxies.log_mstar[j] - galaxies.log_mstar[i] - _dimming(galaxies, i, j, cosmos) < -PIECE_DEX
    i, j = i[lighter], j[lighter]
    head = np.arange(len(galaxies))
    order = np.lexsort((galaxies.id[i].astype(str)[::-1], galaxies.log_mstar[i]))
    head[j[order]] = i[order]  # the heaviest galaxy that covers it
    return _absorbed(galaxies, head, "holds the pieces {}"), int((head != np.arange(len(galaxies))).sum())


def _everywhere(haloes: Haloes) -> Places:
    """Places that may be at any redshift: what the redshifts say is judged pair by pair."""
    n = len(haloes)
    return Places(haloes.ra_deg, haloes.dec_deg, np.full(n, -1.0), np.full(n, 20.0))


def _dimming(haloes: Haloes, i, j, cosmos: Cosmos) -> np.ndarray:
    """What the mass of i from its light would gain at the distance of j, over its listed one [dex]."""
    mpc = point_luminosity_distance_mpc(haloes, cosmos)
    return 2 * np.log10(mpc[j] / mpc[i])


def _absorbed(haloes: Haloes, head: np.ndarray, said: str) -> Haloes:
    names, note = haloes.source_rows.copy(), haloes.note.copy()
    for k in np.unique(head[head != np.arange(len(head))]).tolist():
        others = np.flatnonzero((head == k) & (np.arange(len(head)) != k))
        names[k] = ";".join([str(names[k]), *haloes.source_rows[others]])
        more = ", ".join(haloes.id[others][:5]) + (f" and {others.size - 5} more" if others.size > 5 else "")
        note[k] = f"{note[k]}; {said.format(more)}" if note[k] else said.format(more)
    kept = rows(change(haloes, source_rows=names, note=note), np.flatnonzero(head == np.arange(len(head))))
    return change(kept, notes=haloes.notes)
