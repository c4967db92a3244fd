"""The whole audit, from files to ledgers, reading as a table of contents."""

from __future__ import annotations

import logging
import sys
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from os import PathLike
from types import ModuleType
from typing import Any

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
LOG = logging.getLogger("haloledger")


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

    def __repr__(self) -> str:
        models = ", ".join(m.name for m in self.models)
        return f"Ledgers of {len(self.bursts)} bursts, {len(self.entries)} entries, models {models}"

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
    combine: str = "weighted",
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
    combine    masses of one halo from several catalogues: "weighted" by their errors, or by "precedence"
    progress   called with (done, total, what)
    Raises InputError, with what to do next, before any work where the input cannot be used.
    """
    options: dict[str, Any] = {
        "models": [str(m) for m in _several(models)],
        "draws": 1 if fixed else draws,
        "seed": seed,
        "cosmology": cosmology,
        "fixed": fixed,
        "hold": checked(hold or {}),
        "disc": disc,
        "local": local,
        "source_in_sum": source_in_sum,
        "combine": combine,
    }
    given: dict[str, list] = {
        "bursts": [bursts],
        "galaxies": _several(galaxies),
        "groups": _several(groups),
        "footprints": _several(footprints),
        "overrides": [] if overrides is None else [overrides],
    }
    _check_numbers(draws, seed)
    tell = progress or (lambda done, total, what: None)
    gas, cosmos, electrons = _models(options["models"]), named_cosmology(cosmology), electron_model(disc)
    universe = Universe(seed=seed, n_draws=draws, fixed=fixed, held=options["hold"])
    tell(0, 1, "reading")
    inputs = _read(given)
    own_models = {m: load_model(m) for m in inputs.overrides.models}
    tell(0, 1, "one list of haloes")
    hand = _by_hand(inputs, local, cosmos)
    sightlines = with_unknown_hosts(hand.bursts, [*hand.galaxies, *hand.groups])
    listed = _haloes(hand, local, combine, cosmos)
    haloes = with_member_discs(listed, sightlines, hand.galaxies, cosmos)
    LOG.info("%d haloes listed", len(listed))
    tell(0, 1, "tables of the halo models")
    own_gas = gas_by_hand(haloes, hand.rows, own_models)
    ground = prepare(sightlines, haloes, gas, inputs.footprints, universe, cosmos, electrons, source_in_sum, own_gas)
    LOG.info("%d pairs of sightline and near halo", sum(map(len, ground.near)))
    ledgers = _all_ledgers(ground, tell, keep_draws)
    run = run_record(options, given, [*gas, *(m for m in own_models.values() if m not in gas)], hand.record)
    return _gather(ledgers, inputs, hand, listed, gas, run)


def _several(given) -> list:
    """What was given as a list: one file, one table or one name alone counts as one."""
    if isinstance(given, str | PathLike) or hasattr(given, "columns"):
        return [given]
    return list(given)


def _models(names: list[str]) -> list[Model]:
    if not names:
        raise InputError("no halo model given. Write at least one --model, for instance --model blended.")
    models = [load_model(name) for name in names]
    for i, model in enumerate(models):
        if model.name in [other.name for other in models[:i]]:
            raise InputError(
                f"--model: '{model.name}' is given twice ({names[i]}). Leave one out, or give the file another `name`."
            )
    return models


def _by_hand(inputs: Inputs, local: bool, cosmos: Cosmos) -> ByHand:
    """The tables with the changes by hand made; the built-in nearest haloes, if wanted, are the first group table."""
    nearest = [local_groups()] if local else []
    groups = [*nearest, *inputs.groups]
    return apply_overrides(inputs.overrides, inputs.bursts, inputs.galaxies, groups, cosmos.luminosity_distance_mpc)


def _check_numbers(draws: int, seed: int) -> None:
    if not isinstance(draws, int) or draws < 1:
        raise InputError(f"--draws {draws}: at least one universe is needed. Write 1000, or use --fixed.")
    if not isinstance(seed, int) or seed < 0:
        raise InputError(f"--seed {seed}: seeds are whole numbers from 0 up. Write 1.")


def _haloes(hand: ByHand, local: bool, combine: str, cosmos: Cosmos) -> Haloes:
    """One list of haloes from the catalogues and, where none covers them, the nearest ones."""
    if local:
        nearest, *groups = hand.groups
        nearest = uncovered(nearest, hand.galaxies, groups, cosmos)
        haloes = with_local(hand.galaxies, groups, nearest, cosmos, combine)
    else:
        haloes = halo_list(hand.galaxies, hand.groups, cosmos, combine=combine)
    return haloes_by_hand(haloes, hand.rows, cosmos)


def _read(given: dict[str, list]) -> Inputs:
    return Inputs(
        bursts=read_bursts(given["bursts"][0]),
        galaxies=[read_galaxies(g) for g in given["galaxies"]],
        groups=[read_groups(g) for g in given["groups"]],
        footprints=[read_footprint(f) for f in given["footprints"]],
        overrides=read_overrides(given["overrides"][0] if given["overrides"] else None),
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
