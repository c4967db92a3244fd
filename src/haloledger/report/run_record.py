"""All that is needed to run an audit again: inputs with their hashes, versions, options, model files."""

from __future__ import annotations

import hashlib
import platform
from collections.abc import Mapping, Sequence
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path

from haloledger import __version__

LIBRARIES = ("numpy", "scipy", "astropy", "colossus", "pandas", "pyarrow")


def run_record(options: dict, inputs: Mapping[str, Sequence], models: list, by_hand: list | None = None) -> dict:
    """Record as plain values for a TOML file.

    options  name -> value as given
    inputs   "bursts", "galaxies", ... -> what was given for each ("[CARD:]FILE" or a table in memory)
    models   the halo models used; their files' contents are written out
    by_hand  changes made by hand, as plain values
    """
    record = {
        "haloledger": __version__,
        "python": platform.python_version(),
        "libraries": {name: _version(name) for name in LIBRARIES},
        "options": {k: v for k, v in options.items() if v is not None},
        "inputs": [_input(kind, given) for kind, several in inputs.items() for given in several],
        "models": [m.stated() for m in models],
    }
    return record | ({"by_hand": by_hand} if by_hand else {})


def _input(kind: str, given) -> dict:
    if not isinstance(given, str | Path):
        return {"kind": kind, "given": f"table in memory, {len(given)} rows"}
    text = str(given)
    path = Path(text)
    if not path.is_file() and ":" in text:
        path = Path(text.split(":", 1)[1])
    record = {"kind": kind, "given": text}
    if path.is_file():
        record["path"] = str(path.resolve())
        record["sha256"] = hashlib.sha256(path.read_bytes()).hexdigest()
    return record


def _version(name: str) -> str:
    try:
        return version(name)
    except PackageNotFoundError:
        return "not installed"
