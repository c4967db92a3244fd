"""The rehearsal, reading as a table of contents: a true sky, a survey of it, the audit, the comparison."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import asdict, dataclass, replace
from typing import Any

import numpy as np

from haloledger.cosmos.background import cosmology as named_cosmology
from haloledger.errors import InputError
from haloledger.rehearse.audited import Audited, run_audit
from haloledger.rehearse.score import Calibration, crps, median_width, ranks, tables
from haloledger.rehearse.sky.columns import known_model
from haloledger.rehearse.sky.files import read_sky
from haloledger.rehearse.sky.relations import ALL
from haloledger.rehearse.sky.simulate import Truth, simulate
from haloledger.rehearse.sky.truth import Sky
from haloledger.rehearse.survey import GROUPS, Seen, Survey, look

Progress = Callable[[int, int, str], None]
DEFAULT_MODEL = "textbook-modified-nfw"
SECOND_TRUTH: dict[str, Any] = {
    "relation": "kravtsov2018_no_scatter",
    "scatter_factor": 1.5,
    "satellites": "subhaloes",
    "satellite_share": 0.35,
    "triaxial": 0.25,
    "same_counts": False,
}
"""A sky that the audit's priors do not hold: another relation, scatter, satellites, and haloes that are not round."""
FEW_LINES = 300
BEHIND = 0.25  # how far behind the bursts galaxies are simulated where redshifts are photometric


@dataclass(frozen=True)
class Rehearsal:
    """Result: true and predicted foreground sums [pc cm-3] of each line, and how they compare."""

    truth: np.ndarray  # (n,)
    sums: np.ndarray  # (n, n_draws)
    rank: np.ndarray  # (n,)
    unlisted: np.ndarray  # true DM of haloes that the survey does not show (n,)
    rows: list[Calibration]
    crps: float
    width: float
    entry_bias: dict[str, tuple[int, float, float]]  # kind of halo -> number, true, predicted mean per line
    sky: Sky
    seen: Seen
    audited: Audited
    run: dict[str, Any]


def rehearse(
    truth: Truth | None = None,
    survey: Survey | None = None,
    model: str = DEFAULT_MODEL,
    draws: int = 400,
    seed: int = 1,
    cosmology: str = "Planck18",
    sky: str | None = None,
    hold: Mapping[str, str] | None = None,
    progress: Progress | None = None,
) -> Rehearsal:
    """Simulate, look, audit, compare.

    truth, survey  what the sky is made of and how it is seen
    sky            FITS file with a true sky, used instead of a simulated one
    Raises InputError before any work where the input cannot be used.
    """
    truth, survey = truth or Truth(), survey or Survey()
    check(truth, survey, model, draws)
    tell = progress or (lambda done, total, what: None)
    cosmos = named_cosmology(cosmology)
    if survey.photoz:
        truth = replace(truth, behind=max(truth.behind, BEHIND))
    tell(0, 1, "the true sky")
    true_sky = read_sky(sky) if sky else simulate(truth, seed, cosmos)
    tell(0, 1, "the survey")
    rng = np.random.default_rng([seed, 7])
    seen = look(true_sky, survey, cosmos, rng)
    audited = run_audit(seen, model, draws, seed, cosmos, dict(hold or {}), tell)
    listed, unlisted = true_sums(true_sky, seen)
    rank = ranks(audited.sums, listed, rng)
    run = {"model": model, "draws": draws, "seed": seed, "cosmology": cosmology, "sky": sky or "simulated"}
    run |= {"hold": dict(hold or {}), "survey": asdict(survey), "truth": {} if sky else asdict(truth)}
    return Rehearsal(
        truth=listed,
        sums=audited.sums,
        rank=rank,
        unlisted=unlisted,
        rows=tables(rank, audited.sums, listed),
        crps=float(crps(audited.sums, listed).mean()),
        width=median_width(audited.sums),
        entry_bias=entry_bias(true_sky, seen, audited),
        sky=true_sky,
        seen=seen,
        audited=audited,
        run=run,
    )


