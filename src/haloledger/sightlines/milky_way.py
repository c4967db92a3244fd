"""Column of the Milky Way's own halo from the Sun outward, for laws that are a gas density."""

from __future__ import annotations

from typing import Any

import numpy as np

from haloledger.cosmos.electrons import CM3_PER_MSUN_KPC3, PC_PER_KPC, PER_PROTON

STEPS = 20_001


def halo_column(law: dict[str, Any], l_deg: float, b_deg: float) -> float:
    """DM [pc cm-3] from the Sun to the sphere `edge_kpc` around the Galactic centre, towards (l, b) [deg].

    r^2 = R0^2 + s^2 - 2 R0 s cos(l) cos(b), trapezoids in s; to 1e-4 for the laws of terms.toml.
    """
    toward = law["sun_kpc"] * np.cos(np.radians(l_deg)) * np.cos(np.radians(b_deg))
    edge = toward + np.sqrt(toward**2 + law["edge_kpc"] ** 2 - law["sun_kpc"] ** 2)
    s = np.linspace(0.0, edge, STEPS)
    r = np.sqrt(np.maximum(law["sun_kpc"] ** 2 + s**2 - 2 * toward * s, 0.0))
    density = DENSITIES[law["shape"]](r, law)
    return float(PC_PER_KPC * (s[1] - s[0]) * (density.sum() - 0.5 * (density[0] + density[-1])))


def _modified_nfw(r_kpc: np.ndarray, law: dict[str, Any]) -> np.ndarray:
    """n_e [cm-3], rho proportional to y / (y0 + y)^4 with the mass inside r200c fixed (Mathews & Prochaska 2017)."""
    a, c = law["inner_offset"], law["concentration"]
    t = a + c
    enclosed = np.log(t / a) + 3 * a / t - 1.5 * (a / t) ** 2 + (a / t) ** 3 / 3 - 11 / 6
    scale_kpc = law["r200c_kpc"] / c
    gas = law["kept"] * law["baryon_share"] * law["mass_msun"]
    y = r_kpc / scale_kpc
    return PER_PROTON * CM3_PER_MSUN_KPC3 * gas / (4 * np.pi * scale_kpc**3 * enclosed) * y / (a + y) ** 4


def _power_law(r_kpc: np.ndarray, law: dict[str, Any]) -> np.ndarray:
    """n_e [cm-3] = norm r^(-3 beta) / metallicity."""
    return law["norm"] / law["metallicity"] * np.maximum(r_kpc, law["core_kpc"]) ** (-3 * law["beta"])


DENSITIES = {"modified-nfw": _modified_nfw, "power-law": _power_law}
