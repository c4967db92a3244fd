"""Numbers as text, the same on screen, in figures and in notebooks."""

from __future__ import annotations

import math

from haloledger.report.views import VISIBLE, EntryView, Settings, SightlineView, Spread

NONE = "-"  # what is not known, not determined or not assessed

CAUTION = (
    "The numbers rest on gas models that observations do not yet settle, on photometric redshifts and on incomplete "
    "catalogues: nothing found is not nothing there. Weigh them; they are no measurement of the gas."
)


MEAN_OUTSIDE = "a mean outside its 16 to 84 % range: most draws miss the halo, a few cross it"
FEW_DRAWS = 100
FIXED_RELATION = "moster2013"  # what a fixed run inverts where no relation is held
HELD_UNIT = {
    "relation": "stellar-to-halo relation",
    "zero_point": "dex",
    "hydrostatic_bias": "1-b",
    "kept": "dex",
    "membership": "0 is off",
    "mw_disc": "scale",
    "mw_halo": "pc cm-3",
    "host_rest": "pc cm-3, rest frame",
}


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
    """log10 M200c, median with half its 16 to 84 % interval; two decimals where it has none."""
    if not math.isfinite(spread.p50):
        return NONE
    half = (spread.p84 - spread.p16) / 2
    if half <= 0:
        return f"{spread.p50:.2f}"
    return f"{spread.p50:.1f} ±{half:.1f}" if half >= 0.05 else f"{spread.p50:.1f} ±<0.1"


def length(value: float) -> str:
    """A length in kpc."""
    return number(value, 0 if value >= 9.95 else 1)


def counted(n: int, what: str, several: str = "") -> str:
    """A number of things: 1 row, 3 rows; `several` where the plural is another."""
    return f"{n} {what if n == 1 else several or what + 's'}"


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
    """Reach, controls and verdict in one line, as far as they are known; "" where none was assessed."""
    verdict = f"verdict {view.verdict}{f' ({view.reasons})' if view.reasons else ''}" if view.verdict else ""
    reach = f"reach {percent(view.reach)}" if math.isfinite(view.reach) else ""
    controls = f"controls {number(view.control_p, 3)}" if math.isfinite(view.control_p) else ""
    return "   ".join(part for part in (reach, controls, verdict) if part)


def conditions(settings: Settings) -> list[str]:
    """What was held or switched off, and whether there are too few draws: to be read before the numbers."""
    lines = []
    if settings.fixed:
        relation = settings.held.get("relation", FIXED_RELATION)
        # Tinker et al. 2008 prior, 0.15 to 0.2 dex of scatter: the inversion alone is 0.42 to 0.67 dex too heavy
        much = " (by 0.5 dex at log M* = 11.3)" if relation == FIXED_RELATION else ""
        lines.append(
            f"fixed: no spread and no intervals. Halo masses from stellar masses: {relation} inverted without scatter "
            f"or prior, which is too heavy at the massive end{much}."
        )
    elif settings.draws is not None and settings.draws < FEW_DRAWS:
        lines.append(f"{counted(settings.draws, 'draw')}: intervals are rough. --draws 1000 for numbers to quote.")
    if settings.held:
        lines.append(f"held: {', '.join(_held(name, value) for name, value in settings.held.items())}")
    return lines


def _held(name: str, value: str) -> str:
    unit = HELD_UNIT.get(name, "")
    if name == "mw_halo" and not _is_number(value):
        unit = "law"
    return f"{name} = {value}{f' ({unit})' if unit else ''}"


def _is_number(value: str) -> bool:
    try:
        float(value)
    except ValueError:
        return False
    return True


def with_dm(view: SightlineView) -> list[EntryView]:
    """Foreground entries that add DM in at least some draws, by halo gas or a disc, most first."""
    return [e for e in view.entries if (e.dm.mean > 0 or e.disc.mean > 0) and not e.at_source]


def at_source(view: SightlineView) -> list[EntryView]:
    """Entries the burst sits in, outside the foreground sum."""
    return [e for e in view.entries if e.at_source]


def worth_a_line(view: SightlineView, most: int) -> list[EntryView]:
    """Foreground entries to show one by one: the two largest, up to `most` with 1 % of all haloes' DM or more, and
    those whose disc adds something."""
    lines = with_dm(view)
    floor = 0.01 * sum(e.dm.mean for e in lines + at_source(view))
    large = sum(e.dm.mean >= floor for e in lines)
    shown = lines[: min(max(large, 2), most)]
    return shown + [e for e in lines[len(shown) : most] if e.disc.mean >= VISIBLE]
