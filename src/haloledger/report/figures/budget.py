"""The budget as a staircase: each term starts where the last one ended; the observed DM is the line to reach."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes

from haloledger.report import text
from haloledger.report.figures.style import BURST, FAINT, INK, LEFT_OVER, QUIET
from haloledger.report.views import BUDGET, SightlineView

_COLOURS = {
    "dm_mw_disc": "#b9b9b9",
    "dm_mw_halo": "#8f8f8f",
    "dm_foreground": "#35608d",
    "dm_unlisted": "#6f9bc4",
    "dm_diffuse": "#e6c25a",
    "dm_at_source": "#7a5195",
    "dm_host_obs": "#b07aa1",
}


def draw_budget(axes: Axes, view: SightlineView) -> None:
    """One step a term by its mean (means add up), its 16 to 84 % interval drawn from the step's start."""
    reached, furthest, rows = 0.0, view.dm, 0
    for term, name in BUDGET.items():
        s = view.terms[term]
        mean = s.mean if np.isfinite(s.mean) else 0.0
        axes.barh(rows, mean, left=reached, height=0.62, color=_COLOURS[term], zorder=2)
        if np.isfinite(s.p16):
            for width, colour in ((3.0, "white"), (1.3, INK)):
                ends = [reached + s.p16, reached + s.p84]
                axes.plot(ends, [rows, rows], color=colour, linewidth=width, zorder=3, solid_capstyle="butt")
            furthest = max(furthest, reached + s.p84)
        _row_text(axes, rows, name, f"{text.dm(s.mean)}  ({text.dm_range(s)})" if s.known else text.NONE)
        axes.plot([reached + mean] * 2, [rows, rows + 1], color=QUIET, linewidth=0.7, zorder=1)
        reached += mean
        rows += 1
    lowest = _left_over(axes, view, reached, rows)
    furthest = max(furthest, reached)
    axes.axvline(view.dm, color=BURST, linewidth=1.6, zorder=4)
    axes.text(view.dm, -0.62, f"observed {view.dm:.0f}", color=BURST, ha="center", va="bottom", fontsize=8.8)
    axes.set(xlim=(min(0, lowest), 1.03 * furthest), ylim=(rows + 0.55, -0.6), yticks=[])
    axes.axvline(0, color=INK, linewidth=0.8)
    axes.spines["left"].set_visible(False)
    axes.set_xlabel("DM [pc cm⁻³]", fontsize=9)
    axes.tick_params(labelsize=8.5)


def _left_over(axes: Axes, view: SightlineView, reached: float, row: int) -> float:
    """From what the terms reach to the observed DM; backwards, and hatched, where they reach too far."""
    s = view.terms["dm_after_all"]
    if not s.known:
        _row_text(axes, row, "left over", "no redshift given")
        axes.axhspan(row - 0.31, row + 0.31, color=FAINT, alpha=0.35, zorder=0)
        return 0.0
    hatch = "////" if s.mean < 0 else ""
    axes.barh(
        row, s.mean, left=view.dm - s.mean, height=0.62, facecolor="white", edgecolor=LEFT_OVER, hatch=hatch, zorder=2
    )
    start = view.dm - s.mean
    axes.plot([start + s.p16, start + s.p84], [row, row], color=INK, linewidth=1.3, zorder=3)
    _row_text(axes, row, "left over", f"{text.dm(s.mean)}  ({text.dm_range(s)})", strong=True)
    return start + min(s.p16, 0)


def _row_text(axes: Axes, row: int, name: str, value: str, strong: bool = False) -> None:
    weight = "bold" if strong else "normal"
    beside = axes.get_yaxis_transform()
    axes.text(-0.02, row, name, ha="right", va="center", fontsize=8.8, fontweight=weight, transform=beside)
    axes.text(1.02, row, value, ha="left", va="center", fontsize=8.8, fontweight=weight, transform=beside)
