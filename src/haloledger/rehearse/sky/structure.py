"""Structure of one halo: concentration, NFW radii, velocity dispersion, satellites' masses."""

from __future__ import annotations

import numpy as np
from scipy.special import lambertw

from haloledger.cosmos.background import Cosmos

CONCENTRATION_DEX = 0.11  # Dutton & Maccio 2014, MNRAS 441, 3359, from memory
LIGHT_KMS = 299792.458
PECULIAR_KMS = 300.0  # one dimension; common practice


def median_concentration(log_m200c, z, cosmos: Cosmos) -> np.ndarray:
    """c200c of Dutton & Maccio 2014, table 3: log c = a + b log(M / 1e12 h^-1)."""
    a = 0.520 + 0.385 * np.exp(-0.617 * np.asarray(z) ** 1.21)
    b = -0.101 + 0.026 * np.asarray(z)
    return 10 ** (a + b * (np.asarray(log_m200c) + np.log10(cosmos.h) - 12))


def nfw_mass(y) -> np.ndarray:
    """ln(1+y) - y/(1+y)."""
    return np.log1p(y) - y / (1 + y)


def nfw_radius(share, c200c) -> np.ndarray:
    """Radius over r200c that holds this share of the mass: with t = 1/(1+y), t exp(-t) = exp(-1 - share m(c))."""
    wanted = share * nfw_mass(c200c)
    t = -lambertw(-np.exp(-1 - wanted), 0).real
    return (1 / t - 1) / c200c


def velocity_dispersion_kms(log_m200c, z, cosmos: Cosmos) -> np.ndarray:
    """One-dimensional dispersion, 1082.9 (h(z) M200c / 1e15)^0.3361 (Evrard et al. 2008, ApJ 672, 122)."""
    return 1082.9 * (cosmos.h * cosmos.e_of_z(z) * 10 ** (np.asarray(log_m200c) - 15)) ** 0.3361


PSI = np.geomspace(1e-6, 0.7, 400)
SUBHALO_SLOPE, SUBHALO_CUT = 0.91, 6.0


def _cumulative() -> np.ndarray:
    """N(> psi) up to a factor: dN/dln psi = psi^-0.91 exp(-6 psi^3), form of Giocoli et al. 2008 (from memory)."""
    density = PSI**-SUBHALO_SLOPE * np.exp(-SUBHALO_CUT * PSI**3)
    steps = 0.5 * (density[1:] + density[:-1]) * np.diff(np.log(PSI))
    return np.concatenate([np.cumsum(steps[::-1])[::-1], [0.0]])


ABOVE = _cumulative()


def subhaloes_above(log_psi) -> np.ndarray:
    """Mean number of subhaloes above psi = M_sub at infall / M_host, for amplitude 1; 0 above 0.7."""
    return np.interp(log_psi, np.log10(PSI), ABOVE)


def draw_log_psi(log_psi_least, rng: np.random.Generator) -> np.ndarray:
    """One infall mass ratio (log10) each, above `log_psi_least`."""
    wanted = rng.random(len(log_psi_least)) * subhaloes_above(log_psi_least)
    return np.interp(wanted, ABOVE[::-1], np.log10(PSI)[::-1])
