"""Which listed objects are the host itself, and which haloes the burst sits in."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from haloledger.catalogs.canonical import Bursts
from haloledger.cosmos.background import Cosmos
from haloledger.haloes.distances import by_distance, point_redshift
from haloledger.haloes.relations import load_relation
from haloledger.haloes.table import Haloes
from haloledger.sightlines.draws import LIGHT_KMS, PECULIAR_KMS
from haloledger.sightlines.geometry import separation_deg

LEAST_ARCSEC = 2.0
LEAST_KPC = 15.0
"""The nearest galaxy this close to a burst, at its redshift, is taken as the host."""
WIDEST_ARCSEC = 20.0
"""A poor localisation does not turn every galaxy inside it into the host."""
CERTAIN = 1e12
"""Odds of what a catalogue says itself."""
FAR_SIGMAS = 6.0
"""Farther in velocity than this many dispersions, a halo does not hold the burst."""
WIDEST_Z_ERR = 0.012
"""A group with a larger redshift error, over 1 + z, cannot be said to hold the burst."""


def is_host(bursts: Bursts, i: int, haloes: Haloes, index: np.ndarray, cosmos: Cosmos) -> np.ndarray:
    """Rows of `index` that are the host galaxy of burst i (n_index,) bool: by host_id, or by position and redshift.

    A host_id decides alone. By position it is the nearest galaxy whose redshift agrees, within LEAST_KPC or three sigma
    of the localisation.
    """
    rows = haloes.source_rows[index]
    wanted = str(bursts.host[i])
    if wanted:
        return np.array([wanted in _names(r) for r in rows], dtype=bool)
    if np.isnan(bursts.z[i]):
        return np.zeros(len(index), bool)
    seen_arcsec = np.degrees(LEAST_KPC / cosmos.angular_distance_kpc(max(bursts.z[i], 1e-4))) * 3600
    radius = max(np.clip(3 * np.nan_to_num(bursts.loc_major_arcsec[i]), LEAST_ARCSEC, WIDEST_ARCSEC), seen_arcsec)
    apart = separation_deg(haloes.ra_deg[index], haloes.dec_deg[index], bursts.ra_deg[i], bursts.dec_deg[i]) * 3600
    gap = np.abs(haloes.z[index] - bursts.z[i])
    error = np.sqrt(haloes.z_err[index] ** 2 + np.nan_to_num(bursts.z_err[i]) ** 2 + (PECULIAR_KMS / LIGHT_KMS) ** 2)
    fits = (haloes.kind[index] == "galaxy") & (apart <= radius) & (gap <= 3 * error)
    return fits & (apart <= np.min(apart[fits], initial=np.inf))


def with_unknown_hosts(bursts: Bursts, catalogues: Sequence) -> Bursts:
    """The bursts without those host_id that are rows of no catalogue; a note says so: they are sought by place."""
    wanted = {str(h) for h in bursts.host} - {""}
    if not wanted:
        return bursts
    full = {str(name) for table in catalogues for name in table.row}
    unknown = wanted - full - {name.split(":", 1)[-1] for name in full}
    if not unknown:
        return bursts
    note, host = bursts.note.astype(object), bursts.host.astype(object)
    for i in np.flatnonzero(np.isin(np.asarray(bursts.host, dtype=str), sorted(unknown))):
        said = f"host_id '{bursts.host[i]}' is in no catalogue given: the host is sought by position and redshift"
        note[i] = f"{note[i]}; {said}" if note[i] else said
        host[i] = ""
    return replace(bursts, note=note, host=host)


def odds_of_holding(
    bursts: Bursts,
    i: int,
    haloes: Haloes,
    index: np.ndarray,
    log_m200c: np.ndarray,
    impact_kpc: np.ndarray,
    cosmos: Cosmos,
) -> np.ndarray:
    """Odds that burst i sits in each halo of `index` against its being in none, draw by draw (n_index, n_draws).

    The group that lists the host is certain, and then no other. Else, inside r200c on the sky, galaxies follow matter:

        odds = delta x 2 sqrt(r200c^2 - R^2) H(z) / c x N(dv | sigma_v and errors)

    the density inside the halo against the mean density along the line in the Hubble flow, as for members of groups.
    log_m200c, impact_kpc  draws of the mass and of the impact parameter (n_index, n_draws)
    """
    z = bursts.z[i]
    odds = np.zeros(log_m200c.shape)
    if np.isnan(z):
        return odds
    listed = _lists_host(str(bursts.host[i]), haloes, index)
    if listed.any():
        return odds + np.where(listed, CERTAIN, 0.0)[:, None]
    near = np.flatnonzero(_may_hold(bursts, i, haloes, index, log_m200c, cosmos))
    if near.size:
        odds[near] = _odds(bursts, i, haloes, index[near], log_m200c[near], impact_kpc[near], cosmos)
    return odds


def _may_hold(bursts: Bursts, i: int, haloes: Haloes, index, log_m200c, cosmos: Cosmos) -> np.ndarray:
    """Haloes whose redshift is sharp enough to tell, and not plainly another (n_index,) bool."""
    z, z_halo = bursts.z[i], point_redshift(haloes, cosmos)[index]
    error_z = np.sqrt(haloes.z_err[index] ** 2 + np.nan_to_num(bursts.z_err[i]) ** 2)
    sigma = _sigma_kms(log_m200c.max(axis=1), z_halo, cosmos) / LIGHT_KMS
    sharp = (error_z <= WIDEST_Z_ERR * (1 + z)) & ~(haloes.photometric[index] & (haloes.kind[index] == "galaxy"))
    # where distances rule, a burst far behind in the Hubble flow is not inside, whatever the velocities say
    flow = ~by_distance(haloes)[index] | (np.abs(z - z_halo) <= 3 * (sigma + PECULIAR_KMS / LIGHT_KMS))
    return sharp & flow & (np.abs(z - z_halo) <= FAR_SIGMAS * (np.hypot(sigma, error_z) + PECULIAR_KMS / LIGHT_KMS))


def _odds(bursts: Bursts, i: int, haloes: Haloes, index, log_m200c, impact_kpc, cosmos: Cosmos) -> np.ndarray:
    z_halo = point_redshift(haloes, cosmos)[index]
    # a velocity is compared with the listed redshift where there is one, since it is what both share
    listed = haloes.z[index]
    z_listed = np.where(np.isfinite(listed), listed, z_halo)[:, None]
    z_halo = z_halo[:, None]
    error_z = np.sqrt(haloes.z_err[index] ** 2 + np.nan_to_num(bursts.z_err[i]) ** 2)[:, None]
    error_kms = np.hypot(_sigma_kms(log_m200c, z_halo, cosmos), error_z * LIGHT_KMS / (1 + bursts.z[i]))
    apart_kms = (bursts.z[i] - z_listed) * LIGHT_KMS / (1 + z_listed)
    chord_kpc = 2 * np.sqrt(np.maximum(cosmos.r200c_kpc(log_m200c, z_halo) ** 2 - impact_kpc**2, 0.0))
    hubble_kms = 0.1 * cosmos.h * cosmos.e_of_z(z_halo) * chord_kpc
    per_kms = np.exp(-0.5 * (apart_kms / error_kms) ** 2) / (np.sqrt(2 * np.pi) * error_kms)
    return 200 / cosmos.omega_m_z(z_halo) * hubble_kms * per_kms


def _sigma_kms(log_m200c, z, cosmos: Cosmos) -> np.ndarray:
    return 10 ** load_relation("evrard2008").mean(log_m200c, z, cosmos)


def _lists_host(host: str, haloes: Haloes, index: np.ndarray) -> np.ndarray:
    """Groups of `index` among whose members the named host is, (n_index,) bool."""
    if not host:
        return np.zeros(len(index), dtype=bool)
    return np.array([host in _names(text) for text in haloes.members[index]], dtype=bool)


def _names(rows: str) -> set[str]:
    """All names a halo answers to: the full row names, and the ids without the catalogue's label."""
    full = str(rows).split(";")
    return {*full, *(name.split(":", 1)[-1] for name in full)}
