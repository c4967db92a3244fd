"""`haloledger rehearse`: the audit on a simulated sky with known truth."""

from __future__ import annotations

from time import perf_counter
from typing import Any

import click

from haloledger.cli import exit_codes
from haloledger.cli.audit import _held
from haloledger.cli.lazy import Command, option

SKY, SURVEY, AUDIT, OUTPUT, TALK = "True sky", "Survey", "Audit", "Output", "Talk"

EXAMPLE = """
haloledger rehearse --sightlines 500 --out rehearsal
haloledger rehearse --photoz 0.03 --outliers 0.05 --spec-share 0.5 --groups imperfect
"""


@click.command("rehearse", cls=Command, example=EXAMPLE, context_settings={"help_option_names": ["-h", "--help"]})
@option("--sightlines", group=SKY, type=click.IntRange(min=1), default=2000, show_default=True, help="How many.")
@option("--sky", group=SKY, metavar="FILE", help="A true sky of your own (FITS) instead of a simulated one.")
@option("--one-universe", group=SKY, is_flag=True, help="One relation and zero point for all sightlines.")
@option("--second-truth", group=SKY, is_flag=True, help="A sky that the audit's priors do not hold; its loss is shown.")
@option("--depth", group=SURVEY, type=float, default=9.0, show_default=True, help="log10 M* at the flux limit, z 0.1.")
@option("--photoz", group=SURVEY, type=float, default=0.0, show_default=True, help="Error over 1+z; 0 is spectra.")
@option("--outliers", group=SURVEY, type=float, default=0.05, show_default=True, help="Share of wrong photo-z.")
@option(
    "--spec-share", group=SURVEY, type=float, default=0.0, show_default=True, help="Share with spectra all the same."
)
@option(
    "--groups",
    group=SURVEY,
    type=click.Choice(["true", "imperfect", "none"]),
    default="true",
    show_default=True,
    help="Group catalogue.",
)
@option(
    "--members", group=SURVEY, type=click.IntRange(min=2), default=2, show_default=True, help="Galaxies of a group."
)
@option(
    "--doubles", group=SURVEY, type=float, default=0.0, show_default=True, help="Share listed by a second catalogue."
)
@option("--model", group=AUDIT, default="textbook-modified-nfw", show_default=True, metavar="NAME", help="Halo model.")
@option("--draws", group=AUDIT, type=click.IntRange(min=1), default=400, show_default=True, help="Universes to draw.")
@option("--seed", group=AUDIT, type=click.IntRange(min=0), default=1, show_default=True, help="Seed of sky and draws.")
@option("--hold", group=AUDIT, multiple=True, metavar="NUISANCE=VALUE", callback=_held, help="Fix one nuisance.")
@option("--ideal", group=AUDIT, is_flag=True, help="Compare with the best that could be known (spectra only).")
@option("--out", group=OUTPUT, metavar="DIR", help="Folder for calibration.ecsv, sums.ecsv, pp.png and run.toml.")
@option("-q", "--quiet", group=TALK, is_flag=True, help="Nothing on screen but errors.")
@option("-v", "--verbose", group=TALK, count=True, help="Say more; -vv says all.")
def command(out: str | None, quiet: bool, verbose: int, **asked: Any) -> int:
    """Simulate a light cone, look at it with a survey, audit it, and compare with the truth.

    Printed is how often central intervals hold the true foreground sum: for all sightlines, those probably crossed, and
    fifths by predicted sum. A departure of more than three standard errors is marked. Global nuisances of the truth are
    drawn for each sightline anew.
    """
    from haloledger.cli.talk import listen, progress_bar, say
    from haloledger.report.write import earlier_files

    if out is not None:
        earlier_files(out)
    listen(quiet, verbose)
    start = perf_counter()
    with progress_bar(quiet) as progress:
        results, ideal = _results(asked, progress)
        if out is not None:
            from haloledger.rehearse.write import write

            write(results, out)
    if not quiet:
        _show(results, ideal)
    say(f"{asked['sightlines']} sightlines: {perf_counter() - start:.0f} s", quiet)
    return exit_codes.DONE


def _results(asked: dict[str, Any], progress):
    from haloledger.rehearse.rehearsal import rehearsals

    names = ("sky", "model", "draws", "seed", "hold", "ideal", "second_truth")
    truth = {"lines": asked["sightlines"], "one_universe": asked["one_universe"]}
    survey = {k: asked[k] for k in ("depth", "photoz", "outliers", "spec_share", "groups", "members", "doubles")}
    return rehearsals(truth, survey, progress=progress, **{k: asked[k] for k in names})


def _show(results, ideal) -> None:
    from haloledger.rehearse.show import show
    from haloledger.report.screen import console

    for name, result in results.items():
        show(result, console(), f"{name}: share of true sums inside central intervals, %", ideal.get(name))
