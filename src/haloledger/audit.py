"""The whole audit, from files to ledgers, reading as a table of contents."""

from __future__ import annotations

import sys
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from types import ModuleType

from haloledger.catalogs import read_bursts, read_footprint, read_galaxies, read_groups
from haloledger.catalogs.by_hand import ByHand, apply_overrides
from haloledger.catalogs.canonical import Bursts, Galaxies, Groups
from haloledger.catalogs.local_volume import local_groups
from haloledger.catalogs.overrides import Overrides, read_overrides
from haloledger.cosmos.background import Cosmos
from haloledger.cosmos.background import cosmology as named_cosmology
from haloledger.engine.universe import Universe
from haloledger.errors import InputError
from haloledger.gas.models import Model, load_model
from haloledger.haloes.build import Haloes, halo_list
from haloledger.ledger.by_hand import gas_by_hand, haloes_by_hand
from haloledger.ledger.ledgers import Ledgers as LedgerTables
from haloledger.ledger.ledgers import entries_table, entry_draws_frame, sightlines_table, term_draws_frame
from haloledger.ledger.nuisances import checked
from haloledger.ledger.sightline_ledger import Ground, Ledger, make_ledger, prepare
from haloledger.report.run_record import run_record
from haloledger.sightlines.electron_model import electron_model
from haloledger.sightlines.host import with_unknown_hosts
from haloledger.sightlines.local import uncovered, with_local
from haloledger.sightlines.members import with_member_discs

Progress = Callable[[int, int, str], None]


class Ledgers(LedgerTables):
    """The result of an audit, with its faces: files, picture, notebook."""

    def write(self, folder, format: str = "ecsv", figures: bool = False) -> None:
        """Write the tables into `folder`; `figures` adds a picture a sightline."""
        from haloledger.report.write import write

        write(self, folder, format, figures)

    def plot(self, burst: str, model: str | None = None):
        """Matplotlib figure of one sightline: sky, entries, budget."""
        from haloledger.report.figures import sightline_figure

        return sightline_figure(self, burst, model or self.models[0].name)

    def _repr_html_(self) -> str:
        from haloledger.report.notebook import html

        return html(self)


@dataclass(frozen=True)
class Inputs:
    """Everything that was read."""

    bursts: Bursts
    galaxies: list[Galaxies]
    groups: list[Groups]
    footprints: list
    overrides: Overrides


def audit(
    bursts,
    galaxies: Sequence = (),
    groups: Sequence = (),
    footprints: Sequence = (),
    models: Sequence[str] = ("blended",),
    draws: int = 1000,
    seed: int = 1,
    cosmology: str = "Planck18",
    fixed: bool = False,
    hold: Mapping[str, str] | None = None,
    disc: str = "plane",
    overrides=None,
    local: bool = True,
    source_in_sum: bool = False,
    keep_draws: bool = False,
    progress: Progress | None = None,
) -> Ledgers:
    """Ledgers of all bursts against all catalogues.

    bursts, galaxies, groups, footprints  files as on the command line ("[CARD:]FILE"), or tables in memory
    models     names of halo models, or paths of model files
    draws      number of universes; `fixed` makes it one and switches every spread and nuisance off
    hold       nuisance name -> value: fixes one global nuisance
    disc       Milky Way disc where the table gives none: "plane", or a published electron model ("ne2001", "ne2025")
    overrides  changes by hand: a TOML file, or a list of dictionaries with its keys
    local      the nearest large haloes from the built-in table, where no catalogue given covers them
    source_in_sum  haloes that the burst sits in count in the foreground sum
    progress   called with (done, total, what)
    Raises InputError, with what to do next, before any work where the input cannot be used.
    """
    _check_numbers(draws, seed, models)
    tell = progress or (lambda done, total, what: None)
    gas = [load_model(m) for m in models]
    universe = Universe(seed=seed, n_draws=draws, fixed=fixed, held=checked(hold or {}))
    cosmos = named_cosmology(cosmology)
    electrons = electron_model(disc)
    tell(0, 1, "reading")
    inputs = _read(bursts, galaxies, groups, footprints, overrides)
    own_models = {m: load_model(m) for m in inputs.overrides.models}
    tell(0, 1, "one list of haloes")
    hand = apply_overrides(
        inputs.overrides,
        inputs.bursts,
        inputs.galaxies,
        [*([local_groups()] if local else []), *inputs.groups],
        cosmos.luminosity_distance_mpc,
    )
    haloes = _haloes(hand, local, cosmos)
    tell(0, 1, "tables of the halo models")
    sightlines = with_unknown_hosts(hand.bursts, [*hand.galaxies, *hand.groups])
    own_gas = gas_by_hand(haloes, hand.rows, own_models)
    haloes = with_member_discs(haloes, sightlines, hand.galaxies, cosmos)
    footprints_read = inputs.footprints
    ground = prepare(sightlines, haloes, gas, footprints_read, universe, cosmos, electrons, source_in_sum, own_gas)
    ledgers = _all_ledgers(ground, tell, keep_draws)
    options = {
        "models": [str(m) for m in models],
        "draws": universe.n_draws,
        "seed": seed,
        "cosmology": cosmology,
        "fixed": fixed,
        "hold": dict(universe.held),
        "disc": disc,
        "local": local,
        "source_in_sum": source_in_sum,
    }
    given = {"bursts": [bursts], "galaxies": galaxies, "groups": groups, "footprints": footprints}
    given["overrides"] = [] if overrides is None else [overrides]
    run = run_record(options, given, [*gas, *(m for m in own_models.values() if m not in gas)])
    return _gather(ledgers, inputs, hand, haloes, gas, run | ({"by_hand": hand.record} if hand.record else {}))


