"""One sightline after the other: its haloes, its entries, its budget, for every model."""

from __future__ import annotations

import itertools
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from functools import cache

import numpy as np

from haloledger.catalogs.canonical import Bursts
from haloledger.cosmos.background import Cosmos
from haloledger.engine.universe import Universe
from haloledger.gas.models import Model
from haloledger.haloes.build import Haloes, mass_ceiling, point_mass
from haloledger.haloes.distances import point_redshift, z_floor
from haloledger.haloes.draws import relation_notes
from haloledger.haloes.table import rows
from haloledger.ledger.budget import Ends, budget
from haloledger.ledger.by_hand import OwnGas
from haloledger.ledger.crossing import Crossing, cross, join, with_burst_inside
from haloledger.ledger.disc_crossing import cross_discs, disc_notes
from haloledger.ledger.entries import halo_dm
from haloledger.ledger.kept import census_factor
from haloledger.ledger.nuisances import shared_columns
from haloledger.ledger.rows import Gas, entry_rows, sightline_row
from haloledger.reach.census import Census, take_census
from haloledger.reach.coverage import deepest_by_mass, place, reach_bounds
from haloledger.reach.diffuse import DiffuseWidth, solve_width
from haloledger.sightlines.draws import Sightline, directions, given_redshift, observed_dm
from haloledger.sightlines.host import is_host, odds_of_holding
from haloledger.sightlines.near import near_pairs
from haloledger.sightlines.redshift import redshift_from_dm
from haloledger.sightlines.terms import host_obs, host_rest, mw_disc, mw_halo

SIGMAS = 5.0
"""Localisation and centre errors are searched out to this many sigma."""
AT_ONCE = 400
"""Near haloes drawn at once; most turn out not to be met, and their draws are let go."""
DISC_KPC = 100.0
"""A disc may lie this far from a halo's drawn centre."""
LOCAL = "local"  # haloes of the built-in table: they say nothing of where catalogues look
LOCAL_Z = 0.012
"""Below it a distance taken from the redshift alone is poor (50 Mpc)."""


@dataclass(frozen=True)
class GasGround:
    """What is made once for a model: its census and the width of the diffuse term beside it."""

    model: Model
    census: Census
    census_factor: np.ndarray
    width: DiffuseWidth


@dataclass(frozen=True)
class Ground:
    """What all sightlines share."""

    bursts: Bursts
    haloes: Haloes
    near: list[np.ndarray]  # halo rows that could touch burst i
    widest_r200c: float  # the farthest boundary of all models
    gas: list[GasGround]
    footprints: list
    universe: Universe
    cosmos: Cosmos
    electrons: Callable[[float, float], float] | None
    shared: list[np.ndarray]
    deepest: np.ndarray  # redshift to which each mass bin of the census is listed
    source_in_sum: bool = False  # haloes that hold the burst count in its foreground sum
    own_gas: Mapping[str, OwnGas] = field(default_factory=dict)  # halo id -> gas set by hand


@dataclass(frozen=True)
class Ledger:
    """The ledger of one sightline and model, as rows; draws only where they were asked for."""

    burst: str
    model: str
    row: dict
    entries: list[dict]
    terms: dict[str, np.ndarray] | None
    entry_draws: list[dict] | None


def prepare(
    bursts: Bursts,
    haloes: Haloes,
    gas: list[Model],
    footprints: list,
    universe: Universe,
    cosmos: Cosmos,
    electrons,
    source_in_sum: bool = False,
    own_gas: Mapping[str, OwnGas] | None = None,
) -> Ground:
    """Everything that is made once: who is near whom, and each model's census."""
    own_gas = own_gas or {}
    listed = rows(haloes, np.flatnonzero((haloes.kind != LOCAL) & (haloes.p_member < 1)))
    models = [*gas, *(own.model for own in own_gas.values() if own.model is not None)]
    widest = max(m.boundary_r200c for m in models)
    return Ground(
        bursts=bursts,
        haloes=haloes,
        near=_near(bursts, haloes, widest, cosmos),
        widest_r200c=widest,
        gas=[_gas_ground(m, universe, cosmos) for m in gas],
        footprints=footprints,
        universe=universe,
        cosmos=cosmos,
        electrons=electrons,
        shared=shared_columns(universe),
        deepest=deepest_by_mass(point_mass(listed, cosmos), point_redshift(listed, cosmos)),
        source_in_sum=source_in_sum,
        own_gas=own_gas,
    )


