"""One list of haloes without doubles from all galaxy and group catalogues.

rows of catalogues -> one galaxy, one group each -> groups merged -> galaxies inside groups dropped -> Haloes
"""

from __future__ import annotations

import numpy as np
from scipy.special import ndtri

from haloledger.catalogs.canonical import Galaxies, Groups
from haloledger.cosmos.background import Cosmos
from haloledger.errors import InputError
from haloledger.haloes.combine import measured
from haloledger.haloes.company import score_in_company, with_company
from haloledger.haloes.distances import (
    PECULIAR_KMS,
    SPEED_OF_LIGHT_KMS,
    by_distance,
    distance_error_share,
    point_redshift,
    z_floor,
)
from haloledger.haloes.doubles import merge_galaxies, merge_groups, rows_in_order
from haloledger.haloes.hygiene import without_pieces, without_twins
from haloledger.haloes.listing import galaxy_haloes, group_haloes
from haloledger.haloes.masses import State, log_m200c
from haloledger.haloes.membership import MASS_SCORES, Membership, memberships, published
from haloledger.haloes.nuisances import ZERO_POINT_DEX, RelationOfDraw
from haloledger.haloes.phase_space import Extent, extent
from haloledger.haloes.posterior import MASS_RELATION
from haloledger.haloes.relations import STELLAR_TO_HALO
from haloledger.haloes.satellites import occupation
from haloledger.haloes.table import Haloes, change, has_density, join, rows, with_densities

MEDIAN_RELATION = "moster2013"  # for sizes in the search for doubles and members alone
COMBINE = ("weighted", "precedence")
CEILING_SIGMA = 3.5
CEILING_DISTANCE = 2.0
LEAST_FLOW_KMS = 600.0  # two peculiar velocities
HOST_BEYOND = 1e-3
OFF_CENTRE_DEX = 3 * np.log10(2.0)  # (boundary + 1) r200c of the host, at most twice its boundary of one r200c or more
SAID_UNLISTED = 0.02  # a smaller chance of an unlisted host is not worth a word
MOST_NAMED = 20

__all__ = ["halo_list", "mass_ceiling", "point_mass", "z_floor"]


def halo_list(
    galaxies: list[Galaxies],
    groups: list[Groups],
    cosmos: Cosmos,
    *,
    combine: str = "weighted",
    membership: bool = True,
) -> Haloes:
    """Haloes of all catalogues, each once, in the order of id; `notes` says what was left out or put together.

    The order of the catalogues decides which one describes a galaxy that two list, and a group of equal precedence; the
    order of their rows decides nothing.

    combine     "weighted": masses of one halo from several catalogues are averaged by their errors; "precedence": the
                row that describes the halo gives the mass
    membership  False gives every galaxy a halo of its own, in a group or not: to see what that does
    """
    if combine not in COMBINE:
        raise InputError(f"combine '{combine}' is not known. Write one of {', '.join(COMBINE)}.")
    _distinct_rows([*galaxies, *groups])
    group_parts = [_centred(group_haloes(g, k, cosmos), g.centre_err_share, cosmos) for k, g in enumerate(groups)]
    galaxy_parts = [galaxy_haloes(g, len(groups) + k, cosmos) for k, g in enumerate(galaxies)]
    notes: list[str] = []
    merged_groups = merged_galaxies = None
    if group_parts:
        merged_groups = _merge_groups(join(group_parts), combine, notes, cosmos)
    if galaxy_parts:
        galaxy_parts = [
            _tidy(without_twins, part, "Galaxy rows listed twice in {}: {}.", notes, cosmos) for part in galaxy_parts
        ]
        merged_galaxies = merge_galaxies(with_densities(galaxy_parts), cosmos)
        doubles = sum(map(len, galaxy_parts)) - len(merged_galaxies)
        if doubles:
            notes.append(f"Galaxies listed in more than one catalogue, counted once: {doubles}.")
        merged_galaxies = _tidy(
            without_pieces, merged_galaxies, "Pieces of larger galaxies, not counted: {1}.", notes, cosmos
        )
    if merged_galaxies is not None and membership:
        merged_galaxies, merged_groups = _without_members(merged_galaxies, merged_groups, notes, cosmos)
    parts = [p for p in (merged_groups, merged_galaxies) if p is not None]
    if not parts:
        raise InputError("no catalogue given. Name at least one with --galaxies or --groups.")
    whole = join(parts)
    return rows_in_order(change(whole, notes=(*whole.notes, *notes)))


def _tidy(rule, galaxies: Haloes, said: str, notes: list[str], cosmos: Cosmos) -> Haloes:
    kept, gone = rule(galaxies, cosmos)
    if gone:
        notes.append(said.format(str(galaxies.id[0]).split(":", 1)[0], gone))
    return kept


