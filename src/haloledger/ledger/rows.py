"""From draws to the rows of the two tables."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from haloledger.gas.models import Model
from haloledger.haloes.build import Haloes
from haloledger.haloes.distances import NEARBY_MPC
from haloledger.ledger.budget import CIRCULAR, EXTRA_TERMS, TERMS
from haloledger.ledger.columns import STATISTICS
from haloledger.ledger.crossing import Crossing
from haloledger.ledger.shares import mean_shares, variance_shares
from haloledger.reach.census import LOG_M_LEAST
from haloledger.sightlines.draws import Sightline
from haloledger.sightlines.geometry import separation_deg

QUANTILES = (0.16, 0.5, 0.84)


def statistics(draws: np.ndarray) -> dict[str, np.ndarray]:
    """Mean and 16, 50, 84% points over the last axis, by the names of STATISTICS."""
    low, middle, high = np.quantile(draws, QUANTILES, axis=-1)
    return dict(zip(STATISTICS, (draws.mean(axis=-1), low, middle, high), strict=True))


def sightline_row(
    sightline: Sightline, model: Model, terms: dict[str, np.ndarray], n_haloes: int, crossed: float, reach: float, note
) -> dict:
    """One row of the sightlines table; None is masked."""
    row: dict = {
        "burst": sightline.burst,
        "model": model.name,
        "ra": sightline.ra_deg,
        "dec": sightline.dec_deg,
        "z": _or_none(sightline.z_given),
        "dm": sightline.dm_given,
    }
    for term in TERMS + EXTRA_TERMS:
        circular = np.isnan(sightline.z_given) and term in CIRCULAR
        for name, value in statistics(terms[term]).items():
            row[f"{term}_{name}"] = None if circular else float(value)
    return row | {
        "n_haloes": n_haloes,
        "n_crossed_mean": crossed,
        "reach": _or_none(reach),
        "control_p": None,
        "verdict": None,
        "reasons": None,
        "note": "; ".join(note),
    }


@dataclass(frozen=True)
class Gas:
    """What the entries of one ledger hold: draws (n_haloes, n_draws) [pc cm-3], and the model behind each row.

    foreground  halo gas that counts in the foreground sum
    at_source   halo gas in front of the burst in a halo it sits in
    disc        interstellar medium of the galaxy
    """

    foreground: np.ndarray
    at_source: np.ndarray
    disc: np.ndarray
    models: list[Model]

    @property
    def dm(self) -> np.ndarray:
        """All halo gas."""
        return self.foreground + self.at_source


def entry_rows(
    sightline: Sightline, model: Model, haloes: Haloes, crossing: Crossing, gas: Gas, shared: list[np.ndarray]
) -> list[dict]:
    """Rows of the entries table for one sightline and model: crossed haloes by falling mean DM, then `shared`.

    Haloes that no draw crosses, gas or disc, are left out.
    """
    dm = gas.dm
    share = mean_shares(gas.foreground)
    own, rest = variance_shares(gas.foreground, shared)
    aside = (dm > 0).any(axis=1) & ~(gas.foreground > 0).any(axis=1)
    share[aside], own[aside] = np.ma.masked, np.nan
    crossed = np.flatnonzero(((dm > 0) | (gas.disc > 0)).any(axis=1))
    order = crossed[np.lexsort((haloes.id[crossing.index[crossed]], -dm[crossed].mean(axis=1)))]
    rows = [_entry_row(i, sightline, model, haloes, crossing, gas, share[i], own[i]) for i in order]
    if (gas.foreground > 0).any():
        rows.append({"burst": sightline.burst, "model": model.name, "halo": "shared", "variance_share": rest})
    return rows


def _entry_row(i, sightline, model, haloes, crossing: Crossing, gas: Gas, share, own) -> dict:
    h, dm = crossing.index[i], gas.dm[i]
    mass, impact, spread = (statistics(a) for a in (crossing.log_m200c[i], crossing.impact_kpc[i], dm))
    separation = separation_deg(haloes.ra_deg[h], haloes.dec_deg[h], sightline.ra_deg, sightline.dec_deg)
    boundary = np.median(
        np.arcsin(np.minimum(gas.models[i].boundary_r200c * crossing.r200c_kpc[i] / crossing.distance_kpc[i], 1))
    )
    return {
        "burst": sightline.burst,
        "model": model.name,
        "halo": str(haloes.id[h]),
        "kind": str(haloes.kind[h]),
        "source_rows": str(haloes.source_rows[h]),
        "ra": float(haloes.ra_deg[h]),
        "dec": float(haloes.dec_deg[h]),
        "z": _or_none(haloes.z[h]),
        "z_kind": _z_kind(haloes, h),
        "log_mstar": _or_none(haloes.log_mstar[h]),
        "log_m200c_p16": float(mass["p16"]),
        "log_m200c_p50": float(mass["p50"]),
        "log_m200c_p84": float(mass["p84"]),
        "r200c_kpc": float(np.median(crossing.r200c_kpc[i])),
        "sep_arcmin": float(separation * 60),
        "impact_kpc_p16": float(impact["p16"]),
        "impact_kpc_p50": float(impact["p50"]),
        "impact_kpc_p84": float(impact["p84"]),
        "impact_r200c": float(np.median(crossing.impact_r200c[i])),
        "p_front": float((crossing.behind_kpc[i] > 0).mean()),
        "p_member": float(haloes.p_member[h]),
        "p_crossed": float((dm > 0).mean()),
        "dm_mean": float(spread["mean"]),
        "dm_p16": float(spread["p16"]),
        "dm_p50": float(spread["p50"]),
        "dm_p84": float(spread["p84"]),
        "dm_crossed_p50": float(np.median(dm[dm > 0])) if (dm > 0).any() else None,
        "share": None if np.ma.is_masked(share) else float(share),
        "variance_share": _or_none(own),
        "boundary_arcmin": float(np.degrees(boundary) * 60),
        "note": "; ".join(_entry_notes(i, h, haloes, crossing, gas)),
        **_disc_cells(gas.disc[i]),
    }


def _disc_cells(disc: np.ndarray) -> dict[str, float]:
    if not (disc > 0).any():
        return {}
    return {f"dm_disc_crossing_{name}": float(value) for name, value in statistics(disc).items()}


def _entry_notes(i, h, haloes: Haloes, crossing: Crossing, gas: Gas) -> list[str]:
    notes = [str(haloes.note[h])] if haloes.note[h] else []
    model = gas.models[i]
    if (gas.disc[i] > 0).any():
        notes.append(f"disc crossing in {(gas.disc[i] > 0).mean():.0%} of draws")
    low, high = model.log_mass_range
    outside = float(((crossing.log_m200c[i] < low) | (crossing.log_m200c[i] > high)).mean())
    if outside > 0.16:
        notes.append(f"{outside:.0%} of draws outside the model's mass range 1e{low:g}-1e{high:g} Msun")
    z_low, z_high = model.z_range
    z_outside = float(((crossing.z[i] < z_low) | (crossing.z[i] > z_high)).mean())
    if z_outside > 0.16:
        notes.append(f"outside the model's redshift range {z_low:g}-{z_high:g}")
    if np.median(crossing.log_m200c[i]) < LOG_M_LEAST:
        notes.append(f"lighter than 1e{LOG_M_LEAST:g} Msun: the diffuse term counts the gas of such haloes too")
    inside = float(crossing.at_source[i].mean())
    if inside > 0:
        place = "outside the foreground sum" if (gas.at_source[i] > 0).any() else "in the foreground sum, as asked"
        how_often = "" if inside == 1 else f" in {inside:.0%} of draws"
        notes.append(f"the burst sits in this halo{how_often}: {place}, depth drawn")
    return notes


def _z_kind(haloes: Haloes, h: int) -> str:
    near = np.isfinite(haloes.distance_mpc[h]) and haloes.distance_mpc[h] <= NEARBY_MPC
    if near or not np.isfinite(haloes.z[h]):
        return "distance"
    return "phot" if haloes.photometric[h] else "spec"


def _or_none(value) -> float | None:
    return float(value) if np.isfinite(value) else None
