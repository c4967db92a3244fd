"""From a raw table to our columns in our units, through a card or by our own names. No row is judged here."""

from __future__ import annotations

import re
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from haloledger.catalogs.cards.card import Card, Drop, NativeColumn
from haloledger.catalogs.density_names import density_columns
from haloledger.catalogs.frames import to_heliocentric
from haloledger.catalogs.nativeunits import SHARE, carries_h, factor, parse, split_h
from haloledger.catalogs.raw import RawColumn, RawTable
from haloledger.catalogs.schema import FIELDS, Field, did_you_mean, near
from haloledger.errors import InputError

# log10 shift to Chabrier. Chabrier and Kroupa relative to Salpeter are 0.61 and 0.66: Madau & Dickinson 2014, ARA&A 52,
# 415, section 3 (from memory). Diet Salpeter: the middle of -0.15 to -0.19 (from memory).
IMF_TO_CHABRIER = {"Chabrier": 0.0, "Kroupa": -0.034, "Salpeter": -0.215, "diet Salpeter": -0.17}


@dataclass
class Prepared:
    """Our columns, shape (n,), of the rows that are left after the card's drop rules."""

    file: str
    label: str
    kind: str
    card: Card  # a bare table gets one with the defaults
    bare: bool
    row_number: np.ndarray  # 1-based row of the file
    columns: dict[str, np.ndarray]  # floats with NaN, or texts with ""
    not_numbers: dict[str, dict[int, str]]  # ours -> index into the arrays -> the text found instead
    notes: list[str]

    def __len__(self) -> int:
        return len(self.row_number)

    def number(self, name: str) -> np.ndarray:
        """A copy of a numeric column; NaN everywhere where the table has none."""
        return self.columns[name].copy() if name in self.columns else np.full(len(self), np.nan)

    def text(self, name: str) -> np.ndarray:
        """A text column; "" everywhere where the table has none."""
        return self.columns[name] if name in self.columns else np.full(len(self), "", dtype=str)


# ---- tables with our own column names -------------------------------------------------------------------------------


def prepare_bare(raw: RawTable, kind: str) -> Prepared:
    """A table that uses our names. InputError where a required column is absent or a unit does not convert."""
    fields = FIELDS[kind]
    found = _match_names(raw, kind)
    _refuse_h_names(raw, kind, found)
    notes = _unknown_names(raw, kind, found)
    columns: dict[str, np.ndarray] = {}
    bad: dict[str, dict[int, str]] = {}
    for ours, native in found.items():
        column = raw.columns[native]
        if fields[ours].text:
            columns[ours] = column.texts()
            continue
        values, wrong = column.numbers()
        columns[ours] = values * _bare_factor(raw.file, native, column.unit, fields[ours], values)
        if wrong:
            bad[ours] = wrong
    for native in density_columns(raw.columns) if kind == "galaxies" else []:
        values, wrong = raw.columns[native].numbers()
        columns[native] = values
        if wrong:
            bad[native] = wrong
    card = Card(raw.label, kind, "", "", "from memory", Path(raw.file), {})
    return Prepared(raw.file, raw.label, kind, card, True, np.arange(1, raw.n + 1), columns, bad, notes)


def _match_names(raw: RawTable, kind: str) -> dict[str, str]:
    """ours -> native: the same name, or the same but for capitals."""
    by_lower: dict[str, str] = {}
    for native in raw.columns:
        by_lower.setdefault(native.lower(), native)
    found = {ours: ours if ours in raw.columns else by_lower[ours] for ours in FIELDS[kind] if ours in by_lower}
    if kind == "bursts" and "burst" not in found and "name" in by_lower:
        found["burst"] = by_lower["name"]
    may_lack = set()
    if kind == "groups" and {"sigma_v", "richness", "lx"} & set(found) and "log_mass" not in found:
        may_lack = {"log_mass", "mass_def"}  # a proxy stands in
    if "distance_mpc" in found or (kind == "galaxies" and density_columns(raw.columns)):
        may_lack.add("z")
    for ours, spec in FIELDS[kind].items():
        if spec.required and ours not in found and ours not in may_lack:
            _refuse_h_names(raw, kind, found)
            raise InputError(_lacks(raw, kind, ours, spec, found))
    return found