def _box(lines: int) -> dict[str, int]:
    """A smaller box for few lines: the box takes longer than they do."""
    return {"cells": 128} if lines < FEW_LINES else {}


def rehearsals(
    truth: Mapping[str, Any],
    survey: Mapping[str, Any],
    ideal: bool = False,
    second_truth: bool = False,
    **options: Any,
) -> tuple[dict[str, Rehearsal], dict[str, Any]]:
    """The rehearsal asked for and, if wished, that of the second truth, and ideal posteriors; by name."""
    first, look_ = Truth(**{**_box(truth.get("lines", Truth.lines)), **truth}), Survey(**survey)
    if ideal and (look_.photoz or options.get("sky")):
        raise InputError("--ideal: it is worked out for simulated skies with spectra. Leave --photoz and --sky away.")
    name = "one universe" if first.one_universe else "truth of the priors"
    results = {name: rehearse(first, look_, **options)}
    best: dict[str, Any] = {}
    if ideal:
        from haloledger.rehearse.ideal import ideal_posterior

        r, cosmos = results[name], named_cosmology(options.get("cosmology", "Planck18"))
        draws, seed = options.get("draws", 400), options.get("seed", 1)
        best[name] = ideal_posterior(r.sky, r.seen, look_, first, r.truth, draws, cosmos, seed)
    if second_truth:
        results["second truth"] = rehearse(replace(first, **SECOND_TRUTH), look_, **options)
    return results, best


def check(truth: Truth, survey: Survey, model: str, draws: int) -> None:
    """InputError where a number or a name cannot be used."""
    if truth.lines < 20:
        raise InputError(f"--sightlines {truth.lines}: too few to calibrate anything. Write 300 or more.")
    if draws < 50:
        raise InputError(f"--draws {draws}: too few to rank a truth among. Write 200 or more.")
    if survey.groups not in GROUPS:
        raise InputError(f"--groups {survey.groups}: not known. Write one of {', '.join(GROUPS)}.")
    for name, value in (("--outliers", survey.outliers), ("--spec-share", survey.spec_share)):
        if not 0 <= value <= 1:
            raise InputError(f"{name} {value}: a share lies between 0 and 1.")
    if not 0 <= survey.photoz < 0.2:
        raise InputError(f"--photoz {survey.photoz}: the error over 1 + z. Write 0 (spectra) to 0.1.")
    if truth.relation and truth.relation not in ALL:
        raise InputError(f"relation '{truth.relation}' is not known. Write one of {', '.join(ALL)}.")
    known_model(model)


def true_sums(sky: Sky, seen: Seen) -> tuple[np.ndarray, np.ndarray]:
    """True DM of each line [pc cm-3] in haloes that are listed, and in those that are not; the burst's own apart."""
    front = ~sky.haloes.holds_burst
    n = len(sky.lines)

    def total(which: np.ndarray) -> np.ndarray:
        rows = np.flatnonzero(front & which)
        return np.bincount(sky.haloes.line[rows], sky.dm[rows], n)

    return total(seen.listed), total(~seen.listed)


def entry_bias(sky: Sky, seen: Seen, audited: Audited) -> dict[str, tuple[int, float, float]]:
    """True and predicted mean DM per line, by what is listed of a halo: its group, its central, satellites only.

    What a draw puts at the source is in the prediction too: the last kind is all of it where no other halo is taken so.
    """
    halo = seen.halo_of(audited.entry_row, sky)
    n = len(sky.lines)
    central = np.zeros(len(sky.haloes), dtype=bool)
    rows = seen.rows[sky.galaxies.central[seen.rows]]
    central[sky.galaxies.halo[rows]] = True
    front = ~sky.haloes.holds_burst
    kinds = {
        "group listed": seen.grouped & front,
        "central listed, no group": seen.listed & ~seen.grouped & central & front,
        "satellites listed only": seen.listed & ~seen.grouped & ~central & front,
        "holds the burst": ~front,
    }
    return {
        name: (
            int(np.sum(which & seen.listed)),
            float(sky.dm[which].sum() / n),
            float(audited.entry_mean[which[halo]].sum() / n),
        )
        for name, which in kinds.items()
    }
