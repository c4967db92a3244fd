"""The nearest large haloes, where no catalogue given covers them."""

from __future__ import annotations

import numpy as np

from haloledger.catalogs.canonical import Galaxies, Groups, take
from haloledger.catalogs.local_volume import LABEL, LocalHalo, local_volume
from haloledger.cosmos.background import Cosmos
from haloledger.haloes.build import halo_list, point_mass
from haloledger.haloes.distances import by_distance, distance_error_share
from haloledger.haloes.listing import galaxy_haloes, group_haloes
from haloledger.haloes.table import Haloes, change, join, rows
from haloledger.sightlines.geometry import separation_deg

COVER_R200C, COVER_DEG, WIDEST_DEG = 0.6, 0.5, 3.5
"""A listed halo this near to a centre covers it: light-weighted centres of groups lie that far from the main galaxy."""
COVER_DEX = 1.0
COVER_KMS = 500.0
COVER_SIGMA = 3.0
INSIDE_MPC = 0.3


def uncovered(local: Groups, galaxies: list[Galaxies], groups: list[Groups], cosmos: Cosmos) -> Groups:
    """The rows of the built-in table that no catalogue covers.

    Covered: a listed halo within 0.6 r200c or 0.5 deg of the centre, but at most 3.5 deg, at a distance that agrees
    (where it has none, at a velocity within 500 km/s), of a mass within 1 dex. A satellite is covered with the halo it
    lies in.
    """
    if not len(local):
        return local
    table = group_haloes(local, 0, cosmos)
    radius = _cover_radius_deg(table, cosmos)
    covered = np.zeros(len(table), dtype=bool)
    for listed in [*galaxies, *groups]:
        near = take(listed, _near_rows(table, radius, listed))
        make = galaxy_haloes if isinstance(near, Galaxies) else group_haloes
        if len(near):
            covered |= _covered_by(table, radius, make(near, 1, cosmos), cosmos)
    names = set(table.id[covered].astype(str))
    names |= {h.row for h in local_volume() if f"{LABEL}:{h.inside}" in names}
    return take(local, ~np.isin(local.row, sorted(names)))


def with_local(
    galaxies: list[Galaxies], groups: list[Groups], local: Groups, cosmos: Cosmos, combine: str = "weighted"
) -> Haloes:
    """One list of haloes, those of the built-in table `local` among them as kind `local`.

    A satellite inside the Milky Way keeps its place in the list, for its disc, but has no gas halo of its own.
    combine  as in `halo_list`
    """
    known = {halo.row: halo for halo in local_volume()}
    inner = np.array([known[str(r)].p_satellite >= 1 for r in local.row], dtype=bool)
    outer = take(local, ~inner)
    haloes = halo_list(galaxies, [*groups, outer] if len(outer) else groups, cosmos, combine=combine)
    if inner.any():
        haloes = join([haloes, group_haloes(take(local, inner), int(haloes.catalogue.max(initial=0)) + 1, cosmos)])
        haloes = rows(haloes, np.argsort(haloes.id.astype(str), kind="stable"))
    return _marked(haloes, known, local)


def _marked(haloes: Haloes, known: dict[str, LocalHalo], local: Groups) -> Haloes:
    used = [i for i, name in enumerate(haloes.id) if str(name) in known and np.isin(str(name), local.row)]
    kind, note = haloes.kind.astype(object), haloes.note.astype(object).copy()
    log_mstar, p_member = haloes.log_mstar.copy(), haloes.p_member.copy()
    for i in used:
        halo = known[str(haloes.id[i])]
        kind[i], log_mstar[i], p_member[i] = LABEL, halo.log_mstar, halo.p_satellite
        rest = str(note[i]).removeprefix("mass as listed").strip("; ")
        note[i] = "; ".join(x for x in (halo.note, rest) if x)
    said = haloes.notes
    if used:
        names = ", ".join(str(haloes.id[i]).split(":", 1)[1] for i in used)
        said = (*said, f"Nearest large haloes from the built-in table, which no catalogue given covers: {names}.")
    return change(haloes, kind=kind, note=note, log_mstar=log_mstar, p_member=p_member, notes=said)


def _cover_radius_deg(table: Haloes, cosmos: Cosmos) -> np.ndarray:
    kpc = COVER_R200C * cosmos.r200c_kpc(table.value, np.zeros(len(table)))
    return np.clip(np.degrees(np.minimum(kpc / (1e3 * table.distance_mpc), 0.5)), COVER_DEG, WIDEST_DEG)


def _near_rows(table: Haloes, radius: np.ndarray, listed) -> np.ndarray:
    found = np.zeros(len(listed), dtype=bool)
    for ra, dec, r in zip(table.ra_deg, table.dec_deg, radius, strict=True):
        strip = np.flatnonzero(np.abs(listed.dec_deg - dec) <= r)
        found[strip] |= separation_deg(ra, dec, listed.ra_deg[strip], listed.dec_deg[strip]) <= r
    return np.flatnonzero(found)


def _covered_by(table: Haloes, radius: np.ndarray, listed: Haloes, cosmos: Cosmos) -> np.ndarray:
    """(n_table,) bool."""
    if not len(listed):
        return np.zeros(len(table), dtype=bool)
    apart = separation_deg(table.ra_deg[:, None], table.dec_deg[:, None], listed.ra_deg, listed.dec_deg)
    mass = np.abs(table.value[:, None] - point_mass(listed, cosmos)) <= COVER_DEX
    share = np.hypot(distance_error_share(table)[:, None], distance_error_share(listed))
    measured = np.abs(np.log(table.distance_mpc[:, None] / listed.distance_mpc)) <= COVER_SIGMA * share
    velocity = np.abs(table.z[:, None] - listed.z) <= COVER_KMS / 299792.458 + COVER_SIGMA * listed.z_err
    # a velocity says nothing of the distance where one is listed, and nothing at all inside the Milky Way's halo
    velocity &= (table.distance_mpc > INSIDE_MPC)[:, None]
    agrees = np.where(by_distance(listed), measured, velocity)
    return ((apart <= radius[:, None]) & mass & agrees).any(axis=1)
