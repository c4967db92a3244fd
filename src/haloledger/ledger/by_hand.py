"""What was set by hand, brought to the halo that a row ends up in."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from haloledger.catalogs.by_hand import SHARP_Z_ERR
from haloledger.catalogs.overrides import Override
from haloledger.cosmos.background import Cosmos
from haloledger.gas.models import Model
from haloledger.haloes.table import COLUMNS, Haloes, change


@dataclass(frozen=True)
class OwnGas:
    """Gas of one halo set by hand: another model, and a factor on its gas."""

    model: Model | None
    kept_factor: float


def haloes_by_hand(haloes: Haloes, rows: dict[str, list[Override]], cosmos: Cosmos) -> Haloes:
    """The haloes with notes, masses and redshifts of their changed rows, also where another row describes the halo."""
    if not rows:
        return haloes
    columns = {name: getattr(haloes, name).copy() for name in _TOUCHED if name in COLUMNS}
    columns["note"] = columns["note"].astype(object)
    columns["mass_kind"] = columns["mass_kind"].astype(object)
    for i, name in _haloes_of(haloes, rows):
        for each in rows[name]:
            _set(columns, i, each, described=str(haloes.id[i]) == name, cosmos=cosmos)
            said = f"by hand: {each.said}"
            columns["note"][i] = f"{columns['note'][i]}; {said}" if columns["note"][i] else said
    return change(haloes, **columns)


def gas_by_hand(haloes: Haloes, rows: dict[str, list[Override]], models: dict[str, Model]) -> dict[str, OwnGas]:
    """Halo id -> its own gas."""
    result: dict[str, OwnGas] = {}
    for i, name in _haloes_of(haloes, rows):
        for each in rows[name]:
            if {"model", "kept_factor"} & set(each.sets):
                model = models.get(str(each.sets.get("model", "")))
                result[str(haloes.id[i])] = OwnGas(model, float(each.sets.get("kept_factor", 1.0)))
    return result


_TOUCHED = (
    *("note", "mass_kind", "value", "value_err", "posterior", "one_minus_b", "one_minus_b_err", "log_mstar"),
    *("z", "z_err", "z_flow", "z_scores", "photometric", "distance_mpc", "distance_err_mpc"),
)


def _haloes_of(haloes: Haloes, rows: dict[str, list[Override]]) -> list[tuple[int, str]]:
    """(halo, row) of every changed row that stands behind a halo."""
    if not rows:
        return []
    return [
        (i, name)
        for i, names in enumerate(haloes.source_rows.tolist())
        for name in str(names).split(";")
        if name in rows
    ]


def _set(columns: dict[str, np.ndarray], i: int, each: Override, described: bool, cosmos: Cosmos) -> None:
    sets = each.sets
    if "z" in sets and not described:
        if columns["mass_kind"][i] == "stellar" and columns["z"][i] > 0 and sets["z"] > 0:
            far = cosmos.luminosity_distance_mpc(np.array([sets["z"], columns["z"][i]]))
            step = 2 * np.log10(far[0] / far[1])
            columns["value"][i] += step
            columns["log_mstar"][i] += step
        if "z_flow" in columns and np.isfinite(columns["z_flow"][i]):
            columns["z_flow"][i] = (1 + sets["z"]) * (1 + columns["z_flow"][i]) / (1 + columns["z"][i]) - 1
        columns["z"][i], columns["z_err"][i] = sets["z"], sets.get("z_err", 0.0)
        if "z_scores" in columns:
            columns["z_scores"][i] = np.nan
        columns["photometric"][i] = sets.get("z_err", 0.0) > SHARP_Z_ERR
        columns["distance_mpc"][i] = columns["distance_err_mpc"][i] = np.nan
    if "distance_mpc" in sets:
        columns["distance_mpc"][i] = sets["distance_mpc"]
        columns["distance_err_mpc"][i] = sets.get("distance_err_mpc", np.nan)
    if "log_mstar" in sets and columns["mass_kind"][i] == "stellar":
        columns["value"][i] = columns["log_mstar"][i] = sets["log_mstar"]
        columns["value_err"][i] = sets.get("log_mstar_err", columns["value_err"][i])
    if "log_m200c" in sets:
        columns["mass_kind"][i], columns["value"][i] = "m200c", sets["log_m200c"]
        columns["value_err"][i] = sets.get("log_m200c_err", 0.0)
        columns["posterior"][i] = True
        columns["one_minus_b"][i], columns["one_minus_b_err"][i] = 1.0, 0.0
