"""The picture of one sightline: sky, entries, budget."""

from __future__ import annotations

from typing import Any

import numpy as np
from matplotlib.cm import ScalarMappable
from matplotlib.figure import Figure

from haloledger.report import text
from haloledger.report.figures.bars import bars, draw_bars
from haloledger.report.figures.budget import draw_budget
from haloledger.report.figures.sky import (
    SHOWN,
    SkyHalo,
    colour_norm,
    draw_sky,
    field_radius,
    in_degrees,
    second_view,
    sky_haloes,
    to_scale_on,
    zoom_radius,
)
from haloledger.report.figures.style import BURST, DETAIL, INK, QUIET, dm_colours, new_figure, short, styled
from haloledger.report.views import localisation, view, views

WIDE_ARCMIN = 150.0  # a half-width from which the field is labelled in degrees


def sightline_figure(ledgers: Any, burst: str, model: str | None = None, covered: Any = None) -> Figure:
    """Matplotlib figure of `burst` with `model` (None: the first one).

    `covered(ra_deg, dec_deg) -> bool array` shades the sky that the catalogues do not cover; by default what the
    footprints of the ledgers say, if there are any.
    """
    chosen = view(ledgers, burst, model)
    covered = covered or _covered_by(getattr(ledgers, "footprints", ()))
    others = [v for v in views(ledgers) if v.burst == burst and v.model != chosen.model]
    ellipse = localisation(ledgers, burst)
    numbered = text.worth_a_line(chosen, SHOWN) + text.at_source(chosen)[:2]
    haloes = sky_haloes(chosen, numbered)
    norm = colour_norm(haloes)
    with styled():
        figure = new_figure(13.0, 8.4)
        figure.text(0.035, 0.955, short(burst, 60), fontsize=16, fontweight="bold", gid="title")
        subtitle = f"{text.source(chosen)}   {text.place(chosen, ellipse)}".replace("cm-3", "cm⁻³")
        figure.text(0.035, 0.925, subtitle, fontsize=9.5, color=INK)
        _sky_panel(figure, haloes, ellipse, norm, _on_offsets(covered, chosen))
        right = figure.add_axes((0.575, 0.505, 0.40, 0.385))
        draw_bars(right, bars(chosen, others, numbered, norm))
        right.set_title("What each halo adds", pad=6)
        legend = "bar: mean   line: 16 to 84 %   tick: median"
        right.text(1, 1.02, legend, transform=right.transAxes, ha="right", fontsize=8.5, color=DETAIL)
        low = figure.add_axes((0.70, 0.085, 0.165, 0.315))
        draw_budget(low, chosen)
        figure.text(0.575, 0.432, f"Budget, model {short(chosen.model)}", fontsize=10.5, fontweight="bold")
        figure.text(0.035, 0.012, text.CAUTION, fontsize=7.2, color=QUIET)
    return figure


def _sky_panel(figure: Figure, haloes: list[SkyHalo], ellipse, norm, covered) -> None:
    radius = field_radius(haloes, ellipse)
    zoom = zoom_radius(haloes, radius)
    axes = figure.add_axes((0.07, 0.195, 0.44, 0.681), gid="sky")
    draw_sky(axes, haloes, ellipse, radius, norm, zoom=zoom, covered=covered)
    if zoom:
        second_view(axes, haloes, ellipse, radius, zoom, norm)
    wide = radius > WIDE_ARCMIN
    if wide:
        in_degrees(axes)
    unit = "deg" if wide else "arcmin"
    axes.set(xlabel=f"east offset [{unit}]", ylabel=f"north offset [{unit}]")
    axes.set_title("Boundaries of haloes, to scale", pad=6)
    region = "ellipse: 1 sigma region" if to_scale_on(ellipse, radius) else "cross: the burst, its region is smaller"
    axes.text(1, 1.012, region, transform=axes.transAxes, ha="right", fontsize=8.5, color=BURST)
    for spine in axes.spines.values():
        spine.set_visible(True)
    if any(h.number for h in haloes):
        _colour_bar(figure, norm)
    else:
        nothing = "no listed halo adds DM here"
        axes.text(0.5, 0.04, nothing, transform=axes.transAxes, ha="center", fontsize=10, color=DETAIL)


def _colour_bar(figure: Figure, norm) -> None:
    axes = figure.add_axes((0.11, 0.095, 0.36, 0.016))
    ticks = [t for d in range(-4, 5) for t in (10.0**d, 3 * 10.0**d) if norm.vmin <= t <= norm.vmax]
    figure.colorbar(ScalarMappable(norm, dm_colours()), cax=axes, orientation="horizontal", ticks=ticks)
    axes.set_xticks(ticks, [f"{t:g}" for t in ticks])
    axes.minorticks_off()
    axes.set_xlabel("mean DM of the halo [pc cm⁻³]; thin circles: near, little or nothing added", fontsize=8.8)
    axes.tick_params(labelsize=8)


def _covered_by(footprints: Any):
    """Test whether any of the footprints contains a place; None without footprints."""
    if not footprints:
        return None
    return lambda ra, dec: np.any([f.contains(ra, dec) for f in footprints], axis=0)


def _on_offsets(covered: Any, chosen):
    """Turn a test on RA and Dec into one on offsets [arcmin] from the burst."""
    if covered is None:
        return None
    from astropy import units as u
    from astropy.coordinates import SkyCoord

    centre = SkyCoord(chosen.ra, chosen.dec, unit="deg")

    def inside(east, north):
        angle, sep = np.arctan2(east, north), np.hypot(east, north)
        at = centre.directional_offset_by(angle * u.rad, sep * u.arcmin)
        return covered(at.ra.deg, at.dec.deg)

    return inside