def _lacks(raw: RawTable, kind: str, ours: str, spec: Field, found: dict[str, str]) -> str:
    free = [c for c in raw.columns if c not in found.values()]
    alike = near(ours, free, 0.5) or near(spec.what.split(",")[0], free, 0.7)
    hint = f" Did you mean '{alike}'? {_renaming(alike, ours, spec)}" if alike else ""
    shown = ", ".join(list(raw.columns)[:15]) + (" ..." if len(raw.columns) > 15 else "")
    if ours == "mass_def":
        return (
            f"{raw.file}: a mass without definition: there is log_mass but no column 'mass_def' ({shown})."
            f" Add 'mass_def' with 200c, 500c, 200m, 180m or vir in each row.{hint}"
        )
    hint = hint or f" Add it ({spec.what}{', ' + spec.unit if spec.unit else ''}), or name the card: CARD:FILE."
    return f"{raw.file}: no column '{ours}' for {kind} among {shown}.{hint}"


_MASS_WORD = r"(ass|_?star|_?stellar|_?halo|_?vir|_?(200|500|180)[cm]?)"
_H_WORD = r"(_?/h|_?h-1|_?hinv|_h(_?-?1|70|100|inv)?|_over_h|_per_h|_littleh)"
_H_NAME = re.compile(rf"^(log(10)?_?m{_MASS_WORD}?|(halo_|stellar_)?m{_MASS_WORD}){_H_WORD}$", re.I)


def _renaming(native: str, ours: str, spec: Field) -> str:
    """What to do with a column of another name: renaming alone would keep an h, or a mass that is not a logarithm."""
    if re.search(r"/\s*h|h\s*\^?-1|_h\b", native):
        return (
            f"It carries h: take log10 of the mass divided by h and name it '{ours}', or read the file through a card."
        )
    if spec.log and "log" not in native.lower():
        return f"Take its log10 and name it '{ours}', or read the file through a card (CARD:FILE)."
    return "Rename it, or read the file through a card (CARD:FILE)."


def _refuse_h_names(raw: RawTable, kind: str, found: dict[str, str]) -> None:
    for native in raw.columns:
        if native not in found.values() and _H_NAME.match(native):
            ours = "log_mass" if kind == "groups" else near(native, FIELDS[kind], 0.5) or "log_mstar"
            raise InputError(
                f"{raw.file}: column '{native}' looks like a mass that carries h. Write log10 of the mass in Msun,"
                f" no h (Msun = (Msun/h) / h) in a column '{ours}', or describe the file with a card."
            )


def _unknown_names(raw: RawTable, kind: str, found: dict[str, str]) -> list[str]:
    if kind == "bursts" and "dm_host" in {c.lower() for c in raw.columns}:
        raise InputError(
            f"{raw.file}: column 'dm_host': rest or observed frame? Name it 'dm_host_rest' (at the source) or"
            " 'dm_host_obs' (divided by 1+z)."
        )
    free = [ours for ours in FIELDS[kind] if ours not in found]
    notes = []
    density = density_columns(raw.columns) if kind == "galaxies" else []
    for native in raw.columns:
        if native not in found.values() and native not in density:
            alike = near(native, free, 0.8) or _shares_word(native, free)
            if alike and kind == "bursts":  # a lost localisation or error would change every number, unseen
                raise InputError(
                    f"{raw.file}: column '{native}' is not one of ours. Did you mean '{alike}'?"
                    " Rename it, or leave it out."
                )
            if alike:
                notes.append(f"{raw.label}: column '{native}' is not used. Did you mean '{alike}'?")
    return notes


def _shares_word(native: str, free: list[str]) -> str:
    """A column of ours with a long word in common: 'pos_major' and 'loc_major_arcsec'."""
    words = {w for w in native.lower().split("_") if len(w) > 4}
    return next((ours for ours in free if words & set(ours.split("_"))), "")


def _bare_factor(file: str, native: str, unit: str, spec: Field, values: np.ndarray) -> float:
    """What brings the column to our unit; InputError where its unit says something else."""
    if not unit:
        return 1.0
    mass_like = spec.log or spec.unit in ("Mpc", "1e44 erg/s")
    if mass_like and carries_h(unit):
        raise InputError(
            f"{file}: column '{native}' is in '{unit}', which carries h. Divide by h (Msun/h -> Msun, Mpc/h -> Mpc) and"
            f" write '{spec.unit}', or describe the file with a card."
        )
    if spec.log or spec.unit == "dex":
        return _log_factor(file, native, unit, spec)
    ours = spec.unit or "a pure number"
    try:
        parsed = parse(unit)
    except ValueError:
        raise InputError(
            f"{file}: column '{native}' is in '{unit}', a unit astropy does not know. Write it in {ours}."
        ) from None
    if parsed is None:
        return 1.0
    import astropy.units as u

    if spec.unit == "mag":
        if str(parsed) in ("mag", "mag(AB)", "mag(ST)", "mag(Vega)") or parsed.is_equivalent(u.mag):
            return 1.0
        raise InputError(
            f"{file}: column '{native}' is in '{unit}', which does not convert to mag. Write apparent magnitudes."
        )
    if spec.unit == "" and parsed.is_equivalent(u.km / u.s):
        raise InputError(f"{file}: column '{native}' is in '{unit}', which does not convert to a redshift. Write v/c.")
    try:
        return factor(unit, spec, np.nan)
    except (ValueError, TypeError):
        raise InputError(
            f"{file}: column '{native}' is in '{unit}', which does not convert to {ours}. Write it in {ours}."
        ) from None


