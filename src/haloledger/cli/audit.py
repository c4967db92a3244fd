"""`haloledger audit`: the main job."""

from __future__ import annotations

from time import perf_counter
from typing import Any

import click

from haloledger.cli import exit_codes
from haloledger.cli.lazy import Command, Section, option

INPUT, GAS, OUTPUT, TALK = "Input", "Gas and draws", "Output", "Talk"

NAMED = 4  # files named one by one

EXAMPLE = """
haloledger audit bursts.csv --galaxies galaxies.csv --groups mcxc:mcxc.fits \\
    --model blended --model strong-feedback --out out --figures
"""


def _held(ctx: click.Context, parameter: click.Parameter, values: tuple[str, ...]) -> dict[str, str]:
    """`--hold NUISANCE=VALUE` as a dictionary."""
    held = {}
    for text in values:
        name, equals, value = text.partition("=")
        if not (name.strip() and equals and value.strip()):
            raise click.BadParameter(f"'{text}' is not NUISANCE=VALUE. Write for example --hold zero_point=0.", ctx)
        if name.strip() in held:
            raise click.BadParameter(f"'{name.strip()}' is held twice. Give it once.", ctx)
        held[name.strip()] = value.strip()
    return held


def _more() -> dict[str, Section]:
    from haloledger.cli.words import UNITS, columns, nuisances

    return {"Columns (* required)": [*columns(), UNITS], "Nuisances for --hold": nuisances()}


@click.command(
    "audit",
    cls=Command,
    example=EXAMPLE,
    more=_more,
    statuses=exit_codes.HELP,
    context_settings={"help_option_names": ["-h", "--help"]},
)
@click.argument("bursts", metavar="BURSTS")
@option("--galaxies", group=INPUT, multiple=True, metavar="[CARD:]FILE", help="Galaxy table; may be repeated.")
@option("--groups", group=INPUT, multiple=True, metavar="[CARD:]FILE", help="Group or cluster table; may be repeated.")
@option(
    "--footprint",
    group=INPUT,
    multiple=True,
    metavar="FILE",
    help="Where the tables look: MOC FITS or polygon text.",
)
@option("--overrides", group=INPUT, metavar="FILE", help="Changes by hand, each with its reason; TOML.")
@option("--no-local", group=INPUT, is_flag=True, help="Leave the built-in nearest haloes (M31, M81, ...) away.")
@option("--model", group=GAS, multiple=True, metavar="NAME|FILE", help="Halo model; may be repeated, first in full.")
@option("--draws", group=GAS, type=click.IntRange(min=1), default=1000, show_default=True, help="Universes to draw.")
@option("--seed", group=GAS, type=click.IntRange(min=0), default=1, show_default=True, help="Seed of all draws.")
@option("--cosmology", group=GAS, default="Planck18", show_default=True, help="Cosmology, by its name in astropy.")
@option("--fixed", group=GAS, is_flag=True, help="No spread at all: what a person would compute by hand.")
@option("--hold", group=GAS, multiple=True, metavar="NUISANCE=VALUE", callback=_held, help="Fix a nuisance, see below.")
@option(
    "--disc",
    group=GAS,
    type=click.Choice(["plane", "ne2001", "ne2025"]),
    default="plane",
    show_default=True,
    help="Milky Way disc where the table has no dm_disc.",
)
@option(
    "--combine",
    group=GAS,
    type=click.Choice(["weighted", "precedence"]),
    default="weighted",
    show_default=True,
    help="Masses of one halo from several catalogues: averaged by their errors, or the leading row's.",
)
@option("--source-in-sum", group=GAS, is_flag=True, help="Haloes the burst sits in count as foreground.")
@option("--out", group=OUTPUT, metavar="DIR", help="Folder for the tables; without it, results go to the screen only.")
@option(
    "--format",
    "table_format",
    group=OUTPUT,
    type=click.Choice(["ecsv", "csv", "fits", "votable", "parquet"]),
    default="ecsv",
    show_default=True,
    help="Format of the tables.",
)
@option("--figures", group=OUTPUT, is_flag=True, help="Add a picture per sightline.")
@option("--keep-draws", group=OUTPUT, is_flag=True, help="Add the joint draws, as Parquet.")
@option("-q", "--quiet", group=TALK, is_flag=True, help="Nothing on screen but errors.")
@option("-v", "--verbose", group=TALK, count=True, help="Say what is done; -vv all notes too.")
def command(out: str | None, table_format: str, figures: bool, quiet: bool, verbose: int, **asked: Any) -> int:
    """Account for every halo in front of each burst of BURSTS.

    BURSTS is a table with the columns burst, ra, dec, dm and, where known, z (a card may be put before it: CARD:FILE).
    Tables may be ECSV, CSV, FITS, VOTable or Parquet. A card says what the columns of a public catalogue mean:
    haloledger cards. Without a card a table has the columns listed below.
    """
    _check_output(out, table_format, figures, asked["keep_draws"], quiet)
    return run(out, table_format, figures, quiet, verbose, _for_python(asked))


