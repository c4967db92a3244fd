"""Milky Way and host terms of a sightline: from the table where it gives them, else the stated defaults."""

from __future__ import annotations

import tomllib
from collections.abc import Callable
from functools import lru_cache
from pathlib import Path

import numpy as np

from haloledger.catalogs.canonical import Bursts
from haloledger.engine.universe import Universe
from haloledger.sightlines.milky_way import halo_column

LN10 = np.log(10.0)


@lru_cache(maxsize=1)
def defaults() -> dict:
    """The stated defaults with their sources, as read from terms.toml."""
    return tomllib.loads((Path(__file__).parent / "terms.toml").read_text(encoding="utf-8"))


def mw_disc(
    bursts: Bursts, i: int, universe: Universe, electron_model: Callable[[float, float], float] | None = None
) -> tuple[np.ndarray, str]:
    """Milky Way disc DM draws [pc cm-3] (n_draws,), and how they came about.

    One global nuisance scales the disc in every direction. `electron_model(l_deg, b_deg)` gives a published value.
    """
    given, error = bursts.dm_disc[i], bursts.dm_disc_err[i]
    if np.isfinite(given):
        law = defaults()["mw_disc_given"]
        width = error if np.isfinite(error) else max(law["scatter"] * given, min(law["least"], given))
        return _log_normal(
            given, _dex(width / max(given, 1e-9)), "mw_disc", universe
        ), "Milky Way disc from the table of bursts"
    l_deg, b_deg = galactic(bursts.ra_deg[i], bursts.dec_deg[i])
    if electron_model is not None:
        law = defaults()["mw_disc_given"]
        value = electron_model(l_deg, b_deg)
        width = max(law["scatter"] * value, min(law["least"], value))
        return _log_normal(
            value, _dex(width / value), "mw_disc", universe
        ), "Milky Way disc from a published electron model"
    law = defaults()["mw_disc_plane"]
    sine = np.sin(np.radians(max(abs(b_deg), law["floor_latitude_deg"])))
    low = abs(b_deg) < law["least_latitude_deg"]
    dex = law["scatter_dex_low"] if low else law["scatter_dex"]
    said = "Milky Way disc from the plane-parallel fallback"
    if low:
        said += f", which can be off by a factor two at latitude {b_deg:.1f} deg: give dm_disc"
    return _log_normal(law["pole"] / sine, dex, "mw_disc", universe), said


def mw_halo(bursts: Bursts, i: int, universe: Universe) -> tuple[np.ndarray, str]:
    """Milky Way halo DM draws [pc cm-3] (n_draws,), log-normal, one value for the whole sky in each universe."""
    given, error = bursts.dm_mw_halo[i], bursts.dm_mw_halo_err[i]
    law = defaults()["mw_halo"]
    if np.isfinite(given):
        dex = _dex(error / given) if np.isfinite(error) and given > 0 else law["scatter_dex"]
        return _log_normal(given, dex, "mw_halo", universe), "Milky Way halo from the table"
    held = universe.held.get("mw_halo")
    if held in mw_halo_laws():
        return _by_law(held, bursts, i, universe), f"Milky Way halo by {held}"
    if held is not None:
        return np.full(universe.n_draws, float(held)), "Milky Way halo held"
    return _log_normal(law["median"], law["scatter_dex"], "mw_halo", universe), "Milky Way halo by default"


def mw_halo_laws() -> tuple[str, ...]:
    """Names of the Milky Way halo laws that `--hold mw_halo=NAME` chooses from."""
    return tuple(defaults()["mw_halo_laws"])


def _by_law(name: str, bursts: Bursts, i: int, universe: Universe) -> np.ndarray:
    law = defaults()["mw_halo_laws"][name]
    median = law.get("median")
    if median is None:
        median = halo_column(law, *galactic(bursts.ra_deg[i], bursts.dec_deg[i]))
    return _log_normal(median, law["scatter_dex"], "mw_halo", universe)


def host_rest(
    bursts: Bursts, i: int, universe: Universe, halo_modelled: np.ndarray | None = None
) -> tuple[np.ndarray, str]:
    """Host DM draws in the host's rest frame [pc cm-3] (n_draws,); NaN where the table gives it in ours.

    halo_modelled  draws (n_draws,) in which a listed halo holds the burst: there the default law is one without the
                   host's own halo, so that its gas is not counted twice
    """
    score = universe.normals("host", [bursts.burst[i]])[0]
    given, error = bursts.dm_host_rest[i], bursts.dm_host_err[i]
    if np.isfinite(given):
        return _given_host(given, error, score), "host from the table"
    if np.isfinite(bursts.dm_host_obs[i]):
        return np.full(universe.n_draws, np.nan), "host from the table, observer frame"
    held = universe.held.get("host_rest")
    if held is not None:
        return np.full(universe.n_draws, float(held)), "host held"
    whole = defaults()["host"]
    dm = _host_law(whole, score)
    if halo_modelled is None or not halo_modelled.any():
        return dm, f"host by default ({whole['name']})"
    inner = defaults()["host_without_halo"]
    return np.where(halo_modelled, _host_law(inner, score), dm), (
        f"host without its own halo ({inner['name']}) in {halo_modelled.mean():.0%} of draws,"
        " since a listed halo holds the burst and is counted beside it"
    )


def _host_law(law: dict, score: np.ndarray) -> np.ndarray:
    return law["median_rest"] * np.exp(law["scatter_ln"] * score)


def host_obs(
    bursts: Bursts, i: int, z: np.ndarray, universe: Universe, halo_modelled: np.ndarray | None = None
) -> tuple[np.ndarray, str]:
    """Host DM draws in the observer's frame [pc cm-3]: rest / (1 + z_burst), or as the table gives it."""
    rest, said = host_rest(bursts, i, universe, halo_modelled)
    if np.isfinite(bursts.dm_host_obs[i]) and not np.isfinite(bursts.dm_host_rest[i]):
        score = universe.normals("host", [bursts.burst[i]])[0]
        return _given_host(bursts.dm_host_obs[i], bursts.dm_host_err[i], score), said
    return rest / (1 + z), said


def galactic(ra_deg: float, dec_deg: float) -> tuple[float, float]:
    """Galactic longitude and latitude [deg]."""
    from astropy.coordinates import SkyCoord

    place = SkyCoord(ra_deg, dec_deg, unit="deg").galactic
    return float(place.l.deg), float(place.b.deg)


def _given_host(value: float, error: float, score: np.ndarray) -> np.ndarray:
    dex = _dex(error / value) if np.isfinite(error) and value > 0 else 0.0
    return value * 10 ** (dex * score)


def _log_normal(median: float, dex: float, nuisance: str, universe: Universe) -> np.ndarray:
    held = universe.held.get(nuisance) if nuisance == "mw_disc" else None
    if held is not None:  # the disc is held as a scale on whatever value the direction has
        return np.full(universe.n_draws, median * float(held))
    return median * 10 ** (dex * universe.shared_normal(nuisance))


def _dex(relative_error: float) -> float:
    return float(np.log1p(relative_error) / LN10)
