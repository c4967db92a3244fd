"""The ledger as plain data for anything that shows it: one object a sightline and model, masked cells as NaN or "".

Screen, figures and notebook lay these out; the numbers are those of the tables.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from astropy.table import Table

from haloledger.errors import InputError
from haloledger.ledger.budget import EXTRA_TERMS, TERMS

SHARED = "shared"  # the row of `entries` that is no halo: what all haloes of a draw have in common

BUDGET = {  # terms that add up to the observed DM, in the order light meets them from us outward
    "dm_mw_disc": "Milky Way disc",
    "dm_mw_halo": "Milky Way halo",
    "dm_foreground": "foreground haloes, listed",
    "dm_disc_crossing": "discs of galaxies crossed",
    "dm_unlisted": "foreground haloes, unlisted",
    "dm_diffuse": "diffuse cosmic gas",
    "dm_at_source": "haloes at the source",
    "dm_host_obs": "host galaxy",
}
SOMETIMES = ("dm_disc_crossing", "dm_at_source")  # terms most sightlines do not have: shown where they are not zero
HOLDS_BURST = "the burst sits in this halo"  # so begins the note of such an entry
VISIBLE = 0.05  # pc cm-3: less is 0.0 in print


@dataclass(frozen=True)
class Spread:
    """Mean and quantiles of the draws; NaN where the table is masked."""

    mean: float = np.nan
    p16: float = np.nan
    p50: float = np.nan
    p84: float = np.nan

    @property
    def known(self) -> bool:
        return bool(np.isfinite(self.mean) or np.isfinite(self.p50))

    @property
    def zero(self) -> bool:
        """Nothing in any draw, or not known."""
        return not (self.known and (self.mean != 0 or self.p50 != 0))

    @property
    def spreads(self) -> bool:
        """Whether there is an interval: not where everything is fixed, nor where only a mean is known."""
        one_value = np.allclose([self.p16, self.p84], self.mean, rtol=1e-9, atol=1e-9)  # a mean rounds in its last bits
        return bool(np.isfinite(self.p16) and not one_value)

    @property
    def mean_outside(self) -> bool:
        """Whether the printed mean lies outside the printed interval."""
        return bool(self.mean > self.p84 + VISIBLE or self.mean < self.p16 - VISIBLE)


@dataclass(frozen=True)
class Settings:
    """How the ledgers were made, as far as a reader of the page has to know."""

    fixed: bool = False
    draws: int | None = None
    held: dict[str, str] = field(default_factory=dict)


@dataclass(frozen=True)
class EntryView:
    """One halo of one sightline and model."""

    halo: str
    kind: str
    ra: float
    dec: float
    z: float
    z_kind: str
    log_m200c: Spread
    impact_kpc: Spread
    impact_r200c: float
    sep_arcmin: float
    boundary_arcmin: float
    p_front: float
    p_crossed: float
    dm: Spread
    share: float
    note: str
    disc: Spread = Spread()

    @property
    def at_source(self) -> bool:
        """Whether the burst sits in this halo: it adds DM, but has no share of the foreground sum."""
        return bool(self.dm.mean > 0 and not np.isfinite(self.share))

    @property
    def holds_burst(self) -> bool:
        """Whether the burst sits in this halo, in the sum or not."""
        return self.at_source or HOLDS_BURST in self.note


@dataclass(frozen=True)
class SightlineView:
    """One burst and model: observed values, the terms of the budget, and the entries with most DM first."""

    burst: str
    model: str
    ra: float
    dec: float
    z: float
    dm: float
    n_haloes: int
    n_crossed: float
    reach: float
    control_p: float
    verdict: str
    reasons: str
    note: str
    terms: dict[str, Spread]
    entries: list[EntryView] = field(default_factory=list)

    @property
    def budget(self) -> dict[str, str]:
        """Terms to show, by name: all of BUDGET but those of SOMETIMES that are zero here."""
        return {t: name for t, name in BUDGET.items() if not (t in SOMETIMES and self.terms[t].zero)}


def settings(ledgers: Any) -> Settings:
    """What the run's record says of draws and of what was held."""
    options = ledgers.run.get("options", {})
    held = {str(name): str(value) for name, value in options.get("hold", {}).items()}
    return Settings(bool(options.get("fixed", False)), options.get("draws"), held)


def views(ledgers: Any) -> list[SightlineView]:
    """Every row of `sightlines` with its entries, in the order of the table."""
    table, columns = _plain(ledgers.sightlines)
    entries = _entries(ledgers.entries)
    return [_sightline(columns, i, entries) for i in range(len(table))]