def point_mass(
    haloes: Haloes, cosmos: Cosmos, relation: str = MEDIAN_RELATION, score: float | np.ndarray = 0.0, z=None, shift=0.0
):
    """log10 M200c at one normal score (0 is the median), with mean bias and concentration; shape (n,).

    score  one number, or one a row
    z      redshift that sets the distance, as listed by default
    shift  dex added to the measured value of rows whose mass rests on a flux
    """
    n = len(haloes)
    z = point_redshift(haloes, cosmos) if z is None else z
    column = np.zeros((n, 1))
    state = State(
        score=column + np.asarray(score).reshape(-1, 1),
        value_score=column + np.asarray(score).reshape(-1, 1),
        z=z[:, None],
        value_shift=np.where(haloes.err_holds_z, 0.0, shift)[:, None],
        log_one_minus_b=(haloes.bias_share * np.log10(haloes.one_minus_b))[:, None],
        log_c_offset=column,
    )
    picked = RelationOfDraw((relation,), np.zeros(1, dtype=int))
    return log_m200c(haloes, state, picked, MASS_RELATION, cosmos)[:, 0]


def mass_ceiling(haloes: Haloes, cosmos: Cosmos) -> np.ndarray:
    """log10 M200c that 99.9 per cent of draws stay below, whatever the relation, zero point and redshift; shape (n,).

    Score 3.5 at the listed redshift; the stellar mass heavier by two zero points, and by three errors of the redshift
    or two of the distance. A host drawn in the row's stead counts as the halo that, centred on the row, reaches as far:
    its centre lies up to r200c off.
    """
    z = point_redshift(haloes, cosmos)
    far = z + 3 * np.hypot(haloes.z_err, PECULIAR_KMS / SPEED_OF_LIGHT_KMS)
    wide = has_density(haloes)
    far[wide] = np.maximum(far[wide], haloes.z_scores[wide, -1:].ravel())
    flow = np.log10(cosmos.luminosity_distance_mpc(far) / cosmos.luminosity_distance_mpc(z))
    measured = CEILING_DISTANCE * distance_error_share(haloes) / np.log(10)
    shift = 2 * np.where(by_distance(haloes), measured, flow) + 2 * ZERO_POINT_DEX
    stellar = haloes.mass_kind == "stellar"
    ceiling = np.empty(len(haloes))
    ceiling[~stellar] = point_mass(rows(haloes, ~stellar), cosmos, score=CEILING_SIGMA)
    part = rows(haloes, stellar)
    highest = np.full((len(part), 1), CEILING_SIGMA)
    ceiling[stellar] = np.max(
        [
            point_mass(part, cosmos, name, score_in_company(part, highest, name, cosmos), shift=shift[stellar])
            for name in STELLAR_TO_HALO
        ],
        axis=0,
    )
    # a low (1-b) makes a mass heavier: three of its errors, but not below 0.5
    low_b = np.maximum(haloes.one_minus_b - 3 * haloes.one_minus_b_err, np.minimum(haloes.one_minus_b, 0.5))
    return np.maximum(
        ceiling + haloes.bias_share * np.log10(haloes.one_minus_b / low_b), _host_ceiling(haloes, z, shift, cosmos)
    )


def _host_ceiling(haloes: Haloes, z, shift, cosmos: Cosmos) -> np.ndarray:
    """What a drawn host reaches, but in 1 of 1,000 draws, as a mass centred on the row; -inf where there is none."""
    result = np.full(len(haloes), -np.inf)
    index = np.flatnonzero(haloes.p_hosted > HOST_BEYOND)
    if index.size:
        score = ndtri(1 - HOST_BEYOND / haloes.p_hosted[index])
        y = haloes.value[index] + np.minimum(shift[index], 2 * ZERO_POINT_DEX)
        mass = occupation(cosmos).host(y, z[index], haloes.value_err[index], score)
        result[index] = mass + OFF_CENTRE_DEX
    return result


def _centred(groups: Haloes, largest_share: float, cosmos: Cosmos) -> Haloes:
    """Centre errors cut at a share of r200c."""
    if not len(groups) or not np.isfinite(largest_share):
        return groups
    r200c_kpc = cosmos.r200c_kpc(point_mass(groups, cosmos), point_redshift(groups, cosmos))
    return change(groups, centre_err_kpc=np.minimum(groups.centre_err_kpc, largest_share * r200c_kpc))


