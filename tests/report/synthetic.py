"""An invented set of ledgers with every kind of row the reports have to show."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from astropy.table import QTable

from haloledger.catalogs.canonical import Bursts, Refusal
from haloledger.ledger.ledgers import entries_table, sightlines_table

MODELS = ("blended", "strong-feedback")


@dataclass
class Model:
    name: str
    status: str = "scenario"
    summary: str = "an invented model"


@dataclass
class FakeLedgers:
    sightlines: QTable
    entries: QTable
    bursts: Bursts
    refused: list = field(default_factory=list)
    run: dict = field(default_factory=dict)
    models: list = field(default_factory=list)
    notes: list = field(default_factory=list)
    draws: object = None
    entry_draws: object = None


def spread(name: str, mean: float, low: float, high: float) -> dict:
    return {f"{name}_mean": mean, f"{name}_p16": low, f"{name}_p50": (low + high) / 2, f"{name}_p84": high}


def entry(burst, model, halo, kind, z, log_m, b_kpc, r200c, sep, boundary, dm, share, **more) -> dict:
    angle = more.pop("angle", 40.0)
    ra0, dec0 = more.pop("centre")
    ra = ra0 + sep / 60 * np.sin(np.radians(angle)) / np.cos(np.radians(dec0))
    mean, low, high = dm
    return {
        "burst": burst, "model": model, "halo": halo, "kind": kind, "source_rows": halo, "ra": ra,
        "dec": dec0 + sep / 60 * np.cos(np.radians(angle)), "z": z, "z_kind": "spec", "log_m200c_p16": log_m - 0.15,
        "log_m200c_p50": log_m, "log_m200c_p84": log_m + 0.15, "r200c_kpc": r200c, "sep_arcmin": sep,
        "impact_kpc_p16": b_kpc * 0.98, "impact_kpc_p50": b_kpc, "impact_kpc_p84": b_kpc * 1.02,
        "impact_r200c": b_kpc / r200c, "p_front": 1.0, "p_member": 0.0, "p_crossed": 1.0 if mean else 0.0,
        "dm_mean": mean, "dm_p16": low, "dm_p50": (low + high) / 2, "dm_p84": high, "share": share,
        "variance_share": share, "boundary_arcmin": boundary, **more,
    }  # fmt: skip


def sightline(burst, model, ra, dec, z, dm, foreground, n_haloes, **more) -> dict:
    row = {"burst": burst, "model": model, "ra": ra, "dec": dec, "dm": dm, "n_haloes": n_haloes, "n_crossed_mean": 2.4}
    terms = {
        "dm_mw_disc": (42.0, 34.0, 50.0), "dm_mw_halo": (31.0, 18.0, 44.0), "dm_foreground": foreground,
        "dm_unlisted": (18.0, 9.0, 25.0), "dm_diffuse": (160.0, 118.0, 190.0), "dm_at_source": (0.0, 0.0, 0.0),
        "dm_cosmic_mean_z": (210.0, 160.0, 250.0), "dm_cosmic_with_foreground": (330.0, 260.0, 390.0),
        "dm_host_obs": (62.0, 24.0, 97.0), "dm_disc_crossing": (0.0, 0.0, 0.0),
    }  # fmt: skip
    terms |= more.pop("terms", {})
    if np.isfinite(z):
        row["z"] = z
        left = dm - sum(terms[t][0] for t in terms if "cosmic" not in t)
        terms["dm_after_all"] = (left, left - 70, left + 60)
        terms["dm_after_mw_foreground"] = (left + 240, left + 190, left + 300)
    for term, (mean, low, high) in terms.items():
        row |= spread(term, mean, low, high)
    return row | more


def one_burst(burst: str, ra: float, dec: float, z: float, observed: float, models=MODELS, halo="survey:") -> tuple:
    """Sightline rows and entry rows of a burst behind a cluster, two galaxies and one halo that is only near."""
    sightlines, entries = [], []
    for i, model in enumerate(models):
        f = 1.0 - 0.35 * i
        sum_dm = (f * 160, f * 120, f * 200)
        more = {"note": "outside the footprint of the survey"} if i == 0 else {}
        sightlines.append(sightline(burst, model, ra, dec, z, observed, sum_dm, 4, **more))
        at = {"centre": (ra, dec)}
        dm = {"cluster 7": (f * 130, f * 98, f * 165), "1183": (f * 24, f * 15, f * 34), "1207": (f * 6, 0.0, f * 9)}
        phot = {"z_kind": "phot", "p_front": 0.64, "angle": 140.0}
        haloes = [
            ("cluster 7", "group", 0.09, 14.3, 610, 1250, 6.2, 12.6, 0.81, {}),
            ("1183", "galaxy", 0.18, 12.1, 78, 210, 0.44, 1.2, 0.15, {"angle": 250.0}),
            ("1207", "galaxy", 0.31, 11.6, 101, 150, 0.38, 0.56, 0.04, phot),
            ("1550", "galaxy", 0.05, 11.2, 420, 120, 7.2, 2.1, 0.0, {"angle": 310.0}),
        ]
        for name, *numbers, share, extra in haloes:
            values = (dm.get(name, (0.0, 0.0, 0.0)), share)
            entries.append(entry(burst, model, f"{halo}{name}", *numbers, *values, **at, **extra))
        entries.append({"burst": burst, "model": model, "halo": "shared", "variance_share": 0.0})
    return sightlines, entries


def bursts(names, ra, dec, z, dm, major=0.3, minor=0.2) -> Bursts:
    n = len(names)
    nan, zero = np.full(n, np.nan), np.zeros(n)
    text = np.array([""] * n)
    return Bursts(
        np.array(names), np.array(ra), np.array(dec), np.array(z), zero, np.array(dm), zero,
        np.full(n, major), np.full(n, minor), np.full(n, 30.0), nan, nan, nan, nan, text, nan, nan, nan, text,
    )  # fmt: skip


def ledgers(names=("FRB20990101A", "FRB20990202B"), models=MODELS, major=0.3, minor=0.2, halo="survey:") -> FakeLedgers:
    """Ledgers of invented bursts; the second has no redshift, so it has no residual."""
    ra = [150.0 + i for i in range(len(names))]
    dec = [20.0 + i for i in range(len(names))]
    z = [np.nan if i == 1 else 0.42 for i in range(len(names))]
    dm = [612.0 + i for i in range(len(names))]
    rows, lines = [], []
    for each in zip(names, ra, dec, z, dm, strict=True):
        sightlines, entries = one_burst(*each, models=models, halo=halo)
        rows += sightlines
        lines += entries
    return FakeLedgers(
        sightlines=sightlines_table(rows),
        entries=entries_table(lines),
        bursts=bursts(names, ra, dec, z, dm, major, minor),
        refused=[Refusal("galaxies.csv", 17, "g17", "dec", "97.2", "Dec in degrees between -90 and 90")],
        run={
            "seed": 1,
            "draws": 1000,
            "inputs": [{"file": "bursts.csv", "sha256": "0" * 64}],
            "models": dict.fromkeys(models, "name = 'x'\n"),
        },
        models=[Model(m) for m in models],
        notes=["dm_host_obs: default of 0.3 dex used for 2 bursts"],
    )
