"""One halo, or one galaxy, that several catalogues list, counts once.

Groups. Rows are taken from heavy to light. A row inside the phase space of a heavier row of another catalogue is
    the same halo   where the masses are within 0.7 dex and the halo has no row of the same catalogue yet: then the row
                    with a measured distance within 50 Mpc, then the lowest `precedence`, then the earliest catalogue,
                    gives centre, and mass where masses are not averaged (`combine`);
    a part of it    where it is lighter by more, or where the halo has a row of the same catalogue and this one lies
                    within half of r200c: a clump inside a cluster, which adds no halo.
Where centres agree to 0.3 r200c and masses to 0.7 dex, redshifts need agree to five sigma only.
The rows of one catalogue are never compared with each other: it says itself that they are distinct.

Galaxies. Mutually nearest rows of two catalogues within max(5 arcsec, 10 kpc) and 500 km/s (or at distances that agree)
are one galaxy; the earlier catalogue describes it, what it lacks comes from the other.
"""

from __future__ import annotations

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.haloes.combine import Measured, combined
from haloledger.haloes.distances import (
    SPEED_OF_LIGHT_KMS,
    by_distance,
    distance_error_share,
    point_luminosity_distance_mpc,
    point_redshift,
)
from haloledger.haloes.neighbours import Places, close_pairs, separation_rad
from haloledger.haloes.phase_space import Extent, inside
from haloledger.haloes.table import COLUMNS, Haloes, change, join, rows

COMPARABLE_DEX = 0.7
CORE = 0.5  # r200c: within it a second row of a catalogue is the same halo's, cut in two
CONCENTRIC = 0.3
CONCENTRIC_DEPTH = 5 / 3  # five sigma instead of three
CONCENTRIC_DEPTH_PHOTOMETRIC = 5 / 2  # five instead of two
SAME_GALAXY_ARCSEC = 5.0
SAME_GALAXY_KPC = 10.0
SAME_GALAXY_KMS = 500.0
DESCRIBED = ("source_rows", "distance_mpc", "distance_err_mpc", "note")
WEIGHED = ("mass_kind", "value", "value_err", "relation", "mass_def", "posterior", "one_minus_b", "one_minus_b_err")
SAME_GALAXY_DEX = 1.0  # a dwarf beside a giant is another galaxy, however near


def merge_groups(groups: Haloes, size: Extent, measures: Measured | None = None) -> Haloes:
    """Groups without doubles, in the order of id; `source_rows` keeps the rows that were put together.

    measures  what the rows measure: then the masses of one halo are averaged
    """
    head, same = _join_rows(groups, size)
    chosen = np.arange(len(groups))
    crowds = _crowds(head)
    for h, members in crowds.items():
        peers = members[same[members]]
        chosen[h] = peers[_first(rows(groups, peers))]
    heads = np.flatnonzero(head == np.arange(len(groups)))
    merged = rows(groups, chosen[heads])
    columns = {name: getattr(merged, name).copy() for name in (*DESCRIBED, *WEIGHED, "bias_share")}
    for k, h in enumerate(heads.tolist()):
        if h in crowds:
            _describe(columns, k, groups, chosen[h], crowds[h], same)
            if measures is not None:
                _weigh(columns, k, groups, chosen[h], crowds[h][same[crowds[h]]], measures)
    return rows_in_order(change(merged, **columns))


def _first(peers: Haloes) -> int:
    # within 50 Mpc distances rule: a row without one may be the core of a cluster that is much wider on the sky
    return int(np.lexsort((peers.id.astype(str), peers.catalogue, peers.precedence, ~by_distance(peers)))[0])


def _crowds(head: np.ndarray) -> dict[int, np.ndarray]:
    """Heaviest row -> all rows of its halo, for haloes with more than one."""
    order = np.argsort(head, kind="stable")
    names, start = np.unique(head[order], return_index=True)
    parts = np.split(order, start[1:])
    return {int(h): members for h, members in zip(names, parts, strict=True) if members.size > 1}


