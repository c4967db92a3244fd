"""Names are data: what a burst or a halo is called must not break a screen or leave a folder."""

from __future__ import annotations

import re
import unicodedata

_LONGEST = 80
_LINES = 3  # a name takes at most so many lines of a table
_ID_LEAST = 7  # an id is cut to no less than this while its catalogue's label stays whole


def file_name(text: str) -> str:
    """`text` as one harmless part of a file name: letters, digits, `.`, `_`, `+`, `-`; never empty, never hidden."""
    ascii_text = unicodedata.normalize("NFKD", text).encode("ascii", "ignore").decode()
    cleaned = re.sub(r"[^A-Za-z0-9._+-]+", "_", ascii_text).strip("._-")
    return cleaned[:_LONGEST] or "unnamed"


def file_names(texts: list[str]) -> dict[str, str]:
    """A file name for each text, different for different texts also where a file system ignores case."""
    used: set[str] = set()
    names: dict[str, str] = {}
    for text in dict.fromkeys(texts):
        stem = candidate = file_name(text)
        number = 1
        while candidate.casefold() in used:
            number += 1
            candidate = f"{stem}-{number}"
        used.add(candidate.casefold())
        names[text] = candidate
    return names


def shorten(text: object, longest: int) -> str:
    """`text` without control characters, cut in the middle; of CATALOGUE:ID the id is cut and the catalogue stays."""
    clean = plain(text)
    if len(clean) <= longest:
        return clean
    label, colon, identifier = clean.partition(":")
    if colon and longest - len(label) - 1 >= _ID_LEAST:
        return label + colon + _middle(identifier, longest - len(label) - 1)
    return _middle(clean, longest)


def _middle(text: str, longest: int) -> str:
    head = (longest - 1) // 2
    return f"{text[:head]}…{text[len(text) - (longest - 1 - head) :]}"


def wrapped(text: object, room: int, lines: int = _LINES) -> list[str]:
    """`text` on up to `lines` lines of `room` characters, broken behind `:`, `-`, `_`, blank; what is longer is cut."""
    made = _broken(plain(text), room)
    if len(made) > lines:
        made = _broken(shorten(text, room * lines), room)
    # a name without a good place to break can still need a line more
    return made if len(made) <= lines else [*made[: lines - 1], shorten("".join(made[lines - 1 :]), room)]


def _broken(text: str, room: int) -> list[str]:
    made = [""]
    for piece in re.findall(r"[^-:_ ]*[-:_ ]|[^-:_ ]+", text):
        if made[-1] and len(made[-1]) + len(piece.rstrip()) > room:
            made.append("")
        made[-1] += piece
        while len(made[-1].rstrip()) > room:
            made[-1:] = [made[-1][:room], made[-1][room:]]
    return [line.rstrip() for line in made]


def plain(text: object) -> str:
    """`text` on one line without control characters, so that a name cannot steer a terminal."""
    return "".join(c if c.isprintable() else "?" for c in str(text))
