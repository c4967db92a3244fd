"""The simulated sky behind the files of this folder: `python simulate.py [FOLDER]` writes them again, byte for byte.

Everything is invented: the Saltmarsh survey, its bursts, galaxies and groups. Nothing here was observed.

The recipe: haloes above 10^11.3 Msun are thrown at random into a light cone (no clustering), each gets a central
galaxy, massive ones get satellites, and eight bursts are set where each plays one role (their places are chosen so
that chance haloes do not spoil it). The survey then sees what is brighter than its limit, with errors. The gas put
into the haloes is the script's own, so that the audit is not compared with itself.
"""

from __future__ import annotations

import sys
from dataclasses import dataclass, fields
from pathlib import Path

import numpy as np
from astropy.coordinates import SkyCoord
from astropy.cosmology import Planck18
from colossus.cosmology import cosmology as colossus_cosmology
from colossus.halo import mass_defs
from colossus.lss import mass_function

SEED = 20261201
STRIP = (341.0, 347.0, -9.0, -8.0)  # footprint: RA from, to, Dec from, to [deg]
MARGIN = 1.0  # haloes are simulated this far outside the footprint [deg]
Z_RANGE = (0.012, 0.60)  # nearer than this the sky holds only what is planted
LOG_M_RANGE = (11.3, 15.3)
R_LIMIT, R_SPEC = 19.2, 18.3  # faint limit of the list, and of most spectra [mag]
LIGHT = 299792.458
H = Planck18.h
BARYON_SHARE = Planck18.Ob0 / Planck18.Om0
F_DIFFUSE = 0.84  # ionised share of the baryons, haloes included; common practice at z < 1
PC_FACTOR = 976.040  # 3 c H0 Ob0 (7/8) / (8 pi G m_p) for astropy's Planck18 [pc cm-3]
ELECTRONS = 7 / 8 * 4.046285e-8 * 1000  # Msun kpc-3 times kpc to pc cm-3, by astropy's constants
MW_HALO = 38.0  # one number for the whole field [pc cm-3]
DISC_POLE = 22.0  # plane-parallel disc seen at the pole, the middle of the published models [pc cm-3]

Z_GRID = np.linspace(0.0, 0.7, 1401)
COMOVING = Planck18.comoving_distance(Z_GRID).value
RHO_CRIT = Planck18.critical_density(Z_GRID).to_value("Msun / kpc3")


@dataclass
class Haloes:
    """Haloes as they are.

    ra, dec [deg]; z without and z_obs with peculiar motion; log10 M200c and the central's log10 M* [Msun].
    """

    ra: np.ndarray
    dec: np.ndarray
    z: np.ndarray
    z_obs: np.ndarray
    log_m: np.ndarray
    log_mstar: np.ndarray
    gas: np.ndarray  # factor on the mean kept share


def stack(parts: list) -> object:
    """Several tables of one kind, one after the other."""
    return type(parts[0])(*(np.concatenate([getattr(p, f.name) for p in parts]) for f in fields(parts[0])))


# ---------------------------------------------------------------- random numbers: only uniforms are asked of numpy


def uniform(purpose: int, n: int) -> np.ndarray:
    """n uniforms in (0, 1) of one purpose; a change in one part of the sky leaves the others as they are."""
    return np.random.Generator(np.random.Philox(key=[SEED, purpose])).random(n) + 2.0**-54


def normal(purpose: int, n: int) -> np.ndarray:
    """n unit normals (Box and Muller), so that the files do not hang on how a numpy version draws them."""
    u = uniform(purpose, 2 * n)
    return np.sqrt(-2 * np.log(u[:n])) * np.cos(2 * np.pi * u[n:])


# ---------------------------------------------------------------- distances, sizes, gas


def angular_kpc(z: np.ndarray) -> np.ndarray:
    """Proper kpc per radian."""
    return 1000 * np.interp(z, Z_GRID, COMOVING) / (1 + np.asarray(z))


def r200c_kpc(log_m: np.ndarray, z: np.ndarray) -> np.ndarray:
    return (3 * 10.0 ** np.asarray(log_m) / (800 * np.pi * np.interp(z, Z_GRID, RHO_CRIT))) ** (1 / 3)


def concentration(log_m: np.ndarray, z: np.ndarray) -> np.ndarray:
    """Dutton and Maccio 2014, MNRAS 441, 3359: median c200c."""
    a = 0.520 + 0.385 * np.exp(-0.617 * np.asarray(z) ** 1.21)
    return 10 ** (a + (-0.101 + 0.026 * np.asarray(z)) * (np.asarray(log_m) + np.log10(H) - 12))


def sigma_kms(log_m: np.ndarray, z: np.ndarray) -> np.ndarray:
    """Line-of-sight velocity dispersion, Evrard et al. 2008, ApJ 672, 122."""
    h_of_z = H * np.interp(z, Z_GRID, Planck18.efunc(Z_GRID))
    return 1082.9 * (h_of_z * 10.0 ** (np.asarray(log_m) - 15)) ** 0.3361


def kept(log_m: np.ndarray) -> np.ndarray:
    """Share of the cosmic baryons that the haloes of this sky keep as hot gas inside r200c: invented."""
    return np.clip(0.30 + 0.18 * (np.asarray(log_m) - 12), 0.25, 0.80)


