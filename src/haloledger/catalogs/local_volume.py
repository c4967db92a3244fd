"""The nearest large haloes as a group table: centre, distance and mass of each, every value with its source."""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path

import numpy as np

from haloledger.catalogs.canonical import Groups

LABEL = "local"
LIGHT_KMS = 299792.458
FILE = Path(__file__).parent / "local_volume.toml"


@dataclass(frozen=True)
class LocalHalo:
    """One halo of the table as its file states it; units as in `canonical`."""

    id: str
    called: str
    ra: float
    dec: float
    cz_kms: float
    distance_mpc: float
    distance_err_mpc: float
    log_m200c: float
    log_m200c_err: float
    place_source: str
    mass_source: str
    log_mstar: float = np.nan
    p_satellite: float = 0.0
    inside: str = ""

    @property
    def row(self) -> str:
        """Row name, as of any catalogue."""
        return f"{LABEL}:{self.id}"

    @property
    def note(self) -> str:
        """What an entry says of it."""
        said = f"built-in table ({self.called}): {self.mass_source}"
        if self.p_satellite:
            said += f"; {self.p_satellite:.0%} satellite: no gas of its own inside {self.inside}"
        return said


@lru_cache(maxsize=1)
def local_volume() -> tuple[LocalHalo, ...]:
    """The haloes of local_volume.toml, sources written out."""
    text = tomllib.loads(FILE.read_text(encoding="utf-8"))
    named = text["sources"]
    sources = ("place_source", "mass_source")
    return tuple(LocalHalo(**{**halo, **{k: named[halo[k]] for k in sources}}) for halo in text["halo"])


def local_groups() -> Groups:
    """The table as groups of the catalogue `local`, in the file's order."""
    haloes = local_volume()

    def column(name: str) -> np.ndarray:
        return np.array([getattr(h, name) for h in haloes], dtype=float)

    n = len(haloes)
    unknown = np.full(n, np.nan)
    return Groups(
        label=LABEL,
        row=np.array([h.row for h in haloes]),
        ra_deg=column("ra"),
        dec_deg=column("dec"),
        z=column("cz_kms") / LIGHT_KMS,
        z_err=np.zeros(n),
        photometric=np.zeros(n, dtype=bool),
        log_mass=column("log_m200c"),
        log_mass_err=column("log_m200c_err"),
        sigma_v_kms=unknown,
        n_members=unknown,
        richness=unknown,
        lx_1e44_erg_s=unknown,
        distance_mpc=column("distance_mpc"),
        distance_err_mpc=column("distance_err_mpc"),
        centre_err_kpc=np.zeros(n),
        mass_def=np.full(n, "200c"),
        precedence=99,  # any catalogue given knows better
    )
