"""Entries as bars: mean, 16 to 84 % interval, median; the rest and the sums of all models below."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from matplotlib.axes import Axes

from haloledger.report import text
from haloledger.report.figures.style import DETAIL, FAINT, INK, QUIET, dm_colours, short
from haloledger.report.views import EntryView, SightlineView, Spread

LONGEST = 30  # characters of a name
HEIGHT = 0.4  # of a bar; the rest of a row is its label


@dataclass(frozen=True)
class Bar:
    """One row of the chart."""

    label: str
    spread: Spread
    colour: object
    details: tuple[str, ...] = ()  # from the fullest to the shortest: the first that fits is shown
    strong: bool = False


def bars(view: SightlineView, others: list[SightlineView], numbered: list[EntryView], norm) -> list[Bar]:
    """Rows: numbered entries, the rest together, and the sum with every model."""
    colours = dm_colours()
    rows = []
    for i, e in enumerate(numbered, start=1):
        colour = colours(norm(e.dm.mean)) if e.dm.mean > 0 else FAINT
        rows.append(Bar(f"{i}  {short(e.halo, LONGEST)}", e.dm, colour, _details(e)))
    rest = [e for e in text.with_dm(view) if e not in numbered]
    if rest:
        # only the mean of a sum can be had from entries
        together = Spread(mean=sum(e.dm.mean for e in rest))
        rows.append(Bar(f"{len(rest)} more", together, QUIET, ("sum of their means",)))
    rows.append(Bar(f"sum, {short(view.model)}", view.terms["dm_foreground"], INK, strong=True))
    rows += [Bar(f"sum, {short(o.model)}", o.terms["dm_foreground"], QUIET) for o in others]
    return rows


def _details(e: EntryView) -> tuple[str, ...]:
    """What is known of a halo, in full and then with less and less of it."""
    where = "at the source" if e.at_source else e.kind
    far = f"{text.number(e.impact_r200c, 2)} r200c"
    met = "not in the sum" if e.at_source else f"crossed {text.percent(e.p_crossed)}" if e.p_crossed < 0.995 else ""
    disc = "" if e.disc.zero else f"disc {text.dm(e.disc.mean)} besides"
    z, mass = f"z {text.redshift(e.z, e.z_kind)}", f"log M {text.number(e.log_m200c.p50)}"
    first = where if e.at_source else ""
    choices = (
        (where, z, mass, f"b {text.length(e.impact_kpc.p50)} kpc, {far}", met, disc),
        (first, z, mass, far, met, disc),
        (first, z, far, met, disc),
        (first, met, disc),
    )
    return tuple(", ".join(part for part in parts if part) for parts in choices)


def draw_bars(axes: Axes, rows: list[Bar]) -> None:
    """Horizontal bars, first row on top, each with its label above it; the axis is as long as the numbers need."""
    largest = max(v for r in rows for v in (r.spread.mean, r.spread.p84, 0.0) if np.isfinite(v))
    top = largest or 1.0
    axes.set(xlim=(0, top), ylim=(len(rows) - 0.6, -0.75), yticks=[])
    ends = [_row(axes, i, row, bool(largest)) for i, row in enumerate(rows)]
    # a number that starts at end/limit and takes the share w of the width fits if limit >= end / (1 - w)
    axes.set_xlim(0, max([1.02 * top, *(end / (1 - share) for end, share in ends)]))
    axes.spines["left"].set_color(INK)
    axes.set_xlabel("DM [pc cm⁻³]", fontsize=9)
    axes.tick_params(labelsize=8.5)


def _row(axes: Axes, i: int, row: Bar, any_dm: bool) -> tuple[float, float]:
    """Draw a row; where its number starts, and the share of the width that the number takes."""
    s = row.spread
    axes.barh(i, s.mean if np.isfinite(s.mean) else 0, height=HEIGHT, color=row.colour, alpha=0.85, zorder=2)
    if any_dm:
        whisker(axes, i, s)
    _label(axes, i, row)
    value = text.dm(s.mean) + (f"  ({text.dm_range(s)})" if s.spreads else "")
    end = max(v for v in (s.mean, s.p84, 0.0) if np.isfinite(v))
    number: dict[str, Any] = {"xy": (end, i), "xytext": (5, 0), "textcoords": "offset points"}
    shown = axes.annotate(value, **number, va="center", fontsize=8.8, fontweight=_weight(row))
    return end, min(_share_of_width(axes, shown) + 0.025, 0.9)


def _label(axes: Axes, i: int, row: Bar) -> None:
    above: dict[str, Any] = {"xy": (0, i - HEIGHT / 2), "xytext": (2, 3), "textcoords": "offset points"}
    label = axes.annotate(row.label, **above, va="baseline", fontsize=8.8, fontweight=_weight(row))
    beside: dict[str, Any] = {"xy": (1, 0), "xycoords": label, "xytext": (8, 1), "textcoords": "offset points"}
    room = 1 - _share_of_width(axes, label) - 0.025
    for detail in row.details:
        shown = axes.annotate(detail, **beside, va="bottom", fontsize=7.2, color=DETAIL)
        if _share_of_width(axes, shown) < room:
            return
        shown.remove()


def _share_of_width(axes: Axes, words: Any) -> float:
    renderer = axes.figure.canvas.get_renderer()  # type: ignore[union-attr, attr-defined]
    return float(words.get_window_extent(renderer).width / axes.get_window_extent(renderer).width)


def _weight(row: Bar) -> str:
    return "bold" if row.strong else "normal"


def whisker(axes: Axes, y: float, s: Spread) -> None:
    """The 16 to 84 % interval as a line and the median as a tick on it, readable on any bar."""
    if not s.spreads:
        return
    for width, colour in ((3.4, "white"), (1.5, INK)):
        axes.plot([s.p16, s.p84], [y, y], color=colour, linewidth=width, zorder=3, solid_capstyle="butt")
        axes.plot([s.p50, s.p50], [y - 0.15, y + 0.15], color=colour, linewidth=width, zorder=3, solid_capstyle="butt")
