"""Where a catalogue has looked: IVOA MOC maps and polygon outlines.

A polygon's corners are joined by great circles and its inside is the smaller part of the sky. It is laid on a plane by
Lambert's equal-area projection around its middle, whose only seam is the point opposite: no trouble at RA 0 or a pole.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, Protocol

import numpy as np

from haloledger.catalogs.files import stem
from haloledger.errors import InputError

STEP_DEG = 0.5  # corners are filled in to this spacing: a chord then leaves its great circle by less than 0.01 degree


class Footprint(Protocol):
    """An area on the sky."""

    @property
    def label(self) -> str:
        """Stem of the file."""

    def contains(self, ra_deg: Any, dec_deg: Any) -> np.ndarray:
        """bool, shape of ra_deg: inside or not; degrees ICRS, any RA (-30 is 330)."""


@dataclass(frozen=True)
class MocFootprint:
    """A multi-order coverage map (IVOA standard MOC)."""

    label: str
    moc: Any = field(repr=False)

    def contains(self, ra_deg: Any, dec_deg: Any) -> np.ndarray:
        """bool, shape of ra_deg: inside or not; degrees ICRS."""
        import astropy.units as u

        ra, dec = np.broadcast_arrays(np.asarray(ra_deg, dtype=float), np.asarray(dec_deg, dtype=float))
        flat = self.moc.contains_lonlat(np.ravel(ra % 360.0) * u.deg, np.ravel(dec) * u.deg)
        return np.asarray(flat, dtype=bool).reshape(ra.shape)

    @property
    def sky_fraction(self) -> float:
        """Share of the sky inside."""
        return float(self.moc.sky_fraction)


@dataclass(frozen=True)
class PolygonFootprint:
    """One or more outlines on the sphere; a point in any of them is inside."""

    label: str
    middles: list[np.ndarray] = field(repr=False)  # unit vectors: centre of each projection
    shapes: list[Any] = field(repr=False)  # shapely polygons on the projected planes

    def contains(self, ra_deg: Any, dec_deg: Any) -> np.ndarray:
        """bool, shape of ra_deg: inside or not; degrees ICRS, any RA."""
        import shapely

        ra, dec = np.broadcast_arrays(np.asarray(ra_deg, dtype=float), np.asarray(dec_deg, dtype=float))
        inside = np.zeros(ra.shape, dtype=bool)
        points = _unit(ra, dec)
        for middle, shape in zip(self.middles, self.shapes, strict=True):
            x, y = _lambert(points, middle)
            inside |= shapely.contains_xy(shape, x, y)
        return inside

    @property
    def sky_fraction(self) -> float:
        """Share of the sky inside (the projection keeps areas); outlines that overlap count twice."""
        return float(sum(shape.area for shape in self.shapes) / (4 * np.pi))


def read_footprint(path: str | Path) -> Footprint:
    """The footprint in a file: MOC (FITS) or polygon (text: RA Dec in degrees a line, a blank line between outlines).

    Raises InputError where the file is absent, neither of the two, or an outline with fewer than three corners.
    """
    path = Path(path)
    if not path.is_file():
        raise InputError(f"{path}: no such file. Give a MOC in FITS or a text file of RA Dec in degrees.")
    head = path.open("rb").read(9)
    if not head:
        raise InputError(f"{path}: is empty. Give a MOC in FITS or a text file of RA Dec in degrees.")
    return _read_moc(path) if head == b"SIMPLE  =" else _read_polygon(path)


def _read_moc(path: Path) -> MocFootprint:
    from mocpy import MOC

    try:
        moc = MOC.from_fits(str(path))
    except Exception as fault:  # mocpy raises many kinds
        raise InputError(
            f"{path}: is FITS but no coverage map ({(str(fault) or type(fault).__name__).splitlines()[0]})."
            " Give a MOC, or a text file of RA Dec in degrees."
        ) from None
    if moc.empty():
        raise InputError(f"{path}: the coverage map holds no cell. Give the map of the catalogue, or leave it out.")
    return MocFootprint(stem(path).removesuffix(".moc"), moc)


def _read_polygon(path: Path) -> PolygonFootprint:
    outlines: list[list[tuple[float, float]]] = [[]]
    try:
        lines = path.read_text(encoding="utf-8-sig").splitlines()
    except UnicodeDecodeError:
        raise InputError(f"{path}: is neither a MOC in FITS nor text. Give one of the two.") from None
    for number, line in enumerate(lines, start=1):
        text = line.split("#", 1)[0].replace(",", " ").strip()
        if not text:
            if not line.strip() and outlines[-1]:
                outlines.append([])
            continue
        corner = _corner(path, number, text, first=not any(outlines))
        if corner:
            outlines[-1].append(corner)
    outlines = [o for o in outlines if o]
    if not outlines:
        raise InputError(f"{path}: no corner found. Write RA Dec in degrees, a corner a line.")
    built = [_project(path, np.array(outline)) for outline in outlines]
    return PolygonFootprint(stem(path), [middle for middle, _ in built], [shape for _, shape in built])


def _corner(path: Path, number: int, text: str, first: bool) -> tuple[float, float] | None:
    """(RA, Dec) of a line; None for a line of column names above the first corner."""
    cells = text.split()
    try:
        ra, dec = float(cells[0]), float(cells[1])
    except (ValueError, IndexError):
        if first and len(cells) == 2 and cells[0].lower().startswith("ra"):
            return None
        raise InputError(f"{path}: line {number}: found '{text[:40]}'. Write RA and Dec in degrees.") from None
    if not (-360 <= ra <= 720 and -90 <= dec <= 90):
        raise InputError(f"{path}: line {number}: found RA {ra:g}, Dec {dec:g}. Write degrees, Dec from -90 to 90.")
    return ra, dec


def _project(path: Path, corners: np.ndarray) -> tuple[np.ndarray, Any]:
    """(middle, polygon on the plane around it) of an outline; corners (n, 2) in degrees."""
    import shapely

    vectors = _unit(corners[:, 0], corners[:, 1])
    if np.allclose(vectors[0], vectors[-1], atol=1e-12):
        vectors = vectors[:-1]
    if len(vectors) < 3:
        raise InputError(f"{path}: an outline with {len(vectors)} corners. Write at least three, a corner a line.")
    border = _fill_in(vectors)
    middle = border.mean(axis=0)
    if np.linalg.norm(middle) < 0.05:
        raise InputError(
            f"{path}: the outline goes around half the sky, so its inside is not clear. Give a MOC instead."
        )
    middle = middle / np.linalg.norm(middle)
    shape = shapely.Polygon(np.column_stack(_lambert(border, middle)))
    if not shape.is_valid:
        shape = shapely.make_valid(shape)  # an outline that touches or crosses itself
    shapely.prepare(shape)
    return middle, shape


def _fill_in(vectors: np.ndarray) -> np.ndarray:
    """Points along the great circles between corners, at most STEP_DEG apart; shapes (n, 3) -> (m, 3)."""
    parts = []
    for a, b in zip(vectors, np.roll(vectors, -1, axis=0), strict=True):
        angle = np.arctan2(np.linalg.norm(np.cross(a, b)), (a * b).sum())
        n = max(1, int(np.ceil(np.degrees(angle) / STEP_DEG)))
        t = np.arange(n)[:, None] / n
        if angle < 1e-9:
            parts.append(a[None, :])
            continue
        parts.append((np.sin((1 - t) * angle) * a + np.sin(t * angle) * b) / np.sin(angle))
    return np.concatenate(parts)


def _unit(ra_deg: np.ndarray, dec_deg: np.ndarray) -> np.ndarray:
    ra, dec = np.radians(ra_deg), np.radians(dec_deg)
    return np.stack([np.cos(dec) * np.cos(ra), np.cos(dec) * np.sin(ra), np.sin(dec)], axis=-1)


def _lambert(points: np.ndarray, middle: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Equal-area plane coordinates around `middle`: x, y = sqrt(2 / (1 + cos)) times the tangent components."""
    pole = np.array([0.0, 0.0, 1.0]) if abs(middle[2]) < 0.9 else np.array([1.0, 0.0, 0.0])
    east = np.cross(pole, middle)
    east = east / np.linalg.norm(east)
    north = np.cross(middle, east)
    cosine = (points * middle).sum(axis=-1)
    scale = np.sqrt(2.0 / np.maximum(1.0 + cosine, 1e-12))
    return scale * (points * east).sum(axis=-1), scale * (points * north).sum(axis=-1)
