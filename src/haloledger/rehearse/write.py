"""A rehearsal into a folder: `calibration.ecsv`, `sums.ecsv`, `pp.png` and `run.toml`, whole or not at all."""

from __future__ import annotations

import os
import shutil
import tempfile
from pathlib import Path
from typing import Any

import numpy as np

from haloledger.rehearse.picture import pp_figure
from haloledger.rehearse.rehearsal import Rehearsal
from haloledger.rehearse.score import LEVELS
from haloledger.report.figures.style import save
from haloledger.report.run_record import run_record
from haloledger.report.write import RUN_FILE, earlier_files

FILES = ("calibration.ecsv", "sums.ecsv", "pp.png", RUN_FILE)


def write(results: dict[str, Rehearsal], folder: str | Path) -> None:
    """Write the rehearsals, by name; InputError for a folder that holds something else."""
    place = Path(folder)
    earlier_files(place)
    place.parent.mkdir(parents=True, exist_ok=True)
    work = Path(tempfile.mkdtemp(prefix=f".{place.name}.partial-", dir=place.parent))
    try:
        calibration_table(results).write(work / FILES[0], format="ascii.ecsv")
        _sums_table(results).write(work / FILES[1], format="ascii.ecsv")
        save(pp_figure(results), work / FILES[2])
        _write_run(results, work)
        place.mkdir(exist_ok=True)
        for name in FILES:  # the record last
            os.replace(work / name, place / name)
    finally:
        shutil.rmtree(work, ignore_errors=True)


def calibration_table(results: dict[str, Rehearsal]):
    """A row a rehearsal and set of sightlines."""
    from astropy.table import Table

    rows = []
    for name, result in results.items():
        for row in result.rows:
            cells: dict[str, Any] = {"rehearsal": name, "sightlines": row.name, "n": row.n}
            for level, held, error in zip(LEVELS, row.held, row.error, strict=True):
                cells[f"held_{100 * level:.0f}"] = held
                cells[f"error_{100 * level:.0f}"] = error
            cells |= {"true_mean": row.mean_truth, "predicted_mean": row.mean_predicted, "bias": row.bias}
            cells["bias_error"] = row.bias_error / row.mean_truth if row.mean_truth > 0 else np.nan
            rows.append(cells)
    table = Table(rows=rows)
    for name in ("true_mean", "predicted_mean"):
        table[name].unit = "pc cm-3"
    table["bias"].description = "predicted minus true, over true"
    table["held_68"].description = "share of true sums inside the central 68 per cent; error_68: its standard error"
    return table


def _sums_table(results: dict[str, Rehearsal]):
    from astropy.table import Table, vstack

    parts = []
    for name, result in results.items():
        low, middle, high = np.quantile(result.sums, (0.16, 0.5, 0.84), axis=1)
        columns = {
            "rehearsal": np.full(len(result.truth), name),
            "burst": np.asarray(result.seen.bursts["burst"]),
            "z": result.sky.lines.z_seen,
            "dm_true": result.truth,
            "dm_true_unlisted": result.unlisted,
            "dm_mean": result.sums.mean(axis=1),
            "dm_p16": low,
            "dm_p50": middle,
            "dm_p84": high,
            "rank": result.rank,
        }
        parts.append(Table(columns))
    table = vstack(parts, metadata_conflicts="silent")
    for name in table.colnames:
        if name.startswith("dm_"):
            table[name].unit = "pc cm-3"
            table[name].info.format = ".3f"
    return table


def _write_run(results: dict[str, Rehearsal], work: Path) -> None:
    import tomli_w

    record = run_record({}, {}, [])
    record = {"written_by": "haloledger", "command": "rehearse", **record, "files": dict.fromkeys(FILES[:-1], "")}
    record["rehearsal"] = {name: _plain(result.run) for name, result in results.items()}
    (work / RUN_FILE).write_text(tomli_w.dumps(record), encoding="utf-8")


def _plain(value: Any) -> Any:
    if isinstance(value, dict):
        return {str(k): _plain(v) for k, v in value.items() if v is not None}
    return list(value) if isinstance(value, tuple) else value
