"""Reading cards: TOML in, Card out, every key and value checked."""

from __future__ import annotations

import tomllib
from dataclasses import MISSING, fields
from functools import lru_cache
from pathlib import Path
from typing import Any, get_type_hints

from haloledger.catalogs.cards.card import Card, Drop, NativeColumn
from haloledger.catalogs.frames import FRAMES
from haloledger.catalogs.nativeunits import check_unit
from haloledger.catalogs.schema import FIELDS, MASS_DEFINITIONS, did_you_mean
from haloledger.errors import InputError

FOLDER = Path(__file__).parent
OPERATORS = ("==", "!=", "<", "<=", ">", ">=", "in", "missing")
IMFS = ("Chabrier", "Kroupa", "Salpeter", "diet Salpeter")

# section key, tuple of the values it may take
_CHOICES: dict[tuple[str, str], tuple[str, ...]] = {
    ("", "kind"): tuple(FIELDS),
    ("", "sure"): ("checked on the table", "from memory"),
    ("redshift", "frame"): FRAMES,
    ("redshift", "sum_of"): ("redshifts", "velocities"),
    ("redshift", "kind"): ("spec", "phot"),
    ("redshift", "taken_as"): ("likelihood", "posterior"),
    ("mass", "definition"): ("", *MASS_DEFINITIONS),
    ("mass", "taken_as"): ("", "likelihood", "posterior"),
    ("mass", "imf"): IMFS,
    ("proxy", "use"): ("", "sigma_v", "richness", "lx"),
    ("position", "without_angle"): ("", "larger circle"),
    ("drop", "op"): OPERATORS,
}


def card_names() -> list[str]:
    """Names of the cards that come with the package."""
    return sorted(p.stem for p in FOLDER.glob("*.toml"))


def list_cards() -> list[Card]:
    """All cards that come with the package, by name."""
    return [load_card(name) for name in card_names()]


def load_card(name: str | Path) -> Card:
    """The card of that name, or in that .toml file. InputError where it is absent or says something unknown."""
    text = str(name)
    if text.endswith(".toml"):
        path = Path(text)
        if not path.is_file():
            raise InputError(f"{path}: no such card file. Check the path, or use one of {', '.join(card_names())}.")
        return _load(path, path.stat().st_mtime_ns)
    if text not in card_names():
        hint = did_you_mean(text, card_names())
        raise InputError(
            f"no catalogue card '{text}'.{hint} There are {', '.join(card_names())}; a path to a .toml works too."
        )
    return _load(FOLDER / f"{text}.toml", 0)


@lru_cache(maxsize=64)
def _load(path: Path, _mtime: int) -> Card:
    try:
        data = tomllib.loads(path.read_text(encoding="utf-8"))
    except (tomllib.TOMLDecodeError, UnicodeDecodeError, OSError) as fault:
        raise InputError(f"{path}: is no TOML ({fault}). Mend that line.") from None
    data.setdefault("name", path.stem)
    card = _build(Card, data | {"path": path}, path, "")
    _check(card)
    return card


def _build(cls: Any, data: dict[str, Any], path: Path, where: str) -> Any:
    """An instance of dataclass `cls` from a TOML table; unknown, missing and wrongly typed keys are refused."""
    hints = get_type_hints(cls)
    known = {f.name: f for f in fields(cls)}
    place = f"[{where}]" if where else "the top"
    for key in data:
        if key not in known:
            raise InputError(
                f"{path}: unknown key '{key}' at {place}.{did_you_mean(key, known)}"
                f" Known: {', '.join(k for k in known if k != 'path')}."
            )
    missing = [k for k, f in known.items() if f.default is MISSING and f.default_factory is MISSING and k not in data]
    if missing:
        raise InputError(f"{path}: {place} lacks '{missing[0]}'. Add the key.")
    values = {key: _value(hints[key], key, value, path, where) for key, value in data.items()}
    return cls(**values)