def _check_output(out: str | None, table_format: str, figures: bool, keep_draws: bool, quiet: bool) -> None:
    """Cheap checks before the expensive work."""
    if out is None:
        given = {"--figures": figures, "--keep-draws": keep_draws, "--quiet": quiet, "--format": table_format != "ecsv"}
        for name, there in given.items():
            if there:
                raise click.UsageError(f"{name} needs a folder for the files. Add --out DIR.")
        return
    from haloledger.report.write import earlier_files

    earlier_files(out)


def _for_python(asked: dict[str, Any]) -> dict[str, Any]:
    """Options under the names of `haloledger.audit.audit`; its default models where none is named."""
    renamed = {
        "footprints": asked.pop("footprint"),
        "models": asked.pop("model"),
        "local": not asked.pop("no_local"),
    }
    asked = renamed | asked
    if not asked["models"]:
        del asked["models"]
    return asked


def run(out: str | None, table_format: str, figures: bool, quiet: bool, verbose: int, asked: dict[str, Any]) -> int:
    """Audit, write, show; returns the exit status."""
    from haloledger.cli.talk import listen, progress_bar, say, tell_counts
    from haloledger.report.text import counted

    listen(quiet, verbose)
    start = perf_counter()
    earlier = ""
    with progress_bar(quiet, verbose) as progress:
        from haloledger.audit import audit

        ledgers = audit(**asked, progress=progress)
        if out is not None:
            earlier = _write(ledgers, out, table_format, figures, progress)
    say(earlier, quiet)
    tell_counts(ledgers)
    if not quiet:
        from haloledger.report.screen import console, show

        show(ledgers, console(), out)
    n, m = len(ledgers.bursts), len(ledgers.models)
    say(f"{counted(n, 'burst')}, {counted(m, 'model')}: {perf_counter() - start:.1f} s", quiet)
    return exit_codes.REFUSED if ledgers.refused else exit_codes.DONE


def _write(ledgers: Any, out: str, table_format: str, figures: bool, progress: Any) -> str:
    """Write the files; what became of those of an earlier run, or ""."""
    from haloledger.report.text import counted
    from haloledger.report.write import RUN_FILE, earlier_files, write

    earlier = set(earlier_files(out))
    written = {path.relative_to(out).as_posix() for path in write(ledgers, out, table_format, figures, progress)}
    if not earlier:
        return ""
    removed = sorted(earlier - written)
    replaced = len(earlier & written) + (RUN_FILE in written)
    said = f"{out} held an earlier run: {counted(replaced, 'file')} replaced"
    if not removed:
        return f"{said}."
    more = f" and {len(removed) - NAMED} more" if len(removed) > NAMED else ""
    return f"{said}, {len(removed)} removed ({', '.join(removed[:NAMED])}{more})."
