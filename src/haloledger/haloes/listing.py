"""Rows of catalogues as haloes: every galaxy and group on its own, before doubles and members are found."""

from __future__ import annotations

from typing import Any

import numpy as np

from haloledger.catalogs.canonical import Galaxies, Groups
from haloledger.cosmos.background import Cosmos
from haloledger.errors import InputError
from haloledger.haloes.distances import point_luminosity_distance_mpc, point_redshift
from haloledger.haloes.relations import load_relation
from haloledger.haloes.stellar_mass import StellarMasses, stellar_masses
from haloledger.haloes.table import Haloes, rows

GROUP_ERR_DEX = 0.3  # of a listed mass without error; common practice for groups
DISPERSION_ERR = 0.91  # error of a velocity dispersion / (n - 1)^0.5, Ruel et al. 2014, ApJ 792, 45; from memory
DEFAULT_MEMBERS = 10
HEAVIEST_DEX = 12.0  # log10 Msun, six times M87: ours
DEFAULT_RELATION = {"sigma_v": "evrard2008", "richness": "mcclintock2019", "lx": "pratt2009"}
PROXY_COLUMN = {"sigma_v": "sigma_v_kms", "richness": "richness", "lx": "lx_1e44_erg_s"}


def galaxy_haloes(galaxies: Galaxies, catalogue: int, cosmos: Cosmos) -> Haloes:
    """One halo per galaxy that has a halo mass or a stellar mass, as listed or from magnitudes."""
    n = len(galaxies)
    stellar = stellar_masses(galaxies, point_luminosity_distance_mpc(galaxies, cosmos), cosmos)
    stellar = _believable(stellar, galaxies)
    listed = np.isfinite(galaxies.log_m200c)
    from_light = np.isnan(galaxies.log_mstar) & ~listed
    columns = _shared(galaxies, catalogue, cosmos) | {
        "kind": np.full(n, "galaxy"),
        "optical_radius_kpc": _optical_radius_kpc(galaxies, cosmos),
        "log_mstar": stellar.log_mstar,
        "centre_err_kpc": np.zeros(n),
        "note": np.where(listed, "halo mass as listed", stellar.note.astype(str)).astype(object),
        "mass_kind": np.where(listed, "m200c", "stellar"),
        "value": np.where(listed, galaxies.log_m200c, stellar.log_mstar),
        "value_err": np.where(listed, np.nan_to_num(galaxies.log_m200c_err, nan=0.0), stellar.err),
        "posterior": np.where(from_light, False, listed | (galaxies.mass_is == "posterior")),
        "err_holds_z": listed | (galaxies.mass_err_holds_z & ~from_light),
        "listed_group": np.asarray(galaxies.group).astype(object),
    }
    return _with_mass(Haloes(**columns), galaxies.label, "a stellar mass, a halo mass, or Ks, W1 or g and i magnitudes")


def _believable(stellar: StellarMasses, galaxies: Galaxies) -> StellarMasses:
    """Masses from light above the heaviest galaxies', cut there: a star, a blend or a wrong distance."""
    heavy = np.isnan(galaxies.log_mstar) & (stellar.log_mstar > HEAVIEST_DEX)
    note = stellar.note.copy()
    note[heavy] = [
        f"{n}; its light says 1e{m:.1f} Msun, more than any galaxy: cut" for n, m in _pairs(note, stellar, heavy)
    ]
    return StellarMasses(np.where(heavy, HEAVIEST_DEX, stellar.log_mstar), stellar.err, note)


def _pairs(note: np.ndarray, stellar: StellarMasses, where: np.ndarray):
    return zip(note[where], stellar.log_mstar[where], strict=True)


def group_haloes(groups: Groups, catalogue: int, cosmos: Cosmos) -> Haloes:
    """One halo per group with a mass, or with the proxy that its card names: one of the two, never both."""
    n = len(groups)
    has_mass = np.isfinite(groups.log_mass)
    proxy, proxy_err, relation, note = _proxy(groups)
    mass_err = np.where(np.isfinite(groups.log_mass_err), groups.log_mass_err, GROUP_ERR_DEX)
    bias, bias_err = groups.one_minus_b
    proxy_bias, proxy_bias_err = load_relation(relation).one_minus_b if relation else (1.0, 0.0)
    columns = _shared(groups, catalogue, cosmos) | {
        "kind": np.full(n, "group"),
        "log_mstar": np.full(n, np.nan),
        "centre_err_kpc": np.nan_to_num(groups.centre_err_kpc, nan=0.0),
        "note": np.where(has_mass, "mass as listed", note).astype(object),
        "mass_kind": np.where(has_mass, "mass", "proxy"),
        "value": np.where(has_mass, groups.log_mass, proxy),
        "value_err": np.where(has_mass, mass_err, proxy_err),
        "relation": np.where(has_mass, "", relation).astype(object),
        "mass_def": np.broadcast_to(np.asarray(groups.mass_def, dtype=object), n).copy(),
        "posterior": np.full(n, groups.mass_is == "posterior"),
        "one_minus_b": np.where(has_mass, bias, proxy_bias),
        "one_minus_b_err": np.where(has_mass, bias_err, proxy_bias_err),
        "precedence": np.full(n, groups.precedence),
        "origin": np.where(has_mass, groups.mass_from, groups.proxy).astype(object),
    }
    return _with_mass(Haloes(**columns), groups.label, "a mass, or a velocity dispersion, richness or X-ray luminosity")