def halo_dm(b: np.ndarray, log_m: np.ndarray, z: np.ndarray, gas: np.ndarray, start: float | None = None) -> np.ndarray:
    """Observer-frame DM of haloes at impact b [r200c]; `start` is the depth of a burst inside one [r200c, towards us].

    Density y/(2+y)^4 with y = c r/r200c, cut at r200c (Mathews and Prochaska 2017, ApJ 846, L24).
    """
    b, log_m, z, gas = np.broadcast_arrays(b, log_m, z, gas)
    c = concentration(log_m, z)
    t = 2 + c
    inner = np.log(t / 2) + 6 / t - 6 / t**2 + 8 / (3 * t**3) - 11 / 6  # int_0^c y^3/(2+y)^4 dy
    r200 = r200c_kpc(log_m, z)
    central = kept(log_m) * gas * BARYON_SHARE * 10.0**log_m / (4 * np.pi * (r200 / c) ** 3 * inner)
    half = np.sqrt(np.clip(1 - b**2, 0, None))
    low = -half if start is None else np.clip(start, -half, half)
    node, weight = np.polynomial.legendre.leggauss(64)
    depth = (half + low)[:, None] / 2 + (half - low)[:, None] / 2 * node
    y = c[:, None] * np.sqrt(b[:, None] ** 2 + depth**2)
    column = (weight * y / (2 + y) ** 4).sum(axis=1) * (half - low) / 2 * r200 * central
    return np.where(b < 1, ELECTRONS * column / (1 + z), 0.0)


# ---------------------------------------------------------------- the light cone


def halo_counts(area_deg2: float) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Redshifts, log masses and the expected number in each cell: Tinker et al. 2008, ApJ 688, 709, by colossus."""
    z_edges = np.linspace(*Z_RANGE, 60)
    m_edges = np.linspace(*LOG_M_RANGE, 161)
    z, log_m = (z_edges[1:] + z_edges[:-1]) / 2, (m_edges[1:] + m_edges[:-1]) / 2
    shell = np.diff(np.interp(z_edges, Z_GRID, COMOVING) ** 3) / 3 * area_deg2 * (np.pi / 180) ** 2
    per_dex = [mass_function.massFunction(10**log_m * H, zi, mdef="200c", model="tinker08", q_out="dndlnM") for zi in z]
    return z_edges, m_edges, np.array(per_dex) * np.log(10) * H**3 * np.diff(m_edges) * shell[:, None]


def central_mass(log_m: np.ndarray, z: np.ndarray, scatter: np.ndarray) -> np.ndarray:
    """log10 M* of a halo's central, Moster, Naab and White 2013, MNRAS 428, 3121, table 1; `scatter` in dex."""
    s = z / (1 + z)
    x = 10.0 ** (log_m - 11.590 - 1.195 * s)
    share = 2 * (0.0351 - 0.0247 * s) / (x ** -(1.376 - 0.826 * s) + x ** (0.608 + 0.329 * s))
    return log_m + np.log10(share) + scatter


def light_cone() -> Haloes:
    """Random haloes over the footprint and its margin."""
    ra0, ra1, dec0, dec1 = STRIP[0] - MARGIN, STRIP[1] + MARGIN, STRIP[2] - MARGIN, STRIP[3] + MARGIN
    sines = np.sin(np.radians([dec0, dec1]))
    z_edges, m_edges, expected = halo_counts((ra1 - ra0) * np.degrees(np.diff(sines)[0]))
    n = round(expected.sum())
    cell = np.minimum(np.searchsorted(np.cumsum(expected.ravel()), uniform(1, n) * expected.sum()), expected.size - 1)
    iz, im = np.unravel_index(cell, expected.shape)
    z = z_edges[iz] + uniform(2, n) * np.diff(z_edges)[iz]
    log_m = m_edges[im] + uniform(3, n) * np.diff(m_edges)[im]
    ra = ra0 + uniform(4, n) * (ra1 - ra0)
    dec = np.degrees(np.arcsin(sines[0] + uniform(5, n) * np.diff(sines)[0]))
    z_obs = (1 + z) * (1 + 300 * normal(6, n) / LIGHT) - 1
    log_mstar = central_mass(log_m, z, 0.18 * normal(7, n))
    return Haloes(ra, dec, z, z_obs, log_m, log_mstar, 10 ** (0.1 * normal(8, n)))


# ---------------------------------------------------------------- the eight bursts and what is planted in front of them


@dataclass(frozen=True)
class Role:
    """One burst: where to look for its place, and the halo that makes its role."""

    burst: str
    role: str
    z: float
    window: tuple[float, float, float, float]  # RA from, to, Dec from, to [deg]
    log_m: float = np.nan  # planted halo; NaN for none
    z_halo: float = np.nan
    impact: float = np.nan  # [r200c]
    angle: float = 0.0  # of the halo as seen from the burst, east of north [deg]
    log_mstar: float = np.nan  # of the planted central
    host_log_mstar: float = np.nan  # of a host bright enough to be listed
    loc: tuple[float, float, float] = (0.3, 0.2, 0.0)  # 1 sigma axes [arcsec], position angle [deg]


