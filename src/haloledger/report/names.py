"""Names are data: what a burst or a halo is called must not break a screen or leave a folder."""

from __future__ import annotations

import re
import unicodedata

_LONGEST = 80


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
    """`text` without control characters, cut in the middle: a catalogue's name and the end of an id both tell."""
    clean = plain(text)
    if len(clean) <= longest:
        return clean
    head = (longest - 1) // 2
    return f"{clean[:head]}…{clean[len(clean) - (longest - 1 - head) :]}"


def plain(text: object) -> str:
    """`text` on one line without control characters, so that a name cannot steer a terminal."""
    return "".join(c if c.isprintable() else "?" for c in str(text))
