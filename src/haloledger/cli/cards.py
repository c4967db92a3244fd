"""`haloledger cards`: list the catalogue cards or explain one."""

from __future__ import annotations

import click

from haloledger.cli.lazy import Command

EXAMPLE = """
haloledger cards
haloledger cards mcxc
haloledger audit bursts.csv --groups mcxc:mcxc.fits
"""


@click.command("cards", cls=Command, example=EXAMPLE, context_settings={"help_option_names": ["-h", "--help"]})
@click.argument("card", metavar="[NAME|FILE]", required=False)
def command(card: str | None) -> None:
    """List the public catalogues that can be read as they are, or explain how one is read.

    A card is a TOML file that says what the columns of a catalogue mean: units, h, mass definition, redshift frame,
    depth, footprint, rows to leave out and why.
    """
    from haloledger.catalogs.cards import list_cards, load_card
    from haloledger.report.screen import Cells, console, grid, print_parts, sentence

    to = console()
    if card is not None:
        print_parts(to, [sentence(line) for line in load_card(card).explain().splitlines()])
        return
    every = list_cards()
    columns = [
        Cells("kind", [c.kind for c in every], words=True),
        Cells("catalogue", [c.title for c in every], spare=1, words=True),
        Cells("how sure", [c.sure for c in every], spare=2, words=True),
    ]
    hint = "Explained in full: haloledger cards NAME; used as NAME:FILE, for example --groups mcxc:mcxc.fits"
    print_parts(to, [grid("card", [c.name for c in every], columns, to.width), sentence(hint, "dim")])
