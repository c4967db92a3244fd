"""The draws of one sightline: direction, redshift, observed DM."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from haloledger.catalogs.canonical import Bursts
from haloledger.engine.universe import Universe
from haloledger.sightlines.geometry import local_axes, unit_vectors

PECULIAR_KMS = 300.0
"""1 sigma peculiar velocity along the line; common practice."""
LIGHT_KMS = 299792.458
Z_LEAST = 1e-5


@dataclass(frozen=True)
class Sightline:
    """One burst as draws; arrays (n_draws,) unless a shape is given."""

    burst: str
    ra_deg: float
    dec_deg: float
    z_given: float  # NaN where the redshift is drawn from P(z | DM)
    dm_given: float
    directions: np.ndarray  # unit vectors (n_draws, 3)
    z: np.ndarray  # redshift that sets the distance
    dm: np.ndarray  # observed DM [pc cm-3]
    loc_arcsec: float  # 1 sigma major axis, 0 where taken as exact
    note: str


def directions(bursts: Bursts, i: int, universe: Universe) -> np.ndarray:
    """Unit vectors (n_draws, 3) inside the localisation ellipse of burst i; 1 sigma axes, angle east of north."""
    centre = unit_vectors(bursts.ra_deg[i : i + 1], bursts.dec_deg[i : i + 1])
    east, north = local_axes(bursts.ra_deg[i : i + 1], bursts.dec_deg[i : i + 1])
    major, minor, angle = (
        np.nan_to_num(a[i]) for a in (bursts.loc_major_arcsec, bursts.loc_minor_arcsec, bursts.loc_pa_deg)
    )
    along, across = universe.normals("localisation", [f"{bursts.burst[i]}|major", f"{bursts.burst[i]}|minor"])
    step = np.radians(1 / 3600)
    a, b, pa = along * major * step, across * minor * step, np.radians(angle)
    to_north, to_east = a * np.cos(pa) - b * np.sin(pa), a * np.sin(pa) + b * np.cos(pa)
    moved = centre + to_east[:, None] * east + to_north[:, None] * north
    return moved / np.sqrt(moved[:, 0:1] ** 2 + moved[:, 1:2] ** 2 + moved[:, 2:3] ** 2)


def given_redshift(bursts: Bursts, i: int, universe: Universe) -> np.ndarray:
    """Redshift draws around the given one: its error and the peculiar velocity of the host; (n_draws,)."""
    error, peculiar = universe.normals("burst redshift", [f"{bursts.burst[i]}|error", f"{bursts.burst[i]}|peculiar"])
    z = bursts.z[i] + np.nan_to_num(bursts.z_err[i]) * error
    return np.maximum(z + (1 + z) * PECULIAR_KMS / LIGHT_KMS * peculiar, Z_LEAST)


def observed_dm(bursts: Bursts, i: int, universe: Universe) -> np.ndarray:
    """Observed DM draws [pc cm-3], (n_draws,)."""
    return bursts.dm[i] + np.nan_to_num(bursts.dm_err[i]) * universe.normals("burst dm", [bursts.burst[i]])[0]
