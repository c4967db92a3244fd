"""Opening a table: any of our formats, by content before name; what cannot be read ends in an InputError."""

from __future__ import annotations

import gzip
import io
import re
import warnings
import zlib
from collections.abc import Iterable
from pathlib import Path
from typing import Any

from haloledger.catalogs.raw import MISSING_TEXT, RawTable, from_astropy, from_pandas
from haloledger.catalogs.schema import near
from haloledger.errors import InputError

FORMATS = ("ecsv", "csv", "text", "fits", "votable", "parquet")


def open_table(
    path: str | Path,
    text_columns: Iterable[str] = (),
    format: str = "",
    delimiter: str = "",
    label: str = "",
) -> RawTable:
    """The table in a file.

    text_columns  native columns that hold names: their digits stay as written ("007" is not 7)
    format        one of FORMATS, "" = told from the content
    delimiter     of a text table, "" = told from the header line
    Raises InputError where the file is absent, empty, cut short, a web page or no table.
    """
    path = Path(path)
    data = _content(path)
    found = format or _format(data, path)
    label = label or stem(path)
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # units unknown to astropy, old VOTable dialects: judged by us, later
            if found in ("csv", "text"):
                table = _read_text(data, str(path), label, {t.lower() for t in text_columns}, delimiter, found)
            else:
                table = from_astropy(_read_binary(data, path, found), str(path), label)
    except InputError:
        raise
    except (MemoryError, KeyboardInterrupt):
        raise
    except Exception as fault:  # each format's reader has its own zoo of exceptions
        reason = str(fault).strip().splitlines()[0] if str(fault).strip() else type(fault).__name__
        raise InputError(
            f"{path}: cannot be read as {found} ({reason})."
            " Is the file whole, and is it ECSV, CSV, FITS, VOTable or Parquet?"
        ) from None
    if not table.columns:
        raise InputError(f"{path}: the table has no columns. Write a header line with the column names first.")
    return table


def stem(path: Path) -> str:
    """File name without its endings: 'a.csv.gz' -> 'a'."""
    name = path.name
    for _ in range(2):
        name = re.sub(r"\.(gz|csv|ecsv|txt|dat|tsv|fits?|vot|votable|xml|parquet|pq)$", "", name, flags=re.I)
    return name or path.name


def _content(path: Path) -> bytes:
    if path.is_dir():
        raise InputError(f"{path}: is a folder. Name the table inside it.")
    if not path.is_file():
        beside = [p.name for p in path.parent.iterdir()] if path.parent.is_dir() else []
        found = near(path.name, beside)
        hint = f" Did you mean '{path.parent / found}'?" if found else " Check the path."
        raise InputError(f"{path}: no such file.{hint}")
    try:
        data = path.read_bytes()
        if data[:2] == b"\x1f\x8b":
            data = gzip.decompress(data)
    except (OSError, EOFError, zlib.error) as fault:
        raise InputError(f"{path}: cannot be opened ({fault}). Is the file whole? Fetch it again.") from None
    if not data.strip():
        raise InputError(f"{path}: is empty. A table needs a header line and at least one row.")
    head = data[:2000].lstrip(b"\xef\xbb\xbf \t\r\n").lower()
    if head.startswith((b"<!doctype html", b"<html")):
        raise InputError(f"{path}: is a web page, not a table. Download the table itself and name that file.")
    return data


def _format(data: bytes, path: Path) -> str:
    head = data[:2000].lstrip(b"\xef\xbb\xbf \t\r\n")
    if data[:9] == b"SIMPLE  =":
        return "fits"
    if data[:4] == b"PAR1":
        return "parquet"
    if head[:1] == b"<" and b"VOTABLE" in data[:4000].upper():
        return "votable"
    if re.match(rb"#\s*%ECSV", head):
        return "ecsv"
    ending = re.sub(r"\.gz$", "", path.name.lower()).rsplit(".", 1)[-1]
    known = {"fits": "fits", "fit": "fits", "parquet": "parquet", "pq": "parquet", "vot": "votable", "xml": "votable"}
    if ending in known:
        named = known[ending]
        raise InputError(
            f"{path}: is named like {named} but does not begin like one. Is the file whole? Fetch it again."
        )
    return "csv" if ending == "csv" else "text"


