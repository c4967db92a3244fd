"""A true sky in files: one FITS file with the tables LINES, HALOES and GALAXIES, a simulated one or a user's own.

Columns are the names of `truth.Lines`, `truth.Haloes` (with `dm`, the true column [pc cm-3, observer frame]) and
`truth.Galaxies`; what only a simulated sky has may be left out.
"""

from __future__ import annotations

from dataclasses import fields
from pathlib import Path

import numpy as np

from haloledger.errors import InputError
from haloledger.rehearse.sky.truth import Galaxies, Haloes, Lines, Sky

NEEDED = {
    "LINES": ("ra_deg", "dec_deg", "z", "z_seen", "host"),
    "HALOES": ("line", "log_m200c", "z", "z_seen", "east_mpc", "north_mpc", "dm"),
    "GALAXIES": ("halo", "central", "measured", "z_seen", "east_mpc", "north_mpc"),
}
WHOLE = ("line", "halo", "host", "relation")
MASS_ERR = 0.15  # dex, where the file's header has no MASSERR


def write_sky(sky: Sky, path: str | Path) -> None:
    """Write the sky as one FITS file."""
    from astropy.io import fits
    from astropy.table import Table

    tables = {"LINES": vars(sky.lines), "HALOES": {**vars(sky.haloes), "dm": sky.dm}, "GALAXIES": vars(sky.galaxies)}
    parts = [fits.PrimaryHDU()]
    for name, columns in tables.items():
        parts.append(fits.table_to_hdu(Table(columns)))
        parts[-1].name = name
    parts[0].header["MASSERR"] = (sky.mass_err, "dex, error of measured stellar masses")
    fits.HDUList(parts).writeto(path, overwrite=True)


def read_sky(path: str | Path) -> Sky:
    """A sky from a FITS file. InputError names the table and the column that are wrong."""
    from astropy.io import fits

    if not Path(path).is_file():
        raise InputError(f"--sky {path}: no such file. Give a FITS file with the tables {', '.join(NEEDED)}.")
    try:
        with fits.open(path) as file:
            tables = {name: _columns(file, name, path) for name in NEEDED}
            mass_err = float(file[0].header.get("MASSERR", MASS_ERR))
    except OSError as fault:
        raise InputError(f"--sky {path}: cannot be read as FITS ({fault}). Write one with astropy.") from None
    lines, haloes, galaxies = tables["LINES"], tables["HALOES"], tables["GALAXIES"]
    _points_into(haloes, "HALOES", "line", len(lines["z"]), "LINES", path)
    _points_into(galaxies, "GALAXIES", "halo", len(haloes["z"]), "HALOES", path)
    _points_into(lines, "LINES", "host", len(galaxies["halo"]), "GALAXIES", path)
    n = len(lines["z"])
    for name in ("relation", "zero_point", "kept_score"):
        lines.setdefault(name, np.zeros(n, dtype=int if name == "relation" else float))
    hosts = np.zeros(len(haloes["z"]), dtype=bool)
    hosts[galaxies["halo"][lines["host"]]] = True
    haloes["holds_burst"] = haloes.get("holds_burst", hosts).astype(bool)
    haloes.setdefault("c200c", np.full(len(hosts), np.nan))
    galaxies.setdefault("log_mstar", galaxies["measured"])
    galaxies["central"] = galaxies["central"].astype(bool)
    dm = haloes.pop("dm")
    return Sky(Lines(**lines), Haloes(**haloes), Galaxies(**galaxies), dm, mass_err)


def _columns(file, name: str, path) -> dict[str, np.ndarray]:
    if name not in file:
        raise InputError(f"--sky {path}: no table {name}. A sky has the tables {', '.join(NEEDED)}.")
    data = file[name].data
    known = [f.name for f in fields({"LINES": Lines, "HALOES": Haloes, "GALAXIES": Galaxies}[name])]
    there = {c.lower(): c for c in data.names}
    for column in NEEDED[name]:
        if column not in there:
            raise InputError(
                f"--sky {path}: table {name} has no column '{column}'. It needs {', '.join(NEEDED[name])}."
            )
    found = {}
    for column in (*known, "dm"):
        if column in there:
            values = np.array(data[there[column]])
            values = values.astype(np.int64 if column in WHOLE else bool if values.dtype.kind == "b" else float)
            if column in NEEDED[name] and values.dtype.kind == "f" and not np.isfinite(values).all():
                row = int(np.flatnonzero(~np.isfinite(values))[0]) + 1
                raise InputError(
                    f"--sky {path}: table {name}, row {row}: '{column}' is not a number. Leave the row out."
                )
            found[column] = values
    return found


def _points_into(table, name: str, column: str, n: int, target: str, path) -> None:
    wrong = np.flatnonzero((table[column] < 0) | (table[column] >= n))
    if wrong.size:
        raise InputError(
            f"--sky {path}: table {name}, row {wrong[0] + 1}: {column} = {table[column][wrong[0]]} points to no row of"
            f" {target}, which has {n}. Write its place, counted from 0."
        )
