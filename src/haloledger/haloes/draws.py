"""Draws of a halo's mass, redshift, concentration and centre: draw k of all haloes belongs to one universe.

Every random number is keyed by the halo's id, every shared one by its name; what is drawn for a halo does not depend on
which other haloes are asked for, to the last bit.
"""

from __future__ import annotations

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.cosmos.concentration import SCATTER_DEX
from haloledger.engine.universe import Universe
from haloledger.haloes.company import score_in_company
from haloledger.haloes.hosts import put_hosts
from haloledger.haloes.masses import State, log_m200c, naive_log_m200c
from haloledger.haloes.nuisances import RelationOfDraw, held_number, log_one_minus_b, relation_of_draw, zero_point
from haloledger.haloes.redshifts import draw_redshifts
from haloledger.haloes.relations import load_relation
from haloledger.haloes.table import HaloDraws, Haloes, rows


def draw_haloes(haloes: Haloes, index, universe: Universe, c_relation: str | float, cosmos: Cosmos) -> HaloDraws:
    """Draws of the haloes `index`.

    c_relation  concentration relation of the gas model, or a number: converts masses in other definitions
    Shapes (n_index, n_draws). With `universe.fixed` one draw with everything as given and relations read backwards.
    """
    part = rows(haloes, np.asarray(index, dtype=int))
    relation, zero = relation_of_draw(universe), zero_point(universe)
    shifts = draw_redshifts(part, universe, relation, zero, cosmos)
    follows = np.where(part.err_holds_z[:, None], 0.0, shifts.log_l_shift)
    offset = SCATTER_DEX * universe.normals("concentration", part.id)
    state = State(
        score=_scores(part, universe, relation, cosmos),
        value_score=_some_normals(universe, "stellar_mass", part.id, part.posterior & (part.mass_kind == "stellar")),
        z=shifts.z,
        value_shift=follows - zero,
        log_one_minus_b=part.bias_share[:, None] * log_one_minus_b(universe, part.one_minus_b, part.one_minus_b_err),
        log_c_offset=offset,
    )
    rule = naive_log_m200c if universe.fixed else log_m200c
    moved = part.centre_err_kpc > 0
    east, north = (
        part.centre_err_kpc[:, None] * _some_normals(universe, f"centre_{way}", part.id, moved)
        for way in ("east", "north")
    )
    mass = rule(part, state, relation, c_relation, cosmos)
    own, hosted = _own(part, universe)
    put_hosts(part, hosted, state, universe, c_relation, cosmos, mass, east, north)
    return HaloDraws(mass, shifts.z, shifts.distance_kpc, offset, east, north, own, hosted)


def relation_notes(haloes: Haloes, index, universe: Universe) -> list[str]:
    """What has to be said of relations used beyond the redshifts they were made for, one sentence per relation."""
    part = rows(haloes, np.asarray(index, dtype=int))
    notes = []
    stellar = [(name, part.mass_kind == "stellar") for name, _ in relation_of_draw(universe).columns()]
    proxies = [(name, part.relation == name) for name in sorted(set(part.relation.tolist()) - {""})]
    for name, uses in stellar + proxies:
        low, high = load_relation(name).z_range
        z = np.maximum(part.z, 0.0)  # a velocity towards us is no redshift
        beyond = int(np.sum(uses & ((z < low - part.z_err) | (z > high + part.z_err))))
        if beyond:
            many = "halo" if beyond == 1 else "haloes"
            notes.append(f"{name} is used beyond its redshifts ({low:g} to {high:g}) for {beyond} {many}")
    return notes


def _scores(haloes: Haloes, universe: Universe, relation: RelationOfDraw, cosmos: Cosmos) -> np.ndarray:
    """Normal scores of the halo mass, moved by the company a galaxy keeps; (n, n_draws)."""
    score = universe.normals("halo_mass", haloes.id)
    if universe.fixed or held_number(universe, "membership") == 0:
        return score
    for name, columns in relation.columns():
        score[:, columns] = score_in_company(haloes, np.take(score, columns, axis=1), name, cosmos)
    return score


def _own(haloes: Haloes, universe: Universe) -> tuple[np.ndarray, np.ndarray]:
    """Where there is a halo, and where it is that of an unlisted host; (n, n_draws) each.

    Fixed, or with the nuisance `membership` held at 0: a galaxy is in a listed halo or not, and no host is drawn.
    """
    listed = haloes.p_member - haloes.p_hosted
    own = np.repeat((listed < 0.5)[:, None], universe.n_draws, axis=1)
    hosted = np.zeros_like(own)
    if universe.fixed or held_number(universe, "membership") == 0:
        return own, hosted
    open_ = np.flatnonzero((haloes.p_member > 0) & (haloes.p_member < 1))
    at = universe.uniforms("membership", haloes.id[open_])
    own[open_] = at >= listed[open_, None]
    hosted[open_] = at >= 1 - haloes.p_hosted[open_, None]
    return own, hosted


def _some_normals(universe: Universe, parameter: str, ids: np.ndarray, where: np.ndarray) -> np.ndarray:
    """Normals for the rows `where`, 0 for the others: numbers are keyed, so none is drawn that is not needed."""
    result = np.zeros((len(ids), universe.n_draws))
    index = np.flatnonzero(where)
    result[index] = universe.normals(parameter, ids[index])
    return result
