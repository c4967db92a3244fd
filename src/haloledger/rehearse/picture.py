"""The P-P plot: share of true sums below each predicted share."""

from __future__ import annotations

from typing import Any

import numpy as np

from haloledger.rehearse.rehearsal import Rehearsal


def pp_figure(results: dict[str, Rehearsal]) -> Any:
    """Departure of the cumulative ranks from the diagonal, all lines and crossed ones, with the 95 per cent band."""
    from haloledger.report.figures.style import FAINT, LINES, STYLES, new_figure, styled

    with styled():
        figure = new_figure(9.5, 4.2)
        for k, (title, crossed_only) in enumerate((("all sightlines", False), ("predicted P(sum > 0) > 0.5", True))):
            axes = figure.add_subplot(1, 2, k + 1)
            grid = np.linspace(0, 1, 201)
            widest = 0.0
            for i, (name, result) in enumerate(results.items()):
                rank = result.rank[(result.sums > 0).mean(axis=1) > 0.5] if crossed_only else result.rank
                if not len(rank):
                    continue
                off = np.searchsorted(np.sort(rank), grid, side="right") / len(rank) - grid
                axes.plot(grid, off, color=LINES[i % len(LINES)], ls=STYLES[i % len(STYLES)], label=name)
                widest = max(widest, 1.96 * 0.5 / np.sqrt(len(rank)))
            band = 2 * widest * np.sqrt(grid * (1 - grid))
            axes.fill_between(grid, -band, band, color=FAINT, zorder=0)
            axes.axhline(0, color="black", lw=0.6)
            axes.set(title=title, xlabel="predicted share", ylabel="true share - predicted share")
            if k == 0:
                axes.legend(frameon=False, fontsize=8)
        figure.tight_layout()
    return figure
