"""`haloledger demo`: the audit of the invented sightlines that come with the package."""

from __future__ import annotations

import click

from haloledger.cli import exit_codes
from haloledger.cli.lazy import Command, option

MODELS = ("blended", "textbook-modified-nfw", "strong-feedback")

EXAMPLE = """
haloledger demo
haloledger demo --out somewhere_else
"""


@click.command(
    "demo",
    cls=Command,
    example=EXAMPLE,
    statuses=exit_codes.HELP,
    context_settings={"help_option_names": ["-h", "--help"]},
)
@option("--out", group="Output", default="demo_out", show_default=True, metavar="DIR", help="Folder for the files.")
@option("-q", "--quiet", group="Talk", is_flag=True, help="Nothing on screen but errors.")
@option("-v", "--verbose", group="Talk", count=True, help="Say what is done; -vv all notes too.")
def command(out: str, quiet: bool, verbose: int) -> int:
    """Audit eight invented sightlines, write tables and pictures, and show the ledgers.

    The survey and all names in it are invented; one burst each: behind a cluster, past a galaxy's halo, clean, outside
    the survey, hanging on one photometric redshift, inside its host's group, poorly localised, and nearby.
    """
    from haloledger.cli.audit import run
    from haloledger.cli.talk import say
    from haloledger.paths import data_folder
    from haloledger.report.write import earlier_files

    earlier_files(out)
    folder = data_folder("demo_sightlines")
    asked = {
        "bursts": str(folder / "bursts.ecsv"),
        "galaxies": [str(folder / "galaxies.ecsv")],
        "groups": [str(folder / "groups.ecsv")],
        "footprints": [str(folder / "footprint.txt")],
        "models": MODELS,
    }
    status = run(out, "ecsv", True, quiet, verbose, asked)
    say(f"Tables and pictures of the demo are in {out}. Its input is in {folder}.", quiet)
    return status