CLUSTER_R500 = 0.3  # impact of the cluster's burst [r500c]
ELLIPSE = (60.0, 20.0, 35.0)  # of Gannet
CLEAN = 2.15  # r200c around Curlew without a halo: more than 2, for listed redshifts and masses have errors
ROLES = (
    Role("Avocet", "cluster", 0.29, (343.7, 344.1, -8.65, -8.4), 14.5, 0.112, np.nan, 40, 11.45, loc=(0.4, 0.3, 15)),
    Role("Bittern", "galaxy_halo", 0.21, (342.4, 342.8, -8.8, -8.3), 12.3, 0.081, 0.5, 250, 10.72, loc=(0.2, 0.2, 0)),
    Role("Curlew", "clean", 0.12, (341.3, 342.2, -8.8, -8.2), loc=(0.3, 0.2, 80)),
    Role("Dunlin", "outside_footprint", 0.34, (342.7, 343.1, -9.6, -9.35), loc=(0.5, 0.4, 120)),
    Role("Egret", "photometric_redshift", 0.30, (342.9, 343.3, -8.7, -8.3), 13.0, 0.272, 0.3, 160, 11.15),
    Role("Fulmar", "host_group", 0.17, (344.6, 344.9, -8.7, -8.3), 13.7, 0.17, 0.35, 310, 11.1, 10.6, (0.2, 0.1, 45)),
    Role("Gannet", "large_localisation", 0.25, (344.2, 344.5, -8.8, -8.3), 12.5, 0.095, 0.6, 100, 10.85, loc=ELLIPSE),
    Role("Heron", "local_volume", 0.0152, (346.0, 346.2, -8.6, -8.4), 11.4, 0.00222, 0.3, 80, 9.75, 9.9, (0.6, 0.3, 0)),
)
LOCAL_MPC = 9.5  # distance of the halo in front of Heron; its redshift holds a peculiar velocity
SENTENCES = {
    "cluster": "through a cluster, at 0.3 r500c",
    "galaxy_halo": "skirts the halo of one galaxy, at half its r200c",
    "clean": "no halo within 2 r200c of the line",
    "outside_footprint": "the survey did not look there: nothing listed, which is not nothing there",
    "photometric_redshift": "one massive galaxy with a photometric redshift that may lie in front or behind",
    "host_group": "inside the group of its own host",
    "large_localisation": "an error ellipse wide enough to change the impact parameter",
    "local_volume": "near, and seen through a small halo that spans more than a degree",
}


def separation_kpc(ra: float, dec: float, h: Haloes) -> np.ndarray:
    """Impact parameter [proper kpc] of a line at each halo; flat sky, good to 1e-4 within a degree."""
    east = np.radians(h.ra - ra) * np.cos(np.radians((h.dec + dec) / 2))
    return np.hypot(east, np.radians(h.dec - dec)) * distance_kpc(h)


def distance_kpc(h: Haloes) -> np.ndarray:
    """Proper kpc per radian; the one local halo is where its distance says."""
    return np.where(h.z < Z_RANGE[0], 1000 * LOCAL_MPC, angular_kpc(h.z))


def place(index: int, role: Role, sky: Haloes) -> tuple[float, float]:
    """Where the burst lies: of 600 places in its window, one whose other haloes leave the role to what is planted."""
    ra = role.window[0] + uniform(20 + index, 1200)[:600] * (role.window[1] - role.window[0])
    dec = role.window[2] + uniform(20 + index, 1200)[600:] * (role.window[3] - role.window[2])
    # what lies a little behind a clean line could be listed in front by a photometric redshift: it counts too
    near = (sky.z < role.z + (0.07 if role.role == "clean" else 0)) & (sky.ra > ra.min() - 1) & (sky.ra < ra.max() + 1)
    h = Haloes(*(getattr(sky, f.name)[near] for f in fields(Haloes)))
    r200 = r200c_kpc(h.log_m, h.z)
    for x, y in zip(ra, dec, strict=True):
        b = separation_kpc(x, y, h) / r200
        close = b < 1
        dm = halo_dm(b[close], h.log_m[close], h.z[close], h.gas[close]).sum()
        bright = ((h.log_mstar > 10.2) & (b < 1.5)).any()
        if (b.min() > CLEAN) if role.role == "clean" else role.role == "outside_footprint" or (dm < 12 and not bright):
            return round(float(x), 5), round(float(y), 5)
    raise RuntimeError(f"no place for {role.burst} in its window; choose another seed or window")


def planted(role: Role, ra: float, dec: float) -> Haloes | None:
    """The halo of the role, at its impact parameter from the burst."""
    if np.isnan(role.log_m):
        return None
    r200 = float(r200c_kpc(role.log_m, role.z_halo))
    impact = role.impact * r200 if np.isfinite(role.impact) else CLUSTER_R500 * r500c_kpc(role)
    local = role.role == "local_volume"
    theta = np.degrees(impact / (1000 * LOCAL_MPC if local else float(angular_kpc(role.z_halo))))
    north, east = theta * np.cos(np.radians(role.angle)), theta * np.sin(np.radians(role.angle))
    ra_halo = ra + east / np.cos(np.radians(dec + north / 2))
    return Haloes(
        *(np.array([v]) for v in (ra_halo, dec + north, role.z_halo, role.z_halo, role.log_m, role.log_mstar, 1.0))
    )


