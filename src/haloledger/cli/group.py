"""The command `haloledger` itself: help, version, a short orientation."""

from __future__ import annotations

import click

from haloledger import __version__
from haloledger.cli import exit_codes
from haloledger.cli.lazy import LazyGroup

COMMANDS = {
    "audit": ("haloledger.cli.audit", "The account of every halo in front of each burst."),
    "rehearse": ("haloledger.cli.rehearse", "The audit on a simulated sky with known truth: do its intervals hold?"),
    "models": ("haloledger.cli.models", "List the halo models, explain one, or plot it."),
    "cards": ("haloledger.cli.cards", "List the catalogue cards or explain one."),
    "demo": ("haloledger.cli.demo", "Audit the invented sightlines that come with the package."),
}

ORIENTATION = f"""\
haloledger {__version__}: which haloes lie in front of a fast radio burst, how much DM each adds,
and how far to trust the sum.

  haloledger demo                 see it work on eight invented sightlines
  haloledger audit --help         the same for your bursts and catalogues
  haloledger rehearse --help      the same on a simulated sky whose truth is known
  haloledger models               what gas the haloes can be given
  haloledger cards                the public catalogues it can read as they are

All commands: haloledger --help"""


@click.group(
    cls=LazyGroup,
    lazy=COMMANDS,
    invoke_without_command=True,
    context_settings={"help_option_names": ["-h", "--help"]},
    epilog=exit_codes.HELP,
)
@click.version_option(__version__, "-V", "--version", prog_name="haloledger", message="%(prog)s %(version)s")
@click.pass_context
def cli(ctx: click.Context) -> None:
    """The account of every halo in front of a fast radio burst: its dispersion measure, its share, and how far to
    trust it.

    Results go to stdout and files, talk and progress to stderr.
    """
    if ctx.invoked_subcommand is None:
        click.echo(ORIENTATION)
