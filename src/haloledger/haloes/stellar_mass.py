"""Stellar mass: as listed, else from Ks, else from W1, else from g - i; the calibration is named with each galaxy."""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path
from typing import Any

import numpy as np

from haloledger.catalogs.canonical import Galaxies
from haloledger.cosmos.background import Cosmos
from haloledger.haloes import k_corrections

ORDER = ("given", "ks", "w1", "gi")
MIN_Z = 1e-4


@dataclass(frozen=True)
class StellarMasses:
    """log10 Msun (Chabrier), error [dex] and what the mass rests on; shape (n,), NaN and "" where nothing is known."""

    log_mstar: np.ndarray
    err: np.ndarray
    note: np.ndarray


@lru_cache(maxsize=1)
def calibrations() -> dict[str, Any]:
    """The numbers of `calibrations.toml`."""
    return tomllib.loads((Path(__file__).parent / "calibrations.toml").read_text(encoding="utf-8"))


def stellar_masses(galaxies: Galaxies, luminosity_distance_mpc: np.ndarray, cosmos: Cosmos) -> StellarMasses:
    """Stellar masses at these distances [Mpc], by the first calibration of `ORDER` that each galaxy has light for."""
    n = len(galaxies)
    found = StellarMasses(np.full(n, np.nan), np.full(n, np.nan), np.full(n, "", dtype=object))
    modulus = 5 * np.log10(luminosity_distance_mpc) + 25
    z = np.maximum(np.nan_to_num(galaxies.z, nan=0.0), 0.0)
    for name in ORDER:
        log_mstar, err, note = _METHODS[name](galaxies, modulus, z)
        use = np.isnan(found.log_mstar) & np.isfinite(log_mstar)
        found.log_mstar[use] = log_mstar[use]
        found.err[use] = err[use]
        found.note[use] = note[use] if isinstance(note, np.ndarray) else note
    return found


def mass_from_ks(absolute_vega) -> np.ndarray:
    """log M* = 0.4 (M_sun - M_Ks) + log(M/L)."""
    c = calibrations()["ks"]
    return 0.4 * (c["sun_vega"] - np.asarray(absolute_vega)) + np.log10(c["mass_to_light"])


def mass_from_w1(absolute_vega) -> np.ndarray:
    """Polynomial in log L_W1 (Jarrett et al. 2023), held at the ends of its range with constant M/L beyond."""
    c = calibrations()["w1"]
    log_l = 0.4 * (c["sun_vega"] - np.asarray(absolute_vega))
    inside = np.clip(log_l, *c["log_l_range"])
    return sum(a * inside**k for k, a in enumerate(c["coefficients"])) + (log_l - inside)


def mass_from_gi(g_minus_i, absolute_i) -> np.ndarray:
    """log M* = 1.15 + 0.70 (g - i) - 0.4 M_i (Taylor et al. 2011), rest frame, AB."""
    c = calibrations()["gi"]
    return c["zero"] + c["colour"] * np.asarray(g_minus_i) - 0.4 * np.asarray(absolute_i)


def _given(galaxies: Galaxies, modulus, z):
    c = calibrations()["given"]
    err = np.where(np.isfinite(galaxies.log_mstar_err), galaxies.log_mstar_err, c["error_dex"])
    return galaxies.log_mstar, err, c["note"]


def _ks(galaxies: Galaxies, modulus, z):
    c = calibrations()["ks"]
    correction = 0.0 if galaxies.mag_rest else c["k_correction_per_dex"] * np.log10(1 + z)
    return _near_infrared(galaxies, "ks", modulus + correction, z, mass_from_ks)


def _w1(galaxies: Galaxies, modulus, z):
    return _near_infrared(galaxies, "w1", modulus, z, mass_from_w1)


def _near_infrared(galaxies: Galaxies, band: str, modulus, z, mass):
    c = calibrations()[band]
    if band not in galaxies.mag:
        return _nothing(len(galaxies))
    vega = galaxies.mag[band] - (c["ab_minus_vega"] if galaxies.mag_system.get(band, "Vega") == "AB" else 0.0)
    beyond = f"{c['note']}, beyond its z {c['z_max']}"
    note = np.where((z > c["z_max"]) & (not galaxies.mag_rest), beyond, c["note"]).astype(object)
    return mass(vega - modulus), np.full(len(galaxies), c["error_dex"]), note


def _gi(galaxies: Galaxies, modulus, z):
    c = calibrations()["gi"]
    if not {"g", "i"} <= set(galaxies.mag) or "Vega" in (galaxies.mag_system.get(b, "AB") for b in "gi"):
        return _nothing(len(galaxies))
    if not galaxies.mag_rest and k_corrections.available():
        return _corrected_gi(galaxies, modulus, z)
    rest = galaxies.mag_rest
    log_mstar = mass_from_gi(galaxies.mag["g"] - galaxies.mag["i"], galaxies.mag["i"] - modulus)
    log_mstar = np.where(z <= c["z_max" if rest else "z_max_observed"], log_mstar, np.nan)
    note = c["note"] if rest else f"{c['note']}, no K-correction"
    return log_mstar, np.full(len(galaxies), c["error_dex" if rest else "error_dex_observed"]), note


def _corrected_gi(galaxies: Galaxies, modulus, z):
    c = calibrations()["gi"]
    # at the listed redshift: the mass of a photometric galaxy moves with its distance, not with its K-correction
    optical = {b: m for b, m in galaxies.mag.items() if b in k_corrections.BANDS and _is_ab(galaxies, b)}
    wanted = np.isnan(galaxies.log_mstar)
    k = k_corrections.k_corrections(optical, np.where(wanted & (z <= c["z_max"]), z, np.nan))
    g, i = (galaxies.mag[b] - k[b] for b in "gi")
    note = f"{c['note']}, K-corrected by {k_corrections.made_by()}"
    return mass_from_gi(g - i, i - modulus), np.full(len(galaxies), c["error_dex"]), note


def _is_ab(galaxies: Galaxies, band: str) -> bool:
    return galaxies.mag_system.get(band, "AB") == "AB"


def _nothing(n: int):
    return np.full(n, np.nan), np.full(n, np.nan), ""


_METHODS = {"given": _given, "ks": _ks, "w1": _w1, "gi": _gi}
