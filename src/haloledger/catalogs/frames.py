"""Redshift frames: from the frame a catalogue uses to the heliocentric one.

Formula  z_frame = z_helio + (v/c) cos(theta)              ("velocities": the two are added, as catalogues do)
         1 + z_frame = (1 + z_helio)(1 + (v/c) cos(theta)) ("redshifts": composed)
         theta = angle between the object and the apex of the Sun's motion in that frame
Errors   the apex speeds are known to 0.1 (CMB), 20 (Local Sheet) and 5 km/s (Local Group); not propagated.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from haloledger.errors import InputError

C_KM_S = 299792.458  # exact, SI


@dataclass(frozen=True)
class Apex:
    """Motion of the Sun in a frame: speed [km/s] toward galactic (l, b) [deg]."""

    speed_km_s: float
    l_deg: float
    b_deg: float
    source: str


APEX = {
    "cmb": Apex(369.82, 264.021, 48.253, "Planck 2018 I, A&A 641, A1: solar dipole"),
    "local group": Apex(316.0, 93.0, -4.0, "Karachentsev & Makarov 1996, AJ 111, 794 (from memory)"),
    # 318 toward l = 95, b = -1 in the text; the unrounded terms -26, 317, -8 km/s on the galactic axes are used
    "local sheet": Apex(318.16, 94.69, -1.44, "Tully et al. 2008, ApJ 676, 184 (from memory)"),
}
FRAMES = ("heliocentric", *APEX)

# ICRS -> galactic: J2000 pole (192.85948, 27.12825) and node as in the Hipparcos catalogue, vol. 1, eq. 1.5.11.
_TO_GALACTIC = np.array(
    [
        [-0.0548755604, -0.8734370902, -0.4838350155],
        [+0.4941094279, -0.4448296300, +0.7469822445],
        [-0.8676661490, -0.1980763734, +0.4559837762],
    ]
)


def apex_velocity(ra_deg: np.ndarray, dec_deg: np.ndarray, frame: str) -> np.ndarray:
    """The Sun's velocity toward each position in `frame` [km/s]; shape of ra_deg; 0 for heliocentric."""
    if frame == "heliocentric":
        return np.zeros(np.shape(ra_deg))
    if frame not in APEX:
        raise InputError(f"no redshift frame '{frame}'; there are {', '.join(FRAMES)}.")
    apex = APEX[frame]
    l_rad, b_rad = np.radians(apex.l_deg), np.radians(apex.b_deg)
    galactic = np.array([np.cos(l_rad) * np.cos(b_rad), np.sin(l_rad) * np.cos(b_rad), np.sin(b_rad)])
    x, y, z = (_TO_GALACTIC * galactic[:, None]).sum(axis=0)  # the apex in ICRS
    ra, dec = np.radians(ra_deg), np.radians(dec_deg)
    return apex.speed_km_s * (np.cos(dec) * (np.cos(ra) * x + np.sin(ra) * y) + np.sin(dec) * z)


def to_heliocentric(
    z: np.ndarray, ra_deg: np.ndarray, dec_deg: np.ndarray, frame: str, sum_of: str = "redshifts"
) -> np.ndarray:
    """Heliocentric redshift from the redshift in `frame`; shapes alike; formula and sources in the module's head."""
    if frame == "heliocentric":
        return z
    beta = apex_velocity(ra_deg, dec_deg, frame) / C_KM_S
    if sum_of == "velocities":
        return z - beta
    return (1 + z) / (1 + beta) - 1


def to_cmb(z: np.ndarray, ra_deg: np.ndarray, dec_deg: np.ndarray) -> np.ndarray:
    """Redshift in the CMB frame from the heliocentric one: what the Hubble flow is measured in."""
    return (1 + z) * (1 + apex_velocity(ra_deg, dec_deg, "cmb") / C_KM_S) - 1
