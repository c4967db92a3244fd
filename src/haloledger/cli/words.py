"""What help says of tables and nuisances. Help must be instant, so what lies behind heavy imports is written out here.

A test holds `NUISANCES` and `MW_HALO_LAWS` to the package's own lists.
"""

from __future__ import annotations

NUISANCES = {
    "relation": "stellar-to-halo relation: behroozi2013, behroozi2019, kravtsov2018, moster2013",
    "zero_point": "offset of measured stellar masses [dex]; drawn with 0.1",
    "hydrostatic_bias": "(1-b) of X-ray and SZ masses; drawn as the card says",
    "kept": "offset of the kept fraction of all haloes [dex]; drawn as the model says",
    "membership": "0: a galaxy is in a listed halo or not, and no host beyond the lists is drawn",
    "mw_disc": "scale of the Milky Way disc; 1 leaves it as given",
    "mw_halo": "DM of the Milky Way halo [pc cm-3], or a law by name, where the table gives none",
    "host_rest": "rest-frame DM of every host [pc cm-3], where the table gives none",
}
MW_HALO_LAWS = ("yamasaki-totani-2020", "hoffmann-2026", "prochaska-zheng-2019", "miller-bregman-2015")

ALIASES = {"burst": "name"}  # column: what may stand for it
UNITS = (
    "Without units in the file: deg, log10 Msun without h, Mpc, km/s, pc cm-3, lx in 1e44 erg/s (0.1-2.4 keV inside "
    "r500c). mass_def: 200c, 500c, 200m, 180m or vir; z_kind: spec or phot."
)


def columns() -> list[tuple[str, str]]:
    """The columns of the three tables, required ones with a star."""
    from haloledger.catalogs.schema import FIELDS

    heads = {"BURSTS": "bursts", "--galaxies": "galaxies", "--groups": "groups"}
    return [
        (head, " ".join(_column(name, field.required) for name, field in FIELDS[kind].items()))
        for head, kind in heads.items()
    ]


def nuisances() -> list[tuple[str, str]]:
    """What can be held, with meaning and unit."""
    laws = f"; laws: {', '.join(MW_HALO_LAWS)}"
    return [(name, meaning + (laws if name == "mw_halo" else "")) for name, meaning in NUISANCES.items()]


def _column(name: str, required: bool) -> str:
    other = f" (or {ALIASES[name]})" if name in ALIASES else ""
    return f"{name}{'*' if required else ''}{other}"