def r500c_kpc(role: Role) -> float:
    c = float(concentration(role.log_m, role.z_halo))
    return float(mass_defs.changeMassDefinition(10**role.log_m * H, c, role.z_halo, "200c", "500c")[1]) / H


# ---------------------------------------------------------------- galaxies


@dataclass
class Light:
    """Galaxies as they are; `halo` counts the halo they sit in."""

    ra: np.ndarray
    dec: np.ndarray
    z_obs: np.ndarray
    log_mstar: np.ndarray
    halo: np.ndarray
    host_of: np.ndarray  # index of the burst it hosts, -1 for none


def centrals(h: Haloes) -> Light:
    n = len(h.z)
    return Light(h.ra, h.dec, h.z_obs, h.log_mstar, np.arange(n), np.full(n, -1))


def satellites(h: Haloes) -> Light:
    """Satellites of haloes above 10^12.6: infall masses as the subhalo mass function, places as an NFW profile.

    Number above a share mu of the host: 0.13 mu^-0.8 (the slope is common practice, the amplitude invented).
    """
    least = 10.0**11.0
    hosts = np.flatnonzero(h.log_m > 12.6)
    mu_min = least / 10.0 ** h.log_m[hosts]
    expected = 0.13 * (mu_min**-0.8 - 0.3**-0.8)
    n = round(expected.sum())
    pick = np.minimum(np.searchsorted(np.cumsum(expected), uniform(40, n) * expected.sum()), len(hosts) - 1)
    halo, mu_min = hosts[pick], mu_min[pick]
    mu = (mu_min**-0.8 - uniform(41, n) * (mu_min**-0.8 - 0.3**-0.8)) ** (-1 / 0.8)
    log_m, z = h.log_m[halo], h.z[halo]
    x = nfw_radius(uniform(42, n), concentration(log_m, z)) * r200c_kpc(log_m, z) / angular_kpc(z)
    cos_line, turn = 2 * uniform(43, n) - 1, 2 * np.pi * uniform(44, n)
    projected = np.degrees(x * np.sqrt(1 - cos_line**2))
    dec = h.dec[halo] + projected * np.cos(turn)
    ra = h.ra[halo] + projected * np.sin(turn) / np.cos(np.radians(dec))
    z_obs = (1 + h.z_obs[halo]) * (1 + sigma_kms(log_m, z) * normal(45, n) / LIGHT) - 1
    log_mstar = central_mass(log_m + np.log10(mu), z, 0.18 * normal(46, n))
    log_mstar = np.minimum(log_mstar, h.log_mstar[halo] - 0.1)  # the central stays the brightest
    return Light(ra, dec, z_obs, log_mstar, halo, np.full(n, -1))


def nfw_radius(share: np.ndarray, c: np.ndarray) -> np.ndarray:
    """Radius [r200c] that holds `share` of an NFW halo, by bisection."""
    low, high = np.zeros_like(c), np.ones_like(c)
    total = np.log1p(c) - c / (1 + c)
    for _ in range(40):
        x = (low + high) / 2
        above = np.log1p(c * x) - c * x / (1 + c * x) > share * total
        low, high = np.where(above, low, x), np.where(above, x, high)
    return (low + high) / 2


def hosts(places: list, group_of: dict[str, int]) -> Light:
    """Host galaxies bright enough for the list, an arcsecond from their bursts."""
    rows = [(i, r, p) for i, (r, p) in enumerate(zip(ROLES, places, strict=True)) if np.isfinite(r.host_log_mstar)]
    at = [(p[0] + 2e-4, p[1] + 1e-4, r.z, r.host_log_mstar, group_of.get(r.burst, -1), i) for i, r, p in rows]
    return Light(*(np.array(column) for column in zip(*at, strict=True)))


def magnitude(g: Light) -> np.ndarray:
    """Apparent r: a red and a blue population with their own M/L and K-correction, both invented."""
    n = len(g.z_obs)
    red = uniform(50, n) < 1 / (1 + 10 ** (-(g.log_mstar - 10.3) / 0.45))
    log_ml = np.where(red, 0.42, 0.10) + 0.08 * normal(51, n)
    modulus = 5 * np.log10((1 + g.z_obs) ** 2 * angular_kpc(g.z_obs) / 1000) + 25
    return 4.65 - 2.5 * (g.log_mstar - log_ml) + modulus + np.where(red, 1.1, 0.5) * g.z_obs


@dataclass
class Seen:
    """Rows of the galaxy table, with the index of each galaxy in the sky."""

    index: np.ndarray
    z: np.ndarray
    z_err: np.ndarray
    spec: np.ndarray
    log_mstar: np.ndarray
    log_mstar_err: np.ndarray
    distance_mpc: np.ndarray


