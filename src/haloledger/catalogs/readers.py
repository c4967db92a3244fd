"""The doors: read_galaxies, read_groups, read_bursts. A path, CARD:FILE or a table in memory becomes our plain arrays.

What    galaxies, groups and bursts with the columns named in `schema.FIELDS`, or any table through a catalogue card
Units   see `canonical`: degrees ICRS, log10 Msun without h, Mpc, proper kpc, pc cm-3, heliocentric redshift
Errors  a bad file raises InputError; a bad row is listed in `.refused` and left out
"""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np

from haloledger.catalogs.canonical import Bursts, Galaxies, Groups
from haloledger.catalogs.cards.card import Card
from haloledger.catalogs.cards.loader import card_names, list_cards, load_card
from haloledger.catalogs.files import open_table
from haloledger.catalogs.galaxies import galaxies_from
from haloledger.catalogs.groups import groups_from
from haloledger.catalogs.localised import bursts_from
from haloledger.catalogs.prepare import Prepared, prepare_bare, prepare_card
from haloledger.catalogs.raw import RawTable, from_astropy, from_pandas
from haloledger.catalogs.schema import FIELDS, did_you_mean
from haloledger.errors import InputError


def read_galaxies(source: Any, card: str | Path | Card | None = None) -> Galaxies:
    """Galaxies of one catalogue.

    source  'FILE', 'CARD:FILE' (a card's name or the path of a .toml), an astropy Table or a pandas DataFrame
    card    the card, where it is not named in source
    Raises InputError; refused rows are listed in `.refused`.
    """
    return galaxies_from(_prepared(source, card, "galaxies"))


def read_groups(source: Any, card: str | Path | Card | None = None) -> Groups:
    """Groups or clusters of one catalogue; arguments and errors as in read_galaxies."""
    return groups_from(_prepared(source, card, "groups"))


def read_bursts(source: Any, card: str | Path | Card | None = None) -> Bursts:
    """Bursts in the order of the table; arguments and errors as in read_galaxies.

    A public table whose columns are those of a card is read through that card without being asked, and says so.
    """
    return bursts_from(_prepared(source, card, "bursts"))


def split_source(source: str) -> tuple[str, str]:
    """'CARD:FILE' -> (card, file); a plain path has the card ''. InputError where CARD is neither card nor path."""
    if ":" not in source or Path(source).is_file():
        return "", source
    if ".toml:" in source:
        card, file = source.split(".toml:", 1)
        return card + ".toml", file
    card, file = source.split(":", 1)
    if card in card_names():
        return card, file
    if len(card) == 1 and file[:1] in ("\\", "/"):  # a drive letter
        return "", source
    raise InputError(
        f"{source}: no catalogue card '{card}'.{did_you_mean(card, card_names())} Cards: {', '.join(card_names())};"
        " or write a card of your own and give its path, MY_CARD.toml:FILE."
    )


def _prepared(source: Any, card: str | Path | Card | None, kind: str) -> Prepared:
    if isinstance(source, str | Path):
        named, file = split_source(str(source))
        chosen = _card(named or card, kind)
        raw = open_table(file, _text_columns(kind, chosen), *_options(chosen))
    else:
        chosen = _card(card, kind)
        raw = _in_memory(source, kind)
    if not raw.n:
        raise InputError(f"{raw.file}: an empty list: the table has columns but no row. Give at least one row.")
    if chosen is None:
        chosen, note = _recognised(raw, kind)
        if chosen is None:
            return _bare(raw, kind)
        out = prepare_card(raw, chosen)
        out.notes.insert(0, note)
        return out
    return prepare_card(raw, chosen)


def _card(named: str | Path | Card | None, kind: str) -> Card | None:
    if named is None or named == "":
        return None
    card = named if isinstance(named, Card) else load_card(named)
    if card.kind != kind:
        raise InputError(
            f"card '{card.name}' is for {card.kind}, not for {kind}. Give the file where {card.kind} are asked for."
        )
    return card


def _options(card: Card | None) -> tuple[str, str]:
    return (card.file.format, card.file.delimiter) if card else ("", "")


def _text_columns(kind: str, card: Card | None) -> list[str]:
    ours = [name for name, spec in FIELDS[kind].items() if spec.text]
    if card is None:
        return [*ours, "name"] if kind == "bursts" else ours
    return [n for name, native in card.columns.items() if name in ours for n in native.names]


def _in_memory(source: Any, kind: str) -> RawTable:
    if hasattr(source, "colnames"):
        return from_astropy(source, f"the {kind} table", kind)
    if hasattr(source, "iloc") and hasattr(source, "columns"):
        return from_pandas(source, f"the {kind} table", kind)
    if isinstance(source, dict):
        from astropy.table import Table

        return from_astropy(Table({k: np.asarray(v) for k, v in source.items()}), f"the {kind} table", kind)
    raise InputError(
        f"{kind}: found a {type(source).__name__}. Give a path, CARD:FILE, an astropy Table or a pandas DataFrame."
    )


def _bare(raw: RawTable, kind: str) -> Prepared:
    """A table by our own names; where that fails and a card fits its columns, the message names the card."""
    try:
        return prepare_bare(raw, kind)
    except InputError as fault:
        for card in list_cards():
            native = {name for column in card.columns.values() for name in column.names}
            if native <= set(raw.columns):
                what = "" if card.kind == kind else f" (it lists {card.kind})"
                raise InputError(
                    f"{fault} The card '{card.name}' fits these columns{what}: {card.name}:FILE."
                ) from None
        raise


def _recognised(raw: RawTable, kind: str) -> tuple[Card | None, str]:
    """The card whose `match` columns are all there, and the note that says so."""
    for card in list_cards() if kind == "bursts" else []:
        if card.kind == kind and card.match and set(card.match) <= set(raw.columns):
            return card, f"{raw.label}: read through the card '{card.name}' ({card.title}), recognised by its columns"
    return None, ""
