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
    """A redshift, with "phot" where it is photometric and "dist" where a distance rules."""
    text = number(value, 4)
    said = {"phot": " phot", "distance": " dist"}.get(kind, "")
    return text if text == NONE else text + said


def mass(spread: Spread) -> str:
    """log10 M200c with half its 16 to 84 % interval."""
    if not math.isfinite(spread.p50):
        return NONE
    half = (spread.p84 - spread.p16) / 2
    return f"{spread.p50:.1f} ±{half:.1f}" if half >= 0.05 else f"{spread.p50:.1f}"


def length(value: float) -> str:
    """A length in kpc."""
    return number(value, 0 if value >= 9.95 else 1)


def counted(n: int, what: str) -> str:
    """A number of things: 1 row, 3 rows."""
    return f"{n} {what}{'' if n == 1 else 's'}"


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


def notes(models: list[SightlineView]) -> list[str]:
    """What the rows of one burst say, each thing once; with the model's name where it is not true of all models."""
    said: dict[str, list[str]] = {}
    for each in models:
        for part in dict.fromkeys(p.strip().rstrip(".") for p in each.note.split(";")):
            if part:
                said.setdefault(part, []).append(each.model)
    everywhere = [part for part, names in said.items() if len(names) == len(models)]
    some = [f"{', '.join(names)}: {part}" for part, names in said.items() if len(names) < len(models)]
    return (["; ".join(everywhere)] if everywhere else []) + some


def with_dm(view: SightlineView) -> list[EntryView]:
    """Foreground entries that add DM in at least some draws, most first."""
    return [e for e in view.entries if e.dm.mean > 0 and not e.at_source]


def at_source(view: SightlineView) -> list[EntryView]:
    """Entries the burst sits in, outside the foreground sum."""
    return [e for e in view.entries if e.at_source]


def worth_a_line(view: SightlineView, most: int) -> list[EntryView]:
    """Foreground entries to show one by one: the two largest, and up to `most` with 1 % of all haloes' DM or more."""
    lines = with_dm(view)
    floor = 0.01 * sum(e.dm.mean for e in lines + at_source(view))
    large = sum(e.dm.mean >= floor for e in lines)
    return lines[: min(max(large, 2), most)]
