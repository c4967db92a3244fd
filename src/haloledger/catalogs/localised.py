"""Prepared burst columns -> Bursts."""

from __future__ import annotations

import numpy as np

from haloledger.catalogs.canonical import Bursts
from haloledger.catalogs.prepare import Prepared
from haloledger.catalogs.rows import HIGHEST_REDSHIFT, Rows
from haloledger.errors import InputError

LARGEST_AXIS_ARCSEC = 3600.0 * 30  # beyond it the row is no localisation; usually an axis in another unit


def bursts_from(table: Prepared) -> Bursts:
    """Checks each row, reads the localisation, keeps the good rows in their order."""
    rows = Rows(table, "burst")
    _one_name_each(rows)
    rows.check_names()
    rows.check_numbers()
    rows.check_position()
    _check_redshift_and_dm(rows)
    major, minor, angle, note = _localisation(rows)
    index = rows.index()

    def number(name: str, fill: float = np.nan) -> np.ndarray:
        values = table.number(name)
        return np.where(np.isnan(values), fill, values)[index]

    return Bursts(
        burst=rows.names[index],
        ra_deg=number("ra") % 360.0,
        dec_deg=number("dec"),
        z=number("z"),
        z_err=number("z_err", 0.0),
        dm=number("dm"),
        dm_err=number("dm_err", 0.0),
        loc_major_arcsec=major[index],
        loc_minor_arcsec=minor[index],
        loc_pa_deg=angle[index],
        dm_disc=number("dm_disc"),
        dm_disc_err=number("dm_disc_err"),
        dm_mw_halo=number("dm_mw_halo"),
        dm_mw_halo_err=number("dm_mw_halo_err"),
        host=table.text("host_id")[index],
        dm_host_rest=number("dm_host_rest"),
        dm_host_obs=number("dm_host_obs"),
        dm_host_err=number("dm_host_err"),
        note=note[index],
        notes=tuple(table.notes),
        refused=rows.refusals(),
    )


def _one_name_each(rows: Rows) -> None:
    names, count = np.unique(rows.names[rows.names != ""], return_counts=True)
    if (count > 1).any():
        twice = names[count > 1][0]
        where = ", ".join(str(int(r)) for r in rows.table.row_number[rows.names == twice])
        raise InputError(
            f"{rows.table.file}: two bursts of one name: '{twice}' in rows {where}. Give each burst its own name (a"
            " letter behind the date), or leave one out."
        )


def _check_redshift_and_dm(rows: Rows) -> None:
    z, dm = rows.table.number("z"), rows.table.number("dm")
    rows.refuse(z <= 0, "z", rows.value("z"), "Write the host's redshift, above zero, or leave the cell empty.")
    rows.refuse(
        z > HIGHEST_REDSHIFT, "z", rows.value("z"), "Write a redshift; a velocity in km/s is divided by 299792.458."
    )
    rows.refuse(np.isnan(dm), "dm", lambda i: "nothing", "Write the dispersion measure in pc cm-3.")
    rows.refuse(dm <= 0, "dm", rows.value("dm"), "Write the observed dispersion measure, above zero, in pc cm-3.")


def _localisation(rows: Rows) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    """(major, minor, angle, note): 1 sigma axes [arcsec], NaN where none is given; angle east of north [deg]."""
    table = rows.table
    major, minor, angle = table.number("loc_major_arcsec"), table.number("loc_minor_arcsec"), table.number("loc_pa_deg")
    note = np.full(len(table), "", dtype=object)
    given = np.isfinite(major) | np.isfinite(minor)
    no_angle = given & np.isnan(angle) & (major != minor) & np.isfinite(major) & np.isfinite(minor)
    circle = no_angle & ((major > minor) | (table.card.position.without_angle == "larger circle"))
    larger = np.fmax(major, minor)
    for i in np.flatnonzero(circle):
        note[i] = (
            f"axes {major[i]:g} and {minor[i]:g} arcsec, no position angle: a circle of {larger[i]:g} arcsec is used"
        )
    major, minor = np.where(circle, larger, major), np.where(circle, larger, minor)
    rows.refuse(
        major < minor,
        "loc_major_arcsec",
        lambda i: f"major axis {major[i]:g} arcsec smaller than the minor, {minor[i]:g}",
        "Exchange the two and turn loc_pa_deg by 90 degrees.",
    )
    rows.refuse(
        np.isnan(major) & np.isfinite(minor), "loc_major_arcsec", lambda i: "nothing", "Write the major axis too."
    )
    rows.refuse(
        major > LARGEST_AXIS_ARCSEC,
        "loc_major_arcsec",
        lambda i: f"{major[i]:g}",
        "Axes are 1 sigma in arcsec, at most 30 degrees.",
    )
    minor = np.where(np.isnan(minor), major, minor)
    angle = np.where(np.isnan(angle) & given, 0.0, angle)
    note[~given] = "no localisation given: position taken as exact"
    return major, minor, angle, note.astype(str)