def _join_rows(groups: Haloes, size: Extent) -> tuple[np.ndarray, np.ndarray]:
    """Heaviest row of the halo each row belongs to, and whether the row is that halo itself (else a part of it)."""
    n = len(groups)
    mass = size.log_m200c
    rank = np.empty(n, dtype=int)
    rank[np.lexsort((groups.id.astype(str), -mass))] = np.arange(n)
    pairs = inside(groups, size, groups, size, CONCENTRIC_DEPTH_PHOTOMETRIC)
    alike = np.abs(mass[pairs.i] - mass[pairs.j]) <= COMPARABLE_DEX
    use = (groups.catalogue[pairs.i] != groups.catalogue[pairs.j]) & (rank[pairs.i] < rank[pairs.j])
    deepest = np.where(groups.photometric[pairs.j], CONCENTRIC_DEPTH_PHOTOMETRIC, CONCENTRIC_DEPTH)
    use &= (pairs.depth <= 1) | ((pairs.radius < CONCENTRIC) & alike & (pairs.depth <= deepest))
    i, j, nearness = pairs.i[use], pairs.j[use], np.hypot(pairs.radius[use], pairs.depth[use])
    core = pairs.radius[use] < CORE
    order = np.lexsort((rank[i], nearness, rank[j]))
    head, same = np.arange(n), np.ones(n, dtype=bool)
    listed: dict[int, set[int]] = {}
    done = -1
    for a, b, central in zip(i[order].tolist(), j[order].tolist(), core[order].tolist(), strict=True):
        h = int(head[a])
        if b == done or groups.catalogue[h] == groups.catalogue[b]:
            continue
        comparable = mass[h] - mass[b] <= COMPARABLE_DEX
        names = listed.setdefault(h, {int(groups.catalogue[h])})
        if comparable and int(groups.catalogue[b]) in names:
            if not central:
                continue
            comparable = False
        head[b], same[b], done = h, comparable, b
        if comparable:
            names.add(int(groups.catalogue[b]))
    return head, same


def _describe(columns: dict[str, np.ndarray], k: int, groups: Haloes, chosen: int, members, same) -> None:
    others = members[members != chosen]
    others = others[np.argsort(groups.id[others].astype(str))]
    columns["source_rows"][k] = ";".join([groups.source_rows[chosen], *groups.source_rows[others]])
    parts = int(np.sum(~same[others]))
    peers = others[same[others]]
    said = [columns["note"][k]]
    if peers.size:
        said.append(f"also listed as {', '.join(groups.id[peers])}")
    if parts:
        said.append(f"holds {parts} lesser rows of other catalogues")
    known = peers[np.isfinite(groups.distance_mpc[peers])]
    if known.size and np.isnan(columns["distance_mpc"][k]):
        columns["distance_mpc"][k] = groups.distance_mpc[known[0]]
        columns["distance_err_mpc"][k] = groups.distance_err_mpc[known[0]]
        said.append(f"distance from {groups.id[known[0]]}")
    columns["note"][k] = "; ".join(x for x in said if x)


def _weigh(columns: dict[str, np.ndarray], k: int, groups: Haloes, chosen: int, peers, measures: Measured) -> None:
    """Write the mass that all peers give together into row k, in place."""
    peers = peers[np.lexsort((groups.id[peers].astype(str), groups.catalogue[peers], groups.precedence[peers]))]
    found = combined(measures, np.array([chosen, *peers[peers != chosen]]), groups.one_minus_b)
    if found is None:
        return
    hydrostatic = found.used[measures.biased[found.used]]
    giver = int(hydrostatic[0]) if hydrostatic.size else chosen
    bias = (groups.one_minus_b[giver], groups.one_minus_b_err[giver])
    values = ("mass", found.log_m200c, found.err, "", "200c", False, *bias)
    for name, value in zip(WEIGHED, values, strict=True):
        columns[name][k] = value
    columns["bias_share"][k] = found.bias_share if hydrostatic.size else 1.0
    if not hydrostatic.size:
        columns["one_minus_b"][k], columns["one_minus_b_err"][k] = 1.0, 0.0
    columns["note"][k] += f"; mass from {', '.join(groups.id[found.used])} together"


def merge_galaxies(catalogues: list[Haloes], cosmos: Cosmos) -> Haloes:
    """All galaxies, each once; catalogues in the user's order."""
    merged = catalogues[0]
    for extra in catalogues[1:]:
        i, j = _same_galaxies(merged, extra, cosmos)
        merged = _absorb(merged, i, rows(extra, j), cosmos)
        rest = np.setdiff1d(np.arange(len(extra)), j)
        merged = join([merged, change(rows(extra, rest), notes=extra.notes)])
    return rows_in_order(merged)


def rows_in_order(haloes: Haloes) -> Haloes:
    """The same haloes in the order of id."""
    return change(rows(haloes, np.argsort(haloes.id.astype(str), kind="stable")), notes=haloes.notes)