def survey(g: Light, photometric: int, spectroscopic: int) -> Seen:
    """What the survey lists: inside the strip, brighter than the limit, half with spectra, all with errors.

    The two numbers are the planted galaxies of Egret and Bittern, whose kind of redshift is part of the role.
    """
    r, number = magnitude(g), np.arange(len(g.z_obs))
    role_galaxy = np.isin(number, [photometric, spectroscopic])
    inside = (g.ra > STRIP[0]) & (g.ra < STRIP[1]) & (g.dec > STRIP[2]) & (g.dec < STRIP[3])
    spec = uniform(60, len(number)) < np.where(r < R_SPEC, 0.92, 0.15)
    spec = np.where(role_galaxy, number == spectroscopic, spec | (g.host_of >= 0) | (g.z_obs < Z_RANGE[0]))
    index = np.flatnonzero(inside & ((r < R_LIMIT) | role_galaxy | (g.host_of >= 0)))
    z, spec = g.z_obs[index], spec[index]
    z_err = np.where(spec, 0.0002, 0.022 * (1 + z))
    n, role_galaxy = len(number), role_galaxy[index]
    shift = np.where(role_galaxy & ~spec, 0.7, normal(61, n)[index])  # Egret's galaxy is listed at a chosen place
    z_seen = np.maximum(z + z_err * shift, 0.001)
    local = z < Z_RANGE[0]
    distance = np.where(local, LOCAL_MPC * (1 + 0.05 * normal(62, n)[index]), np.nan)
    error = np.where(spec, 0.12, 0.15)
    # a photometric mass is worked out at the photometric redshift
    moved = np.where(local, 0.0, 2 * np.log10(angular_kpc(z_seen) * (1 + z_seen) ** 2 / angular_kpc(z) / (1 + z) ** 2))
    log_mstar = g.log_mstar[index] + error * np.where(role_galaxy, 0.1, normal(63, n)[index]) + moved
    order = np.argsort(g.ra[index], kind="stable")
    return Seen(*(a[order] for a in (index, z_seen, z_err, spec, log_mstar, error, distance)))


# ---------------------------------------------------------------- groups


def group_table(h: Haloes, g: Light, seen: Seen) -> dict[str, np.ndarray]:
    """Groups with four listed members or more; the listed mass is a posterior, so truth scatters about it."""
    halo = g.halo[seen.index]
    members = np.bincount(halo[halo >= 0], minlength=len(h.z))
    with_spectrum = np.bincount(halo[(halo >= 0) & seen.spec], minlength=len(h.z))
    inside = (h.ra > STRIP[0]) & (h.ra < STRIP[1]) & (h.dec > STRIP[2]) & (h.dec < STRIP[3])
    index = np.flatnonzero((members >= 4) & (with_spectrum >= 2) & (h.log_m > 12.6) & inside)
    index = index[np.argsort(h.ra[index], kind="stable")]
    n, log_m = len(index), h.log_m[index]
    error = np.where(members[index] < 8, 0.30, np.where(members[index] < 20, 0.22, 0.15))
    measured = log_m + error * normal(70, n)
    middle, width = log_m.mean(), log_m.std()  # of the listed groups: the prior that the survey's posterior rests on
    z_err = np.hypot(sigma_kms(log_m, h.z[index]) / np.sqrt(with_spectrum[index]), 60) / LIGHT
    centre_err = np.where(members[index] < 8, 80.0, np.where(members[index] < 20, 60.0, 40.0))
    off = np.degrees(centre_err / angular_kpc(h.z[index]))
    return {
        "halo": index,
        "ra": h.ra[index] + off * normal(71, n) / np.cos(np.radians(h.dec[index])),
        "dec": h.dec[index] + off * normal(72, n),
        "z": h.z_obs[index] + z_err * normal(73, n),
        "log_mass": (measured / error**2 + middle / width**2) / (error**-2 + width**-2),
        "z_err": z_err,
        "log_mass_err": (error**-2 + width**-2) ** -0.5,
        "n_members": members[index],
        "centre_err_kpc": centre_err,
    }


# ---------------------------------------------------------------- the dispersion measures


def mean_cosmic(z: float) -> float:
    """Mean cosmic DM to z with the ionised share F_DIFFUSE."""
    x = np.linspace(0, z, 2001)
    y = (1 + x) / np.interp(x, Z_GRID, Planck18.efunc(Z_GRID))
    return PC_FACTOR * F_DIFFUSE * float(np.sum((y[1:] + y[:-1]) / 2 * np.diff(x)))


def mean_haloes(z: float) -> float:
    """Mean DM of the haloes of this sky to z: their gas, spread evenly over comoving volume."""
    log_m = np.linspace(*LOG_M_RANGE, 161)
    x = np.linspace(0.001, z, 40)
    gas = kept(log_m) * BARYON_SHARE * 10**log_m
    density = []
    for zi in x:
        per_dex = mass_function.massFunction(10**log_m * H, zi, mdef="200c", model="tinker08", q_out="dndlnM") * np.log(
            10
        )
        density.append(np.sum(per_dex * H**3 * gas) * (log_m[1] - log_m[0]))
    baryons = Planck18.Ob0 * Planck18.critical_density0.to_value("Msun / Mpc3")
    y = np.array(density) / baryons * (1 + x) / np.interp(x, Z_GRID, Planck18.efunc(Z_GRID))
    return PC_FACTOR * float(np.sum((y[1:] + y[:-1]) / 2 * np.diff(x)))


