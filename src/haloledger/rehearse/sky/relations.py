"""Stellar mass of a halo's own galaxy, from published relations: the sky's own few lines.

Each gives the mean log10 of M* at log10 of the halo mass in the relation's definition, and a scatter.
"""

from __future__ import annotations

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.cosmos.mass_definitions import from_200c

NAMES = ("behroozi2013", "behroozi2019", "kravtsov2018", "moster2013")  # what a universe draws from


def moster2013(m, z):
    """Moster, Naab & White 2013, MNRAS 428, 3121, table 1; M200c."""
    w = z / (1 + z)
    m1, n, b, g = 11.590 + 1.195 * w, 0.0351 - 0.0247 * w, 1.376 - 0.826 * w, 0.608 + 0.329 * w
    x = 10 ** (m - m1)
    return m + np.log10(2 * n / (x**-b + x**g))


def behroozi2013(m, z):
    """Behroozi, Wechsler & Conroy 2013, ApJ 770, 57, section 5; Mvir."""
    a = 1 / (1 + z)
    nu = np.exp(-4 * a * a)
    log_eps = -1.777 - 0.006 * (a - 1) * nu - 0.119 * (a - 1)
    m1 = 11.514 + (-1.793 * (a - 1) - 0.251 * z) * nu
    shape = (-1.412 + 0.731 * (a - 1) * nu, 3.508 + (2.608 * (a - 1) - 0.043 * z) * nu)
    return log_eps + m1 + _bend(m - m1, *shape, 0.316 + (1.319 * (a - 1) + 0.279 * z) * nu)


def behroozi2019(m, z):
    """Behroozi et al. 2019, MNRAS 488, 3143, table J1, observed masses of all galaxies; peak Mvir."""
    a = 1 / (1 + z)
    m1 = 12.035 + 4.556 * (a - 1) - 4.417 * np.log(a) - 0.731 * z
    eps = -1.435 + 1.831 * (a - 1) - 1.368 * np.log(a) - 0.217 * z
    low = 1.963 - 2.316 * (a - 1) + 1.732 * np.log(a) + 0.178 * z
    high = 0.482 - 0.841 * (a - 1) - 0.471 * z
    bump = 10 ** (-1.034 - 3.100 * (a - 1) - 1.055 * z)
    x = m - m1
    return m1 + eps - np.log10(10 ** (-low * x) + 10 ** (-high * x)) + bump * np.exp(-0.5 * (x / 0.411) ** 2)


def kravtsov2018(m, z):
    """Kravtsov et al. 2018, Astron. Lett. 44, 8, table 3 with 0.2 dex scatter; M200c, no evolution."""
    return -1.642 + 11.35 + _bend(m - 11.35, -1.779, 4.394, 0.547)


def kravtsov2018_no_scatter(m, z):
    """Kravtsov et al. 2018, Astron. Lett. 44, 8, table 3 without scatter; M200c, no evolution. None of the audit's."""
    return -1.618 + 11.39 + _bend(m - 11.39, -1.795, 4.345, 0.619)


def _bend(x, alpha, delta, gamma):
    def f(y):
        with np.errstate(over="ignore"):
            return -np.log10(10 ** (alpha * y) + 1) + delta * np.log10(1 + np.exp(y)) ** gamma / (1 + np.exp(10**-y))

    return f(x) - f(0.0)


_MEAN = {f.__name__: f for f in (behroozi2013, behroozi2019, kravtsov2018, moster2013, kravtsov2018_no_scatter)}
ALL = tuple(_MEAN)
_IN_VIRIAL_MASS = ("behroozi2013", "behroozi2019")


def mean_log_mstar(name: str, log_m200c, z, c200c, cosmos: Cosmos) -> np.ndarray:
    """Mean log10 M* [Msun, Chabrier] of the galaxy that a halo forms; arrays of one shape."""
    mass = from_200c(log_m200c, "vir", z, c200c, cosmos) if name in _IN_VIRIAL_MASS else np.asarray(log_m200c)
    return _MEAN[name](mass, z)


def scatter_dex(name: str, z) -> np.ndarray:
    """Scatter of log10 M* at fixed halo mass [dex]: as published, or assumed by the authors (from memory)."""
    a = 1 / (1 + np.asarray(z))
    value = {
        "moster2013": 0.15,
        "behroozi2019": 0.2,
        "kravtsov2018": 0.2,
        "behroozi2013": 0.218,
        "kravtsov2018_no_scatter": 0.2,
    }[name]
    return value + (-0.023 * (a - 1) if name == "behroozi2013" else 0 * a)
