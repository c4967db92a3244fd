"""The two tables of this package: the list of haloes, and their draws."""

from __future__ import annotations

from dataclasses import dataclass, fields

import numpy as np


@dataclass(frozen=True)
class Haloes:
    """One row per halo; arrays have the shape (n,) unless another is given. Made by `build.halo_list`, by id."""

    id: np.ndarray  # "label:id" of the row that gives centre and mass
    kind: np.ndarray  # "galaxy" or "group"
    source_rows: np.ndarray  # all rows that name this halo, ";"-joined, the first is id
    ra_deg: np.ndarray
    dec_deg: np.ndarray
    z: np.ndarray  # as listed, heliocentric, for comparisons; from the distance where only that is known
    z_flow: np.ndarray  # what sets the distance in the Hubble flow: in the CMB frame where the frame of z is known
    z_err: np.ndarray
    photometric: np.ndarray  # bool
    z_scores: np.ndarray  # (n, 49): p(z) as redshifts at the catalogues' normal `SCORES`, NaN where none; (n, 0)
    z_outlier: np.ndarray  # share of outliers among photometric redshifts like this one
    distance_mpc: np.ndarray  # luminosity distance, NaN where none
    distance_err_mpc: np.ndarray
    log_mstar: np.ndarray  # NaN for groups
    optical_radius_kpc: np.ndarray  # NaN where not known
    p_member: np.ndarray  # probability that it is no centre of a halo of its own: a satellite
    centre_err_kpc: np.ndarray  # 1 sigma per axis
    note: np.ndarray
    # how the mass is known
    mass_kind: np.ndarray  # "stellar" "m200c" "mass" "proxy"
    value: np.ndarray  # log10 of stellar mass, halo mass or proxy
    value_err: np.ndarray  # dex
    relation: np.ndarray  # name of the proxy's relation, "" where none
    mass_def: np.ndarray
    posterior: np.ndarray  # bool: the value is a posterior already, no mass function is put on it
    z_posterior: np.ndarray  # bool: the redshift is a posterior already, no volume is put on it
    err_holds_z: np.ndarray  # bool: value_err contains the redshift error: the value does not follow the drawn redshift
    one_minus_b: np.ndarray  # hydrostatic bias: the mass is divided by it
    one_minus_b_err: np.ndarray
    bias_share: np.ndarray  # weight of hydrostatic masses in the value
    origin: np.ndarray  # what the mass rests on: "lx" "sz" "richness" "sigma_v" "luminosity", "" where not known
    catalogue: np.ndarray  # int: place of the catalogue among the user's
    precedence: np.ndarray  # int: lower gives centre and mass where two catalogues name one halo
    p_hosted: np.ndarray  # part of p_member: in those draws the row stands for a host that no list has, off its place
    n_satellites: np.ndarray  # listed galaxies that this one is expected to hold, NaN where the list cannot tell
    faintest: np.ndarray  # log10 stellar mass down to which the list has satellites there
    list_share: np.ndarray  # completeness of the list
    n_members: np.ndarray  # listed for the group, NaN where not known
    members: np.ndarray  # ";"-joined rows of galaxies that this group holds for sure
    listed_group: np.ndarray  # "label:id" of the group the catalogue puts this galaxy in, "" where none
    notes: tuple[str, ...] = ()

    def __len__(self) -> int:
        return len(self.id)


@dataclass(frozen=True)
class HaloDraws:
    """Draws of haloes; all arrays have the shape (n_index, n_draws)."""

    log_m200c: np.ndarray
    z: np.ndarray  # sets the distance: peculiar velocity or distance error included
    distance_kpc: np.ndarray  # angular-diameter distance, proper kpc per radian
    log_c_offset: np.ndarray  # dex
    centre_east_kpc: np.ndarray
    centre_north_kpc: np.ndarray
    own: np.ndarray  # bool: there is a halo: its own, or in its stead a host that no list has
    hosted: np.ndarray  # bool: mass and centre are those of such a host


def rows(haloes: Haloes, index) -> Haloes:
    """The haloes `index`."""
    return change(haloes, **{name: getattr(haloes, name)[index] for name in COLUMNS})


def change(haloes: Haloes, **columns) -> Haloes:
    """The same haloes with other columns."""
    values = {f.name: getattr(haloes, f.name) for f in fields(haloes)}
    return Haloes(**{**values, **columns})


def join(parts: list[Haloes]) -> Haloes:
    """The haloes of all parts, one after the other, their notes too."""
    parts = with_densities(parts)
    columns = {name: np.concatenate([getattr(p, name) for p in parts]) for name in COLUMNS}
    return Haloes(**columns, notes=tuple(note for p in parts for note in p.notes))


def has_density(haloes: Haloes) -> np.ndarray:
    """Where the catalogue gives p(z), shape (n,)."""
    return np.isfinite(haloes.z_scores).all(axis=1) & (haloes.z_scores.shape[1] > 0)


def with_densities(parts: list[Haloes]) -> list[Haloes]:
    """The parts with p(z) tables of one width: none where no part has any."""
    width = max((p.z_scores.shape[1] for p in parts), default=0)
    return [p if p.z_scores.shape[1] == width else change(p, z_scores=np.full((len(p), width), np.nan)) for p in parts]


COLUMNS = tuple(f.name for f in fields(Haloes) if f.name != "notes")
