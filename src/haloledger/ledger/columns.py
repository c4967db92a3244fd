"""The columns of the two output tables: name, unit, meaning. The order here is the order in the files."""

from __future__ import annotations

from dataclasses import dataclass

from haloledger.ledger.budget import EXTRA_TERMS, TERMS

STATISTICS = ("mean", "p16", "p50", "p84")

_TERM_MEANING = {
    "dm_mw_disc": "Milky Way disc",
    "dm_mw_halo": "Milky Way halo",
    "dm_foreground": "listed foreground haloes",
    "dm_unlisted": "haloes the catalogues did not list",
    "dm_diffuse": "diffuse cosmic gas outside haloes",
    "dm_cosmic_mean_z": "total cosmic DM at this redshift before looking at the foreground",
    "dm_cosmic_with_foreground": "diffuse + listed + unlisted: cosmic DM after looking",
    "dm_at_source": "listed haloes the burst sits in",
    "dm_host_obs": "host, observer frame",
    "dm_disc_crossing": "interstellar medium of foreground galaxies whose disc the line crosses",
    "dm_after_mw_foreground": "observed - Milky Way - listed foreground - discs crossed",
    "dm_after_all": "observed - all terms; negative values are results",
}


@dataclass(frozen=True)
class Column:
    """One column: its unit ("" for none, "text" for strings) and what it holds."""

    name: str
    unit: str
    meaning: str


def _term_columns(terms: tuple[str, ...]) -> list[Column]:
    return [
        Column(f"{term}_{statistic}", "pc cm-3", f"{_TERM_MEANING[term]}; {statistic} of the draws")
        for term in terms
        for statistic in STATISTICS
    ]


SIGHTLINES = [
    Column("burst", "text", "name of the burst"),
    Column("model", "text", "halo model"),
    Column("ra", "deg", "right ascension, ICRS"),
    Column("dec", "deg", "declination, ICRS"),
    Column("z", "", "redshift as given; masked: drawn from P(z | DM)"),
    Column("dm", "pc cm-3", "observed dispersion measure"),
    *_term_columns(TERMS),
    Column("n_haloes", "", "haloes crossed in at least one draw, outside the burst's own"),
    Column("n_crossed_mean", "", "mean number of haloes crossed"),
    Column("reach", "", "share of the average halo DM these catalogues would have listed; masked: not determined"),
    Column("control_p", "", "chance of a larger sum on control sightlines; masked: not determined"),
    Column("verdict", "text", "keep, check or set aside; masked: not determined"),
    Column("reasons", "text", "reasons of the verdict; masked: not determined"),
    *_term_columns(EXTRA_TERMS),
    Column("note", "text", "what to know before using the numbers of this row"),
]

ENTRIES = [
    Column("burst", "text", "name of the burst"),
    Column("model", "text", "halo model"),
    Column("halo", "text", "halo: the catalogue row that stands for it; 'shared': variance shared by all entries"),
    Column("kind", "text", "galaxy, group or local"),
    Column("source_rows", "text", "every catalogue row behind the halo"),
    Column("ra", "deg", "right ascension of the centre, ICRS"),
    Column("dec", "deg", "declination of the centre, ICRS"),
    Column("z", "", "redshift as listed, heliocentric"),
    Column("z_kind", "text", "spec, phot or distance"),
    Column("log_mstar", "", "stellar mass, log10 Msun, Chabrier IMF"),
    Column("log_m200c_p16", "", "halo mass M200c, log10 Msun"),
    Column("log_m200c_p50", "", "halo mass M200c, log10 Msun"),
    Column("log_m200c_p84", "", "halo mass M200c, log10 Msun"),
    Column("r200c_kpc", "kpc", "median r200c, proper"),
    Column("sep_arcmin", "arcmin", "separation of the nominal positions"),
    Column("impact_kpc_p16", "kpc", "impact parameter, proper"),
    Column("impact_kpc_p50", "kpc", "impact parameter, proper"),
    Column("impact_kpc_p84", "kpc", "impact parameter, proper"),
    Column("impact_r200c", "", "median impact parameter over r200c"),
    Column("p_front", "", "share of draws with the halo's closest approach in front of the burst"),
    Column("p_member", "", "chance that this galaxy belongs to a listed group and has no halo of its own"),
    Column("p_crossed", "", "share of draws in which the line crosses the halo's gas"),
    Column("dm_mean", "pc cm-3", "DM of this halo, observer frame"),
    Column("dm_p16", "pc cm-3", "DM of this halo, observer frame"),
    Column("dm_p50", "pc cm-3", "DM of this halo, observer frame"),
    Column("dm_p84", "pc cm-3", "DM of this halo, observer frame"),
    Column("dm_crossed_p50", "pc cm-3", "median DM over the draws that cross it"),
    Column("share", "", "mean DM over the mean foreground sum; masked where that is zero"),
    Column("variance_share", "", "share of the sum's variance that is this halo's own"),
    Column("boundary_arcmin", "arcmin", "median radius of the model's boundary on the sky"),
    *(
        Column(f"dm_disc_crossing_{s}", "pc cm-3", f"{_TERM_MEANING['dm_disc_crossing']}; masked: no crossing")
        for s in STATISTICS
    ),
    Column("note", "text", "what to know before using the numbers of this row"),
]
