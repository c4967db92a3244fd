"""Prepared galaxy columns -> Galaxies."""

from __future__ import annotations

import numpy as np

from haloledger.catalogs.canonical import Galaxies
from haloledger.catalogs.prepare import Prepared
from haloledger.catalogs.redshift_density import SCORES, redshift_scores
from haloledger.catalogs.rows import (
    Rows,
    distance_error,
    error_or_default,
    flow_redshift,
    photometric_rows,
    redshift_error,
    row_names,
)
from haloledger.catalogs.schema import BAND_SYSTEM, BANDS
from haloledger.errors import InputError

STELLAR_MASS_RANGE = (1.0, 14.0)  # log10 Msun; below, a cell is in units of 1e10, above, it is nobody's galaxy
STAR = ("star", "s", "stellar", "point source")
HALO_MASS_RANGE = (5.0, 17.0)


def galaxies_from(table: Prepared) -> Galaxies:
    """Checks each row, fills in errors, keeps the good rows."""
    rows = Rows(table, "id")
    rows.check_names()
    rows.check_numbers()
    rows.check_position()
    z_scores = _density(rows)
    rows.check_redshift()
    rows.check_log_mass("log_mstar", *STELLAR_MASS_RANGE)
    rows.check_log_mass("log_m200c", *HALO_MASS_RANGE)
    _leave_out_stars(rows)
    photometric = photometric_rows(rows)
    if z_scores is not None:
        photometric = photometric | np.isfinite(z_scores[:, 0])
    index = rows.index()
    card = table.card
    bands = [b for b in BANDS if f"mag_{b}" in table.columns]
    system = {b: card.magnitudes.system.get(b, BAND_SYSTEM[b]) for b in bands}
    if table.bare and bands:
        said = ", ".join(f"{b} {system[b]}" for b in bands)
        table.notes.append(f"{table.label}: magnitudes are taken as apparent and extinction-corrected: {said}")
    columns = {
        "z_err": redshift_error(table, photometric, index),
        "log_mstar_err": error_or_default(table, "log_mstar", "log_mstar_err", card.mass.error_dex, index),
        "log_m200c_err": error_or_default(table, "log_m200c", "log_m200c_err", card.mass.error_dex, index),
        "distance_err_mpc": distance_error(table, index),
    }
    return Galaxies(
        label=table.label,
        row=row_names(table.label, rows.names[index]),
        ra_deg=table.number("ra")[index] % 360.0,
        dec_deg=table.number("dec")[index],
        z=table.number("z")[index],
        photometric=photometric[index].astype(bool),
        log_mstar=table.number("log_mstar")[index],
        log_m200c=table.number("log_m200c")[index],
        distance_mpc=table.number("distance_mpc")[index],
        group=table.text("group_id")[index],
        mag={b: table.number(f"mag_{b}")[index] for b in bands},
        mag_system=system,
        mag_rest=card.magnitudes.rest_frame,
        radius_arcsec=table.number("radius_arcsec")[index] if "radius_arcsec" in table.columns else None,
        z_scores=None if z_scores is None else z_scores[index],
        z_outlier=card.redshift.outliers,
        z_flow=flow_redshift(table, index),
        z_is=card.redshift.taken_as,
        mass_is=card.mass.taken_as or "likelihood",
        mass_err_holds_z=card.mass.error_holds_redshift,
        notes=tuple(table.notes),
        refused=rows.refusals(),
        **{name: values[index] for name, values in columns.items()},
    )


def _leave_out_stars(rows: Rows) -> None:
    """Rows that call themselves stars, with a note."""
    star = np.isin(np.char.lower(rows.table.text("object_class").astype(str)), STAR)
    if star.all() and len(star):
        raise InputError(f"{rows.table.file}: every row is a 'star' in 'object_class'. Give a table of galaxies.")
    if star.any():
        rows.table.notes.append(f"{rows.table.label}: {int(star.sum())} rows left out: stars by 'object_class'")
    rows.good &= ~star


def _density(rows: Rows) -> np.ndarray | None:
    """p(z) where the table gives it; its median and half width stand in for z and z_err that are not given."""
    scores = redshift_scores(rows)
    if scores is None:
        return None
    table, middle = rows.table, SCORES.size // 2
    one = int(np.argmin(np.abs(SCORES - 1)))
    half = 0.5 * (scores[:, one] - scores[:, -1 - one])
    for name, value in (("z", scores[:, middle]), ("z_err", half)):
        given = table.number(name)
        table.columns[name] = np.where(np.isnan(given), value, given)
    said = np.isin(np.char.lower(table.text("z_kind").astype(str)), ["spec", "spectroscopic"])
    scores[said] = np.nan
    taken = int(np.isfinite(scores[:, 0]).sum())
    table.notes.append(f"{table.label}: p(z) of {taken} rows is used, as a likelihood: volume and number act on top")
    return scores