def _merge_groups(groups: Haloes, combine: str, notes: list[str], cosmos: Cosmos) -> Haloes:
    size = extent(groups, point_mass(groups, cosmos), cosmos)
    merged = merge_groups(groups, size, measured(groups, cosmos) if combine == "weighted" else None)
    if len(merged) < len(groups):
        gone = len(groups) - len(merged)
        notes.append(f"Group rows that name a halo, or a part of one, of another catalogue: {gone}.")
    placeless = np.isnan(merged.distance_mpc) & (merged.z < LEAST_FLOW_KMS / SPEED_OF_LIGHT_KMS)
    if placeless.any():
        notes.append(
            f"Groups below {LEAST_FLOW_KMS:g} km/s without a distance, left out since their own motion hides it:"
            f" {placeless.sum()}. A distance_mpc brings them back."
        )
    return change(rows(merged, np.flatnonzero(~placeless)), notes=groups.notes)


def _without_members(galaxies: Haloes, groups: Haloes | None, notes: list[str], cosmos: Cosmos):
    """Galaxies with a halo of their own in some draw, and how probably they have none; groups with their members."""
    names = sorted({name for text in ([] if groups is None else groups.source_rows) for name in text.split(";")})
    sizes = [[] if h is None else _sizes(h, cosmos) for h in (galaxies, groups)]
    found = memberships(galaxies, sizes[0], groups, sizes[1], names, cosmos)
    if groups is not None:
        groups = _with_members(groups, galaxies, found)
    own = np.flatnonzero(found.listed < 1)
    _say_members(found, galaxies, names, notes)
    note = galaxies.note.copy()
    lone = found.hosted >= SAID_UNLISTED
    note[lone] = [
        _added(n, f"in {p:.0%} of draws the halo is that of an unlisted host, off the galaxy")
        for n, p in _zip(note, found, lone)
    ]
    changed = change(galaxies, p_member=found.listed + found.unlisted, p_hosted=found.hosted, note=note)
    changed = with_company(changed, found.satellites, found.share, published(galaxies, names), cosmos)
    return change(rows(changed, own), notes=galaxies.notes), groups


def _with_members(groups: Haloes, galaxies: Haloes, found: Membership) -> Haloes:
    """The names of the galaxies that each group holds for sure, and a word where one is too heavy for it."""
    members, note = groups.members.copy(), groups.note.copy()
    held: dict[int, list[str]] = {}
    for j in np.flatnonzero((found.listed >= 1) & (found.group >= 0)).tolist():
        held.setdefault(int(found.group[j]), []).append(str(galaxies.source_rows[j]))
    for i, names in held.items():
        members[i] = ";".join(names)
    for j in np.flatnonzero(found.heavier).tolist():
        i = int(found.group[j])
        note[i] = _added(note[i], f"{galaxies.id[j]} at its centre is a galaxy of a heavier halo")
    return change(groups, members=members, note=note)


def _sizes(haloes: Haloes, cosmos: Cosmos) -> list[Extent]:
    return [extent(haloes, point_mass(haloes, cosmos, score=u), cosmos) for u in MASS_SCORES.tolist()]


def _zip(note, found: Membership, lone):
    return zip(note[lone], found.hosted[lone], strict=True)


def _added(note: str, more: str) -> str:
    return f"{note}; {more}" if note else more


def _say_members(found: Membership, galaxies: Haloes, group_rows: list[str], notes: list[str]) -> None:
    gone = int((found.listed >= 1).sum())
    if gone:
        notes.append(f"Galaxies that listed haloes hold, without a halo of their own: {gone}.")
    if found.claimed:
        notes.append(f"Galaxies that a heavier galaxy beside them probably holds: {found.claimed}.")
    if found.unlisted.any():
        total = found.unlisted.sum()
        notes.append(f"Galaxies expected to be in haloes that no list has: {total:.3g} of {len(galaxies)}.")
    lost = (galaxies.listed_group != "") & ~published(galaxies, group_rows)
    if lost.any():
        pairs = [f"{a} ({b})" for a, b in zip(galaxies.id[lost], galaxies.listed_group[lost], strict=True)]
        more = f" and {len(pairs) - MOST_NAMED} more" if len(pairs) > MOST_NAMED else ""
        shown = ", ".join(pairs[:MOST_NAMED]) + more
        notes.append(f"group_id that names no listed group, so that place and redshift decide: {shown}.")


def _distinct_rows(tables: list[Galaxies | Groups]) -> None:
    seen: set[str] = set()
    for table in tables:
        names = set(map(str, table.row))
        if len(names) < len(table) or seen & names:
            double = sorted(seen & names)[:1] or [table.label]
            raise InputError(f"{table.label}: row name '{double[0]}' stands twice. Give each catalogue its own label.")
        seen |= names