def _log_factor(file: str, native: str, unit: str, spec: Field) -> float:
    """Logarithms: dex, dex(Msun), log(Msun), [Msun], or Msun as the argument; anything else is refused."""
    inner = re.sub(r"^(dex|log10|log|\[)\s*\(?\s*|[\])]+$", "", unit.strip(), flags=re.I)
    inner = re.sub(r"^\(|\)$", "", inner)
    try:
        parsed = parse(inner)
    except ValueError:
        parsed = False
    import astropy.units as u

    if parsed is None or (parsed is not False and (parsed == u.Msun or parsed == u.dex)):
        return 1.0
    what = "log10 of Msun" if spec.log else "dex"
    raise InputError(f"{file}: column '{native}' is in '{unit}', which does not convert to {what}. Write {what}.")


# ---- tables read through a card -------------------------------------------------------------------------------------


def prepare_card(raw: RawTable, card: Card) -> Prepared:
    """A native table through its card: rows dropped, units, h, frames and logarithms turned into ours."""
    _have_native(raw, card)
    notes: list[str] = []
    keep = np.ones(raw.n, dtype=bool)
    for rule in card.drop:
        if rule.column:
            keep = _drop(keep, _holds(raw.columns[rule.column], rule), rule, card, notes)
    index = np.flatnonzero(keep)
    columns: dict[str, np.ndarray] = {}
    bad: dict[str, dict[int, str]] = {}
    for ours, native in card.columns.items():
        if FIELDS[card.kind][ours].text:
            columns[ours] = raw.columns[native.names[0]].texts()[index]
    for ours, native in card.columns.items():
        spec = FIELDS[card.kind][ours]
        if not spec.text:
            columns[ours] = _converted(raw, card, ours, native, index, bad)
    for ours, native in card.columns.items():
        if native.unit == SHARE:
            columns[ours] = columns[ours] * columns[ours.replace("_err", "")]
    out = Prepared(raw.file, card.name, card.kind, card, False, index + 1, columns, bad, notes)
    if "z" in columns and card.redshift.frame != "heliocentric":
        r = card.redshift
        columns["z"] = to_heliocentric(columns["z"], columns["ra"], columns["dec"], r.frame, r.sum_of)
    if "log_mstar" in columns:
        columns["log_mstar"] = columns["log_mstar"] + IMF_TO_CHABRIER[card.mass.imf]
    _velocity_distances(raw, out, index)
    return _drop_ours(out)


def _have_native(raw: RawTable, card: Card) -> None:
    wanted = [n for native in card.columns.values() for n in native.names]
    wanted += [rule.column for rule in card.drop if rule.column]
    wanted += [n for n in (card.distance.velocity, card.distance.measured) if n]
    for name in wanted:
        if name not in raw.columns:
            raise InputError(
                f"{raw.file}: no column '{name}', which card '{card.name}' reads.{did_you_mean(name, raw.columns)}"
                f" Columns: {', '.join(list(raw.columns)[:15])}. Is this the table of the card?"
            )


def _holds(column: RawColumn, rule: Drop) -> np.ndarray:
    """Rows for which the rule's comparison is true; a missing cell is never equal, larger or smaller."""
    if rule.op == "missing":
        return (
            column.missing | np.isnan(column.numbers()[0]) if column.values.dtype.kind == "f" else column.texts() == ""
        )
    value: Any = rule.value
    if isinstance(value, str) or (isinstance(value, list) and value and isinstance(value[0], str)):
        return _compare(column.texts(), rule.op, value) & ~column.missing
    cells = column.numbers()[0]
    return _compare(cells, rule.op, value) & ~np.isnan(cells)


def _compare(cells: np.ndarray, op: str, value: Any) -> np.ndarray:
    if op == "in":
        return np.isin(cells, np.asarray(value if isinstance(value, list) else [value]))
    with np.errstate(invalid="ignore"):
        compared = {
            "==": np.equal,
            "!=": np.not_equal,
            "<": np.less,
            "<=": np.less_equal,
            ">": np.greater,
            ">=": np.greater_equal,
        }
        return compared[op](cells, value)


