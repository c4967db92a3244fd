"""The sky around a burst: every halo's boundary to scale, coloured by DM, and the localisation region.

Offsets are zenithal equidistant about the burst: separations from the burst are exact, so a circle holds the burst if
and only if the line crosses that halo (at median mass and position).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.colors import LogNorm
from matplotlib.patches import Circle, Ellipse, Rectangle
from matplotlib.ticker import FuncFormatter, MultipleLocator

from haloledger.report import text
from haloledger.report.figures.style import BURST, FAINT, INK, QUIET, dm_colours
from haloledger.report.views import EntryView, SightlineView

SHOWN = 8  # entries with a number on the sky and a bar of their own
ZOOM_WORTH = 6.0  # a second view is drawn where halos with DM are this much smaller than the field


@dataclass(frozen=True)
class SkyHalo:
    """A halo on the sky, arcmin from the burst; x grows to the east."""

    x: float
    y: float
    radius: float
    dm: float
    number: int  # place in the list of entries, 0 for those without a number

    @property
    def sep(self) -> float:
        return float(np.hypot(self.x, self.y))


def offsets(ra0: float, dec0: float, ra: np.ndarray, dec: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """East and north offsets [arcmin] from (ra0, dec0) [deg]; separation and direction are exact."""
    d0, d1, dra = np.radians(dec0), np.radians(dec), np.radians(np.asarray(ra) - ra0)
    east = np.cos(d1) * np.sin(dra)
    north = np.sin(d1) * np.cos(d0) - np.cos(d1) * np.sin(d0) * np.cos(dra)
    across = np.hypot(east, north)
    sep = np.arctan2(across, np.sin(d1) * np.sin(d0) + np.cos(d1) * np.cos(d0) * np.cos(dra))
    scale = np.degrees(sep) * 60 / np.where(across > 0, across, 1)
    return east * scale, north * scale


def sky_haloes(view: SightlineView, numbered: list[EntryView]) -> list[SkyHalo]:
    """Haloes with a place and a boundary, those in `numbered` carrying their place in that list."""
    number = {id(e): i + 1 for i, e in enumerate(numbered)}
    known = [e for e in view.entries if np.isfinite([e.ra, e.dec, e.boundary_arcmin]).all()]
    if not known:
        return []
    x, y = offsets(view.ra, view.dec, np.array([e.ra for e in known]), np.array([e.dec for e in known]))
    dm = [0.0 if np.isnan(e.dm.mean) else e.dm.mean for e in known]
    return [
        SkyHalo(float(x[i]), float(y[i]), e.boundary_arcmin, dm[i], number.get(id(e), 0)) for i, e in enumerate(known)
    ]


def field_radius(haloes: list[SkyHalo], ellipse: tuple[float, float, float]) -> float:
    """Half-width of the field [arcmin]: haloes that add 3 % or more in full, and the localisation region."""
    floor = 0.03 * sum(h.dm for h in haloes)
    wanted = [1.06 * (h.sep + h.radius) for h in haloes if h.number and h.dm >= floor]
    if not wanted:
        nearest = sorted(h.sep + h.radius for h in haloes)[:3]
        wanted = [5.0, *(1.06 * n for n in nearest)]
    if np.isfinite(ellipse[0]):
        wanted.append(2.5 * ellipse[0] / 60)
    return max([*wanted, 0.5])


def zoom_radius(haloes: list[SkyHalo], field: float) -> float | None:
    """Half-width [arcmin] of a second view on the small haloes with DM; None where one view shows all."""
    small = [1.1 * (h.sep + h.radius) for h in haloes if h.number and ZOOM_WORTH * (h.sep + h.radius) < field]
    return max(small) if small else None


def colour_norm(haloes: list[SkyHalo]) -> LogNorm:
    """Logarithmic colours over a factor of 20 to 300 in DM, as the numbered haloes need it."""
    values = [h.dm for h in haloes if h.number and h.dm > 0]
    top = max(values, default=1.0)
    return LogNorm(min(max(min(values, default=0.1), top / 300), top / 20) * 0.9, top * 1.1)


def draw_sky(
    axes: Axes,
    haloes: list[SkyHalo],
    ellipse: tuple[float, float, float],
    radius: float,
    norm: LogNorm,
    zoom: float | None = None,
    small: bool = False,
    covered: Callable[[np.ndarray, np.ndarray], np.ndarray] | None = None,
) -> None:
    """Draw the field of half-width `radius` [arcmin].

    zoom     half-width of the second view, which numbers what lies in it; small: this is that second view
    covered  (east, north) [arcmin] -> bool array: what the catalogues cover
    """
    colours = dm_colours()
    if covered is not None:
        _footprint(axes, radius, covered)
    for h in sorted(haloes, key=lambda h: -h.radius):
        if h.sep - h.radius > 1.5 * radius:
            continue
        colour = colours(norm(h.dm)) if h.dm > 0 else QUIET
        fill = (*colour[:3], 0.13) if h.number else "none"
        line = 1.8 if h.number else 0.7
        axes.add_patch(Circle((h.x, h.y), h.radius, facecolor=fill, edgecolor=colour, linewidth=line, gid="boundary"))
    _localisation(axes, ellipse, radius, small)
    # each halo has its number once: in the second view if that shows it whole
    numbered = [h for h in haloes if (h.sep + h.radius < (radius if small else zoom or 0)) == small]
    _numbers(axes, numbered, radius, colours, norm, small)
    axes.set(xlim=(radius, -radius), ylim=(-radius, radius), aspect="equal")


def to_scale_on(ellipse: tuple[float, float, float], radius: float) -> bool:
    """Whether the localisation region is large enough to be drawn on a field of half-width `radius` [arcmin]."""
    return bool(np.isfinite(ellipse[0]) and ellipse[0] / 60 > 0.012 * radius)


def _localisation(axes: Axes, ellipse: tuple[float, float, float], radius: float, small: bool) -> None:
    """The 1 sigma region to scale where it can be seen, and a cross that points at the burst."""
    major, minor, angle = ellipse
    to_scale = to_scale_on(ellipse, radius)
    if to_scale:
        minor = minor if np.isfinite(minor) else major
        angle = angle if np.isfinite(angle) else 0.0
        # an ellipse turns from +x, which is east here, towards +y, north; the position angle turns from north to east
        region = Ellipse(
            (0, 0), 2 * major / 60, 2 * minor / 60, angle=90 - angle, facecolor="none", edgecolor=BURST, linewidth=1.6,
            zorder=5, gid="localisation",
        )  # fmt: skip
        axes.add_patch(region)
    gap, reach = (0.0, 0.02) if to_scale else (0.018, 0.055)
    gap, reach = (gap, reach) if not small else (2 * gap, 2 * reach)
    for dx, dy in ((1, 0), (-1, 0), (0, 1), (0, -1)):
        xs, ys = [dx * gap * radius, dx * reach * radius], [dy * gap * radius, dy * reach * radius]
        axes.plot(xs, ys, color=BURST, linewidth=1.8, zorder=6, solid_capstyle="butt")


def _numbers(axes: Axes, haloes: list[SkyHalo], radius: float, colours, norm: LogNorm, small: bool) -> None:
    """The number of each halo at its centre; small ones are numbered at their edge, outside."""
    taken: list[tuple[float, float]] = [(0.0, 0.0)]
    clear = (0.17 if small else 0.062) * radius
    for h in sorted((h for h in haloes if h.number), key=lambda h: h.number):
        anchor = _anchor(h, radius)
        if anchor is None:
            continue
        x, y = _free_place(anchor, taken, clear, radius)
        taken.append((x, y))
        if np.hypot(x - anchor[0], y - anchor[1]) > 0.5 * clear:
            axes.plot([anchor[0], x], [anchor[1], y], color=INK, linewidth=0.6, zorder=6)
        dark = colours(norm(h.dm)) if h.dm > 0 else QUIET
        box = {"boxstyle": "circle,pad=0.22", "facecolor": "white", "edgecolor": dark, "linewidth": 1.1}
        axes.text(x, y, str(h.number), ha="center", va="center", fontsize=7.5 if small else 8.5, bbox=box, zorder=7)


def _anchor(h: SkyHalo, radius: float) -> tuple[float, float] | None:
    """Where a halo is numbered: its centre, or the place of it in view that is nearest to the centre; None outside."""
    edge = 0.94 * radius
    if max(abs(h.x), abs(h.y)) <= edge:
        return h.x, h.y
    turn = np.linspace(0, 2 * np.pi, 720, endpoint=False)
    x, y = h.x + 0.97 * h.radius * np.cos(turn), h.y + 0.97 * h.radius * np.sin(turn)
    seen = np.flatnonzero((abs(x) < edge) & (abs(y) < edge))
    if seen.size:
        middle = seen[np.argmin(np.hypot(x[seen], y[seen]))]
        return float(x[middle]), float(y[middle])
    held = float(np.clip(h.x, -edge, edge)), float(np.clip(h.y, -edge, edge))
    return held if np.hypot(held[0] - h.x, held[1] - h.y) < h.radius else None  # a halo that fills the whole view


def out_of_view(haloes: list[SkyHalo], radius: float) -> list[int]:
    """Numbers of the haloes that a field of half-width `radius` [arcmin] does not reach."""
    return sorted(h.number for h in haloes if h.number and _anchor(h, radius) is None)


def _free_place(
    at: tuple[float, float], taken: list[tuple[float, float]], clear: float, radius: float
) -> tuple[float, float]:
    """The place itself, or the nearest one on widening rings round it that no other number holds."""
    for ring in range(12):
        for turn in range(12 if ring else 1):
            angle = 2 * np.pi * turn / 12 + 0.4
            x, y = at[0] + ring * 0.8 * clear * np.cos(angle), at[1] + ring * 0.8 * clear * np.sin(angle)
            inside = max(abs(x), abs(y)) < 0.95 * radius
            if inside and all(np.hypot(x - a, y - b) > clear for a, b in taken):
                return x, y
    return at


def _footprint(axes: Axes, radius: float, covered: Callable[[np.ndarray, np.ndarray], np.ndarray]) -> None:
    """Shade what no listed catalogue covers."""
    side = np.linspace(-radius, radius, 200)
    east, north = np.meshgrid(side, side)
    inside = np.asarray(covered(east, north), float)
    axes.contourf(east, north, inside, levels=[-0.5, 0.5], colors=[FAINT], alpha=0.45, zorder=0)
    if 0 < inside.mean() < 1:
        axes.contour(east, north, inside, levels=[0.5], colors=[QUIET], linewidths=0.9, linestyles="--", zorder=0)


def emptiest_corner(haloes: list[SkyHalo], radius: float, size: float) -> tuple[float, float]:
    """Lower left corner, as a share of the axes, of the square of `size` that hides least of what matters."""
    turn = np.linspace(0, 2 * np.pi, 90, endpoint=False)
    hidden = {}
    for corner in ((1 - size, 0.0), (0.0, 0.0), (1 - size, 1 - size), (0.0, 1 - size)):
        count = 0.0
        for h in (h for h in haloes if h.number):
            x = np.append(h.x + h.radius * np.cos(turn), np.full(40, h.x))  # a centre weighs like half a circle
            y = np.append(h.y + h.radius * np.sin(turn), np.full(40, h.y))
            right, up = (radius - x) / (2 * radius), (y + radius) / (2 * radius)
            inside = (right > corner[0]) & (right < corner[0] + size) & (up > corner[1]) & (up < corner[1] + size)
            count += inside.sum()
        hidden[corner] = count
    return min(hidden, key=lambda c: hidden[c])


def second_view(
    axes: Axes,
    haloes: list[SkyHalo],
    ellipse: tuple[float, float, float],
    radius: float,
    zoom: float,
    norm: LogNorm,
) -> None:
    """The middle of the field, larger, in the emptiest corner."""
    size = 0.37
    corner = emptiest_corner(haloes, radius, size)
    inset = axes.inset_axes((corner[0] + 0.012, corner[1] + 0.012, size - 0.024, size - 0.024), zorder=8)
    draw_sky(inset, haloes, ellipse, zoom, norm, small=True)
    inset.set(xticks=[], yticks=[])
    inset.text(
        0.04, 0.955, f"middle, {text.angle(2 * zoom * 60)} wide", transform=inset.transAxes, fontsize=7.5, va="top"
    )
    for spine in inset.spines.values():
        spine.set_visible(True)
        spine.set_color(INK)
    outline = Rectangle((-zoom, -zoom), 2 * zoom, 2 * zoom, facecolor="none", edgecolor=INK, linewidth=0.8, zorder=4)
    axes.add_patch(outline)
    centre = (radius * (1 - 2 * (corner[0] + size / 2)), radius * (2 * (corner[1] + size / 2) - 1))
    x, y = np.sign(centre[0]) * zoom, np.sign(centre[1]) * zoom
    axes.plot([x, centre[0]], [y, centre[1]], color=INK, linewidth=0.7, zorder=4)


def in_degrees(axes: Axes) -> None:
    """Label a wide field in degrees; positions stay in arcmin."""
    for axis in (axes.xaxis, axes.yaxis):
        axis.set_major_locator(MultipleLocator(60 * _step(axes.get_ylim()[1] / 60)))
        axis.set_major_formatter(FuncFormatter(lambda arcmin, _: f"{arcmin / 60:g}"))


def _step(half_width: float) -> float:
    return next((s for s in (0.5, 1, 2, 5, 10, 20) if half_width / s < 5), 30)