def _same_galaxies(a: Haloes, b: Haloes, cosmos: Cosmos) -> tuple[np.ndarray, np.ndarray]:
    za = point_redshift(a, cosmos)
    mpc_a, mpc_b = point_luminosity_distance_mpc(a, cosmos), point_luminosity_distance_mpc(b, cosmos)
    kpc_per_rad = cosmos.angular_distance_kpc(za)
    radius = np.maximum(np.radians(SAME_GALAXY_ARCSEC / 3600), SAME_GALAXY_KPC / kpc_per_rad)
    i, j = close_pairs(_window(a), _window(b), radius)
    scale = SPEED_OF_LIGHT_KMS / (1 + za[i])
    velocity = np.abs(a.z[i] - b.z[j]) * scale
    allowed = np.sqrt(SAME_GALAXY_KMS**2 + (3 * scale) ** 2 * (a.z_err[i] ** 2 + b.z_err[j] ** 2))
    both = by_distance(a)[i] & by_distance(b)[j]
    da, db = a.distance_mpc[i], b.distance_mpc[j]
    err = np.hypot(da * distance_error_share(a)[i], db * distance_error_share(b)[j])
    agree = (velocity < allowed) | (both & (np.abs(da - db) <= 2 * err))
    step = np.abs(a.log_mstar[i] - b.log_mstar[j] + 2 * np.log10(mpc_b[j] / mpc_a[i]))  # of their light, that is
    agree &= ~(step > SAME_GALAXY_DEX)
    apart = separation_rad(a.ra_deg[i], a.dec_deg[i], b.ra_deg[j], b.dec_deg[j])
    return _nearest_first(i[agree], j[agree], apart[agree])


def _window(haloes: Haloes) -> Places:
    err = 3 * haloes.z_err + 4 * SAME_GALAXY_KMS / SPEED_OF_LIGHT_KMS
    z = np.maximum(haloes.z, -0.01)
    return Places(haloes.ra_deg, haloes.dec_deg, z - err, z + err)


def _nearest_first(i, j, apart) -> tuple[np.ndarray, np.ndarray]:
    """One-to-one pairs, the closest first."""
    taken_i, taken_j, pairs = set(), set(), []
    for k in np.lexsort((j, i, apart)).tolist():
        a, b = int(i[k]), int(j[k])
        if a not in taken_i and b not in taken_j:
            taken_i.add(a)
            taken_j.add(b)
            pairs.append((a, b))
    found = np.array(sorted(pairs), dtype=int).reshape(-1, 2)
    return found[:, 0], found[:, 1]


def _lacks(a: np.ndarray, b: np.ndarray) -> np.ndarray:
    return np.isnan(a) & np.isfinite(b)


def _absorb(a: Haloes, i: np.ndarray, b: Haloes, cosmos: Cosmos) -> Haloes:
    """Rows i of a, each completed by its double in b; a mass from light follows a distance that is filled in."""
    columns = {name: getattr(a, name).copy() for name in COLUMNS}
    names = np.array([f"{x};{y}" for x, y in zip(a.source_rows[i], b.source_rows, strict=True)], dtype=object)
    columns["source_rows"][i] = names
    notes = a.note[i].copy()
    for what, fill, names_filled in (
        ("distance", _lacks(a.distance_mpc[i], b.distance_mpc), ("distance_mpc", "distance_err_mpc")),
        (
            "spectroscopic redshift",
            a.photometric[i] & ~b.photometric,
            ("z", "z_flow", "z_err", "photometric", "z_scores", "z_outlier", "z_posterior"),
        ),
        ("optical radius", _lacks(a.optical_radius_kpc[i], b.optical_radius_kpc), ("optical_radius_kpc",)),
        ("group", (a.listed_group[i] == "") & (b.listed_group != ""), ("listed_group",)),
    ):
        for name in names_filled:
            columns[name][i[fill]] = getattr(b, name)[fill]
        notes[fill] = [f"{n}; {what} from {x}" for n, x in zip(notes[fill], b.id[fill], strict=True)]
    columns["note"][i] = notes
    filled = change(a, **columns)
    step = 2 * np.log10(point_luminosity_distance_mpc(filled, cosmos) / point_luminosity_distance_mpc(a, cosmos))
    step = np.where(a.err_holds_z, 0.0, step)
    value = a.value + np.where(a.mass_kind == "stellar", step, 0.0)
    return change(filled, value=value, log_mstar=a.log_mstar + step)
