"""The tables every other package sees: galaxies, groups and bursts as plain arrays with the unit in the name.

A missing number is NaN, a missing text is "". Redshifts are heliocentric. Masses are log10 Msun without h, IMF
Chabrier. Readers and cards bring files to this form; nothing above this floor knows a native column.
"""

from __future__ import annotations

from dataclasses import dataclass, field, fields

import numpy as np


@dataclass(frozen=True)
class Refusal:
    """A row that was not used, with the reason and what to write instead."""

    file: str
    row: int  # 1-based row of the table, 0 for the whole file
    name: str  # id or burst, "" where there is none
    column: str
    found: str
    advice: str


@dataclass(frozen=True)
class Galaxies:
    """Galaxy rows of one catalogue. All arrays have the shape (n,)."""

    label: str  # card name, or the file's stem
    row: np.ndarray  # "label:id", unique
    ra_deg: np.ndarray
    dec_deg: np.ndarray
    z: np.ndarray  # heliocentric; NaN only where distance_mpc is given
    z_err: np.ndarray  # never NaN where z is given: the card's or the stated default error is filled in
    photometric: np.ndarray  # bool
    log_mstar: np.ndarray
    log_mstar_err: np.ndarray
    log_m200c: np.ndarray
    log_m200c_err: np.ndarray
    distance_mpc: np.ndarray
    distance_err_mpc: np.ndarray
    group: np.ndarray  # group_id as written: "label:id", or a bare id of any listed group; "" where there is none
    mag: dict[
        str, np.ndarray
    ]  # canonical band ("g","r","i","z","ks","w1") -> apparent magnitude, system as in `mag_system`
    mag_system: dict[str, str] = field(default_factory=dict)  # band -> "AB" or "Vega"
    mag_rest: bool = False  # magnitudes are already corrected to the rest frame
    z_flow: np.ndarray | None = None  # redshift in the CMB frame, for distances; None: z serves
    radius_arcsec: np.ndarray | None = None  # optical radius, NaN where not known
    z_scores: np.ndarray | None = None  # p(z): redshifts at the normal scores of `redshift_density`, (n, 49); NaN: none
    z_outlier: float = 0.0  # share of outliers among the photometric redshifts
    z_is: str = "likelihood"  # or "posterior": then no volume or mass-function prior is put on z
    mass_is: str = "likelihood"  # of log_mstar; log_m200c is always taken as it stands
    mass_err_holds_z: bool = False  # log_mstar_err already contains the redshift error
    notes: tuple[str, ...] = ()
    refused: tuple[Refusal, ...] = ()

    def __len__(self) -> int:
        return len(self.row)


@dataclass(frozen=True)
class Groups:
    """Group or cluster rows of one catalogue. All arrays have the shape (n,)."""

    label: str
    row: np.ndarray
    ra_deg: np.ndarray
    dec_deg: np.ndarray
    z: np.ndarray
    z_err: np.ndarray
    photometric: np.ndarray
    log_mass: np.ndarray  # in the definition `mass_def`; NaN where only a proxy is known
    log_mass_err: np.ndarray
    sigma_v_kms: np.ndarray
    n_members: np.ndarray
    richness: np.ndarray
    lx_1e44_erg_s: np.ndarray  # 0.1-2.4 keV inside r500c
    distance_mpc: np.ndarray
    distance_err_mpc: np.ndarray
    centre_err_kpc: np.ndarray  # 1 sigma per axis; 0 where the centre is taken as exact
    mass_def: (
        np.ndarray
    )  # definition of log_mass row by row: "200c" "500c" "200m" "180m" "vir"; "" where log_mass is NaN
    mass_is: str = "posterior"  # or "likelihood": then the mass-function prior is applied
    mass_from: str = ""  # what log_mass was derived from: "lx", "sz", "richness", "sigma_v", "luminosity", "" unknown
    proxy: str = ""  # proxy to use where log_mass is NaN: "sigma_v", "richness", "lx"
    proxy_relation: str = ""  # name of the relation file for that proxy
    one_minus_b: tuple[float, float] = (1.0, 0.0)  # hydrostatic bias (1-b) and its error; mass is divided by it
    precedence: int = 50  # lower wins when two catalogues list the same halo
    centre_err_share: float = float("inf")  # centre_err_kpc is at most this share of r200c
    z_flow: np.ndarray | None = None  # redshift in the CMB frame, for distances; None: z serves
    z_is: str = "likelihood"
    notes: tuple[str, ...] = ()
    refused: tuple[Refusal, ...] = ()

    def __len__(self) -> int:
        return len(self.row)


@dataclass(frozen=True)
class Bursts:
    """Bursts. All arrays have the shape (n,); order is the file's."""

    burst: np.ndarray
    ra_deg: np.ndarray
    dec_deg: np.ndarray
    z: np.ndarray  # NaN: drawn from P(z | DM)
    z_err: np.ndarray  # 0 where not given
    dm: np.ndarray
    dm_err: np.ndarray  # 0 where not given
    loc_major_arcsec: np.ndarray  # 1 sigma; NaN where not given
    loc_minor_arcsec: np.ndarray
    loc_pa_deg: np.ndarray  # east of north
    dm_disc: np.ndarray
    dm_disc_err: np.ndarray
    dm_mw_halo: np.ndarray
    dm_mw_halo_err: np.ndarray
    host: np.ndarray  # host_id, "" where not given
    dm_host_rest: np.ndarray
    dm_host_obs: np.ndarray
    dm_host_err: np.ndarray
    note: np.ndarray  # what the reader has to say of the row
    notes: tuple[str, ...] = ()  # what it has to say of the whole table
    refused: tuple[Refusal, ...] = ()

    def __len__(self) -> int:
        return len(self.burst)


def take(table, index):
    """The rows `index` of a canonical table, everything else unchanged."""
    n = len(table)
    changed = {}
    for f in fields(table):
        value = getattr(table, f.name)
        if isinstance(value, np.ndarray) and value.shape[:1] == (n,):
            changed[f.name] = value[index]
        elif isinstance(value, dict) and value and all(isinstance(v, np.ndarray) for v in value.values()):
            changed[f.name] = {k: v[index] for k, v in value.items()}
        else:
            changed[f.name] = value
    return type(table)(**changed)
