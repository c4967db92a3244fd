"""Catalogue cards: TOML files that say what the columns of one public catalogue mean, how deep it goes and where."""

from haloledger.catalogs.cards.card import Card, Drop, NativeColumn
from haloledger.catalogs.cards.loader import card_names, list_cards, load_card

__all__ = ["Card", "Drop", "NativeColumn", "card_names", "list_cards", "load_card"]