def make_ledger(ground: Ground, i: int, keep_draws: bool = False) -> list[Ledger]:
    """The ledgers of burst i, one a model."""
    sightline, milky_way, note = _sightline(ground, i)
    index = ground.near[i]
    index = index[~is_host(ground.bursts, i, ground.haloes, index, ground.cosmos)]
    outside, said = place(sightline.ra_deg, sightline.dec_deg, ground.footprints)
    if outside and (ground.haloes.kind[index] != LOCAL).any():
        outside, said = False, "outside every footprint given, yet haloes are listed near: not all lists have one"
    note = [*note, said, *relation_notes(ground.haloes, index, ground.universe)]

    @cache
    def crossing_for(relation: str | float) -> Crossing:
        return _cross(ground, i, sightline, index, relation)

    ledgers = []
    for gas in ground.gas:
        crossing = crossing_for(gas.model.concentration)
        host, host_said = host_obs(ground.bursts, i, sightline.z, ground.universe, crossing.halo_modelled)
        dm, models = _halo_gas(ground, gas.model, crossing, crossing_for)
        discs = cross_discs(sightline, ground.haloes, crossing, ground.universe, ground.cosmos)
        in_sum = ~crossing.at_source | ground.source_in_sum
        held = Gas(np.where(in_sum, dm, 0.0), np.where(in_sum, 0.0, dm), discs.dm, models)
        notes = [*note, host_said, *disc_notes(ground.haloes, crossing, discs)]
        ends = Ends(*milky_way, host)
        ledgers.append(_one_model(ground, gas, sightline, ends, crossing, held, outside, notes, keep_draws))
    return ledgers


def _near(bursts: Bursts, haloes: Haloes, boundary_r200c: float, cosmos: Cosmos) -> list[np.ndarray]:
    z = z_floor(haloes, cosmos)
    reach_kpc = boundary_r200c * cosmos.r200c_kpc(mass_ceiling(haloes, cosmos), z) + SIGMAS * haloes.centre_err_kpc
    radius = np.degrees(np.arcsin(np.minimum(reach_kpc / cosmos.angular_distance_kpc(z), 1.0)))
    margin = SIGMAS * np.nan_to_num(bursts.loc_major_arcsec) / 3600
    burst, halo = near_pairs(bursts.ra_deg, bursts.dec_deg, margin, haloes.ra_deg, haloes.dec_deg, radius)
    latest = bursts.z + SIGMAS * np.nan_to_num(bursts.z_err) + 0.01 * (1 + bursts.z)
    in_front = ~(z[halo] > latest[burst])  # written so that a burst without redshift keeps all
    burst, halo = burst[in_front], halo[in_front]
    edges = np.searchsorted(burst, np.arange(len(bursts) + 1))
    return [halo[a:b] for a, b in itertools.pairwise(edges)]


def _gas_ground(model: Model, universe: Universe, cosmos: Cosmos) -> GasGround:
    census = take_census(model, cosmos, universe.seed)
    return GasGround(model, census, census_factor(model, universe, cosmos), solve_width(census, cosmos))


def _sightline(ground: Ground, i: int) -> tuple[Sightline, tuple[np.ndarray, np.ndarray], list[str]]:
    """Draws of the line itself, of the Milky Way's disc and halo, and what is said of them."""
    bursts, universe = ground.bursts, ground.universe
    disc, disc_said = mw_disc(bursts, i, universe, ground.electrons)
    halo, halo_said = mw_halo(bursts, i, universe)
    dm = observed_dm(bursts, i, universe)
    name = str(bursts.burst[i])
    note = [str(bursts.note[i])] if bursts.note[i] else []
    if np.isfinite(bursts.z[i]):
        z = given_redshift(bursts, i, universe)
    else:
        host, _ = _host_guess(bursts, i, universe)
        z = redshift_from_dm(name, dm, disc + halo, host, universe, ground.cosmos)
        note.append(f"redshift drawn from P(z | DM), median {np.median(z):.2f}: no residual is given")
    sightline = Sightline(
        burst=name,
        ra_deg=float(bursts.ra_deg[i]),
        dec_deg=float(bursts.dec_deg[i]),
        z_given=float(bursts.z[i]),
        dm_given=float(bursts.dm[i]),
        directions=directions(bursts, i, universe),
        z=z,
        dm=dm,
        loc_arcsec=float(np.nan_to_num(bursts.loc_major_arcsec[i])),
        note="",
    )
    return sightline, (disc, halo), [*note, disc_said, halo_said]