def _read_binary(data: bytes, path: Path, found: str) -> Any:
    from astropy.table import Table

    source: Any = data.decode("utf-8-sig") if found == "ecsv" else io.BytesIO(data)
    if found == "ecsv":
        return Table.read(source, format="ascii.ecsv")
    if found == "votable":
        return Table.read(source, format="votable")
    if found == "parquet":
        return _read_parquet(data)
    if found == "fits":
        return _read_fits(data)
    raise InputError(f"{path}: no format '{found}'; there are {', '.join(FORMATS)}.")


def _read_fits(data: bytes) -> Any:
    from astropy.io import fits
    from astropy.table import Table

    with fits.open(io.BytesIO(data)) as hdus:
        tables = [h for h in hdus if isinstance(h, fits.BinTableHDU | fits.TableHDU)]
        if not tables:
            raise ValueError("no table extension in it")
        where = tables[0].fileinfo()
        if where["datLoc"] + tables[0].size > len(data):
            raise ValueError("the file ends before its table does: it was cut short")
        return Table.read(tables[0])


def _read_parquet(data: bytes) -> Any:
    from astropy.table import Table

    return Table.read(io.BytesIO(data), format="parquet")


def _decode(data: bytes) -> str:
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError:
        return data.decode("latin-1")


def _read_text(data: bytes, file: str, label: str, text_columns: set[str], delimiter: str, found: str) -> RawTable:
    """A text table: lines that begin with # are comments, the first other line names the columns."""
    import pandas as pd

    if b"\x00" in data[:4000]:
        raise InputError(
            f"{file}: is a binary file, and not FITS, VOTable or Parquet. Write it as one of these or as CSV."
        )
    text = _decode(data)
    if text.startswith("#") or "\n#" in text:
        text = "\n".join(line for line in text.splitlines() if not line.lstrip().startswith("#"))
    text = text.lstrip("\r\n")
    header = text.split("\n", 1)[0].rstrip("\r")
    sep = delimiter or _separator(header, found)
    native = [c.strip() for c in _split(header, sep)]
    twice = {c for c in native if native.count(c) > 1}
    if twice:
        raise InputError(
            f"{file}: column '{sorted(twice)[0]}' stands twice in the header. Give each column its own name."
        )
    if all(_is_number(c) for c in native):
        raise InputError(
            f"{file}: the first line ({header[:60]!r}) holds numbers. Write a header line with the column names."
        )
    is_text = [c.lower() in text_columns for c in native]
    frame = pd.read_csv(
        io.StringIO(text),
        sep=sep if sep != " " else r"\s+",
        header=0,
        names=native,
        index_col=False,
        dtype={c: str for c, t in zip(native, is_text, strict=True) if t},
        na_values={c: _blanks(t) for c, t in zip(native, is_text, strict=True)},
        keep_default_na=False,
        skipinitialspace=True,
        skip_blank_lines=True,
        float_precision="round_trip",
        low_memory=False,
        on_bad_lines="error",
    )
    _refuse_long_lines(text, sep, native, file)
    return from_pandas(frame, file, label)


def _blanks(is_text: bool) -> list[str]:
    if is_text:
        return [""]
    return [form for word in MISSING_TEXT for form in {word, word.upper(), word.capitalize()}] + ["NaN"]


def _refuse_long_lines(text: str, sep: str, native: list[str], file: str) -> None:
    """pandas drops what stands beyond the last column without a word: such a line is told here."""
    if sep == " " or '"' in text:
        return
    for number, line in enumerate(text.splitlines()[1:], start=1):
        if line.count(sep) >= len(native) and line.rstrip(sep + " \r"):
            cells = line.split(sep)
            if any(c.strip() for c in cells[len(native) :]):
                raise InputError(
                    f"{file}: row {number} has {len(cells)} cells, the header {len(native)}."
                    f" Quote cells that hold '{sep}'."
                )


def _split(header: str, sep: str) -> list[str]:
    if sep == " ":
        return header.split()
    import csv

    return next(csv.reader([header], delimiter=sep, skipinitialspace=True), [])


def _separator(header: str, found: str) -> str:
    if found == "csv" and "," in header:
        return ","
    for sep in ("\t", "|", ",", ";"):
        if sep in header:
            return sep
    return "," if found == "csv" else " "


def _is_number(cell: str) -> bool:
    try:
        float(cell)
    except ValueError:
        return False
    return True
