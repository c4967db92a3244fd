"""Changes by hand, applied to the tables after reading: rows set, dropped and added, hosts named."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np

from haloledger.catalogs.canonical import Bursts, Galaxies, Groups, Refusal, take
from haloledger.catalogs.local_volume import LABEL as LOCAL
from haloledger.catalogs.overrides import ADDED, Override, Overrides
from haloledger.catalogs.schema import FIELDS, did_you_mean
from haloledger.errors import InputError

LABEL = "by-hand"
SHARP_Z_ERR = 0.005  # a redshift set by hand with a larger error is photometric
NEARBY_MPC = 50.0  # within it a measured distance rules
FEW = 20_000  # names among which a near match is looked for

Table = Galaxies | Groups


@dataclass
class ByHand:
    """The tables with all changes, and what was changed.

    rows     row name -> what was set, in the words of the file; for notes and for the halo the row ends up in
    changes  everything that was applied
    """

    bursts: Bursts
    galaxies: list[Galaxies]
    groups: list[Groups]
    rows: dict[str, list[Override]] = field(default_factory=dict)
    changes: list[Override] = field(default_factory=list)
    refused: list[Refusal] = field(default_factory=list)

    @property
    def notes(self) -> list[str]:
        """One sentence a change."""
        return [f"By hand: {c.object}: {c.said}" for c in self.changes]

    @property
    def record(self) -> list[dict[str, Any]]:
        """The changes as plain values, for run.toml."""
        return [{"object": c.object, **c.sets, "reason": c.reason} for c in self.changes]


def apply_overrides(
    overrides: Overrides, bursts: Bursts, galaxies: list[Galaxies], groups: list[Groups], luminosity_mpc: Callable
) -> ByHand:
    """All changes applied in their order; what names an unknown object or burst is refused, the rest goes on.

    luminosity_mpc  luminosity distance [Mpc] of a redshift: a listed stellar mass follows a redshift that is set
    """
    hand = ByHand(bursts, list(galaxies), list(groups), refused=list(overrides.refused))
    added: dict[str, list[Override]] = {}
    for change in overrides.changes:
        if "add" in change.sets:
            added.setdefault(str(change.sets["add"]), []).append(change)
    for kind, several in added.items():
        _add(hand, kind, several)
    for change in overrides.changes:
        if "host" in change.sets:
            _name_host(hand, change)
        elif "add" not in change.sets:
            _set_row(hand, change, luminosity_mpc)
    hand.changes.sort(key=lambda c: c.number)
    return hand


def _name_host(hand: ByHand, change: Override) -> None:
    at = np.flatnonzero(np.asarray(hand.bursts.burst, dtype=str) == change.object)
    if not at.size:
        names = np.asarray(hand.bursts.burst, dtype=str).tolist()
        hint = did_you_mean(change.object, names) or f" Bursts: {', '.join(names[:10])}."
        hand.refused.append(change.refusal("burst", "no burst of this name", f"Name a burst of the table.{hint}"))
        return
    host, note = hand.bursts.host.astype(object), hand.bursts.note.astype(object)
    host[at[0]] = change.sets["host"]
    note[at[0]] = "; ".join(x for x in (str(note[at[0]]), f"by hand: host = {host[at[0]]} ({change.reason})") if x)
    hand.bursts = replace(hand.bursts, host=host, note=note)
    hand.changes.append(change)


def _set_row(hand: ByHand, change: Override, luminosity_mpc: Callable) -> None:
    found = [(kind, k, i) for kind in ("galaxies", "groups") for k, i in _places(getattr(hand, kind), change.object)]
    if len(found) > 1:  # a bare id means the user's own row before one of the built-in table
        found = [f for f in found if getattr(hand, f[0])[f[1]].label != LOCAL] or found
    if len(found) != 1:
        hand.refused.append(_not_one(hand, change, found))
        return
    kind, k, i = found[0]
    tables = getattr(hand, kind)
    name = str(tables[k].row[i])
    if "drop" in change.sets:
        tables[k] = take(tables[k], np.arange(len(tables[k])) != i)
    else:
        if isinstance(tables[k], Groups) and "log_mstar" in change.sets:
            advice = "A group has no stellar mass of its own: set log_m200c, or drop it and add a galaxy."
            hand.refused.append(change.refusal("log_mstar", str(change.sets["log_mstar"]), advice))
            return
        tables[k] = _changed(tables[k], i, change.sets, luminosity_mpc)
        hand.rows.setdefault(name, []).append(change)
    hand.changes.append(change)


def _places(tables: list, name: str) -> list[tuple[int, int]]:
    """(table, row) of the full row name, else of the id without a label."""
    rows = [np.asarray(t.row, dtype=str) for t in tables]
    full = [(k, int(i)) for k, r in enumerate(rows) for i in np.flatnonzero(r == name)]
    bare = [(k, int(i)) for k, r in enumerate(rows) for i in np.flatnonzero(np.char.endswith(r, f":{name}"))]
    return full or [(k, i) for k, i in bare if str(rows[k][i]).split(":", 1)[-1] == name]


def _not_one(hand: ByHand, change: Override, found: list) -> Refusal:
    if found:
        names = [str(getattr(hand, kind)[k].row[i]) for kind, k, i in found]
        return change.refusal("object", f"{len(found)} rows: {', '.join(names[:5])}", f"Write one, such as {names[0]}.")
    tables: list[Table] = [*hand.galaxies, *hand.groups]
    if any(r.name == change.object.split(":", 1)[-1] for t in tables for r in t.refused):
        advice = "The row was refused when its table was read: put it right there, or add the object."
        return change.refusal("object", "a refused row", advice)
    names = [str(n) for t in tables for n in t.row] if sum(map(len, tables)) <= FEW else []
    hint = did_you_mean(change.object, names)
    return change.refusal("object", "no such row in any catalogue", f"Write CATALOGUE:ID as in source_rows.{hint}")


def _luminosity_mpc(table: Any, i: int, sets: dict[str, Any], luminosity_mpc: Callable) -> float:
    """Luminosity distance [Mpc] of row i with `sets` made: a distance within 50 Mpc rules, then the redshift."""
    distance = sets.get("distance_mpc", np.nan if "z" in sets else table.distance_mpc[i])
    z = sets.get("z", table.z[i])
    if np.isfinite(distance) and (distance <= NEARBY_MPC or not z > 0):
        return float(distance)
    return float(luminosity_mpc(z)) if z > 0 else 0.0


def _changed(table: Any, i: int, sets: dict[str, Any], luminosity_mpc: Callable) -> Any:
    """The table with row i set. A redshift set by hand replaces a listed distance."""
    new = {name: np.array(getattr(table, name)) for name in ("z", "z_err", "photometric", "distance_mpc")}
    new["distance_err_mpc"] = np.array(table.distance_err_mpc)
    masses = ("log_mstar", "log_m200c") if isinstance(table, Galaxies) else ("log_mass",)
    new |= {name: np.array(getattr(table, name)) for m in masses for name in (m, f"{m}_err")}
    if "log_mstar" in new and "log_mstar" not in sets:
        before, after = _luminosity_mpc(table, i, {}, luminosity_mpc), _luminosity_mpc(table, i, sets, luminosity_mpc)
        if before > 0 and after > 0:  # light was seen, so the mass goes with the distance squared
            new["log_mstar"][i] += 2 * np.log10(after / before)
    if "z" in sets:
        if getattr(table, "z_flow", None) is not None:  # the frame's motion stays what it is in that direction
            new["z_flow"] = np.array(table.z_flow)
            new["z_flow"][i] = (1 + sets["z"]) * _frame_factor(table, i) - 1
        if getattr(table, "z_scores", None) is not None:  # a listed p(z) is replaced too
            new["z_scores"] = np.array(table.z_scores)
            new["z_scores"][i] = np.nan
        new["z"][i], new["z_err"][i] = sets["z"], sets.get("z_err", 0.0)
        new["photometric"][i] = sets.get("z_err", 0.0) > SHARP_Z_ERR
        new["distance_mpc"][i] = new["distance_err_mpc"][i] = np.nan
    elif "z_err" in sets:
        new["z_err"][i] = sets["z_err"]
    for name in ("distance_mpc", "distance_err_mpc", "log_mstar", "log_mstar_err"):
        if name in sets:
            new[name][i] = sets[name]
    if "log_m200c" in sets and isinstance(table, Galaxies):
        new["log_m200c"][i], new["log_m200c_err"][i] = sets["log_m200c"], sets.get("log_m200c_err", 0.0)
    elif "log_m200c" in sets:
        # the catalogue's hydrostatic bias is divided out later
        new["log_mass"][i] = sets["log_m200c"] + np.log10(table.one_minus_b[0])
        new["log_mass_err"][i] = sets.get("log_m200c_err", 0.0)
        new["mass_def"] = np.array(table.mass_def, dtype=object)
        new["mass_def"][i] = "200c"
    return replace(table, **new)


def _frame_factor(table: Any, i: int) -> float:
    factor = (1 + table.z_flow[i]) / (1 + table.z[i])
    return float(factor) if np.isfinite(factor) else 1.0


def _add(hand: ByHand, kind: str, several: list[Override]) -> None:
    """All added objects of one kind as a catalogue of their own, through the same checks as any table."""
    from astropy.table import Table as PlainTable

    from haloledger.catalogs.galaxies import galaxies_from
    from haloledger.catalogs.groups import groups_from
    from haloledger.catalogs.prepare import prepare_bare
    from haloledger.catalogs.raw import from_astropy

    columns = FIELDS[ADDED[kind]]
    keys = [k for k in columns if columns[k].required or any(k in c.sets for c in several)]
    rows: dict[str, list] = {k: ["" if columns[k].text else np.nan] * len(several) for k in keys}
    rows["id"] = [c.object for c in several]
    for place, change in enumerate(several):
        for key, value in change.sets.items():
            if key in rows:
                rows[key][place] = value
    try:
        raw = from_astropy(PlainTable(rows), several[0].file, LABEL)
        table = (galaxies_from if kind == "galaxy" else groups_from)(prepare_bare(raw, ADDED[kind]))
    except InputError as fault:
        hand.refused += [c.refusal("add", kind, str(fault)) for c in several]
        return
    lost = {r.row for r in table.refused}
    hand.refused += [several[r.row - 1].refusal(r.column, r.found, r.advice) for r in table.refused]
    kept = [c for place, c in enumerate(several, start=1) if place not in lost]
    getattr(hand, ADDED[kind]).append(replace(table, refused=()))
    for change in kept:
        hand.rows.setdefault(f"{LABEL}:{change.object}", []).append(change)
    hand.changes += kept
