"""Mean cosmic dispersion measure to a redshift."""

from __future__ import annotations

from functools import lru_cache

import numpy as np
from scipy.interpolate import CubicSpline

from haloledger.cosmos.background import Z_MAX, Cosmos, cosmology
from haloledger.cosmos.electrons import PER_PROTON

IONISED_SHARE = 0.84
"""Share of the baryons that is ionised gas outside galaxies (f_d), the common constant for z = 0-1; from memory."""


def mean_cosmic_dm(z, cosmos: Cosmos, ionised_share: float = IONISED_SHARE) -> np.ndarray:
    """Mean DM [pc cm-3, observer frame] of all ionised gas to redshift z, diffuse and in haloes.

    <DM> = 3 c H0 Omega_b / (8 pi G m_p) x (1 - Y/2) x f_d x integral of (1+z)/E(z) dz
    """
    return ionised_share * dm_per_unit_integral(cosmos.name) * path_integral(z, cosmos)


def path_integral(z, cosmos: Cosmos) -> np.ndarray:
    """Integral of (1+z')/E(z') from 0 to z, dimensionless."""
    return _path(cosmos.name)(np.log1p(z))


@lru_cache(maxsize=8)
def dm_per_unit_integral(cosmology_name: str) -> float:
    """3 c H0 Omega_b (1 - Y/2) / (8 pi G m_p) [pc cm-3]; 976.040 for Planck18."""
    from astropy import constants as const

    exact = cosmology(cosmology_name).astropy
    bare = 3 * const.c * exact.H0 * exact.Ob0 / (8 * np.pi * const.G * const.m_p)
    return float(bare.to_value("pc cm-3") * PER_PROTON)


@lru_cache(maxsize=8)
def _path(cosmology_name: str):
    cosmos = cosmology(cosmology_name)
    ln = np.linspace(0.0, np.log1p(Z_MAX), 4000)
    # dz = (1+z) dln(1+z)
    integrand = CubicSpline(ln, np.exp(2 * ln) / cosmos.astropy.efunc(np.expm1(ln)))
    return integrand.antiderivative()