def _shared(table: Galaxies | Groups, catalogue: int, cosmos: Cosmos) -> dict[str, Any]:
    n = len(table)
    row = np.asarray(table.row).astype(object)
    z_given = np.isfinite(table.z)
    return {
        "id": row,
        "source_rows": row.copy(),
        "ra_deg": np.asarray(table.ra_deg, dtype=float),
        "dec_deg": np.asarray(table.dec_deg, dtype=float),
        "z": np.where(z_given, table.z, point_redshift(table, cosmos)),
        "z_flow": _flow(table, z_given, cosmos),
        "z_err": np.where(z_given, np.nan_to_num(table.z_err, nan=0.0), 0.0),
        "photometric": np.asarray(table.photometric, dtype=bool),
        "z_scores": _scores(table),
        "z_outlier": np.where(table.photometric, getattr(table, "z_outlier", 0.0), 0.0),
        "distance_mpc": np.asarray(table.distance_mpc, dtype=float),
        "distance_err_mpc": np.asarray(table.distance_err_mpc, dtype=float),
        "optical_radius_kpc": np.full(n, np.nan),
        "p_member": np.zeros(n),
        "p_hosted": np.zeros(n),
        "bias_share": np.ones(n),
        "origin": np.full(n, "", dtype=object),
        "n_satellites": np.full(n, np.nan),
        "faintest": np.full(n, np.nan),
        "list_share": np.ones(n),
        "n_members": np.asarray(getattr(table, "n_members", np.full(n, np.nan)), dtype=float),
        "members": np.full(n, "", dtype=object),
        "relation": np.full(n, "", dtype=object),
        "mass_def": np.full(n, "200c", dtype=object),
        "z_posterior": np.full(n, table.z_is == "posterior"),
        "err_holds_z": np.zeros(n, dtype=bool),
        "one_minus_b": np.ones(n),
        "one_minus_b_err": np.zeros(n),
        "catalogue": np.full(n, catalogue),
        "precedence": np.full(n, 50),
        "listed_group": np.full(n, "", dtype=object),
    }


def _optical_radius_kpc(galaxies: Galaxies, cosmos: Cosmos) -> np.ndarray:
    if galaxies.radius_arcsec is None:
        return np.full(len(galaxies), np.nan)
    return np.radians(galaxies.radius_arcsec / 3600) * cosmos.angular_distance_kpc(point_redshift(galaxies, cosmos))


def _scores(table: Galaxies | Groups) -> np.ndarray:
    given = getattr(table, "z_scores", None)
    if given is None:
        return np.empty((len(table), 0))
    return np.where(np.asarray(table.photometric, dtype=bool)[:, None], given, np.nan)


def _flow(table: Galaxies | Groups, z_given: np.ndarray, cosmos: Cosmos) -> np.ndarray:
    flow = table.z if table.z_flow is None else table.z_flow
    return np.where(z_given, flow, point_redshift(table, cosmos))


def _proxy(groups: Groups) -> tuple[np.ndarray, np.ndarray, str, str]:
    """log10 of the card's proxy, its error [dex], the relation's name and the note."""
    n = len(groups)
    if not groups.proxy:
        return np.full(n, np.nan), np.full(n, np.nan), "", ""
    relation = groups.proxy_relation or DEFAULT_RELATION[groups.proxy]
    load_relation(relation)  # an unknown name is refused here, before anything is drawn
    measured = np.asarray(getattr(groups, PROXY_COLUMN[groups.proxy]), dtype=float)
    value = np.log10(np.where(measured > 0, measured, np.nan))
    err = np.zeros(n)
    if groups.proxy == "sigma_v":
        members = np.where(np.isfinite(groups.n_members), groups.n_members, DEFAULT_MEMBERS)
        err = DISPERSION_ERR / np.sqrt(np.maximum(members - 1, 1)) / np.log(10)
    return value, err, relation, f"mass from {groups.proxy} ({relation})"


def _with_mass(haloes: Haloes, label: str, wanted: str) -> Haloes:
    """The rows whose mass and place are known, in the order of id; the others are counted in a note."""
    usable = np.isfinite(haloes.value) & np.isfinite(haloes.z)
    usable &= (haloes.z > 0) | np.isfinite(haloes.distance_mpc)
    order = np.argsort(haloes.id[usable].astype(str), kind="stable")
    kept = rows(haloes, np.flatnonzero(usable)[order])
    lost = len(haloes) - len(kept)
    if not lost:
        return kept
    if not len(kept):
        raise InputError(
            f"{label}: none of its {lost} rows can be used. A row needs {wanted}, and a distance. Look for misspelt"
            " column names and for masses that are not log10."
        )
    note = f"{label}: {lost} of {len(haloes)} rows left out: no usable mass. A row needs {wanted}, and a distance."
    return Haloes(**{**vars(kept), "notes": (note,)})