def crossings(role: Role, ra: float, dec: float, h: Haloes, own: int) -> dict[str, np.ndarray]:
    """Haloes in front within 2 r200c, with the DM each puts on the line; `own` is the halo the burst sits in."""
    b = separation_kpc(ra, dec, h)
    x = b / r200c_kpc(h.log_m, h.z)
    index = np.flatnonzero((x < 2) & ((h.z < role.z) | (np.arange(len(h.z)) == own)))
    index = index[np.argsort(x[index], kind="stable")]
    dm = halo_dm(x[index], h.log_m[index], h.z[index], h.gas[index])
    if own >= 0:  # the burst is in the middle of its group: half of the line is in front
        k = index == own
        dm[k] = halo_dm(x[index][k], h.log_m[index][k], h.z[index][k], h.gas[index][k], start=0.0)
    return {"halo": index, "impact_kpc": b[index], "impact_r200c": x[index], "dm": dm}


# ---------------------------------------------------------------- files


def ecsv(path: Path, about: list[str], columns: list[tuple[str, str, str, str, list]]) -> None:
    """An ECSV table from (name, unit, type, format, values); None is an empty cell."""
    lines = ["# %ECSV 1.0", "# ---", "# delimiter: ','", "# datatype:"]
    for name, unit, kind, _, _ in columns:
        unit_part = f"unit: {unit}, " if unit else ""
        lines.append(f"# - {{name: {name}, {unit_part}datatype: {kind}}}")
    lines += ["# meta:", "#   simulated: true", "#   survey: Saltmarsh (invented)", "#   about:"]
    lines += [f"#   - '{line}'" for line in about]
    lines += ["# schema: astropy-2.0", ",".join(c[0] for c in columns)]
    cells = [["" if v is None else format(v, form) for v in values] for _, _, _, form, values in columns]
    lines += [",".join(row) for row in zip(*cells, strict=True)]
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")


def filled(values: np.ndarray) -> list:
    """A list with None for NaN."""
    return [None if np.isnan(v) else v for v in values]


def write_galaxies(folder: Path, g: Light, seen: Seen, galaxy_id: list[str], group_id: list[str]) -> None:
    about = [
        "SIMULATED: no galaxy of this list exists. Written by simulate.py, which stands beside it.",
        f"All galaxies brighter than r = {R_LIMIT} (AB) in the strip of footprint.txt;",
        f"most brighter than {R_SPEC} have spectra, most fainter ones a photometric redshift.",
        "Masses: Chabrier, log10 Msun, error without the redshift part. Redshifts: heliocentric, errors 1 sigma.",
        "group_id: the row of groups.ecsv it belongs to. distance_mpc: nearer than 50 Mpc only.",
    ]
    i = seen.index
    ecsv(
        folder / "galaxies.ecsv",
        about,
        [
            ("id", "", "string", "s", galaxy_id),
            ("ra", "deg", "float64", ".5f", list(g.ra[i])),
            ("dec", "deg", "float64", ".5f", list(g.dec[i])),
            ("z", "", "float64", ".5f", list(seen.z)),
            ("z_err", "", "float64", ".4f", list(seen.z_err)),
            ("z_kind", "", "string", "s", ["spec" if s else "phot" for s in seen.spec]),
            ("log_mstar", "", "float64", ".2f", list(seen.log_mstar)),
            ("log_mstar_err", "", "float64", ".2f", list(seen.log_mstar_err)),
            ("distance_mpc", "Mpc", "float64", ".2f", filled(seen.distance_mpc)),
            ("group_id", "", "string", "s", group_id),
        ],
    )


def write_groups(folder: Path, groups: dict[str, np.ndarray], ids: list[str]) -> None:
    about = [
        "SIMULATED: no group of this list exists. Written by simulate.py, which stands beside it.",
        "Groups with four listed members or more, two of them with spectra. log_mass is M200c, log10 Msun without h,",
        "a posterior: the error holds everything the survey knows. centre_err_kpc is 1 sigma per axis, proper kpc.",
    ]
    ecsv(
        folder / "groups.ecsv",
        about,
        [
            ("id", "", "string", "s", ids),
            ("ra", "deg", "float64", ".5f", list(groups["ra"])),
            ("dec", "deg", "float64", ".5f", list(groups["dec"])),
            ("z", "", "float64", ".5f", list(groups["z"])),
            ("log_mass", "", "float64", ".2f", list(groups["log_mass"])),
            ("mass_def", "", "string", "s", ["200c"] * len(ids)),
            ("z_err", "", "float64", ".5f", list(groups["z_err"])),
            ("log_mass_err", "", "float64", ".2f", list(groups["log_mass_err"])),
            ("n_members", "", "int64", "d", list(groups["n_members"])),
            ("centre_err_kpc", "kpc", "float64", ".0f", list(groups["centre_err_kpc"])),
        ],
    )


