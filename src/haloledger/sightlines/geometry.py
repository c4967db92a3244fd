"""Directions as unit vectors, and the impact parameter as two components on the sky of the halo."""

from __future__ import annotations

import numpy as np


def unit_vectors(ra_deg, dec_deg) -> np.ndarray:
    """Directions as unit vectors; (n,) degrees in, (n, 3) out."""
    ra, dec = np.radians(ra_deg), np.radians(dec_deg)
    return np.stack([np.cos(dec) * np.cos(ra), np.cos(dec) * np.sin(ra), np.sin(dec)], axis=-1)


def local_axes(ra_deg, dec_deg) -> tuple[np.ndarray, np.ndarray]:
    """East and north unit vectors at each direction; (n,) degrees in, two (n, 3) out."""
    ra, dec = np.radians(ra_deg), np.radians(dec_deg)
    zero = np.zeros_like(ra)
    east = np.stack([-np.sin(ra), np.cos(ra), zero], axis=-1)
    north = np.stack([-np.sin(dec) * np.cos(ra), -np.sin(dec) * np.sin(ra), np.cos(dec)], axis=-1)
    return east, north


def components(axis: np.ndarray, directions: np.ndarray) -> np.ndarray:
    """Dot products of (m, 3) axes with (k, 3) directions, shape (m, k).

    Written out, not as a matrix product: a matrix product may round differently with another number of rows.
    """
    return (
        axis[:, 0:1] * directions[None, :, 0]
        + axis[:, 1:2] * directions[None, :, 1]
        + axis[:, 2:3] * directions[None, :, 2]
    )


def separation_deg(ra1_deg, dec1_deg, ra2_deg, dec2_deg) -> np.ndarray:
    """Angle on the sky [deg] by the haversine formula, exact for small angles; shapes broadcast."""
    ra1, dec1, ra2, dec2 = map(np.radians, (ra1_deg, dec1_deg, ra2_deg, dec2_deg))
    h = np.sin((dec2 - dec1) / 2) ** 2 + np.cos(dec1) * np.cos(dec2) * np.sin((ra2 - ra1) / 2) ** 2
    return np.degrees(2 * np.arcsin(np.sqrt(np.clip(h, 0, 1))))


def impact_parameters(
    ra_deg: np.ndarray,
    dec_deg: np.ndarray,
    distance_kpc: np.ndarray,
    east_offset_kpc: np.ndarray,
    north_offset_kpc: np.ndarray,
    directions: np.ndarray,
) -> tuple[np.ndarray, np.ndarray]:
    """Closest approach of a line of sight to halo centres, and how far in front of us it lies.

    b = D sin(angle) as its east and north components, each moved by the centre's offset; the closest approach is
    D cos(angle) away from the observer (negative: behind us).

    ra_deg, dec_deg      nominal halo centres (m,)
    distance_kpc         proper kpc per radian (m, k)
    east_offset_kpc ...  centre offsets [proper kpc] (m, k)
    directions           unit vectors of the line, draw by draw (k, 3)
    Returns impact_kpc (m, k) and distance to the closest approach [kpc] (m, k).
    """
    east, north = local_axes(ra_deg, dec_deg)
    radial = unit_vectors(ra_deg, dec_deg)
    b_east = distance_kpc * components(east, directions) - east_offset_kpc
    b_north = distance_kpc * components(north, directions) - north_offset_kpc
    return np.sqrt(b_east**2 + b_north**2), distance_kpc * components(radial, directions)