def _host_guess(bursts: Bursts, i: int, universe: Universe) -> tuple[np.ndarray, str]:
    """Host draws before the redshift is known; an observer-frame value is taken at z = 0."""
    rest, said = host_rest(bursts, i, universe)
    if np.isnan(rest).any():
        return host_obs(bursts, i, np.zeros(universe.n_draws), universe)
    return rest, said


def _cross(ground: Ground, i: int, sightline: Sightline, index: np.ndarray, relation) -> Crossing:
    """The haloes that the line meets in any draw, and the burst placed inside those it may sit in."""
    parts = []
    for start in range(0, max(len(index), 1), AT_ONCE):
        part = cross(sightline, ground.haloes, index[start : start + AT_ONCE], relation, ground.universe, ground.cosmos)
        parts.append(part.rows(np.flatnonzero(_met(part, ground.widest_r200c))))
    crossing = join(parts)
    odds = odds_of_holding(
        ground.bursts, i, ground.haloes, crossing.index, crossing.log_m200c, crossing.impact_kpc, ground.cosmos
    )
    return with_burst_inside(crossing, odds, sightline, ground.haloes, ground.universe)


def _met(crossing: Crossing, widest_r200c: float) -> np.ndarray:
    """Haloes whose gas, or whose galaxy's disc, the line may meet in some draw (n_haloes,) bool."""
    gas = crossing.own & (crossing.impact_r200c < widest_r200c)
    return np.any(gas | (crossing.impact_kpc < DISC_KPC), axis=1)


def _halo_gas(ground: Ground, model: Model, crossing: Crossing, crossing_for) -> tuple[np.ndarray, list[Model]]:
    """DM draws of all haloes (n_haloes, n_draws) and the model behind each: the ledger's, or one set by hand."""
    ids = ground.haloes.id[crossing.index]
    dm, models = halo_dm(crossing, ids, model, ground.universe, ground.cosmos), [model] * len(ids)
    for k in [k for k, name in enumerate(ids.tolist()) if str(name) in ground.own_gas]:
        own = ground.own_gas[str(ids[k])]
        if own.model is not None:
            one = crossing_for(own.model.concentration).rows(np.array([k]))
            dm[k], models[k] = halo_dm(one, ids[k : k + 1], own.model, ground.universe, ground.cosmos)[0], own.model
        dm[k] *= own.kept_factor
    return dm, models


def _one_model(
    ground: Ground,
    gas: GasGround,
    sightline: Sightline,
    ends: Ends,
    crossing: Crossing,
    held: Gas,
    outside: bool,
    note: list[str],
    keep_draws: bool,
) -> Ledger:
    ids, dm = ground.haloes.id[crossing.index], held.dm
    crossed = held.foreground > 0
    reach = reach_bounds(float(np.median(sightline.z)), gas.census, ground.deepest, outside)
    terms = budget(
        sightline,
        ends,
        held.foreground.sum(axis=0),
        held.at_source.sum(axis=0),
        held.disc.sum(axis=0),
        gas.census,
        gas.census_factor,
        gas.width,
        reach,
        ground.universe,
        ground.cosmos,
    )
    said = [*note, *_model_notes(gas, sightline)]
    row = sightline_row(
        sightline,
        gas.model,
        terms,
        int(crossed.any(axis=1).sum()),
        float(crossed.sum(axis=0).mean()),
        reach.known,
        said,
    )
    return Ledger(
        burst=sightline.burst,
        model=gas.model.name,
        row=row,
        entries=entry_rows(sightline, gas.model, ground.haloes, crossing, held, ground.shared),
        terms=terms if keep_draws else None,
        entry_draws=_entry_draws(sightline, gas.model, ids, crossing, dm) if keep_draws else None,
    )


def _model_notes(gas: GasGround, sightline: Sightline) -> list[str]:
    notes = []
    if np.isfinite(sightline.z_given) and gas.width.floored_at(sightline.z_given):
        notes.append(
            "haloes of this model alone spread as widely as the published total, so the diffuse term gets its least"
        )
    return notes


def _entry_draws(sightline, model, ids, crossing: Crossing, dm: np.ndarray) -> list[dict]:
    return [
        {
            "burst": sightline.burst,
            "model": model.name,
            "halo": str(ids[i]),
            "log_m200c": crossing.log_m200c[i],
            "impact_kpc": crossing.impact_kpc[i],
            "dm": dm[i],
        }
        for i in np.flatnonzero((dm > 0).any(axis=1))
    ]
