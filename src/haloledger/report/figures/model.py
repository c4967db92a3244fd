"""The picture of one halo model: its density, and its projection against the impact parameter."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
from matplotlib.figure import Figure
from matplotlib.ticker import FuncFormatter

from haloledger.report.figures.style import LINES, QUIET, STYLES, new_figure, short, styled

MASSES = (11.0, 12.0, 13.0, 14.0, 15.0)


def model_figure(model: Any, cosmos: Any, masses: Sequence[float] = MASSES, z: float = 0.1) -> Figure:
    """Density against radius and DM against impact parameter for haloes of log10 M200c `masses` at redshift `z`."""
    from haloledger.cosmos.concentration import concentration
    from haloledger.gas.projection import projection

    table = projection(model, cosmos)
    x = np.geomspace(0.01, model.boundary_r200c, 300)
    x[-1] *= 1 - 1e-9
    with styled():
        figure = new_figure(12.0, 5.4)
        left = figure.add_axes((0.075, 0.125, 0.40, 0.70))
        right = figure.add_axes((0.565, 0.125, 0.40, 0.70))
        for i, log_m in enumerate(masses):
            mass = np.array([float(log_m)])
            c200c = np.asarray(concentration(model.concentration, mass, np.array([z]), cosmos))
            r200c = np.asarray(cosmos.r200c_kpc(mass, np.array([z])))
            look = {"color": LINES[i % len(LINES)], "linestyle": STYLES[i % len(STYLES)], "linewidth": 1.8}
            look["label"] = f"{log_m:g}"
            left.loglog(x, np.ravel(model.density_cm3(x, mass, z, c200c, cosmos)), **look)
            dm = np.ravel(table.dm_rest(x, np.full(x.shape, mass[0]), z, c200c[0], r200c[0]))
            right.loglog(x * r200c, np.where(dm > 0, dm, np.nan), **look)
        left.axvline(model.boundary_r200c, color=QUIET, linewidth=0.8, linestyle=":")
        left.set(xlabel="r / r200c", ylabel="electron density [cm⁻³]")
        left.set_title("Density")
        right.set(xlabel="impact parameter [kpc]", ylabel="DM in the halo's rest frame [pc cm⁻³]")
        right.set_title(f"Projection inside the boundary ({model.boundary_r200c:g} r200c)")
        _limits(left)
        _limits(right)
        right.legend(title="log10 M200c [Msun]", frameon=False, fontsize=9, title_fontsize=9)
        figure.text(0.035, 0.945, short(model.name, 60), fontsize=15, fontweight="bold")
        figure.text(0.035, 0.9, f"{model.status}; {short(model.summary, 150)} (z = {z:g})", fontsize=9)
    return figure


def _limits(axes) -> None:
    """At most five decades: an edge where the gas ends must not press everything else flat."""
    values = np.concatenate([line.get_ydata()[:] for line in axes.lines if len(line.get_ydata()) > 2])
    top = np.nanmax(values[np.isfinite(values)])
    low = np.nanmin(values[np.isfinite(values) & (values > 0)])
    axes.set_ylim(max(low * 0.7, top * 1e-5), top * 2)
    for axis in (axes.xaxis, axes.yaxis):
        axis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:g}"))
    axes.grid(color="#ececec", linewidth=0.7)
    axes.set_axisbelow(True)
