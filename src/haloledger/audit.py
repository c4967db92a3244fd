"""The whole audit, from files to ledgers, reading as a table of contents."""

from __future__ import annotations

import sys
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from types import ModuleType

from haloledger.catalogs import read_bursts, read_footprint, read_galaxies, read_groups
from haloledger.catalogs.canonical import Bursts, Galaxies, Groups
from haloledger.cosmos.background import cosmology as named_cosmology
from haloledger.engine.universe import Universe
from haloledger.errors import InputError
from haloledger.gas.models import Model, load_model
from haloledger.haloes.build import Haloes, halo_list
from haloledger.ledger.ledgers import Ledgers as LedgerTables
from haloledger.ledger.ledgers import entries_table, entry_draws_frame, sightlines_table, term_draws_frame
from haloledger.ledger.nuisances import checked
from haloledger.ledger.sightline_ledger import Ground, Ledger, make_ledger, prepare
from haloledger.report.run_record import run_record
from haloledger.sightlines.electron_model import electron_model

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
    keep_draws: bool = False,
    progress: Progress | None = None,
) -> Ledgers:
    """Ledgers of all bursts against all catalogues.

    bursts, galaxies, groups, footprints  files as on the command line ("[CARD:]FILE"), or tables in memory
    models     names of halo models, or paths of model files
    draws      number of universes; `fixed` makes it one and switches every spread and nuisance off
    hold       nuisance name -> value: fixes one global nuisance
    disc       Milky Way disc where the table gives none: "plane", or a published electron model ("ne2001", "ne2025")
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
    inputs = _read(bursts, galaxies, groups, footprints)
    tell(0, 1, "one list of haloes")
    haloes = halo_list(inputs.galaxies, inputs.groups, cosmos)
    tell(0, 1, "tables of the halo models")
    ground = prepare(inputs.bursts, haloes, gas, inputs.footprints, universe, cosmos, electrons)
    ledgers = _all_ledgers(ground, tell, keep_draws)
    options = {
        "models": [str(m) for m in models],
        "draws": universe.n_draws,
        "seed": seed,
        "cosmology": cosmology,
        "fixed": fixed,
        "hold": dict(universe.held),
        "disc": disc,
    }
    given = {"bursts": [bursts], "galaxies": galaxies, "groups": groups, "footprints": footprints}
    return _gather(ledgers, inputs, haloes, gas, run_record(options, given, gas))


def _check_numbers(draws: int, seed: int, models: Sequence[str]) -> None:
    if draws < 1:
        raise InputError(f"--draws {draws}: at least one universe is needed. Write 1000, or use --fixed.")
    if seed < 0:
        raise InputError(f"--seed {seed}: seeds are whole numbers from 0 up. Write 1.")
    if not models:
        raise InputError("no halo model given. Write at least one --model, for instance --model blended.")


def _read(bursts, galaxies, groups, footprints) -> Inputs:
    return Inputs(
        bursts=read_bursts(bursts),
        galaxies=[read_galaxies(g) for g in galaxies],
        groups=[read_groups(g) for g in groups],
        footprints=[read_footprint(f) for f in footprints],
    )


def _all_ledgers(ground: Ground, tell: Progress, keep_draws: bool) -> list[Ledger]:
    total = len(ground.bursts)
    ledgers: list[Ledger] = []
    for i in range(total):
        tell(i, total, "sightlines")
        ledgers.extend(make_ledger(ground, i, keep_draws))
    tell(total, total, "sightlines")
    return ledgers


def _gather(ledgers: list[Ledger], inputs: Inputs, haloes: Haloes, gas: list[Model], run: dict) -> Ledgers:
    catalogues: list[Galaxies | Groups] = [*inputs.galaxies, *inputs.groups]
    refused = [*inputs.bursts.refused, *(r for c in catalogues for r in c.refused)]
    notes = [*inputs.bursts.notes, *(n for c in catalogues for n in c.notes), *haloes.notes]
    return Ledgers(
        sightlines=sightlines_table([ledger.row for ledger in ledgers]),
        entries=entries_table([row for ledger in ledgers for row in ledger.entries]),
        bursts=inputs.bursts,
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
