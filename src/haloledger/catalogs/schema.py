"""The columns of our three tables: name, unit, what it is. Readers, cards and messages all use this list."""

from __future__ import annotations

import difflib
from collections.abc import Iterable
from dataclasses import dataclass


@dataclass(frozen=True)
class Field:
    """One column of a canonical table. `unit` is an astropy unit string, "" for a pure number."""

    unit: str
    what: str
    required: bool = False
    text: bool = False
    log: bool = False  # log10 of `unit`
    not_negative: bool = False


MASS_DEFINITIONS = ("200c", "500c", "200m", "180m", "vir")
BANDS = ("g", "r", "i", "z", "ks", "w1")
# The systems in which these surveys publish: SDSS-like bands in AB, 2MASS and WISE in Vega. Common practice.
BAND_SYSTEM = {"g": "AB", "r": "AB", "i": "AB", "z": "AB", "ks": "Vega", "w1": "Vega"}

_POSITION = {
    "ra": Field("deg", "right ascension, ICRS", required=True),
    "dec": Field("deg", "declination, ICRS", required=True),
}
_DISTANCE = {
    "distance_mpc": Field("Mpc", "distance", not_negative=True),
    "distance_err_mpc": Field("Mpc", "its error", not_negative=True),
}

FIELDS: dict[str, dict[str, Field]] = {
    "galaxies": {
        "id": Field("", "name, unique in the table", required=True, text=True),
        **_POSITION,
        "z": Field("", "heliocentric redshift", required=True),
        "z_err": Field("", "redshift error", not_negative=True),
        "z_kind": Field("", "'spec' or 'phot'", text=True),
        "log_mstar": Field("Msun", "log10 stellar mass, no h, Chabrier", log=True),
        "log_mstar_err": Field("dex", "its error", not_negative=True),
        "log_m200c": Field("Msun", "log10 halo mass M200c, no h", log=True),
        "log_m200c_err": Field("dex", "its error", not_negative=True),
        **_DISTANCE,
        "radius_arcsec": Field("arcsec", "optical radius, such as that at 25 mag per square arcsec", not_negative=True),
        "object_class": Field("", "'star' rows are left out", text=True),
        "group_id": Field("", "id of the listed group it belongs to", text=True),
        **{f"mag_{band}": Field("mag", f"apparent magnitude, {band}") for band in BANDS},
    },
    "groups": {
        "id": Field("", "name, unique in the table", required=True, text=True),
        **_POSITION,
        "z": Field("", "heliocentric redshift", required=True),
        "z_err": Field("", "redshift error", not_negative=True),
        "z_kind": Field("", "'spec' or 'phot'", text=True),
        "log_mass": Field("Msun", "log10 mass, no h, in the definition of mass_def", required=True, log=True),
        "mass_def": Field("", "200c, 500c, 200m, 180m or vir", required=True, text=True),
        "log_mass_err": Field("dex", "its error", not_negative=True),
        "sigma_v": Field("km/s", "line-of-sight velocity dispersion", not_negative=True),
        "richness": Field("", "red-sequence richness", not_negative=True),
        "n_members": Field("", "number of listed members", not_negative=True),
        "lx": Field("1e44 erg/s", "X-ray luminosity 0.1-2.4 keV inside r500c", not_negative=True),
        **_DISTANCE,
        "centre_err_kpc": Field("kpc", "1 sigma of the centre on each axis", not_negative=True),
    },
    "bursts": {
        "burst": Field("", "name, unique in the table", required=True, text=True),
        **_POSITION,
        "z": Field("", "redshift of the host"),
        "z_err": Field("", "its error", not_negative=True),
        "dm": Field("pc/cm3", "dispersion measure", required=True),
        "dm_err": Field("pc/cm3", "its error", not_negative=True),
        "loc_major_arcsec": Field("arcsec", "1 sigma localisation, major axis", not_negative=True),
        "loc_minor_arcsec": Field("arcsec", "1 sigma localisation, minor axis", not_negative=True),
        "loc_pa_deg": Field("deg", "position angle of the major axis, east of north"),
        "dm_disc": Field("pc/cm3", "Milky Way disc", not_negative=True),
        "dm_disc_err": Field("pc/cm3", "its error", not_negative=True),
        "dm_mw_halo": Field("pc/cm3", "Milky Way halo", not_negative=True),
        "dm_mw_halo_err": Field("pc/cm3", "its error", not_negative=True),
        "host_id": Field("", "row of the host galaxy", text=True),
        "dm_host_rest": Field("pc/cm3", "host, rest frame", not_negative=True),
        "dm_host_obs": Field("pc/cm3", "host, observer frame", not_negative=True),
        "dm_host_err": Field("pc/cm3", "error of the host term", not_negative=True),
    },
}


def near(name: str, names: Iterable[str], cutoff: float = 0.6) -> str:
    """The most similar of `names`, case ignored, or ""."""
    by_lower = {n.lower(): n for n in names}
    found = difflib.get_close_matches(name.lower(), list(by_lower), n=1, cutoff=cutoff)
    return by_lower[found[0]] if found else ""


def did_you_mean(name: str, names: Iterable[str], cutoff: float = 0.6) -> str:
    """' Did you mean ...?' or ''."""
    found = near(name, names, cutoff)
    return f" Did you mean '{found}'?" if found else ""
