"""Unit and meaning of every column that is written; the header of each table is filled from here."""

from __future__ import annotations

DM_UNIT = "pc cm-3"

_STATISTICS = {
    "mean": "mean of the draws",
    "p16": "16th percentile of the draws",
    "p50": "median of the draws",
    "p84": "84th percentile of the draws",
}

TERMS = {
    "dm_mw_disc": "DM of the Milky Way disc",
    "dm_mw_halo": "DM of the Milky Way halo",
    "dm_foreground": "observer-frame DM of all listed haloes in front of the burst",
    "dm_unlisted": "observer-frame DM of haloes expected here that the catalogues could not list",
    "dm_diffuse": "observer-frame DM of cosmic gas outside the boundaries of haloes",
    "dm_cosmic_mean_z": "cosmic DM of an average sightline to this redshift, before looking at any catalogue",
    "dm_cosmic_with_foreground": "cosmic DM after looking: listed haloes, unlisted haloes and diffuse gas",
    "dm_at_source": "observer-frame DM of haloes the burst lies in, from the burst outward; the host's own term apart",
    "dm_host_obs": "observer-frame DM of the host galaxy",
    "dm_after_mw_foreground": "observed DM less the Milky Way and the listed haloes",
    "dm_after_all": "observed DM less every term of the budget; negative values are results",
}

_SIGHTLINES = {
    "burst": ("", "name of the burst"),
    "model": ("", "halo model"),
    "ra": ("deg", "right ascension of the burst, ICRS"),
    "dec": ("deg", "declination of the burst, ICRS"),
    "z": ("", "redshift of the burst; blank: none given, drawn from P(z|DM)"),
    "dm": (DM_UNIT, "observed DM"),
    "n_haloes": ("", "haloes in the ledger"),
    "n_crossed_mean": ("", "haloes whose boundary the line crosses, mean of the draws"),
    "reach": ("", "share of the expected halo DM that lies in haloes these catalogues would have listed; blank: not assessed"),
    "control_p": ("", "share of control sightlines with at least this foreground DM; blank: not assessed"),
    "verdict": ("", "keep, check or set aside; a flag for people to weigh; blank: not assessed"),
    "reasons": ("", "reasons of the verdict"),
    "note": ("", "what else has to be said of this row"),
}

_ENTRIES = {
    "halo": ("", "halo, named for its first catalogue row; 'shared' is the rest of the variance"),
    "kind": ("", "galaxy, group or local"),
    "source_rows": ("", "catalogue rows this halo rests on"),
    "ra": ("deg", "right ascension of the halo, ICRS"),
    "dec": ("deg", "declination of the halo, ICRS"),
    "z": ("", "redshift of the halo, heliocentric"),
    "z_kind": ("", "spec, phot or distance"),
    "log_mstar": ("", "log10 of the stellar mass in Msun"),
    "log_m200c_p16": ("", "log10 of M200c in Msun, 16th percentile of the draws"),
    "log_m200c_p50": ("", "log10 of M200c in Msun, median of the draws"),
    "log_m200c_p84": ("", "log10 of M200c in Msun, 84th percentile of the draws"),
    "r200c_kpc": ("kpc", "r200c, proper, median of the draws"),
    "sep_arcmin": ("arcmin", "separation of halo and burst on the sky"),
    "impact_kpc_p16": ("kpc", "impact parameter, proper, 16th percentile of the draws"),
    "impact_kpc_p50": ("kpc", "impact parameter, proper, median of the draws"),
    "impact_kpc_p84": ("kpc", "impact parameter, proper, 84th percentile of the draws"),
    "impact_r200c": ("", "impact parameter in units of r200c, median of the draws"),
    "p_front": ("", "share of draws with the halo in front of the burst"),
    "p_member": ("", "share of draws in which a listed group holds the galaxy: no halo of its own"),
    "p_crossed": ("", "share of draws in which the line crosses the boundary of the halo"),
    "dm_mean": (DM_UNIT, "observer-frame DM of this halo, mean of the draws"),
    "dm_p16": (DM_UNIT, "observer-frame DM of this halo, 16th percentile of the draws"),
    "dm_p50": (DM_UNIT, "observer-frame DM of this halo, median of the draws"),
    "dm_p84": (DM_UNIT, "observer-frame DM of this halo, 84th percentile of the draws"),
    "dm_crossed_p50": (DM_UNIT, "observer-frame DM of this halo, median of the draws that cross it"),
    "share": ("", "part of the mean foreground DM; blank where the sum is zero"),
    "variance_share": ("", "Cov(entry, sum) / Var(sum)"),
    "boundary_arcmin": ("arcmin", "radius of the model's boundary on the sky, median of the draws"),
}

REFUSED = {
    "file": ("", "file or table the row stands in"),
    "row": ("", "row, counted from 1; 0 for the whole file"),
    "name": ("", "burst or id"),
    "column": ("", "column that was at fault"),
    "found": ("", "what was found"),
    "advice": ("", "what to write instead"),
}


def meaning(table: str, column: str) -> tuple[str, str]:
    """Unit and meaning of `column` in the table `sightlines` or `entries`; two empty texts where it is not known."""
    if table == "refused":
        return REFUSED.get(column, ("", ""))
    own = {"sightlines": _SIGHTLINES, "entries": {**_SIGHTLINES, **_ENTRIES}}.get(table, {})
    if column in own:
        return own[column]
    term, _, statistic = column.rpartition("_")
    if term in TERMS and statistic in _STATISTICS:
        return DM_UNIT, f"{TERMS[term]}: {_STATISTICS[statistic]}"
    return (DM_UNIT, TERMS[column]) if column in TERMS else ("", "")


def sightline_columns() -> list[str]:
    """Columns of `sightlines`, in order."""
    names = list(_SIGHTLINES)
    statistics = [f"{term}_{s}" for term in TERMS for s in _STATISTICS]
    return names[:6] + statistics + names[6:]


def entry_columns() -> list[str]:
    """Columns of `entries`, in order."""
    return ["burst", "model", *_ENTRIES, "note"]
