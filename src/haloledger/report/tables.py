"""One table into one file: ECSV, CSV, FITS, VOTable or Parquet, masked cells and meanings kept."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import astuple
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
from astropy.table import Column, MaskedColumn, Table

from haloledger.errors import InputError
from haloledger.ledger.columns import SIGHTLINES, STATISTICS

if TYPE_CHECKING:
    import pandas as pd

    from haloledger.catalogs.canonical import Refusal

SUFFIX = {"ecsv": ".ecsv", "csv": ".csv", "fits": ".fits", "votable": ".vot", "parquet": ".parquet"}

_REFUSED = {
    "file": "file or table the row stands in",
    "row": "row, counted from 1; 0 for the whole file",
    "name": "burst or id",
    "column": "column that was at fault",
    "found": "what was found",
    "advice": "what to write instead",
}


def check_format(table_format: str) -> str:
    """The format, or an InputError that lists those that exist."""
    if table_format not in SUFFIX:
        raise InputError(f"No table format '{table_format}'. Write one of: {', '.join(SUFFIX)}.")
    return table_format


def described(table: Table, table_format: str) -> Table:
    """A plain copy of `table` that `table_format` can hold; units and meanings are those of its columns."""
    plain = Table(table, copy=True)
    for name in plain.colnames:
        if plain[name].dtype.kind == "O":
            plain[name] = _as_text(plain[name])
        unit = plain[name].unit
        if table_format in ("fits", "votable") and unit is not None and "dex" in str(unit):
            plain[name].unit = None  # neither standard knows dex; the meaning says log10 Msun
    return plain


def refused_table(refused: Sequence[Refusal]) -> Table:
    """Refused rows as a table."""
    table = Table(rows=[astuple(refusal) for refusal in refused], names=list(_REFUSED))
    for name, text in _REFUSED.items():
        table[name].description = text
    return table


def write_table(table: Table, path: Path, table_format: str) -> None:
    """Write a described table to `path`; CSV has no header for units, `legend` is its companion."""
    if table_format == "fits":
        _write_fits(table, path)
    elif table_format == "parquet":
        _write_parquet(table, path)
    elif table_format == "votable":
        table.write(path, format="votable", table_id="ledger")
    else:
        table.write(path, format="ascii.ecsv" if table_format == "ecsv" else "ascii.csv")


def legend(tables: dict[str, Table]) -> Table:
    """Table, column, unit and meaning of every column: what the header of the other formats holds."""
    rows = [
        (kind, name, str(table[name].unit or ""), table[name].description or "")
        for kind, table in tables.items()
        for name in table.colnames
    ]
    return Table(rows=rows, names=["table", "column", "unit", "meaning"])


def write_draws(frame: pd.DataFrame, path: Path) -> None:
    """Joint draws as Parquet; DM columns carry unit and meaning in the schema."""
    import pyarrow as pa
    from pyarrow import parquet

    # a draw of a term means what its mean means, without the statistic
    known_terms = {c.name.removesuffix("_mean"): c for c in SIGHTLINES if not c.name.endswith(STATISTICS[1:])}
    arrow = pa.Table.from_pandas(frame)
    schema = arrow.schema
    for i, column in enumerate(schema):
        term = known_terms.get(column.name)
        if term:
            text = term.meaning.removesuffix("; mean of the draws")
            known = {**(column.metadata or {}), "unit": term.unit.replace("text", ""), "description": text}
            schema = schema.set(i, column.with_metadata(known))
    parquet.write_table(arrow.cast(schema), path)


def _as_text(column: Column) -> Column:
    mask = np.array(getattr(column, "mask", np.zeros(len(column), bool)), copy=True)
    values = ["" if m or v is None else str(v) for v, m in zip(np.ma.getdata(column), mask, strict=True)]
    return MaskedColumn(np.array(values, dtype=str), mask=mask, unit=column.unit, description=column.description)


def _write_fits(table: Table, path: Path) -> None:
    from astropy.io import fits

    for name in table.colnames:
        if table[name].dtype.kind == "U":  # FITS holds ASCII only
            escaped = [str(v).encode("ascii", "backslashreplace").decode() for v in np.ma.getdata(table[name])]
            mask = getattr(table[name], "mask", None)
            kept = MaskedColumn(escaped, mask=mask) if mask is not None else Column(escaped)
            kept.description = table[name].description
            table[name] = kept
    table.write(path, format="fits")
    with fits.open(path, mode="update") as hdus:
        for number, name in enumerate(table.colnames, start=1):
            # the usual keyword for a column's comment: astropy keeps meanings in a place of its own
            comment = (table[name].description or "").encode("ascii", "replace").decode()
            hdus[1].header[f"TCOMM{number}"] = comment


def _write_parquet(table: Table, path: Path) -> None:
    """A masked number is a null, a masked text is empty; unit and meaning in each field and in astropy's header.

    Text has no nulls because astropy's reader stops at one.
    """
    import pyarrow as pa
    from astropy.table import meta
    from pyarrow import parquet

    arrays, fields, header = [], [], {}
    for name in table.colnames:
        array = _arrow(table[name])
        arrays.append(array)
        known = {"unit": str(table[name].unit or ""), "description": table[name].description or ""}
        fields.append(pa.field(name, array.type, metadata=known))
        if table[name].dtype.kind == "U":
            header[f"table::len::{name}"] = str(table[name].dtype.itemsize // 4)  # what astropy's reader asks for
    header["table_meta_yaml"] = "\n".join(meta.get_yaml_from_table(table))
    parquet.write_table(pa.Table.from_arrays(arrays, schema=pa.schema(fields, metadata=header)), path)


def _arrow(column: Column):
    import pyarrow as pa

    mask = np.asarray(getattr(column, "mask", np.zeros(len(column), bool)))
    values = np.ma.getdata(column)
    if values.dtype.kind == "U":
        return pa.array(["" if m else str(v) for v, m in zip(values, mask, strict=True)], pa.string())
    if mask.any():  # a whole number has no NaN to be read back as
        values = values.astype(float)
    return pa.array(np.asarray(values), mask=mask)
