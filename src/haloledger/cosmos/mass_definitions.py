"""The same halo in other mass definitions, for an NFW mass profile.

The ratio of two masses depends on concentration alone (500c) or on concentration and redshift (200m, 180m, vir). It is
tabulated from colossus and interpolated, so that a million draws cost nothing. 180m (180 times the mean density) is the
definition of halo-based group finders.
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np
from scipy.interpolate import CubicSpline, RectBivariateSpline

from haloledger.cosmos.background import Cosmos, cosmology
from haloledger.cosmos.colossus_link import colossus_cosmology
from haloledger.cosmos.concentration import concentration
from haloledger.errors import InputError

DEFINITIONS = ("200c", "500c", "200m", "180m", "vir")
LN_C = np.linspace(np.log(0.8), np.log(60.0), 90)
Z = np.linspace(0.0, 5.0, 101)


def from_200c(log_m200c, mass_def: str, z, c200c, cosmos: Cosmos) -> np.ndarray:
    """log10 mass in `mass_def` of a halo with M200c and c200c at z; shapes broadcast."""
    return np.asarray(log_m200c) + _log_ratio(mass_def, z, c200c, cosmos)


def to_200c(log_mass, mass_def: str, z, relation: str | float, cosmos: Cosmos, log_c_offset=0.0) -> np.ndarray:
    """log10 M200c of a halo whose mass is given in `mass_def`; shapes broadcast.

    The concentration is the relation's at M200c, moved by `log_c_offset` [dex]: solved by fixed-point steps, each of
    which shrinks the error by more than ten, since concentration hangs weakly on mass.
    """
    log_m200c = np.asarray(log_mass, dtype=float) + 0 * np.asarray(z) + 0 * np.asarray(log_c_offset)
    if mass_def == "200c":
        return log_m200c
    for _ in range(5):
        c200c = concentration(relation, log_m200c, z, cosmos) * 10.0 ** np.asarray(log_c_offset)
        log_m200c = np.asarray(log_mass) - _log_ratio(mass_def, z, c200c, cosmos)
    return log_m200c


def r500c_over_r200c(c200c) -> np.ndarray:
    """Radius ratio r500c / r200c = (M500c / M200c x 200 / 500)^(1/3)."""
    return np.cbrt(10.0 ** _log_ratio_500c()(np.log(c200c)) * 0.4)


def nfw_mass_share(x, c200c) -> np.ndarray:
    """M(<x r200c) / M200c of an NFW halo: m(c x) / m(c) with m(y) = ln(1+y) - y/(1+y)."""
    y = np.asarray(x) * c200c
    return (np.log1p(y) - y / (1 + y)) / (np.log1p(c200c) - c200c / (1 + np.asarray(c200c)))


def _log_ratio(mass_def: str, z, c200c, cosmos: Cosmos) -> np.ndarray:
    if mass_def == "200c":
        return np.zeros(np.broadcast_shapes(np.shape(z), np.shape(c200c)))
    ln_c = np.clip(np.log(c200c), LN_C[0], LN_C[-1])
    if mass_def == "500c":
        return _log_ratio_500c()(ln_c) + 0 * np.asarray(z)
    if mass_def not in DEFINITIONS:
        raise InputError(f"mass definition '{mass_def}' is not known. Write one of {', '.join(DEFINITIONS)}.")
    return _log_ratio_z(mass_def, cosmos.name).ev(np.clip(z, Z[0], Z[-1]), ln_c)


@lru_cache(maxsize=1)
def _log_ratio_500c() -> CubicSpline:
    return CubicSpline(LN_C, _row("500c", 0.0, cosmology("Planck18")))


@lru_cache(maxsize=16)
def _log_ratio_z(mass_def: str, cosmology_name: str) -> RectBivariateSpline:
    cosmos = cosmology(cosmology_name)
    return RectBivariateSpline(Z, LN_C, np.array([_row(mass_def, z, cosmos) for z in Z]))


def _row(mass_def: str, z: float, cosmos: Cosmos) -> np.ndarray:
    from colossus.halo import mass_defs

    mass = np.full(LN_C.size, 1e12)
    with colossus_cosmology(cosmos):
        changed, _, _ = mass_defs.changeMassDefinition(mass, np.exp(LN_C), float(z), "200c", mass_def)
    return np.log10(changed / mass)
