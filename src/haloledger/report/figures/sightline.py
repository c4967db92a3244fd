"""The picture of one sightline: sky, entries, budget."""

from __future__ import annotations

from typing import Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.cm import ScalarMappable
from matplotlib.figure import Figure
from matplotlib.transforms import ScaledTranslation

from haloledger.report import text
from haloledger.report.figures.bars import bars, draw_bars
from haloledger.report.figures.budget import draw_budget
from haloledger.report.figures.budget import rows as budget_rows
from haloledger.report.figures.sky import (
    SHOWN,
    SkyHalo,
    colour_norm,
    draw_sky,
    field_radius,
    in_degrees,
    out_of_view,
    second_view,
    sky_haloes,
    to_scale_on,
    zoom_radius,
)
from haloledger.report.figures.style import BURST, DETAIL, INK, QUIET, dm_colours, new_figure, same_minus, short, styled
from haloledger.report.views import Settings, Spread, localisation, settings, view, views

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
    made = settings(ledgers)
    rows = bars(chosen, others, numbered, norm)
    with styled():
        page = Page(len(rows), budget_rows(chosen))
        figure = page.figure
        figure.text(page.x(0.455), page.y(0.38), short(burst, 60), fontsize=16, fontweight="bold", gid="title")
        subtitle = f"{text.source(chosen)}   {text.place(chosen, ellipse)}".replace("cm-3", "cm⁻³")
        figure.text(page.x(0.455), page.y(0.63), subtitle, fontsize=9.5, color=INK)
        _sky_panel(page, haloes, ellipse, norm, _on_offsets(covered, chosen))
        right = page.axes(7.475, 0.92, 5.2, page.bars_inch)
        draw_bars(right, rows)
        right.set_title("What each halo adds", pad=6)
        if not made.fixed:
            legend = "bar: mean   line: 16 to 84 %   tick: median"
            right.text(1, 1, legend, transform=_above(right, 5), ha="right", fontsize=8.5, color=DETAIL)
        top = 0.92 + page.bars_inch + 1.15
        low = page.axes(9.1, top, 2.15, page.budget_inch)
        draw_budget(low, chosen)
        means = "" if made.fixed else ": means, which add up"
        title = f"Budget, model {short(chosen.model)}{means}"
        figure.text(page.x(7.475), page.y(top - 0.32), title, fontsize=10.5, fontweight="bold")
        _foot(page, made, [bar.spread for bar in rows])
    return figure


class Page:
    """A figure measured in inches from its upper left corner; it grows downward with the rows it holds."""

    WIDTH = 13.0
    LEAST = 8.4

    def __init__(self, bars: int, budget: int) -> None:
        self.bars_inch = max(0.44 * bars + 0.1, 2.0)
        self.budget_inch = 0.33 * budget + 0.1
        self.height = max(self.LEAST, 0.92 + self.bars_inch + 1.15 + self.budget_inch + 0.9)
        self.figure = new_figure(self.WIDTH, self.height)

    def x(self, inch: float) -> float:
        """Share of the width at so many inches from the left."""
        return inch / self.WIDTH

    def y(self, inch: float) -> float:
        """Share of the height at so many inches from the top."""
        return 1 - inch / self.height

    def axes(self, left: float, top: float, width: float, height: float, **more: Any) -> Axes:
        """Axes of a size in inches."""
        place = (self.x(left), self.y(top + height), self.x(width), height / self.height)
        return self.figure.add_axes(place, **more)


def _above(axes: Axes, points: float):
    """Axes coordinates, moved up by so many points: a distance that does not grow with the panel."""
    return axes.transAxes + ScaledTranslation(0, points / 72, axes.figure.dpi_scale_trans)


def _foot(page: Page, made: Settings, spreads: list[Spread]) -> None:
    """What was held, how to read a mean beyond its interval, and the caution."""
    lines = text.conditions(made)
    if any(s.mean_outside for s in spreads):
        lines.append(text.MEAN_OUTSIDE)
    for i, line in enumerate([text.CAUTION, *reversed(lines)]):
        page.figure.text(
            page.x(0.455), (0.1 + 0.17 * i) / page.height, line, fontsize=7.2, color=QUIET if i == 0 else DETAIL
        )


def _sky_panel(page: Page, haloes: list[SkyHalo], ellipse, norm, covered) -> None:
    radius = field_radius(haloes, ellipse)
    zoom = zoom_radius(haloes, radius)
    axes = page.axes(0.91, 1.04, 5.72, 5.72, gid="sky")
    draw_sky(axes, haloes, ellipse, radius, norm, zoom=zoom, covered=covered)
    if zoom:
        second_view(axes, haloes, ellipse, radius, zoom, norm)
    wide = radius > WIDE_ARCMIN
    same_minus(axes.xaxis)
    same_minus(axes.yaxis)
    if wide:
        in_degrees(axes)
    unit = "deg" if wide else "arcmin"
    axes.set(xlabel=f"east offset [{unit}]", ylabel=f"north offset [{unit}]")
    axes.set_title("Boundaries of haloes, to scale", pad=6)
    region = "ellipse: 1 sigma region" if to_scale_on(ellipse, radius) else "cross: the burst, its region is smaller"
    axes.text(1, 1.012, region, transform=axes.transAxes, ha="right", fontsize=8.5, color=BURST)
    for spine in axes.spines.values():
        spine.set_visible(True)
    below: dict[str, Any] = {"transform": axes.transAxes, "fontsize": 8.5, "color": DETAIL}
    outside = out_of_view(haloes, radius)
    if outside:
        axes.text(1, -0.065, f"outside this view: {', '.join(map(str, outside))}", ha="right", va="top", **below)
    if any(h.number for h in haloes):
        _colour_bar(page, norm)
    else:
        axes.text(0.5, 0.04, "no listed halo adds DM here", ha="center", **below | {"fontsize": 10})


def _colour_bar(page: Page, norm) -> None:
    axes = page.axes(1.43, 7.42, 4.68, 0.135)
    ticks = [t for d in range(-4, 5) for t in (10.0**d, 3 * 10.0**d) if norm.vmin <= t <= norm.vmax]
    page.figure.colorbar(ScalarMappable(norm, dm_colours()), cax=axes, orientation="horizontal", ticks=ticks)
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