def _value(hint: Any, key: str, value: Any, path: Path, where: str) -> Any:
    dotted = f"{where}.{key}" if where else key
    if key == "columns" and not where:
        return _columns(value, path)
    if key == "drop" and not where:
        if not isinstance(value, list):
            raise InputError(f"{path}: 'drop' must be a list of tables: write [[drop]], not [drop].")
        return [_build(Drop, rule, path, "drop") for rule in value]
    if hasattr(hint, "__dataclass_fields__"):
        if not isinstance(value, dict):
            raise InputError(
                f"{path}: '{dotted}' must be a table, found {value!r}. Write [{dotted}] and its keys below."
            )
        return _build(hint, value, path, dotted)
    choices = _CHOICES.get((where, key))
    if choices and value not in choices:
        shown = ", ".join(repr(c) for c in choices if c)
        raise InputError(
            f"{path}: {dotted} = {value!r} is not known.{did_you_mean(str(value), choices)} Write one of {shown}."
        )
    if hint is float and isinstance(value, int) and not isinstance(value, bool):
        return float(value)
    wanted = {str: str, float: float, int: int, bool: bool}.get(hint)
    if (wanted and (not isinstance(value, wanted) or (wanted is not bool and isinstance(value, bool)))) or (
        str(hint).startswith(("list", "dict")) and not isinstance(value, list if str(hint).startswith("list") else dict)
    ):
        raise InputError(
            f"{path}: {dotted} = {value!r} is not a {getattr(wanted or hint, '__name__', hint)}. Mend the value."
        )
    return value


def _columns(value: Any, path: Path) -> dict[str, NativeColumn]:
    if not isinstance(value, dict):
        raise InputError(
            f"{path}: 'columns' must be a table of our columns. Write [columns] and below ra = \"RA_DEG\" ..."
        )
    out = {}
    for ours, native in value.items():
        entry = {"column": native} if isinstance(native, str | list) else native
        if not isinstance(entry, dict):
            raise InputError(f"{path}: columns.{ours} = {native!r}: write the native column's name or a table.")
        out[ours] = _build(NativeColumn, entry, path, f"columns.{ours}")
    return out


def _check(card: Card) -> None:
    """What the keys say together."""
    known = FIELDS[card.kind]
    for ours, native in card.columns.items():
        if ours not in known:
            raise InputError(
                f"{card.path}: columns.{ours} is no column of {card.kind}.{did_you_mean(ours, known)}"
                f" Known: {', '.join(known)}."
            )
        check_unit(native.unit, known[ours], f"{card.path}: columns.{ours}.unit", card.h)
        if native.valid and len(native.valid) != 2:
            raise InputError(f"{card.path}: columns.{ours}.valid = {native.valid}: write [lowest, highest].")
    given_elsewhere = {"mass_def", "log_mass", "z"}
    for ours, spec in known.items():
        if spec.required and ours not in card.columns and ours not in given_elsewhere:
            raise InputError(
                f"{card.path}: no native column is named for '{ours}'. Add {ours} = \"...\" under [columns]."
            )
    if card.kind == "groups":
        if "log_mass" in card.columns and not card.mass.definition and "mass_def" not in card.columns:
            raise InputError(
                f'{card.path}: a mass without definition. Add definition = "200c"'
                f" (or {', '.join(MASS_DEFINITIONS[1:])}) under [mass]."
            )
        if "log_mass" not in card.columns and not card.proxy.use:
            raise InputError(
                f'{card.path}: neither a mass nor a proxy. Name columns.log_mass, or use = "richness" under [proxy].'
            )
        if card.proxy.use and card.proxy.use not in card.columns:
            raise InputError(
                f"{card.path}: the proxy '{card.proxy.use}' has no native column. Name it under [columns]."
            )
    if "z" not in card.columns and "distance_mpc" not in card.columns and card.kind != "bursts":
        raise InputError(f"{card.path}: neither z nor distance_mpc is named. Add one under [columns].")
    if not 0 <= card.redshift.outliers < 1:
        raise InputError(f"{card.path}: redshift.outliers = {card.redshift.outliers:g}: write a share, such as 0.05.")
    for rule in card.drop:
        if bool(rule.column) == bool(rule.ours):
            raise InputError(f"{card.path}: a [[drop]] must name either 'column' (native) or 'ours'. Found {rule}.")
        for ours in (rule.ours, rule.unless):
            if ours and ours not in known:
                raise InputError(
                    f"{card.path}: [[drop]] names '{ours}', no column of {card.kind}.{did_you_mean(ours, known)}"
                )
        if rule.value is None and rule.op != "missing":
            raise InputError(f"{card.path}: [[drop]] with op = '{rule.op}' needs a value. Found {rule}.")
    if len(card.mass.one_minus_b) != 2 or not 0 < card.mass.one_minus_b[0] <= 1.5:
        raise InputError(
            f"{card.path}: mass.one_minus_b = {card.mass.one_minus_b}: write [value, error], value near 0.8."
        )
