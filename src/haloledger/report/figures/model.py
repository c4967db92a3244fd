"""The picture of one halo model: its density, and its projection against the impact parameter."""

from __future__ import annotations

from typing import Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.ticker import FuncFormatter

from haloledger.report.figures.style import LINES, QUIET, STYLES, new_figure, short, styled

DECADES = 1e5  # at most: an edge where the gas ends must not press everything else flat


def model_figure(curves: Any) -> Figure:
    """Density against radius and DM against impact parameter, of `haloledger.gas.curves.curves(model, ...)`."""
    model = curves.model
    with styled():
        figure = new_figure(12.0, 5.4)
        left = figure.add_axes((0.075, 0.125, 0.40, 0.70))
        right = figure.add_axes((0.565, 0.125, 0.40, 0.70))
        for i, log_m in enumerate(curves.log_m200c):
            look: dict[str, Any] = {"color": LINES[i % len(LINES)], "linestyle": STYLES[i % len(STYLES)]}
            look |= {"label": f"{log_m:g}", "linewidth": 1.8}
            left.loglog(curves.x, curves.density_cm3[i], **look)
            right.loglog(curves.impact_kpc[i], np.where(curves.dm_rest[i] > 0, curves.dm_rest[i], np.nan), **look)
        _frame(left, curves.density_cm3)
        _frame(right, curves.dm_rest)
        left.axvline(model.boundary_r200c, color=QUIET, linewidth=0.8, linestyle=":")
        left.set(xlabel="r / r200c", ylabel="electron density [cm⁻³]")
        left.set_title("Density")
        right.set(xlabel="impact parameter [kpc]", ylabel="DM in the halo's rest frame [pc cm⁻³]")
        right.set_title(f"Projection inside the boundary ({model.boundary_r200c:g} r200c)")
        right.legend(title="log10 M200c [Msun]", frameon=False, fontsize=9, title_fontsize=9)
        figure.text(0.035, 0.945, short(model.name, 60), fontsize=15, fontweight="bold")
        figure.text(0.035, 0.9, f"{model.status}; {short(model.summary, 150)} (z = {curves.z:g})", fontsize=9)
    return figure


def _frame(axes: Axes, values: np.ndarray) -> None:
    shown = values[np.isfinite(values) & (values > 0)]
    top, low = shown.max(initial=1e-12), shown.min(initial=np.inf)
    axes.set_ylim(max(low * 0.7, top / DECADES), top * 2)
    for axis in (axes.xaxis, axes.yaxis):
        axis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:g}"))
    axes.grid(color="#ececec", linewidth=0.7)
    axes.set_axisbelow(True)