def _drop(keep: np.ndarray, holds: np.ndarray, rule: Drop, card: Card, notes: list[str]) -> np.ndarray:
    gone = int((keep & holds).sum())
    if gone:
        notes.append(f"{card.name}: {gone} row{'s' if gone > 1 else ''} left out: {rule.why}")
    return keep & ~holds


def _drop_ours(p: Prepared) -> Prepared:
    """The rules that speak of our columns, after all conversions."""
    keep = np.ones(len(p), dtype=bool)
    for rule in p.card.drop:
        if rule.ours:
            cells = p.text(rule.ours) if FIELDS[p.kind][rule.ours].text else p.number(rule.ours)
            missing = (cells == "") if cells.dtype.kind == "U" else np.isnan(cells)
            holds = missing if rule.op == "missing" else _compare(cells, rule.op, rule.value) & ~missing
            if rule.unless:
                holds = holds & np.isnan(p.number(rule.unless))
            keep = _drop(keep, holds, rule, p.card, p.notes)
    if keep.all():
        return p
    index = np.flatnonzero(keep)
    new_place = {int(i): k for k, i in enumerate(index)}
    p.columns = {name: values[index] for name, values in p.columns.items()}
    p.not_numbers = {
        name: {new_place[i]: t for i, t in cells.items() if i in new_place} for name, cells in p.not_numbers.items()
    }
    p.row_number = p.row_number[index]
    return p


def _converted(
    raw: RawTable, card: Card, ours: str, native: NativeColumn, index: np.ndarray, bad: dict[str, dict[int, str]]
) -> np.ndarray:
    spec = FIELDS[card.kind][ours]
    cells = []
    for name in native.names:
        values, wrong = raw.columns[name].numbers()
        marks = {float(m) for m in native.missing if not isinstance(m, str)}
        words = {str(m) for m in native.missing}
        values[np.isin(values, list(marks))] = np.nan
        place = {int(i): k for k, i in enumerate(index)} if wrong else {}
        left = {place[i]: text for i, text in wrong.items() if i in place and text not in words}
        if left:
            bad.setdefault(ours, {}).update(left)
        cells.append(values[index])
    if spec.unit == "dex" and native.unit and native.unit != SHARE and native.unit != "dex":
        return _linear_error_in_dex(raw, card, ours, native, cells, index)
    values = cells[0] if len(cells) == 1 else np.mean(cells, axis=0)
    if native.unit == SHARE:
        return values
    scale = factor(native.unit, spec, card.h)
    if spec.log and native.log10:
        values = values + np.log10(scale)
    elif spec.log:
        values = np.log10(np.where(values > 0, values * scale, np.nan))
    else:
        values = values * scale
    values = values + native.add
    if native.valid:
        lowest, highest = native.valid
        values = np.where((values >= lowest) & (values <= highest), values, np.nan)
    return values


def _linear_error_in_dex(
    raw: RawTable, card: Card, ours: str, native: NativeColumn, cells: list[np.ndarray], index: np.ndarray
) -> np.ndarray:
    """Errors on the linear mass -> dex: half of log10((M + up) / (M - down)). Columns: [up, down] or one for both."""
    mass_of = card.columns[ours.removesuffix("_err")]
    mass = raw.columns[mass_of.names[0]].numbers()[0][index]
    ratio = _plain(native.unit) / _plain(mass_of.unit)
    up, down = np.abs(cells[0]) * ratio, np.abs(cells[-1]) * ratio
    with np.errstate(invalid="ignore", divide="ignore"):
        dex = 0.5 * np.log10((mass + up) / (mass - down))
    return np.where(np.isfinite(dex) & (dex > 0), dex, np.nan)


def _plain(unit: str) -> float:
    import astropy.units as u

    parsed = parse(split_h(unit)[0])
    return 1.0 if parsed is None else float((1 * parsed).to_value(u.Msun))


def _velocity_distances(raw: RawTable, p: Prepared, index: np.ndarray) -> None:
    """Distance velocity / H0 where there is no other, with the error that peculiar velocities put on it."""
    d = p.card.distance
    if not d.velocity or not d.hubble:
        return
    distance = p.number("distance_mpc")
    error = p.number("distance_err_mpc")
    velocity = raw.columns[d.velocity].numbers()[0][index]
    none = np.isnan(distance)
    distance = np.where(none & (velocity > 0), velocity / d.hubble, distance)
    by_velocity = none
    if d.measured:
        measured = raw.columns[d.measured].numbers()[0][index]
        by_velocity = none | ~(measured > 0)
    spread = np.minimum(d.peculiar_km_s / d.hubble, d.largest_error_share * distance)
    p.columns["distance_mpc"] = distance
    p.columns["distance_err_mpc"] = np.where(by_velocity, spread, error)
