"""What a user sets by hand: a small TOML file, one table `[[override]]` a change, each with its reason.

[[override]]
object = "2mpp:12345"      # a catalogue row, with its catalogue's label or, where one has it, without
z = 0.0271                 # also z_err distance_mpc distance_err_mpc log_mstar log_mstar_err
log_m200c = 12.4           #      log_m200c log_m200c_err kept_factor model
reason = "redshift of our own spectrum"

[[override]]
object = "2mpp:999"
drop = true
reason = "a star"

[[override]]
burst = "FRB20990101A"
host = "2mpp:4711"
reason = "host by its radio source"

[[override]]
add = "galaxy"             # or "group"; then the columns of that table
object = "dwarf"
ra = 150.0
dec = 20.0
z = 0.0271
log_mstar = 8.9
reason = "found in our deep image"
"""

from __future__ import annotations

import tomllib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from haloledger.catalogs.canonical import Refusal
from haloledger.catalogs.schema import FIELDS, did_you_mean
from haloledger.errors import InputError

NUMBERS = {  # lowest and highest value
    "z": (0.0, 20.0),
    "z_err": (0.0, 20.0),
    "distance_mpc": (0.0, 1e5),
    "distance_err_mpc": (0.0, 1e5),
    "log_mstar": (1.0, 14.0),
    "log_mstar_err": (0.0, 5.0),
    "log_m200c": (5.0, 15.9),
    "log_m200c_err": (0.0, 5.0),
    "kept_factor": (0.0, 20.0),
}
TEXTS = ("object", "burst", "host", "add", "model", "reason")
FLAGS = ("drop",)
ADDED = {"galaxy": "galaxies", "group": "groups"}
IN_MEMORY = "the overrides"


@dataclass(frozen=True)
class Override:
    """One change: where it stands, whom it is about, what is set, and why."""

    file: str
    number: int  # 1-based place in the file
    object: str
    reason: str
    sets: dict[str, Any]  # everything else that was written

    @property
    def said(self) -> str:
        """The change in words, for notes."""
        return ", ".join(f"{k} = {v}" for k, v in self.sets.items()) + f" ({self.reason})"

    def refusal(self, column: str, found: str, advice: str) -> Refusal:
        """This change as a row that was not used."""
        return Refusal(self.file, self.number, self.object, column, found, advice)


@dataclass(frozen=True)
class Overrides:
    """All changes that can be tried, and those that cannot."""

    file: str = IN_MEMORY
    changes: list[Override] = field(default_factory=list)
    refused: list[Refusal] = field(default_factory=list)

    @property
    def models(self) -> list[str]:
        """Halo models that changes name."""
        return list(dict.fromkeys(str(c.sets["model"]) for c in self.changes if "model" in c.sets))


def read_overrides(source: str | Path | Sequence[Mapping[str, Any]] | None) -> Overrides:
    """Overrides of a TOML file, or of a list of dictionaries with the same keys; none for None.

    Raises InputError for a file that cannot be read, an unknown key (with a near match) or a value of another type.
    A change without reason, or with a value out of range, is refused alone.
    """
    if source is None:
        return Overrides()
    if isinstance(source, str | Path):
        file, tables = str(source), _tables(Path(source), str(source))
    else:
        file, tables = IN_MEMORY, list(source)
    changes: list[Override] = []
    refused: list[Refusal] = []
    for number, table in enumerate(tables, start=1):
        _check_keys(file, number, table)
        sets = {k: v for k, v in table.items() if k not in ("object", "reason")}
        who = str(table.get("object") or table.get("burst") or "")
        change = Override(file, number, who, str(table.get("reason", "")).strip(), sets)
        fault = _fault(change, table)
        if fault:
            refused.append(change.refusal(*fault))
        else:
            changes.append(change)
    return Overrides(file, changes, refused)


def _tables(path: Path, file: str) -> list[Mapping[str, Any]]:
    try:
        text = tomllib.loads(path.read_text(encoding="utf-8"))
    except OSError as error:
        raise InputError(f"{file}: cannot be read ({error.strerror}). Give the path of an overrides file.") from None
    except (tomllib.TOMLDecodeError, UnicodeDecodeError) as error:
        raise InputError(f"{file}: not TOML: {error}. Write tables [[override]] with key = value lines.") from None
    for key in text:
        if key != "override":
            raise InputError(
                f"{file}: unknown key '{key}' outside a table.{did_you_mean(key, ['override'], 0.4)}"
                " Write every change as a table [[override]]."
            )
    tables = text.get("override", [])
    if not isinstance(tables, list) or not tables:
        raise InputError(
            f"{file}: an empty list: no table [[override]]. Write at least one, or leave --overrides away."
        )
    return tables


def _check_keys(file: str, number: int, table: Mapping[str, Any]) -> None:
    where = f"{file}: override {number}"
    if not isinstance(table, Mapping):
        raise InputError(f"{where}: found {table!r}. Write a table of keys and values.")
    extra = FIELDS[ADDED[table["add"]]] if table.get("add") in ADDED else {}
    known = [*NUMBERS, *TEXTS, *FLAGS, *(k for k in extra if k != "id")]
    for key, value in table.items():
        if key not in known:
            hint = did_you_mean(str(key), known)
            raise InputError(f"{where}: unknown key '{key}'.{hint} Known keys: {', '.join(dict.fromkeys(known))}.")
        text = key in TEXTS or (key in extra and extra[key].text)
        wanted: tuple[type, ...] = (bool,) if key in FLAGS else (str,) if text else (int, float)
        if not isinstance(value, wanted) or (isinstance(value, bool) and key not in FLAGS):
            kind = "true or false" if key in FLAGS else "a text in quotes" if text else "a number"
            raise InputError(f"{where}: '{key}' is {value!r}. Write {kind}.")


def _fault(change: Override, table: Mapping[str, Any]) -> tuple[str, str, str] | None:
    """(column, found, advice) of what keeps a change from being tried."""
    if not change.reason:
        return "reason", "nothing", 'Every change by hand needs its reason: write reason = "...".'
    if not change.object:
        return "object", "nothing", "Name a catalogue row with object, or a burst with burst."
    for key, (low, high) in NUMBERS.items():
        value = table.get(key)
        if value is not None and not low <= value <= high:
            more = " No cluster is heavier than 10^15.9 Msun." if key == "log_m200c" and value > high else ""
            return key, str(value), f"Write a number between {low:g} and {high:g}.{more}"
    if "burst" in table or "host" in table:
        if set(table) - {"burst", "host", "reason"} or not {"burst", "host"} <= set(table):
            return "host", ", ".join(table), "A host is set with burst, host and reason, and nothing else."
        return None
    if "add" in table:
        add = str(table["add"])
        hint = did_you_mean(add, ADDED, 0.4)
        return None if add in ADDED else ("add", add, f'Write add = "galaxy" or add = "group".{hint}')
    what = set(change.sets) - {"z_err", "distance_err_mpc", "log_mstar_err", "log_m200c_err"}
    if change.sets.get("drop") is False:
        return "drop", "false", "Write drop = true, or leave the key away."
    if not what:
        return "object", "nothing set", f"Set one of {', '.join(k for k in NUMBERS if 'err' not in k)}, model or drop."
    if "drop" in what and len(what) > 1:
        return "drop", ", ".join(sorted(what)), "A row that is dropped has nothing else to set."
    return None
