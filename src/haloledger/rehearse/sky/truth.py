"""The tables of the truth. Lengths on the sky are comoving Mpc across the line; redshifts say which."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np


@dataclass(frozen=True)
class Lines:
    """Sightlines (n,), with the universe that each lies in."""

    ra_deg: np.ndarray
    dec_deg: np.ndarray
    z: np.ndarray  # of the Hubble flow
    z_seen: np.ndarray  # as measured: peculiar velocity of the host included
    relation: np.ndarray  # number of the stellar-to-halo relation that holds
    zero_point: np.ndarray  # dex by which stellar masses are measured too high
    kept_score: np.ndarray  # normal score of the shared kept fraction
    host: np.ndarray  # row of the host among the galaxies

    def __len__(self) -> int:
        return len(self.z)


@dataclass(frozen=True)
class Haloes:
    """True haloes (n,)."""

    line: np.ndarray
    log_m200c: np.ndarray
    z: np.ndarray  # of the Hubble flow
    z_seen: np.ndarray
    east_mpc: np.ndarray
    north_mpc: np.ndarray
    c200c: np.ndarray
    holds_burst: np.ndarray

    def __len__(self) -> int:
        return len(self.line)


@dataclass(frozen=True)
class Galaxies:
    """True galaxies (n,)."""

    halo: np.ndarray
    central: np.ndarray
    log_mstar: np.ndarray  # true
    measured: np.ndarray  # with zero point and error, at the true distance
    z_seen: np.ndarray
    east_mpc: np.ndarray
    north_mpc: np.ndarray

    def __len__(self) -> int:
        return len(self.halo)


@dataclass(frozen=True)
class Sky:
    """Everything that is true; `dm` is each halo's column [pc cm-3, observer frame], 0 where it is not crossed."""

    lines: Lines
    haloes: Haloes
    galaxies: Galaxies
    dm: np.ndarray
    mass_err: float  # dex, of `measured`


def pick(table, index):
    """The rows `index` of one of these tables."""
    return type(table)(**{name: values[index] for name, values in vars(table).items()})


def join(parts: list):
    """One table after the other."""
    return type(parts[0])(**{name: np.concatenate([getattr(p, name) for p in parts]) for name in vars(parts[0])})
