"""One list of haloes without doubles from all galaxy and group catalogues.

rows of catalogues -> one galaxy, one group each -> groups merged -> galaxies inside groups dropped -> Haloes
"""

from __future__ import annotations

import numpy as np

from haloledger.catalogs.canonical import Galaxies, Groups
from haloledger.cosmos.background import Cosmos
from haloledger.errors import InputError
from haloledger.haloes.distances import (
    PECULIAR_KMS,
    SPEED_OF_LIGHT_KMS,
    by_distance,
    distance_error_share,
    point_redshift,
    z_floor,
)
from haloledger.haloes.doubles import merge_galaxies, merge_groups, rows_in_order
from haloledger.haloes.listing import galaxy_haloes, group_haloes
from haloledger.haloes.masses import State, log_m200c
from haloledger.haloes.membership import member_probability
from haloledger.haloes.nuisances import ZERO_POINT_DEX, RelationOfDraw
from haloledger.haloes.phase_space import extent
from haloledger.haloes.posterior import MASS_RELATION
from haloledger.haloes.relations import STELLAR_TO_HALO
from haloledger.haloes.table import Haloes, change, join, rows

MEDIAN_RELATION = "moster2013"  # for sizes in the search for doubles and members alone
CEILING_SIGMA = 3.5
CEILING_DISTANCE = 2.0

__all__ = ["halo_list", "mass_ceiling", "point_mass", "z_floor"]


def halo_list(galaxies: list[Galaxies], groups: list[Groups], cosmos: Cosmos) -> Haloes:
    """Haloes of all catalogues, each once, in the order of id; `notes` says what was left out or put together.

    The order of the catalogues decides which one describes a galaxy that two list, and a group of equal precedence; the
    order of their rows decides nothing.
    """
    _distinct_rows([*galaxies, *groups])
    group_parts = [group_haloes(g, k, cosmos) for k, g in enumerate(groups)]
    galaxy_parts = [galaxy_haloes(g, len(groups) + k, cosmos) for k, g in enumerate(galaxies)]
    notes: list[str] = []
    merged_groups = merged_galaxies = None
    if group_parts:
        merged_groups = _merge_groups(join(group_parts), notes, cosmos)
    if galaxy_parts:
        merged_galaxies = merge_galaxies(galaxy_parts, cosmos)
        doubles = sum(map(len, galaxy_parts)) - len(merged_galaxies)
        if doubles:
            notes.append(f"Galaxies listed in more than one catalogue, counted once: {doubles}.")
    if merged_galaxies is not None and merged_groups is not None:
        merged_galaxies = _without_members(merged_galaxies, merged_groups, notes, cosmos)
    parts = [p for p in (merged_groups, merged_galaxies) if p is not None]
    if not parts:
        raise InputError("no catalogue given. Name at least one with --galaxies or --groups.")
    whole = join(parts)
    return rows_in_order(change(whole, notes=(*whole.notes, *notes)))


def point_mass(haloes: Haloes, cosmos: Cosmos, relation: str = MEDIAN_RELATION, score: float = 0.0, z=None, shift=0.0):
    """log10 M200c at one normal score (0 is the median), with mean bias and concentration; shape (n,).

    z      redshift that sets the distance, as listed by default
    shift  dex added to the measured value of rows whose mass rests on a flux
    """
    n = len(haloes)
    z = point_redshift(haloes, cosmos) if z is None else z
    column = np.zeros((n, 1))
    state = State(
        score=column + score,
        value_score=column + score,
        z=z[:, None],
        value_shift=np.where(haloes.err_holds_z, 0.0, shift)[:, None],
        log_one_minus_b=np.log10(haloes.one_minus_b)[:, None],
        log_c_offset=column,
    )
    picked = RelationOfDraw((relation,), np.zeros(1, dtype=int))
    return log_m200c(haloes, state, picked, MASS_RELATION, cosmos)[:, 0]


def mass_ceiling(haloes: Haloes, cosmos: Cosmos) -> np.ndarray:
    """log10 M200c that 99.9 per cent of draws stay below, whatever the relation, zero point and redshift; shape (n,).

    Score 3.5 at the listed redshift; the stellar mass heavier by two zero points, and by three errors of the redshift
    or two of the distance.
    """
    z = point_redshift(haloes, cosmos)
    far = z + 3 * np.hypot(haloes.z_err, PECULIAR_KMS / SPEED_OF_LIGHT_KMS)
    flow = np.log10(cosmos.luminosity_distance_mpc(far) / cosmos.luminosity_distance_mpc(z))
    measured = CEILING_DISTANCE * distance_error_share(haloes) / np.log(10)
    shift = 2 * np.where(by_distance(haloes), measured, flow) + 2 * ZERO_POINT_DEX
    stellar = haloes.mass_kind == "stellar"
    ceiling = np.empty(len(haloes))
    ceiling[~stellar] = point_mass(rows(haloes, ~stellar), cosmos, score=CEILING_SIGMA)
    part = rows(haloes, stellar)
    ceiling[stellar] = np.max(
        [point_mass(part, cosmos, name, CEILING_SIGMA, shift=shift[stellar]) for name in STELLAR_TO_HALO], axis=0
    )
    # a low (1-b) makes a mass heavier: three of its errors, but not below 0.5
    low_b = np.maximum(haloes.one_minus_b - 3 * haloes.one_minus_b_err, np.minimum(haloes.one_minus_b, 0.5))
    return ceiling + np.log10(haloes.one_minus_b / low_b)


def _merge_groups(groups: Haloes, notes: list[str], cosmos: Cosmos) -> Haloes:
    size = extent(groups, point_mass(groups, cosmos), cosmos)
    merged = merge_groups(groups, size)
    if len(merged) < len(groups):
        gone = len(groups) - len(merged)
        notes.append(f"Group rows that name a halo, or a part of one, of another catalogue: {gone}.")
    return change(merged, notes=groups.notes)


def _without_members(galaxies: Haloes, groups: Haloes, notes: list[str], cosmos: Cosmos) -> Haloes:
    size = extent(groups, point_mass(groups, cosmos), cosmos)
    galaxy_size = extent(galaxies, point_mass(galaxies, cosmos), cosmos)
    names = {name for text in groups.source_rows for name in text.split(";")}
    p = member_probability(galaxies, galaxy_size, groups, size, names, cosmos)
    own = np.flatnonzero(p < 1)
    if own.size < p.size:
        notes.append(f"Galaxies that listed groups hold, without a halo of their own: {p.size - own.size}.")
    return change(rows(change(galaxies, p_member=p), own), notes=galaxies.notes)


def _distinct_rows(tables: list[Galaxies | Groups]) -> None:
    seen: set[str] = set()
    for table in tables:
        names = set(map(str, table.row))
        if len(names) < len(table) or seen & names:
            double = sorted(seen & names)[:1] or [table.label]
            raise InputError(f"{table.label}: row name '{double[0]}' stands twice. Give each catalogue its own label.")
        seen |= names
