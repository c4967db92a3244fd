"""Prepared group columns -> Groups."""

from __future__ import annotations

import numpy as np

from haloledger.catalogs.canonical import Groups
from haloledger.catalogs.galaxies import HALO_MASS_RANGE
from haloledger.catalogs.prepare import Prepared
from haloledger.catalogs.rows import (
    Rows,
    distance_error,
    error_or_default,
    flow_redshift,
    photometric_rows,
    redshift_error,
    row_names,
)
from haloledger.catalogs.schema import MASS_DEFINITIONS, near

HEAVIEST_CLUSTER = 15.9  # log10 Msun; the heaviest known have 15.5 within r200c: from memory
# Of several proxies the first is used: X-ray light, then richness, then dynamics. Common practice.
PROXIES = ("lx", "richness", "sigma_v")
# Which relation file turns a proxy into a mass where no card names one.
RELATION_OF = {"lx": "pratt2009", "richness": "mcclintock2019", "sigma_v": "munari2013"}


def groups_from(table: Prepared) -> Groups:
    """Checks each row, fills in errors, keeps the good rows."""
    rows = Rows(table, "id")
    rows.check_names()
    rows.check_numbers()
    rows.check_position()
    rows.check_redshift()
    rows.check_log_mass("log_mass", *HALO_MASS_RANGE)
    rows.refuse(
        table.number("log_mass") > HEAVIEST_CLUSTER,
        "log_mass",
        rows.value("log_mass"),
        f"More than any cluster, {HEAVIEST_CLUSTER:g}: write log10 of the mass in Msun, without h, or drop the row.",
    )
    card = table.card
    proxy, relation = _proxy(table)
    mass = table.number("log_mass")
    definition = _definitions(rows, mass)
    _mass_or_proxy(rows, mass, proxy)
    photometric = photometric_rows(rows)
    index = rows.index()
    columns = {
        "z_err": redshift_error(table, photometric, index),
        "log_mass_err": error_or_default(table, "log_mass", "log_mass_err", card.mass.error_dex, index),
        "distance_err_mpc": distance_error(table, index),
        "centre_err_kpc": _centre_error(table),
        "sigma_v_kms": table.number("sigma_v"),
        "n_members": table.number("n_members"),
        "richness": table.number("richness"),
        "lx_1e44_erg_s": table.number("lx"),
    }
    return Groups(
        label=table.label,
        row=row_names(table.label, rows.names[index]),
        ra_deg=table.number("ra")[index] % 360.0,
        dec_deg=table.number("dec")[index],
        z=table.number("z")[index],
        photometric=photometric[index].astype(bool),
        log_mass=mass[index],
        distance_mpc=table.number("distance_mpc")[index],
        mass_def=definition[index],
        mass_is=card.mass.taken_as or "posterior",
        mass_from=card.mass.made_from,
        proxy=proxy,
        proxy_relation=relation,
        one_minus_b=(card.mass.one_minus_b[0], card.mass.one_minus_b[1]),
        precedence=card.precedence,
        centre_err_share=card.centre.largest_share,
        z_flow=flow_redshift(table, index),
        z_is=card.redshift.taken_as,
        notes=tuple(table.notes),
        refused=rows.refusals(),
        **{name: values[index] for name, values in columns.items()},
    )


def _centre_error(table: Prepared) -> np.ndarray:
    """As given, else the card's; the one galaxy of a group of one is its centre."""
    centre = table.card.centre
    single = (table.number("n_members") == 1) & np.isfinite(centre.single_kpc)
    given = table.number("centre_err_kpc")
    return np.where(np.isnan(given), np.where(single, centre.single_kpc, centre.error_kpc), given)


def _proxy(table: Prepared) -> tuple[str, str]:
    """(proxy, relation) for rows without a mass: the card's, or the best of a bare table's columns."""
    if not table.bare:
        return table.card.proxy.use, table.card.proxy.relation
    for proxy in PROXIES:
        if proxy in table.columns and np.isnan(table.number("log_mass")).any():
            table.notes.append(
                f"{table.label}: rows without log_mass get their mass from '{proxy}' ({RELATION_OF[proxy]})"
            )
            return proxy, RELATION_OF[proxy]
    return "", ""


def _definitions(rows: Rows, mass: np.ndarray) -> np.ndarray:
    """Mass definition row by row; a mass with none, or an unknown one, is refused."""
    table = rows.table
    has = np.isfinite(mass)
    if "mass_def" not in table.columns:
        return np.where(has, table.card.mass.definition, "").astype(str)
    said = np.char.lower(table.text("mass_def").astype(str))
    said = np.where(np.char.startswith(said, "m"), np.char.lstrip(said, "m_"), said)
    rows.refuse(
        has & (said == ""),
        "mass_def",
        lambda i: "nothing",
        f"A mass without definition: write one of {', '.join(MASS_DEFINITIONS)}.",
    )
    for word in np.unique(said[has & (said != "") & ~np.isin(said, MASS_DEFINITIONS)]):
        alike = near(str(word), MASS_DEFINITIONS, 0.5)
        hint = f" Did you mean '{alike}'?" if alike else ""
        rows.refuse(
            has & (said == word),
            "mass_def",
            rows.value("mass_def"),
            f"Write one of {', '.join(MASS_DEFINITIONS)}.{hint}",
        )
    return np.where(has, said, "").astype(str)


def _mass_or_proxy(rows: Rows, mass: np.ndarray, proxy: str) -> None:
    """A row needs a mass, or the proxy of its table above zero."""
    lacks = np.isnan(mass)
    if proxy:
        rows.refuse(
            lacks & ~(rows.table.number(proxy) > 0),
            proxy,
            rows.value(proxy),
            f"Write log_mass and mass_def, or a positive '{proxy}'.",
        )
    else:
        rows.refuse(lacks, "log_mass", lambda i: "nothing", "Write log10 of the mass in Msun, and its mass_def.")
