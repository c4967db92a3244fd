"""A table as it came from a file: arrays, which cells are missing, and the unit each column carries."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

MISSING_TEXT = ("", "nan", "na", "n/a", "null", "none", "--", "-")


@dataclass(frozen=True)
class RawColumn:
    """One column: values of any type, shape (n,), a mask of missing cells and the unit as a string ("" = none)."""

    values: np.ndarray
    missing: np.ndarray
    unit: str = ""

    def texts(self) -> np.ndarray:
        """Cells as text, verbatim but for blanks around them; "" where missing. An integer id is its digits."""
        v = self.values
        if v.dtype.kind == "S":
            text = np.char.decode(v, "utf-8", "replace")
        elif v.dtype.kind == "f":
            text = np.array([str(int(x)) if np.isfinite(x) and x == int(x) else str(x) for x in v], dtype=str)
        elif v.dtype.kind == "O":
            text = np.array([_text(x) for x in v], dtype=str)
        else:
            text = v.astype(str)
        return np.where(self.missing, "", np.char.strip(text.astype(str)))

    def numbers(self) -> tuple[np.ndarray, dict[int, str]]:
        """Cells as floats, NaN where missing, and the cells that are no numbers: row index -> text found."""
        if self.values.dtype.kind in "fiub":
            out = self.values.astype(float)
            out[self.missing] = np.nan
            return out, {}
        text = self.texts()
        out = np.full(len(text), np.nan)
        bad: dict[int, str] = {}
        for i, cell in enumerate(text.tolist()):
            try:
                out[i] = float(cell)
            except ValueError:
                if cell.lower() not in MISSING_TEXT:
                    bad[i] = cell
        out[self.missing] = np.nan
        return out, bad


def _text(x: Any) -> str:
    if isinstance(x, bytes):
        return x.decode("utf-8", "replace")
    return "" if x is None else str(x)


@dataclass(frozen=True)
class RawTable:
    """Columns by their native names. `file` is what messages call it, `label` the stem that rows are named after."""

    file: str
    label: str
    n: int
    columns: dict[str, RawColumn]


def from_astropy(table: Any, file: str, label: str) -> RawTable:
    """RawTable of an astropy Table. Columns that are no plain list of cells (coordinates, vectors) are left out."""
    columns = {}
    for name in table.colnames:
        column = table[name]
        if not hasattr(column, "dtype") or getattr(column, "shape", ()) != (len(table),):
            continue
        mask = np.broadcast_to(np.asarray(getattr(column, "mask", False), dtype=bool), (len(table),))
        plain = column.unmasked if hasattr(column, "unmasked") else column
        plain = np.asarray(getattr(plain, "data", plain) if not hasattr(plain, "to_value") else plain.value)
        if plain.dtype.kind not in "fiubSUO":
            continue
        if plain.dtype.kind == "O":
            mask = mask | np.array([x is None for x in plain], dtype=bool)
        unit = getattr(column, "unit", None)
        columns[str(name)] = RawColumn(plain, mask, "" if unit is None else str(unit))
    return RawTable(file, label, len(table), columns)


def from_pandas(frame: Any, file: str, label: str) -> RawTable:
    """RawTable of a pandas DataFrame; the index is not used."""
    columns = {}
    for position, name in enumerate(frame.columns):
        series = frame.iloc[:, position]
        missing = series.isna().to_numpy(dtype=bool)
        if str(series.dtype) in ("category", "string", "str") or series.dtype == object:
            values = np.array([None if m else x for x, m in zip(series, missing, strict=True)], dtype=object)
        elif missing.any():
            values = series.to_numpy(dtype=float, na_value=np.nan)
        else:
            values = series.to_numpy()
            if values.dtype.kind not in "fiubSUO":
                values = values.astype(str)
        columns[str(name)] = RawColumn(values, missing)
    return RawTable(file, label, len(frame), columns)
