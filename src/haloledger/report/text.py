"""Numbers as text, the same on screen, in figures and in notebooks."""

from __future__ import annotations

import math

from haloledger.report.views import EntryView, SightlineView, Spread

NONE = "-"  # what is not known, not determined or not assessed

CAUTION = (
    "The numbers rest on gas models that observations do not yet settle, on photometric redshifts and on incomplete "
    "catalogues: nothing found is not nothing there. Weigh them; they are no measurement of the gas."
)


def number(value: float, decimals: int = 1) -> str:
    """A number with fixed decimals, "-" where it is not known; never "-0.0"."""
    if not math.isfinite(value):
        return NONE
    text = f"{value:.{decimals}f}"
    return text.removeprefix("-") if float(text) == 0 else text


def dm(value: float) -> str:
    """A DM: one decimal below 100, whole numbers above."""
    return number(value, 1 if abs(value) < 99.95 else 0)


def dm_range(spread: Spread) -> str:
    """The 16 to 84 % interval of a DM."""
    return f"{dm(spread.p16)} to {dm(spread.p84)}" if math.isfinite(spread.p16) else NONE


def percent(value: float) -> str:
    """A share as percent; small shares are not rounded to nothing."""
    if not math.isfinite(value):
        return NONE
    if 0 < value < 0.01:
        return "<1%"
    return f"{100 * value:.0f}%"


def redshift(value: float, kind: str = "") -> str:
    """A redshift with its kind where that is not a spectrum."""
    text = number(value, 4)
    return f"{text} {kind}" if kind in ("phot", "distance") and text != NONE else text


def mass(spread: Spread) -> str:
    """log10 M200c with half its 16 to 84 % interval."""
    if not math.isfinite(spread.p50):
        return NONE
    half = (spread.p84 - spread.p16) / 2
    return f"{spread.p50:.1f} ±{half:.1f}" if half >= 0.05 else f"{spread.p50:.1f}"


def length(value: float) -> str:
    """A length in kpc."""
    return number(value, 0 if value >= 9.95 else 1)


def angle(arcsec: float) -> str:
    """An angle in the unit a person would choose."""
    for unit, size in (("deg", 3600.0), ("arcmin", 60.0)):
        if arcsec >= size:
            return f"{arcsec / size:.3g} {unit}"
    return f"{arcsec:.2g} arcsec"


def place(view: SightlineView, ellipse: tuple[float, float, float]) -> str:
    """Position and localisation of a burst."""
    major, minor, _ = ellipse
    where = f"RA {view.ra:.4f}  Dec {view.dec:+.4f}"
    if not math.isfinite(major):
        return f"{where}  localisation not given"
    if not math.isfinite(minor):
        minor = major
    return f"{where}  localisation {angle(major)} x {angle(minor)} (1 sigma)"


def source(view: SightlineView) -> str:
    """Redshift and DM of a burst."""
    z = f"z {number(view.z, 4)}" if math.isfinite(view.z) else "z not given, drawn from P(z|DM)"
    return f"{z}   DM {view.dm:.1f} pc cm-3"


def judged(view: SightlineView) -> str:
    """Reach, controls and verdict in one line; says so where they were not assessed."""
    if not view.verdict and not math.isfinite(view.reach) and not math.isfinite(view.control_p):
        return f"reach {NONE}   controls {NONE}   verdict {NONE}   (not assessed)"
    verdict = f"{view.verdict or NONE}{f' ({view.reasons})' if view.reasons else ''}"
    return f"reach {percent(view.reach)}   controls {number(view.control_p, 3)}   verdict {verdict}"


def with_dm(view: SightlineView) -> list[EntryView]:
    """Entries that add DM in at least some draws, most first."""
    return [e for e in view.entries if e.dm.mean > 0 or e.dm.p84 > 0]
