"""Entries as bars: mean, 16 to 84 % interval, median; the rest and the sums of all models below."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from matplotlib.axes import Axes

from haloledger.report import text
from haloledger.report.figures.style import DETAIL, FAINT, INK, QUIET, dm_colours, short
from haloledger.report.views import EntryView, SightlineView, Spread

HEIGHT = 0.4  # of a bar; the rest of a row is its label


@dataclass(frozen=True)
class Bar:
    """One row of the chart."""

    label: str
    spread: Spread
    colour: object
    detail: str = ""
    strong: bool = False


def bars(view: SightlineView, others: list[SightlineView], numbered: list[EntryView], norm) -> list[Bar]:
    """Rows: numbered entries, the rest together, and the sum with every model."""
    colours = dm_colours()
    rows = []
    for i, e in enumerate(numbered, start=1):
        colour = colours(norm(e.dm.mean)) if e.dm.mean > 0 else FAINT
        rows.append(Bar(f"{i}  {short(e.halo, 22)}", e.dm, colour, _detail(e)))
    rest = [e for e in text.with_dm(view) if e not in numbered]
    if rest:
        # only the mean of a sum can be had from entries
        rows.append(Bar(f"{len(rest)} more", Spread(mean=sum(e.dm.mean for e in rest)), QUIET, "sum of their means"))
    rows.append(Bar(f"sum, {short(view.model)}", view.terms["dm_foreground"], INK, "", strong=True))
    rows += [Bar(f"sum, {short(o.model)}", o.terms["dm_foreground"], QUIET) for o in others]
    return rows


def _detail(e: EntryView) -> str:
    parts = [
        "at the source" if e.at_source else e.kind,
        f"z {text.redshift(e.z, e.z_kind)}",
        f"log M {text.number(e.log_m200c.p50)}",
    ]
    parts.append(f"b {text.length(e.impact_kpc.p50)} kpc, {text.number(e.impact_r200c, 2)} r200c")
    if e.at_source:
        parts.append("not in the sum")
    elif e.p_crossed < 0.995:
        parts.append(f"crossed {text.percent(e.p_crossed)}")
    return ", ".join(p for p in parts if p)


def draw_bars(axes: Axes, rows: list[Bar]) -> None:
    """Horizontal bars, first row on top, each with its label above it."""
    largest = max(v for r in rows for v in (r.spread.mean, r.spread.p84, 0.0) if np.isfinite(v))
    top = largest or 1.0
    for i, row in enumerate(rows):
        s = row.spread
        axes.barh(i, s.mean if np.isfinite(s.mean) else 0, height=HEIGHT, color=row.colour, alpha=0.85, zorder=2)
        if largest:
            whisker(axes, i, s)
        _labels(axes, i, row, top)
    axes.set(xlim=(0, 1.34 * top), ylim=(len(rows) - 0.6, -0.75), yticks=[])
    axes.spines["left"].set_color(INK)
    axes.set_xlabel("DM [pc cm⁻³]", fontsize=9)
    axes.tick_params(labelsize=8.5)


def _labels(axes: Axes, i: int, row: Bar, top: float) -> None:
    weight = "bold" if row.strong else "normal"
    above: dict[str, Any] = {"xy": (0, i - HEIGHT / 2), "xytext": (2, 3), "textcoords": "offset points"}
    label = axes.annotate(row.label, **above, va="baseline", fontsize=8.8, fontweight=weight)
    if row.detail:
        beside: dict[str, Any] = {"xy": (1, 0), "xycoords": label, "xytext": (8, 1), "textcoords": "offset points"}
        axes.annotate(row.detail, **beside, va="bottom", fontsize=7.2, color=DETAIL)
    s = row.spread
    value = text.dm(s.mean) + (f"  ({text.dm_range(s)})" if np.isfinite(s.p16) else "")
    end = max(v for v in (s.mean, s.p84, 0.0) if np.isfinite(v))
    axes.text(end + 0.015 * top, i, value, va="center", fontsize=8.8, fontweight=weight)


def whisker(axes: Axes, y: float, s: Spread) -> None:
    """The 16 to 84 % interval as a line and the median as a tick on it, readable on any bar."""
    if not np.isfinite(s.p16):
        return
    for width, colour in ((3.4, "white"), (1.5, INK)):
        axes.plot([s.p16, s.p84], [y, y], color=colour, linewidth=width, zorder=3, solid_capstyle="butt")
        axes.plot([s.p50, s.p50], [y - 0.15, y + 0.15], color=colour, linewidth=width, zorder=3, solid_capstyle="butt")
