"""The budget as a staircase: each term starts where the last one ended; the observed DM is the line to reach."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes
from matplotlib.ticker import MaxNLocator

from haloledger.report import text
from haloledger.report.figures.style import BURST, FAINT, INK, LEFT_OVER, QUIET, same_minus
from haloledger.report.views import SightlineView, Spread

_COLOURS = {
    "dm_mw_disc": "#b9b9b9",
    "dm_mw_halo": "#8f8f8f",
    "dm_foreground": "#35608d",
    "dm_disc_crossing": "#4d9078",
    "dm_unlisted": "#6f9bc4",
    "dm_diffuse": "#e6c25a",
    "dm_at_source": "#7a5195",
    "dm_host_obs": "#b07aa1",
}


def rows(view: SightlineView) -> int:
    """Lines of the chart: the terms and what is left over."""
    return len(view.budget) + 1


def draw_budget(axes: Axes, view: SightlineView) -> None:
    """One step a term by its mean (means add up), its 16 to 84 % interval drawn from the step's start.

    What is left over is skewed, so it stands apart: its median as a bar from zero.
    """
    reached, ends, row = 0.0, [0.0, view.dm], 0
    for term, name in view.budget.items():
        s = view.terms[term]
        mean = s.mean if np.isfinite(s.mean) else 0.0
        axes.barh(row, mean, left=reached, height=0.62, color=_COLOURS[term], zorder=2)
        if s.spreads:
            interval(axes, row, reached + s.p16, reached + s.p84)
            ends += [reached + s.p16, reached + s.p84]
        _row_text(axes, row, name, with_range(s, s.mean) if s.known else text.NONE)
        axes.plot([reached + mean] * 2, [row, row + 0.5], color=QUIET, linewidth=0.7, zorder=1)
        reached += mean
        row += 1
    ends += [reached, *_left_over(axes, view, row)]
    low, high = min(ends), max(ends)
    margin = 0.03 * (high - low)
    axes.plot([view.dm, view.dm], [-0.6, row - 0.5], color=BURST, linewidth=1.6, zorder=4)
    axes.text(view.dm, -0.62, f"observed {view.dm:.0f}", color=BURST, ha="center", va="bottom", fontsize=8.8)
    axes.set(xlim=(low - margin if low < 0 else 0, high + margin), ylim=(row + 0.55, -0.6), yticks=[])
    axes.axhline(row - 0.5, color=FAINT, linewidth=0.8, zorder=0)
    axes.axvline(0, color=INK, linewidth=0.8)
    axes.spines["left"].set_visible(False)
    axes.xaxis.set_major_locator(MaxNLocator(4))
    same_minus(axes.xaxis)
    axes.set_xlabel("DM [pc cm⁻³]", fontsize=9)
    axes.tick_params(labelsize=8.5)


def interval(axes: Axes, row: float, low: float, high: float) -> None:
    """A line that is seen on any bar."""
    for width, colour in ((3.0, "white"), (1.3, INK)):
        axes.plot([low, high], [row, row], color=colour, linewidth=width, zorder=3, solid_capstyle="butt")


def with_range(s: Spread, value: float) -> str:
    """A value and the interval, if there is one."""
    return f"{text.dm(value)}  ({text.dm_range(s)})" if s.spreads else text.dm(value)


def _left_over(axes: Axes, view: SightlineView, row: int) -> list[float]:
    """Median and interval from zero, hatched where the terms reach beyond what was observed; its ends."""
    s = view.terms["dm_after_all"]
    if not s.known:
        _row_text(axes, row, "left over", "no redshift given")
        axes.axhspan(row - 0.31, row + 0.31, color=FAINT, alpha=0.35, zorder=0)
        return []
    hatch = "////" if s.p50 < 0 else ""
    axes.barh(row, s.p50, height=0.62, facecolor="white", edgecolor=LEFT_OVER, hatch=hatch, zorder=2, gid="left over")
    if s.spreads:
        interval(axes, row, s.p16, s.p84)
    _row_text(axes, row, "left over, median" if s.spreads else "left over", with_range(s, s.p50), strong=True)
    return [s.p16, s.p50, s.p84]


def _row_text(axes: Axes, row: int, name: str, value: str, strong: bool = False) -> None:
    weight = "bold" if strong else "normal"
    beside = axes.get_yaxis_transform()
    axes.text(-0.02, row, name, ha="right", va="center", fontsize=8.8, fontweight=weight, transform=beside)
    axes.text(1.02, row, value, ha="left", va="center", fontsize=8.8, fontweight=weight, transform=beside)
