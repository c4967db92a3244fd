"""Halo masses at given normal scores, redshifts and nuisances, each kind of measurement by its own rule.

stellar   P(M | log M*_obs, z) with the mass function as prior (`posterior`)
m200c     normal, as it stands
mass      posterior: normal in its own definition, converted; likelihood: with the mass function as prior
proxy     proxy given mass: with the prior; mass given the proxy: normal, converted
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.cosmos.mass_definitions import to_200c
from haloledger.haloes.conversion import to_200c_fast
from haloledger.haloes.nuisances import RelationOfDraw
from haloledger.haloes.posterior import inverse
from haloledger.haloes.relations import Relation, load_relation
from haloledger.haloes.table import Haloes

SHARP = 0.05  # dex: below this error the mass function moves a mass by less than 0.02 dex, and the table ends


@dataclass(frozen=True)
class State:
    """What a mass hangs on besides the row: arrays of shape (n, n_draws)."""

    score: np.ndarray  # normal score of the mass
    value_score: np.ndarray  # normal score of a stellar mass that is a posterior already
    z: np.ndarray
    value_shift: np.ndarray  # dex added to the measured value (distance; zero point)
    log_one_minus_b: np.ndarray
    log_c_offset: np.ndarray

    def part(self, index) -> State:
        """The rows `index`."""
        return State(**{k: v[index] for k, v in vars(self).items()})


def log_m200c(haloes: Haloes, state: State, relation: RelationOfDraw, c_relation: str | float, cosmos: Cosmos):
    """log10 M200c, shape (n, n_draws)."""
    result = np.empty(state.score.shape)
    for rule, index in _groups_of_rows(haloes):
        part, values = state.part(index), _Values(haloes.value[index, None], haloes.value_err[index, None])
        if rule[0] == "stellar":
            result[index] = _stellar(values, part, haloes.posterior[index, None], relation, cosmos)
        elif rule[0] == "m200c":
            result[index] = values.value + values.err * part.score
        else:
            result[index] = _by_rule(rule, values, part, c_relation, cosmos)
    return result


@dataclass(frozen=True)
class _Values:
    value: np.ndarray
    err: np.ndarray


def _groups_of_rows(haloes: Haloes):
    """Yield (rule, rows); a rule is kind, definition or relation, and "prior" where a listed mass needs it."""
    prior = ~haloes.posterior & (haloes.value_err >= SHARP)
    kind = haloes.mass_kind.astype(str)
    name = np.where(kind == "mass", haloes.mass_def, np.where(kind == "proxy", haloes.relation, "")).astype(str)
    with_prior = np.where((kind == "mass") & prior, "prior", "")
    keys = np.char.add(np.char.add(np.char.add(kind, "|"), np.char.add(name, "|")), with_prior)
    unique, which = np.unique(keys, return_inverse=True)
    for i, rule in enumerate(unique.tolist()):
        yield rule.split("|"), np.flatnonzero(which == i)


def _stellar(values: _Values, state: State, posterior, relation: RelationOfDraw, cosmos: Cosmos) -> np.ndarray:
    y = values.value + state.value_shift + np.where(posterior, values.err, 0.0) * state.value_score
    err = np.where(posterior, 0.0, values.err)
    result = np.empty(y.shape)
    for name, columns in relation.columns():
        at = (np.take(a, columns, axis=1) for a in (y, state.z, state.score))
        y_k, z_k, u_k = at
        result[:, columns] = inverse(name, cosmos).mass(y_k, z_k, err, u_k)
    return result


def _by_rule(rule: list[str], values: _Values, state: State, c_relation, cosmos: Cosmos) -> np.ndarray:
    kind, name, prior = rule
    if kind == "mass":
        value = values.value - state.log_one_minus_b
        if prior:
            return inverse(f"same-{name}", cosmos).mass(value, state.z, values.err, state.score)
        own, mass_def = value + values.err * state.score, name
    else:
        proxy = load_relation(name)
        if proxy.needs_prior:
            # a relation for hydrostatic masses is met by a halo heavier by 1 / (1-b)
            value = values.value - proxy.parameters["slope"] * state.log_one_minus_b
            return inverse(name, cosmos).mass(value, state.z, values.err, state.score)
        err = np.hypot(proxy.scatter(state.z), proxy.parameters["slope"] * values.err)
        own = proxy.mean(values.value, state.z, cosmos) + proxy.median_step + err * state.score
        mass_def = proxy.mass_def
    return to_200c_fast(own, mass_def, state.z, c_relation, cosmos, state.log_c_offset)


def naive_log_m200c(haloes: Haloes, state: State, relation: RelationOfDraw, c_relation, cosmos: Cosmos) -> np.ndarray:
    """The mass a person would compute: every relation read backwards, without scatter, error or prior; (n, n_draws)."""
    result = np.empty(state.score.shape)
    for rule, index in _groups_of_rows(haloes):
        part, value = state.part(index), haloes.value[index, None]
        if rule[0] == "m200c":
            result[index] = value
            continue
        own, mass_def = _naive(rule, value, part, relation, cosmos)
        result[index] = to_200c(own, mass_def, part.z, c_relation, cosmos)
    return result


def _naive(rule: list[str], value, state: State, relation: RelationOfDraw, cosmos: Cosmos) -> tuple[np.ndarray, str]:
    if rule[0] == "mass":
        return value - state.log_one_minus_b, rule[1]
    proxy = load_relation(relation.names[0] if rule[0] == "stellar" else rule[1])
    if rule[0] == "stellar":
        value = value + state.value_shift
    own = read_backwards(proxy, value, state.z, cosmos) if proxy.needs_prior else proxy.mean(value, state.z, cosmos)
    return own - state.log_one_minus_b, proxy.mass_def


def read_backwards(relation: Relation, y, z, cosmos: Cosmos) -> np.ndarray:
    """log10 mass, in the relation's definition, whose mean proxy is y; bisection between 7 and 16 to 1e-9."""
    low = np.full(np.broadcast_shapes(np.shape(y), np.shape(z)), 7.0)
    high = low + 9.0
    for _ in range(34):
        middle = 0.5 * (low + high)
        below = relation.mean(middle, z, cosmos) < y
        low, high = np.where(below, middle, low), np.where(below, high, middle)
    return 0.5 * (low + high)
