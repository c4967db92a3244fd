"""What a survey shows of a true sky: tables of galaxies, groups and bursts, as an observer would write them."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.rehearse.sky.truth import Sky, pick

OUTLIER = 0.3  # width over (1 + z) of the redshifts that fail: ours, without a preferred place
SPEC_ERR = 1e-4
GROUPS = ("true", "imperfect", "none")


@dataclass(frozen=True)
class Survey:
    """How the sky is seen."""

    depth: float = 9.0  # log10 M* at the flux limit, at z = 0.1
    least: float = 9.3  # and no galaxy below this measured mass
    photoz: float = 0.0  # error over 1 + z; 0: every redshift is spectroscopic
    outliers: float = 0.0  # share of photometric redshifts that fail
    spec_share: float = 0.0  # share of the galaxies that have spectra all the same
    groups: str = "true"
    members: int = 2  # listed galaxies that make a group
    group_err: float = 0.01  # dex, of "true" groups
    imperfect_err: float = 0.25
    missed: float = 0.2
    off_centre: float = 0.15  # share of imperfect groups centred on a satellite
    doubles: float = 0.0  # share of the galaxies that a second catalogue lists too


@dataclass(frozen=True)
class Seen:
    """Tables as the audit reads them, and what they stand for."""

    bursts: Any
    galaxies: list
    groups: list
    rows: np.ndarray  # galaxies of the sky that are listed
    listed: np.ndarray  # haloes of the sky of which a galaxy or the group is listed (n_haloes,)
    grouped: np.ndarray  # haloes with a group row

    def halo_of(self, names, sky: Sky) -> np.ndarray:
        """True halo behind each catalogue row "label:id"."""
        ids = [str(name).rsplit(":", 1)[-1] for name in names]
        number = np.array([int(i.lstrip("cdg")) for i in ids], dtype=int)
        group = np.array([i.startswith("c") for i in ids], dtype=bool)
        return np.where(group, number, sky.galaxies.halo[np.where(group, 0, number)])


def look(sky: Sky, survey: Survey, cosmos: Cosmos, rng: np.random.Generator) -> Seen:
    """The sky through the survey."""
    z_measured, photometric = _redshifts(sky, survey, rng)
    log_mstar = _stellar_masses(sky, z_measured, cosmos)
    rows = _rows(sky, survey, log_mstar, z_measured, cosmos)
    counts = np.bincount(sky.galaxies.halo[rows], minlength=len(sky.haloes))
    grouped = _grouped(counts, survey, rng)
    galaxies = _galaxy_table(sky, survey, rows, z_measured, photometric, log_mstar, grouped)
    tables = [galaxies]
    if survey.doubles:
        tables.append(_doubles(galaxies, survey, rng))
    groups = [_group_table(sky, survey, grouped, counts, rows, cosmos, rng)] if grouped.any() else []
    return Seen(_burst_table(sky), tables, groups, rows, (counts > 0) | grouped, grouped)


def _redshifts(sky: Sky, survey: Survey, rng) -> tuple[np.ndarray, np.ndarray]:
    g = sky.galaxies
    n = len(g)
    photometric = (rng.random(n) >= survey.spec_share) & (survey.photoz > 0)
    photometric[sky.lines.host] = False
    failed = rng.random(n) < survey.outliers
    width = np.where(failed, OUTLIER, survey.photoz) * (1 + g.z_seen)
    err = np.where(photometric, width, SPEC_ERR)
    return g.z_seen + err * rng.standard_normal(n), photometric


def _stellar_masses(sky: Sky, z_measured, cosmos: Cosmos) -> np.ndarray:
    """Measured from flux: they follow the measured redshift."""
    g, halo = sky.galaxies, sky.haloes
    true_mpc = cosmos.luminosity_distance_mpc(halo.z[g.halo])
    seen_mpc = cosmos.luminosity_distance_mpc(np.maximum(z_measured, 1e-3))
    return g.measured + 2 * np.log10(seen_mpc / true_mpc)


def flux_limit(z, survey: Survey, cosmos: Cosmos) -> np.ndarray:
    """Least log10 M* that is listed at a measured redshift."""
    far = cosmos.luminosity_distance_mpc(np.maximum(z, 1e-3)) / cosmos.luminosity_distance_mpc(0.1)
    return np.maximum(survey.depth + 2 * np.log10(far), survey.least)


def _rows(sky: Sky, survey: Survey, log_mstar, z_measured, cosmos: Cosmos) -> np.ndarray:
    """Galaxies above the flux limit and the least mass; hosts always."""
    seen = (log_mstar > flux_limit(z_measured, survey, cosmos)) & (z_measured > 1e-3)
    seen[sky.lines.host] = True
    return np.flatnonzero(seen)


def _grouped(counts, survey: Survey, rng) -> np.ndarray:
    if survey.groups == "none":
        return np.zeros(len(counts), dtype=bool)
    grouped = counts >= survey.members
    if survey.groups == "imperfect":
        grouped &= rng.random(len(counts)) >= survey.missed
    return grouped


def _galaxy_table(sky: Sky, survey: Survey, rows, z_measured, photometric, log_mstar, grouped):
    from astropy.table import Table

    g = pick(sky.galaxies, rows)
    ra, dec = _positions(sky, sky.haloes.line[g.halo], g.east_mpc, g.north_mpc, sky.haloes.z[g.halo])
    phot = photometric[rows]
    columns = {
        "id": np.char.add("g", rows.astype(str)),
        "ra": ra,
        "dec": dec,
        "z": z_measured[rows],
        "z_err": np.where(phot, survey.photoz * (1 + z_measured[rows]), SPEC_ERR),
        "z_kind": np.where(phot, "phot", "spec"),
        "log_mstar": log_mstar[rows],
        "log_mstar_err": np.full(len(rows), sky.mass_err),
    }
    if survey.groups == "true":
        columns["group_id"] = np.where(grouped[g.halo], np.char.add("c", g.halo.astype(str)), "")
    return Table(columns, meta={"name": "survey"})


def _doubles(galaxies, survey: Survey, rng):
    from astropy.table import Table

    again = Table(galaxies[rng.random(len(galaxies)) < survey.doubles], copy=True)
    again["id"] = np.char.add("d", np.asarray(again["id"]))
    step = 0.4 / 3600
    again["dec"] = again["dec"] + step * rng.standard_normal(len(again))
    again["ra"] = again["ra"] + step * rng.standard_normal(len(again)) / np.cos(np.radians(again["dec"]))
    return again


def _group_table(sky: Sky, survey: Survey, grouped, counts, rows, cosmos: Cosmos, rng):
    from astropy.table import Table

    index = np.flatnonzero(grouped)
    h = pick(sky.haloes, index)
    n = len(index)
    err, mass = survey.group_err, h.log_m200c
    east, north = h.east_mpc, h.north_mpc
    if survey.groups == "imperfect":
        err = survey.imperfect_err
        mass, err = _posterior_mass(h.log_m200c + err * rng.standard_normal(n), h.log_m200c)
        east, north = _wrong_centres(sky, survey, index, rows, rng)
    ra, dec = _positions(sky, h.line, east, north, h.z)
    return Table(
        {
            "id": np.char.add("c", index.astype(str)),
            "ra": ra,
            "dec": dec,
            "z": h.z_seen,
            "z_err": np.full(n, SPEC_ERR),
            "log_mass": mass,
            "log_mass_err": np.full(n, err),
            "mass_def": np.full(n, "200c"),
            "n_members": counts[index].astype(float),
        },
        meta={"name": "groups"},
    )


def _posterior_mass(measured, true) -> tuple[np.ndarray, float]:
    """Mean and spread of the true mass at a measured one: a catalogue calibrated on mocks, so masses are posteriors."""
    fit = np.polynomial.Polynomial.fit(measured, true, 3)
    mean = fit(measured)
    return mean, float(np.std(true - mean))


def _wrong_centres(sky: Sky, survey: Survey, index, rows, rng) -> tuple[np.ndarray, np.ndarray]:
    """Centres, some of them on a listed galaxy of the halo picked at random."""
    east, north = sky.haloes.east_mpc[index].copy(), sky.haloes.north_mpc[index].copy()
    order = rows[np.argsort(sky.galaxies.halo[rows], kind="stable")]
    halo = sky.galaxies.halo[order]
    first, last = np.searchsorted(halo, index), np.searchsorted(halo, index, side="right")
    chosen = order[first + (rng.random(len(index)) * (last - first)).astype(int)]
    wrong = rng.random(len(index)) < survey.off_centre
    east[wrong] = sky.galaxies.east_mpc[chosen[wrong]]
    north[wrong] = sky.galaxies.north_mpc[chosen[wrong]]
    return east, north


def _burst_table(sky: Sky):
    from astropy.table import Table

    lines = sky.lines
    n = len(lines)
    return Table(
        {
            "burst": [f"S{i:05d}" for i in range(n)],
            "ra": lines.ra_deg,
            "dec": lines.dec_deg,
            "z": lines.z_seen,
            "dm": 1000.0 * lines.z_seen + 100.0,
            "host_id": np.char.add("g", lines.host.astype(str)),
        },
        meta={"name": "bursts"},
    )


def _positions(sky: Sky, line, east_mpc, north_mpc, z) -> tuple[np.ndarray, np.ndarray]:
    """Directions [deg] of points beside their lines; offsets comoving, z the redshift of the flow."""
    from haloledger.cosmos.background import cosmology

    distance = cosmology().comoving_distance_mpc(z)
    ra0, dec0 = np.radians(sky.lines.ra_deg[line]), np.radians(sky.lines.dec_deg[line])
    x, y = east_mpc / distance, north_mpc / distance
    px = np.cos(dec0) - y * np.sin(dec0)  # along the line's meridian, in the plane of the equator
    ra = ra0 + np.arctan2(x, px)
    dec = np.arctan2(np.sin(dec0) + y * np.cos(dec0), np.hypot(px, x))
    return np.degrees(ra) % 360.0, np.degrees(dec)
