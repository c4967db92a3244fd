"""The result of an audit: two tables, what was refused, and all that is needed to run it again."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np

from haloledger.catalogs.canonical import Bursts, Refusal
from haloledger.gas.models import Model
from haloledger.ledger.columns import ENTRIES, SIGHTLINES, Column

COUNTS = ("n_haloes",)


@dataclass
class Ledgers:
    """Ledgers of all sightlines.

    sightlines   QTable, a row a burst and model
    entries      QTable, a row a burst, model and halo, then one row `shared` a ledger
    draws        DataFrame, a row a burst, model and universe: every budget term; None unless asked for
    entry_draws  DataFrame, a row a burst, model and halo: lists of log_m200c, impact_kpc and dm; None unless asked for
    run          what is needed to run it again
    """

    sightlines: Any  # QTable; astropy is imported when a table is made
    entries: Any
    bursts: Bursts
    models: list[Model]
    refused: list[Refusal]
    run: dict
    notes: list[str] = field(default_factory=list)
    footprints: list = field(default_factory=list)  # as given, for the pictures
    draws: Any = None
    entry_draws: Any = None

    def to_pandas(self):
        """The two tables as pandas DataFrames: (sightlines, entries)."""
        return self.sightlines.to_pandas(), self.entries.to_pandas()


def make_table(rows: list[dict], columns: list[Column]):
    """A QTable with units and meanings from rows of plain values; None and absent cells are masked."""
    from astropy.table import Column as PlainColumn
    from astropy.table import MaskedColumn, QTable

    made = []
    for column in columns:
        values = [row.get(column.name) for row in rows]
        mask = [v is None for v in values]
        unit = column.unit if column.unit not in ("", "text") else None
        about = {"name": column.name, "unit": unit, "description": column.meaning}
        data = _filled(values, column)
        made.append(MaskedColumn(data, mask=mask, **about) if any(mask) else PlainColumn(data, **about))
    return QTable(made)


def sightlines_table(rows: list[dict]):
    """The sightlines table."""
    return make_table(rows, SIGHTLINES)


def entries_table(rows: list[dict]):
    """The entries table."""
    return make_table(rows, ENTRIES)


def _filled(values: list, column: Column) -> np.ndarray:
    if column.unit == "text":
        return np.array(["" if v is None else str(v) for v in values], dtype=str)
    if column.name in COUNTS:
        return np.array([0 if v is None else int(v) for v in values], dtype=np.int64)
    return np.array([np.nan if v is None else float(v) for v in values], dtype=float)


def term_draws_frame(ledgers):
    """Budget terms draw by draw, a row a burst, model and universe; None where draws were not kept."""
    import pandas as pd

    kept = [x for x in ledgers if x.terms is not None]
    if not kept:
        return None
    frames = [
        pd.DataFrame(
            {"burst": x.burst, "model": x.model, "universe": np.arange(len(x.terms["dm_foreground"])), **x.terms}
        )
        for x in kept
    ]
    return pd.concat(frames, ignore_index=True)


def entry_draws_frame(ledgers):
    """Halo draws, a row a burst, model and halo, lists over universes; None where draws were not kept."""
    import pandas as pd

    kept = [row for x in ledgers if x.entry_draws is not None for row in x.entry_draws]
    asked = any(x.entry_draws is not None for x in ledgers)
    return pd.DataFrame(kept) if asked else None
