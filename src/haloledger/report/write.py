"""Ledgers into a folder: tables, draws, figures and `run.toml`, whole or not at all.

Everything is written into a temporary folder beside the place it belongs and then renamed, file by file, `run.toml`
last. A run that is interrupted or fails before that leaves the folder as it was.
"""

from __future__ import annotations

import hashlib
import os
import shutil
import tempfile
import tomllib
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np

from haloledger.errors import InputError
from haloledger.report import tables
from haloledger.report.names import file_names

RUN_FILE = "run.toml"
FIGURES = "figures"
_MARK = "haloledger"  # run.toml says `written_by = "haloledger"`: only such a folder is written into again


def write(
    ledgers: Any,
    folder: str | Path,
    table_format: str = "ecsv",
    figures: bool = False,
    progress: Callable[[int, int, str], None] | None = None,
) -> list[Path]:
    """Write all files of a run into `folder` and return their paths.

    `table_format` is "ecsv", "csv", "fits", "votable" or "parquet"; with `figures` a PNG per sightline is added.
    What an earlier run wrote and this one does not is removed. InputError for a folder that holds something else.
    """
    tables.check_format(table_format)
    place = Path(folder)
    earlier = earlier_files(place)
    try:
        place.parent.mkdir(parents=True, exist_ok=True)
        work = Path(tempfile.mkdtemp(prefix=f".{place.name}.partial-", dir=place.parent))
    except OSError as error:
        raise InputError(f"{place.parent}: cannot be written into ({error.strerror}). Name another folder.") from error
    try:
        _write_tables(ledgers, work, table_format)
        _write_draws(ledgers, work)
        if figures:
            _write_figures(ledgers, work / FIGURES, progress)
        _write_run(ledgers, work)
        return _move(work, place, earlier)
    finally:
        shutil.rmtree(work, ignore_errors=True)


def earlier_files(place: str | Path) -> list[str]:
    """Files an earlier run left in `place`, by its `run.toml`; InputError for a folder that is not ours."""
    place = Path(place)
    if not place.exists():
        return []
    if not place.is_dir():
        raise InputError(f"{place}: is a file; results go into a folder. Name another place.")
    if not any(place.iterdir()):
        return []
    try:
        run = tomllib.loads((place / RUN_FILE).read_text(encoding="utf-8"))
    except (OSError, ValueError):
        run = {}
    if run.get("written_by") != _MARK:
        raise InputError(
            f"{place}: holds files but no {RUN_FILE} of an earlier run, so nothing is written over. "
            "Name a new or empty folder, or empty this one."
        )
    return [name for name in run.get("files", {}) if _ours(name)]


def _ours(name: str) -> bool:
    """Whether a listed name can only lie inside the folder: a file, or a file in `figures`."""
    parts = Path(name).parts
    inside = len(parts) == 1 or (len(parts) == 2 and parts[0] == FIGURES)
    return inside and not Path(name).is_absolute() and ".." not in parts


def _write_tables(ledgers: Any, work: Path, table_format: str) -> None:
    every = {"sightlines": ledgers.sightlines, "entries": ledgers.entries}
    if ledgers.refused:
        every["refused"] = tables.refused_table(ledgers.refused)
    every = {kind: tables.described(table, table_format) for kind, table in every.items()}
    for kind, table in every.items():
        tables.write_table(table, work / f"{kind}{tables.SUFFIX[table_format]}", table_format)
    if table_format == "csv":
        tables.write_table(tables.legend(every), work / "columns.csv", "csv")


def _write_draws(ledgers: Any, work: Path) -> None:
    for name in ("draws", "entry_draws"):
        frame = getattr(ledgers, name, None)
        if frame is not None:
            tables.write_draws(frame, work / f"{name}.parquet")


def _write_figures(ledgers: Any, folder: Path, progress: Callable[[int, int, str], None] | None) -> None:
    from haloledger.report.figures import save, sightline_figure

    folder.mkdir()
    names = file_names([str(burst) for burst in ledgers.bursts.burst])
    shown = set(np.unique(ledgers.sightlines["burst"]).astype(str))
    for done, (burst, stem) in enumerate(names.items()):
        if progress:
            progress(done, len(names), "figures")
        if burst in shown:
            save(sightline_figure(ledgers, burst), folder / f"{stem}.png")
    if progress:
        progress(len(names), len(names), "figures")


def _write_run(ledgers: Any, work: Path) -> None:
    import tomli_w

    files = sorted(path for path in work.rglob("*") if path.is_file())
    listed = {path.relative_to(work).as_posix(): hashlib.sha256(path.read_bytes()).hexdigest() for path in files}
    run = {"written_by": _MARK, **_toml(ledgers.run), "files": listed}
    (work / RUN_FILE).write_text(tomli_w.dumps(run, multiline_strings=True), encoding="utf-8")


def _toml(value: Any) -> Any:
    """`value` as TOML can hold it: numpy numbers become plain, what is None is left out."""
    if isinstance(value, dict):
        return {str(k): _toml(v) for k, v in value.items() if v is not None}
    if isinstance(value, list | tuple | set | frozenset):
        return [_toml(v) for v in value if v is not None]
    if isinstance(value, np.ndarray):
        return [_toml(v) for v in value.tolist()]
    if isinstance(value, np.generic):
        return value.item()
    return str(value) if isinstance(value, Path) else value


def _move(work: Path, place: Path, earlier: list[str]) -> list[Path]:
    """Rename every file into `place`, `run.toml` last, and remove what only the earlier run had."""
    os.chmod(work, 0o777 & ~_umask())
    names = sorted((p.relative_to(work).as_posix() for p in work.rglob("*") if p.is_file()), key=_run_last)
    if not place.exists():
        os.replace(work, place)  # one step: the folder is there with all its files or not at all
        return [place / name for name in names]
    for name in names:
        (place / name).parent.mkdir(exist_ok=True)
        os.replace(work / name, place / name)
    for name in set(earlier) - set(names):
        (place / name).unlink(missing_ok=True)
    if (place / FIGURES).is_dir() and not any((place / FIGURES).iterdir()):
        (place / FIGURES).rmdir()
    return [place / name for name in names]


def _run_last(name: str) -> tuple[bool, str]:
    return name == RUN_FILE, name


def _umask() -> int:
    """The mask of this process; mkdtemp makes folders nobody else may read, results should follow the user's habit."""
    mask = os.umask(0)
    os.umask(mask)
    return mask
