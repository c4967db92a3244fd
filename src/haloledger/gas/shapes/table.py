"""A user's own electron density, n_e(r/r200c, M200c), from a table file."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from pathlib import Path

import numpy as np
from scipy.interpolate import PchipInterpolator

from haloledger.errors import InputError
from haloledger.gas.shapes.base import Shape

COLUMNS = ("r_over_r200c", "log_m200c", "n_e")


@dataclass(frozen=True, kw_only=True)
class DensityTable(Shape):
    """density = n_e(x, M) [cm-3]: monotone cubic in (ln x, ln n_e), linear in log M between the masses of the table.

    file         ECSV, CSV or any table astropy reads, with columns r_over_r200c, log_m200c, n_e [cm-3]: the same
                 radii for every mass. Inside the smallest radius the density is constant; masses beyond the table take
                 its nearest.
    at_redshift  the redshift the densities are for; at others they scale with the critical density

    Every n_e must be above 0 and the radii must reach the model's boundary. A [kept] section in the model file keeps
    the shape and replaces the amount.
    """

    kind = "table"
    fixes = "electrons"
    file: str
    at_redshift: float = 0.0

    @property
    def depends_on(self) -> tuple[str, ...]:
        return ("mass",) if len(self._data[1]) > 1 else ()

    @property
    def x_max(self) -> float:
        return float(np.exp(self._data[0][-1])) * (1 + 1e-12)

    @cached_property
    def _data(self) -> tuple[np.ndarray, np.ndarray, list[PchipInterpolator]]:
        ln_x, log_m, ln_n = read_density_table(Path(self.file))
        return ln_x, log_m, [PchipInterpolator(ln_x, row, extrapolate=False) for row in ln_n]

    def density(self, x, log_m200c, z, c200c) -> np.ndarray:
        knots, masses, curves = self._data
        ln_x = np.log(np.clip(x, np.exp(knots[0]), np.exp(knots[-1])))
        ln_x = np.clip(ln_x, knots[0], knots[-1])  # exp and log do not undo each other to the last bit
        place = np.interp(log_m200c, masses, np.arange(len(masses)))
        total = 0.0
        for k, curve in enumerate(curves):  # over the few masses of the table: a tent function picks two neighbours
            total = total + np.maximum(0.0, 1 - np.abs(place - k)) * curve(ln_x)
        return np.exp(total)

    def check(self) -> str | None:
        if not self.file:
            return 'file is missing; write file = "my_density.ecsv"'
        if not 0 <= self.at_redshift <= 10:
            return f"at_redshift = {self.at_redshift} is outside 0..10"
        self._data  # noqa: B018  reads the file now, so that its faults are met when the model is loaded
        return None


def read_density_table(path: Path) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """ln(r/r200c) (n,), log10 M200c (m,) and ln n_e (m, n) of a user's table; InputError says what is wrong."""
    from astropy.table import Table

    if not path.is_file():
        raise InputError(f"{path}: no such file. Write the path of the density table, relative to the model file.")
    try:
        table = Table.read(path)
    except Exception as fault:  # astropy's readers raise many kinds
        raise InputError(f"{path}: astropy cannot read this table ({fault}). Write it as ECSV or CSV.") from None
    missing = [name for name in COLUMNS if name not in table.colnames]
    if missing:
        raise InputError(
            f"{path}: no column '{missing[0]}' among {table.colnames}. Write columns {', '.join(COLUMNS)}."
        )
    unit = table["n_e"].unit
    scale = 1.0 if unit is None else _to_cm3(unit, path)
    r, log_m, n_e = [_plain(table[name], path) for name in COLUMNS]
    for name, bad, want in (
        ("r_over_r200c", ~(r > 0), "a radius above 0"),
        ("log_m200c", ~((log_m > 5) & (log_m < 17)), "a log10 mass in Msun between 5 and 17"),
        ("n_e", ~(n_e > 0), "a density above 0 cm-3; end the table where the gas ends and set the boundary there"),
    ):
        if bad.any():
            row = int(np.flatnonzero(bad)[0])
            value = {"r_over_r200c": r, "log_m200c": log_m, "n_e": n_e}[name][row]
            raise InputError(f"{path}: row {row + 1}: {name} = {value:g}. Write {want}.")
    radii, masses = np.unique(r), np.unique(log_m)
    if len(radii) < 4 or len(table) != len(radii) * len(masses):
        raise InputError(
            f"{path}: {len(table)} rows for {len(radii)} radii and {len(masses)} masses. "
            "Write the same radii, four or more, once for every mass."
        )
    order = np.lexsort((r, log_m))
    if not np.array_equal(r[order], np.tile(radii, len(masses))):
        raise InputError(f"{path}: a pair of radius and mass stands twice. Write the same radii once for every mass.")
    return np.log(radii), masses, np.log(scale * n_e[order]).reshape(len(masses), len(radii))


def _to_cm3(unit, path: Path) -> float:
    try:
        return float(unit.to("cm-3"))
    except Exception:
        raise InputError(f"{path}: n_e is in '{unit}', not convertible to cm-3. Write it in cm-3.") from None


def _plain(column, path: Path) -> np.ndarray:
    """A column as doubles, masked cells as NaN."""
    try:
        return np.ma.filled(np.ma.asarray(column).astype(float), np.nan)
    except ValueError:
        raise InputError(f"{path}: column '{column.name}' holds text. Write numbers.") from None