def _check_numbers(draws: int, seed: int, models: Sequence[str]) -> None:
    if draws < 1:
        raise InputError(f"--draws {draws}: at least one universe is needed. Write 1000, or use --fixed.")
    if seed < 0:
        raise InputError(f"--seed {seed}: seeds are whole numbers from 0 up. Write 1.")
    if not models:
        raise InputError("no halo model given. Write at least one --model, for instance --model blended.")


def _haloes(hand: ByHand, local: bool, cosmos: Cosmos) -> Haloes:
    """One list of haloes from the catalogues and, where none covers them, the nearest ones."""
    if local:
        nearest, *groups = hand.groups
        nearest = uncovered(nearest, hand.galaxies, groups, cosmos)
        haloes = with_local(hand.galaxies, groups, nearest, cosmos)
    else:
        haloes = halo_list(hand.galaxies, hand.groups, cosmos)
    return haloes_by_hand(haloes, hand.rows, cosmos)


def _read(bursts, galaxies, groups, footprints, overrides) -> Inputs:
    return Inputs(
        bursts=read_bursts(bursts),
        galaxies=[read_galaxies(g) for g in galaxies],
        groups=[read_groups(g) for g in groups],
        footprints=[read_footprint(f) for f in footprints],
        overrides=read_overrides(overrides),
    )


def _all_ledgers(ground: Ground, tell: Progress, keep_draws: bool) -> list[Ledger]:
    total = len(ground.bursts)
    ledgers: list[Ledger] = []
    for i in range(total):
        tell(i, total, "sightlines")
        ledgers.extend(make_ledger(ground, i, keep_draws))
    tell(total, total, "sightlines")
    return ledgers


def _gather(
    ledgers: list[Ledger], inputs: Inputs, hand: ByHand, haloes: Haloes, gas: list[Model], run: dict
) -> Ledgers:
    catalogues: list[Galaxies | Groups] = [*inputs.galaxies, *inputs.groups]
    refused = [*inputs.bursts.refused, *(r for c in catalogues for r in c.refused), *hand.refused]
    notes = [*inputs.bursts.notes, *(n for c in catalogues for n in c.notes), *haloes.notes, *hand.notes]
    return Ledgers(
        sightlines=sightlines_table([ledger.row for ledger in ledgers]),
        entries=entries_table([row for ledger in ledgers for row in ledger.entries]),
        bursts=hand.bursts,
        models=gas,
        refused=refused,
        run=run,
        notes=list(dict.fromkeys(notes)),
        footprints=inputs.footprints,
        draws=term_draws_frame(ledgers),
        entry_draws=entry_draws_frame(ledgers),
    )


class _Callable(ModuleType):
    """The package's main function and this module share the name `haloledger.audit`: calling the module audits."""

    def __call__(self, *args, **kwargs) -> Ledgers:
        return audit(*args, **kwargs)


sys.modules[__name__].__class__ = _Callable
