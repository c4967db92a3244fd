"""Galaxies that a listed group holds for sure have no gas halo; those whose disc a line may meet come back for that."""

from __future__ import annotations

import numpy as np

from haloledger.catalogs.canonical import Bursts, Galaxies, take
from haloledger.cosmos.background import Cosmos
from haloledger.haloes.distances import point_redshift
from haloledger.haloes.listing import galaxy_haloes
from haloledger.haloes.table import Haloes, change, join, rows
from haloledger.sightlines.disc import reach_kpc
from haloledger.sightlines.geometry import separation_deg
from haloledger.sightlines.near import near_pairs

SIGMAS = 5.0
SAME_ARCSEC, SAME_KPC = 5.0, 10.0
"""Two rows this near are one galaxy of two catalogues."""
NEARER = 0.7  # of the listed distance: what peculiar velocities leave of it in the nearest draws
NOTE = "a listed group holds it: no gas halo of its own, in the list for its disc"


def with_member_discs(haloes: Haloes, bursts: Bursts, galaxies: list[Galaxies], cosmos: Cosmos) -> Haloes:
    """The haloes, and as rows without gas (p_member = 1) the members that lie on a line of `bursts`."""
    members = {name for text in haloes.members for name in str(text).split(";")} - {""}
    if not members or not len(bursts):
        return haloes
    found: list[Haloes] = []
    for k, table in enumerate(galaxies):
        index = _on_a_line(bursts, table, members, cosmos)
        if index.size:
            found.append(galaxy_haloes(take(table, index), k, cosmos))
    if not found:
        return haloes
    extra = _once(join(found), cosmos)
    n = len(extra)
    extra = change(extra, p_member=np.ones(n), note=np.full(n, NOTE, dtype=object), notes=())
    whole = join([haloes, extra])
    return rows(whole, np.argsort(whole.id.astype(str), kind="stable"))


def _on_a_line(bursts: Bursts, table: Galaxies, members: set[str], cosmos: Cosmos) -> np.ndarray:
    held = np.flatnonzero(np.fromiter((str(name) in members for name in table.row), bool, len(table)))
    part = take(table, held)
    reach = float(reach_kpc(np.array([np.nan]))[0])
    radius = np.degrees(reach / (NEARER * cosmos.angular_distance_kpc(point_redshift(part, cosmos))))
    if getattr(part, "radius_arcsec", None) is not None:
        radius = np.fmax(radius, part.radius_arcsec / 3600 / NEARER)
    margin = SIGMAS * np.nan_to_num(bursts.loc_major_arcsec) / 3600
    _, near = near_pairs(bursts.ra_deg, bursts.dec_deg, margin, part.ra_deg, part.dec_deg, np.minimum(radius, 90.0))
    return held[np.unique(near)]


def _once(haloes: Haloes, cosmos: Cosmos) -> Haloes:
    """The first of rows that are one galaxy; catalogues in the user's order."""
    apart = separation_deg(haloes.ra_deg[:, None], haloes.dec_deg[:, None], haloes.ra_deg, haloes.dec_deg)
    same = np.maximum(
        SAME_ARCSEC / 3600, np.degrees(SAME_KPC / cosmos.angular_distance_kpc(np.maximum(haloes.z, 1e-3)))
    )
    twin = (apart <= same) & (haloes.catalogue[:, None] != haloes.catalogue)
    earlier = twin & (haloes.catalogue < haloes.catalogue[:, None])
    return rows(haloes, np.flatnonzero(~earlier.any(axis=1)))