def write_bursts(folder: Path, listed: list, dm: list[float], disc: list[float], host_id: list[str]) -> None:
    about = [
        "SIMULATED: no burst of this list exists. Written by simulate.py, which stands beside it.",
        "What each is for:",
    ]
    about += [f"{r.burst}: {SENTENCES[r.role]}." for r in ROLES]
    about += ["dm_disc is left empty where the reader should fall back on a stated default."]
    dm_unit = "pc cm-3"
    known = [i % 2 == 0 for i in range(len(ROLES))]
    ecsv(
        folder / "bursts.ecsv",
        about,
        [
            ("burst", "", "string", "s", [r.burst for r in ROLES]),
            ("ra", "deg", "float64", ".5f", [p[0] for p in listed]),
            ("dec", "deg", "float64", ".5f", [p[1] for p in listed]),
            ("z", "", "float64", ".4f", [r.z for r in ROLES]),
            ("dm", dm_unit, "float64", ".1f", dm),
            ("dm_err", dm_unit, "float64", ".1f", [0.3] * len(ROLES)),
            ("loc_major_arcsec", "arcsec", "float64", ".1f", [r.loc[0] for r in ROLES]),
            ("loc_minor_arcsec", "arcsec", "float64", ".1f", [r.loc[1] for r in ROLES]),
            ("loc_pa_deg", "deg", "float64", ".0f", [r.loc[2] for r in ROLES]),
            ("dm_disc", dm_unit, "float64", ".1f", [d if k else None for d, k in zip(disc, known, strict=True)]),
            ("dm_disc_err", dm_unit, "float64", ".1f", [5.0 if k else None for k in known]),
            ("host_id", "", "string", "s", host_id),
        ],
    )


def write_footprint(folder: Path) -> None:
    ra0, ra1, dec0, dec1 = STRIP
    # a side along a parallel is not a great circle: corners every half degree keep the two within an arcsecond
    ra = np.linspace(ra0, ra1, 13)
    corners = [(x, dec0) for x in ra] + [(x, dec1) for x in ra[::-1]]
    header = [
        "# SIMULATED: the outline of the Saltmarsh survey, which does not exist. Written by simulate.py.",
        f"# One polygon, RA and Dec in degrees (ICRS), closed by its first corner; depth r = {R_LIMIT} (AB).",
    ]
    body = [f"{x:.4f} {y:.4f}" for x, y in corners]
    (folder / "footprint.txt").write_text("\n".join(header + body) + "\n", encoding="utf-8")


def write_truth(folder: Path, rows: list[dict], crossed: list[dict]) -> None:
    about = [
        "SIMULATED: what was put into the sky of this folder, for comparison with what an audit finds.",
        "dm = dm_mw_disc + dm_mw_halo + dm_haloes + dm_diffuse + dm_host_obs, all in the observer frame.",
        "dm_haloes: every halo above 10^11.3 Msun that the line crosses inside r200c; dm_diffuse: the rest.",
        "key_*: the halo that makes the role, in the true sky; empty where there is none.",
    ]
    dm_unit = "pc cm-3"
    names = ["dm", "dm_mw_disc", "dm_mw_halo", "dm_haloes", "dm_diffuse", "dm_cosmic_mean_z", "dm_host_obs"]
    key = [
        ("key_z", "", ".5f"),
        ("key_log_m200c", "", ".3f"),
        ("key_impact_kpc", "kpc", ".1f"),
        ("key_impact_r200c", "", ".3f"),
    ]
    ecsv(
        folder / "truth.ecsv",
        about,
        [
            ("burst", "", "string", "s", [r["burst"] for r in rows]),
            ("role", "", "string", "s", [r["role"] for r in rows]),
            ("ra", "deg", "float64", ".6f", [r["ra"] for r in rows]),
            ("dec", "deg", "float64", ".6f", [r["dec"] for r in rows]),
            ("z", "", "float64", ".4f", [r["z"] for r in rows]),
            *((n, dm_unit, "float64", ".2f", [r[n] for r in rows]) for n in names),
            ("key_row", "", "string", "s", [r["key_row"] for r in rows]),
            *((n, unit, "float64", form, [r.get(n) for r in rows]) for n, unit, form in key),
        ],
    )
    about = [
        "SIMULATED: every true halo in front of each burst within 2 r200c of the line, listed by the survey or not.",
        "row: its row in groups.ecsv, else that of its central in galaxies.ecsv, empty where neither lists it.",
    ]
    ecsv(
        folder / "truth_haloes.ecsv",
        about,
        [
            ("burst", "", "string", "s", [r["burst"] for r in crossed]),
            ("row", "", "string", "s", [r["row"] for r in crossed]),
            ("ra", "deg", "float64", ".5f", [r["ra"] for r in crossed]),
            ("dec", "deg", "float64", ".5f", [r["dec"] for r in crossed]),
            ("z", "", "float64", ".5f", [r["z"] for r in crossed]),
            ("log_m200c", "", "float64", ".3f", [r["log_m"] for r in crossed]),
            ("impact_kpc", "kpc", "float64", ".1f", [r["impact_kpc"] for r in crossed]),
            ("impact_r200c", "", "float64", ".3f", [r["impact_r200c"] for r in crossed]),
            ("dm", dm_unit, "float64", ".2f", [r["dm"] for r in crossed]),
        ],
    )


# ---------------------------------------------------------------- all of it


def seen_place(index: int, role: Role, true: tuple[float, float]) -> tuple[float, float]:
    """The position that the telescope gives: the true one, moved by its error ellipse."""
    major, minor = np.array(role.loc[:2]) * normal(80 + index, 2) / 3600
    turn = np.radians(role.loc[2])
    north, east = major * np.cos(turn) - minor * np.sin(turn), major * np.sin(turn) + minor * np.cos(turn)
    return true[0] + east / np.cos(np.radians(true[1])), true[1] + north