def view(ledgers: Any, burst: str, model: str | None = None) -> SightlineView:
    """The sightline of `burst` with `model` (None: the first one); InputError with a near match for an unknown name."""
    every = [v for v in views(ledgers) if v.burst == burst]
    if not every:
        raise InputError(f"No burst '{burst}' in these ledgers.{near(burst, ledgers.sightlines['burst'])}")
    found = [v for v in every if model in (None, v.model)]
    if not found:
        raise InputError(f"No model '{model}' for {burst}.{near(model, [v.model for v in every])}")
    return found[0]


def near(name: Any, known: Any) -> str:
    """A sentence with the nearest known name, or with the names there are; starts with a blank."""
    import difflib

    names = [str(k) for k in dict.fromkeys(np.asarray(known).astype(str))]
    close = difflib.get_close_matches(str(name), names, n=1, cutoff=0.5)
    if close:
        return f" Did you mean '{close[0]}'?"
    return f" There are: {', '.join(names[:8])}{' ...' if len(names) > 8 else ''}."


def by_burst(every: list[SightlineView]) -> dict[str, list[SightlineView]]:
    """Views of one burst together, models in their order."""
    grouped: dict[str, list[SightlineView]] = {}
    for each in every:
        grouped.setdefault(each.burst, []).append(each)
    return grouped


def localisation(ledgers: Any, burst: str) -> tuple[float, float, float]:
    """Semi-axes [arcsec, 1 sigma] and position angle [deg, east of north]; NaN where not given."""
    at = np.flatnonzero(np.asarray(ledgers.bursts.burst).astype(str) == burst)
    if not at.size:
        return np.nan, np.nan, np.nan
    b = ledgers.bursts
    return tuple(float(a[at[0]]) for a in (b.loc_major_arcsec, b.loc_minor_arcsec, b.loc_pa_deg))  # type: ignore[return-value]


def _plain(table: Table) -> tuple[Table, dict[str, list]]:
    """Columns as lists of plain values: NaN for a masked number, "" for a masked text."""
    plain = Table(table)
    columns = {}
    for name in plain.colnames:
        column = plain[name]
        mask = np.asarray(getattr(column, "mask", np.zeros(len(column), bool)))
        values = np.ma.getdata(column)
        if values.dtype.kind in "OSU":
            columns[name] = ["" if m or v is None else str(v) for v, m in zip(values, mask, strict=True)]
        else:
            columns[name] = np.where(mask, np.nan, np.asarray(values, float)).tolist()
    return plain, columns


def _number(columns: dict[str, list], name: str, i: int) -> float:
    return columns[name][i] if name in columns else np.nan


def _text(columns: dict[str, list], name: str, i: int) -> str:
    return columns[name][i] if name in columns else ""


def _spread(columns: dict[str, list], name: str, i: int) -> Spread:
    return Spread(*(_number(columns, f"{name}_{s}", i) for s in ("mean", "p16", "p50", "p84")))


def _sightline(columns: dict[str, list], i: int, entries: dict[tuple[str, str], list[EntryView]]) -> SightlineView:
    burst, model = columns["burst"][i], columns["model"][i]
    cells: dict[str, Any] = {n: _number(columns, n, i) for n in ("ra", "dec", "z", "dm", "reach", "control_p")}
    cells |= {n: _text(columns, n, i) for n in ("verdict", "reasons", "note")}
    haloes = _number(columns, "n_haloes", i)
    return SightlineView(
        burst=burst,
        model=model,
        n_haloes=int(haloes) if np.isfinite(haloes) else 0,
        n_crossed=_number(columns, "n_crossed_mean", i),
        terms={term: _spread(columns, term, i) for term in TERMS + EXTRA_TERMS},
        entries=entries.get((burst, model), []),
        **cells,
    )


def _entries(table: Table) -> dict[tuple[str, str], list[EntryView]]:
    plain, columns = _plain(table)
    grouped: dict[tuple[str, str], list[EntryView]] = {}
    for i in range(len(plain)):
        if columns["halo"][i] != SHARED:
            grouped.setdefault((columns["burst"][i], columns["model"][i]), []).append(_entry(columns, i))
    for lines in grouped.values():
        lines.sort(key=lambda e: (-np.nan_to_num(e.dm.mean), np.nan_to_num(e.sep_arcmin, nan=np.inf)))
    return grouped


def _entry(columns: dict[str, list], i: int) -> EntryView:
    numbers = ("ra", "dec", "z", "impact_r200c", "sep_arcmin", "boundary_arcmin", "p_front", "p_crossed", "share")
    cells: dict[str, Any] = {n: _number(columns, n, i) for n in numbers}
    cells |= {n: _text(columns, n, i) for n in ("halo", "kind", "z_kind", "note")}
    return EntryView(
        log_m200c=_spread(columns, "log_m200c", i),
        impact_kpc=_spread(columns, "impact_kpc", i),
        dm=_spread(columns, "dm", i),
        disc=_spread(columns, "dm_disc_crossing", i),
        **cells,
    )
