"""Judging rows: what all three tables have in common. A bad row is listed and left out, the others go on."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from haloledger.catalogs.canonical import Refusal
from haloledger.catalogs.frames import to_cmb
from haloledger.catalogs.prepare import Prepared
from haloledger.catalogs.schema import FIELDS
from haloledger.errors import InputError

HIGHEST_REDSHIFT = 20.0  # above it a "redshift" is a velocity


class Rows:
    """The rows of a prepared table that are still good, and the refusals so far."""

    def __init__(self, table: Prepared, name_column: str):
        self.table = table
        self.name_column = name_column
        self.names = table.text(name_column)
        self.good = np.ones(len(table), dtype=bool)
        self.refused: list[Refusal] = []

    def refuse(self, bad: np.ndarray, column: str, found: Callable[[int], str], advice: str) -> None:
        """Leave out the rows of the mask `bad`; a row is told its first fault only."""
        for i in np.flatnonzero(bad & self.good).tolist():
            self.refused.append(
                Refusal(self.table.file, int(self.table.row_number[i]), str(self.names[i]), column, found(i), advice)
            )
        self.good &= ~bad

    def value(self, column: str) -> Callable[[int], str]:
        """What to print for a row: the cell of that column."""
        cells = self.table.columns.get(column)
        return lambda i: (
            "nothing"
            if cells is None or str(cells[i]) in ("nan", "")
            else f"{cells[i]:g}"
            if cells.dtype.kind == "f"
            else str(cells[i])
        )

    def index(self) -> np.ndarray:
        """Good rows; InputError where none is left."""
        if not len(self.table):
            raise InputError(
                f"{self.table.file}: an empty list: card '{self.table.label}' leaves out every row. Give at least one."
            )
        if not self.good.any():
            r = self.refused[0]
            raise InputError(
                f"{self.table.file}: all {len(self.table)} rows are refused; the first, row {r.row} ('{r.name}'), for"
                f" '{r.column}': found {r.found}. {r.advice}"
            )
        return np.flatnonzero(self.good)

    def refusals(self) -> tuple[Refusal, ...]:
        """All refusals, in the order of the file."""
        return tuple(sorted(self.refused, key=lambda r: r.row))

    # -- checks ------------------------------------------------------------------------------------------------------

    def check_names(self) -> None:
        """A row needs a name of its own; the first of several keeps it."""
        self.refuse(self.names == "", self.name_column, lambda i: "nothing", "Give the row a name of its own.")
        _, first = np.unique(self.names, return_index=True)
        again = np.ones(len(self.table), dtype=bool)
        again[first] = False
        if again.any():
            where = {n: int(self.table.row_number[i]) for n, i in zip(self.names[first], first, strict=True)}
            self.refuse(
                again,
                self.name_column,
                lambda i: f"'{self.names[i]}' again, first in row {where[self.names[i]]}",
                "Give each row its own name, or leave the copy out.",
            )

    def check_numbers(self) -> None:
        """Words where a number belongs, infinities, negative errors."""
        n = len(self.table)
        for column, cells in self.table.not_numbers.items():
            if column.startswith("mag_"):
                continue  # words such as "faint" in a magnitude: no magnitude
            bad = np.zeros(n, dtype=bool)
            bad[list(cells)] = True
            advice = "Write a number, or leave the cell empty."
            if column in ("ra", "dec"):
                advice = "Write decimal degrees, ICRS."
            self.refuse(bad, column, lambda i, cells=cells: repr(cells[i]), advice)  # type: ignore[misc]
        for column, spec in FIELDS[self.table.kind].items():
            if spec.text or column not in self.table.columns:
                continue
            values = self.table.columns[column]
            if column.startswith("mag_"):
                self.table.columns[column] = np.where(np.isfinite(values), values, np.nan)
                continue
            self.refuse(np.isinf(values), column, self.value(column), "Write a finite number, or leave the cell empty.")
            if spec.not_negative:
                self.refuse(
                    values < 0, column, self.value(column), "Write zero or a positive number, or leave the cell empty."
                )

    def check_position(self) -> None:
        """RA 0..360 and Dec -90..90, both given."""
        ra, dec = self.table.number("ra"), self.table.number("dec")
        for column, values in (("ra", ra), ("dec", dec)):
            self.refuse(np.isnan(values), column, lambda i: "nothing", "Write decimal degrees, ICRS.")
        self.refuse((ra < 0) | (ra > 360), "ra", self.value("ra"), "Write right ascension in degrees from 0 to 360.")
        self.refuse(np.abs(dec) > 90, "dec", self.value("dec"), "Write declination in degrees from -90 to 90.")

    def check_redshift(self) -> None:
        """A redshift above zero, or a distance."""
        z, d = self.table.number("z"), self.table.number("distance_mpc")
        self.refuse(
            d <= 0,
            "distance_mpc",
            self.value("distance_mpc"),
            "Write a positive distance in Mpc, or leave the cell empty.",
        )
        no_distance = np.isnan(d)
        self.refuse(
            np.isnan(z) & no_distance, "z", lambda i: "nothing", "Write a redshift, or a distance in distance_mpc."
        )
        self.refuse(
            (z <= 0) & no_distance,
            "z",
            self.value("z"),
            "A redshift of zero or below needs a distance: write it in distance_mpc.",
        )
        self.refuse(
            (z > HIGHEST_REDSHIFT) | (z <= -1),
            "z",
            self.value("z"),
            "Write a redshift; a velocity in km/s is divided by 299792.458.",
        )

    def check_log_mass(self, column: str, lowest: float, highest: float) -> None:
        """Masses are log10 Msun without h: a value no logarithm can have is refused."""
        if column not in self.table.columns:
            return
        m = self.table.columns[column]
        self.refuse(
            m > 20, column, self.value(column), "This is not a logarithm: write log10 of the mass in Msun, without h."
        )
        self.refuse(
            (m < lowest) | (m > highest),
            column,
            self.value(column),
            f"log10 of a mass in Msun (no h, no 1e14 units) lies between {lowest:g} and {highest:g}: write that.",
        )


def redshift_error(table: Prepared, photometric: np.ndarray, index: np.ndarray) -> np.ndarray:
    """The given error, else the card's typical one, else 0 (spectroscopic) or 0.03 (1+z) (photometric).

    0.03 (1+z): broad-band photometric redshifts of galaxies, common practice.
    """
    z, given = table.number("z"), table.number("z_err")
    r = table.card.redshift
    z = np.where(np.isfinite(z), z, np.nan)
    default = r.error + r.error_per_one_plus_z * (1 + z)
    if table.bare:
        default = np.where(photometric, 0.03 * (1 + z), 0.0)
    lacks = np.isnan(given) & np.isfinite(z)
    lacks = lacks & np.isin(np.arange(len(table)), index)
    spec, phot = int((lacks & ~photometric).sum()), int((lacks & photometric).sum())
    if table.bare and spec:
        table.notes.append(f"{table.label}: no redshift error in {spec} spectroscopic rows: taken as exact (z_err = 0)")
    if table.bare and phot:
        table.notes.append(f"{table.label}: no redshift error in {phot} photometric rows: 0.03 (1+z) is used")
    return np.where(np.isnan(given), default, given)


def flow_redshift(table: Prepared, index: np.ndarray) -> np.ndarray | None:
    """Redshifts for distances: in the CMB frame where a card states the frame, as given (None) in a bare table."""
    if table.bare:
        return None
    z, ra, dec = (table.number(name)[index] for name in ("z", "ra", "dec"))
    return to_cmb(z, ra, dec)


def photometric_rows(rows: Rows) -> np.ndarray:
    """bool (n,): z_kind says 'phot'; where it says nothing, the card decides (spectroscopic in a bare table)."""
    table = rows.table
    said = np.char.lower(table.text("z_kind").astype(str))
    phot = np.isin(said, ["phot", "photo", "photometric"])
    spec = np.isin(said, ["spec", "spectroscopic"])
    rows.refuse(~phot & ~spec & (said != ""), "z_kind", rows.value("z_kind"), "Write 'spec' or 'phot'.")
    return np.where(said == "", table.card.redshift.kind == "phot", phot)


def distance_error(table: Prepared, index: np.ndarray) -> np.ndarray:
    """The given error, else the card's share (10% in a bare table) of the distance; zero counts as not given."""
    d, given = table.number("distance_mpc"), table.number("distance_err_mpc")
    lacks = np.isfinite(d) & ~(given > 0)
    share = table.card.distance.error_share
    n = int(lacks[index].sum())
    if n:
        table.notes.append(f"{table.label}: no distance error in {n} rows: {100 * share:g}% is used")
    return np.where(lacks, share * d, given)


def error_or_default(table: Prepared, value: str, error: str, default: float, index: np.ndarray) -> np.ndarray:
    """Error of a log mass; rows without one get the default, with a note."""
    m, given = table.number(value), table.number(error)
    lacks = np.isfinite(m) & np.isnan(given)
    n = int(lacks[index].sum())
    if n:
        table.notes.append(f"{table.label}: no {error} in {n} rows: {default:g} dex is used")
    return np.where(lacks, default, given)


def row_names(label: str, names: np.ndarray) -> np.ndarray:
    """'label:id' of each row."""
    return np.char.add(f"{label}:", names.astype(str))