def build() -> tuple[list, Haloes, Light, dict[str, int]]:
    """Places of the bursts, haloes, galaxies, and which halo is planted for which burst (those come first)."""
    random_sky = light_cone()
    places = [place(i, r, random_sky) for i, r in enumerate(ROLES)]
    extra = {r.burst: planted(r, *p) for r, p in zip(ROLES, places, strict=True)}
    extra = {name: halo for name, halo in extra.items() if halo is not None}
    key = {name: k for k, name in enumerate(extra)}
    sky = stack([*extra.values(), random_sky])
    return places, sky, stack([centrals(sky), satellites(sky), hosts(places, {"Fulmar": key["Fulmar"]})]), key


def row_names(sky: Haloes, seen: Seen, galaxy_ids: list[str], group_of_halo: dict[int, str]) -> dict[int, str]:
    """The listed row of each halo: its group, else its central."""
    listed = zip(seen.index.tolist(), galaxy_ids, strict=True)
    return {k: name for k, name in listed if k < len(sky.z)} | group_of_halo


def dm_parts(i: int, role: Role, ra: float, dec: float, from_haloes: float) -> dict[str, float]:
    """The budget of one burst, term by term."""
    latitude = SkyCoord(ra, dec, unit="deg").galactic.b.rad
    mean = mean_cosmic(role.z)
    spread = min(0.3, 0.06 / np.sqrt(role.z))
    parts = {
        "dm_mw_disc": DISC_POLE / abs(np.sin(latitude)),
        "dm_mw_halo": MW_HALO,
        "dm_haloes": from_haloes,
        "dm_diffuse": (mean - mean_haloes(role.z)) * np.exp(spread * normal(90, len(ROLES))[i]),
        "dm_host_obs": 150 * np.exp(0.8 * normal(91, len(ROLES))[i]) / (1 + role.z),
    }
    return parts | {"dm": sum(parts.values()), "dm_cosmic_mean_z": mean}


def truth(places: list, sky: Haloes, key: dict[str, int], row_of: dict[int, str]) -> tuple[list[dict], list[dict]]:
    """A row per burst, and a row per burst and halo in front of it."""
    rows, crossed = [], []
    for i, (role, (ra, dec)) in enumerate(zip(ROLES, places, strict=True)):
        own = key[role.burst] if role.role == "host_group" else -1
        line = crossings(role, ra, dec, sky, own)
        row = {"burst": role.burst, "role": role.role, "ra": ra, "dec": dec, "z": role.z, "key_row": ""}
        row |= dm_parts(i, role, ra, dec, line["dm"].sum())
        for k, halo in enumerate(line["halo"].tolist()):
            part = {n: line[n][k] for n in ("impact_kpc", "impact_r200c", "dm")}
            part |= {"z": sky.z[halo], "log_m": sky.log_m[halo], "ra": sky.ra[halo], "dec": sky.dec[halo]}
            crossed.append({"burst": role.burst, "row": row_of.get(halo, ""), **part})
            if halo == key.get(role.burst):
                row |= {"key_row": row_of[halo], "key_z": part["z"], "key_log_m200c": part["log_m"]}
                row |= {"key_impact_kpc": part["impact_kpc"], "key_impact_r200c": part["impact_r200c"]}
        rows.append(row)
    return rows, crossed


def simulate(folder: Path) -> None:
    """The whole sky, from haloes to files."""
    model = {"H0": Planck18.H0.value, "Om0": Planck18.Om0, "Ob0": Planck18.Ob0, "sigma8": 0.8102, "ns": 0.9665}
    colossus_cosmology.setCosmology("saltmarsh", flat=True, persistence="", **model)
    places, sky, galaxies, key = build()
    seen = survey(galaxies, key["Egret"], key["Bittern"])
    groups = group_table(sky, galaxies, seen)

    galaxy_ids = [f"SM{k:05d}" for k in range(1, len(seen.index) + 1)]
    group_ids = [f"SMG{k:03d}" for k in range(1, len(groups["halo"]) + 1)]
    group_of_halo = dict(zip(groups["halo"].tolist(), group_ids, strict=True))
    rows, crossed = truth(places, sky, key, row_names(sky, seen, galaxy_ids, group_of_halo))
    host_of = dict(zip(galaxies.host_of[seen.index].tolist(), galaxy_ids, strict=True))
    host_ids = [host_of.get(i, "") for i in range(len(ROLES))]
    listed = [seen_place(i, r, p) for i, (r, p) in enumerate(zip(ROLES, places, strict=True))]

    folder.mkdir(parents=True, exist_ok=True)
    write_galaxies(
        folder, galaxies, seen, galaxy_ids, [group_of_halo.get(k, "") for k in galaxies.halo[seen.index].tolist()]
    )
    write_groups(folder, groups, group_ids)
    write_bursts(folder, listed, [r["dm"] for r in rows], [r["dm_mw_disc"] for r in rows], host_ids)
    write_footprint(folder)
    write_truth(folder, rows, crossed)


if __name__ == "__main__":
    simulate(Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).parent)
