"""Notes of the rows, each said once: what holds for most bursts together, the rest beside its burst."""

from __future__ import annotations

import re
from collections.abc import Iterable

from haloledger.report.views import SightlineView

LEAST = 3  # bursts that share a note before it is said for them together
NAMED = 6  # bursts that are named one by one
_COUNT = re.compile(r"\b\d+(?= haloes\b)")  # a number that differs from burst to burst in one and the same note

Shared = set[tuple[str, str]]  # (note, model)


def burst_notes(models: list[SightlineView], shared: Shared | None = None) -> list[str]:
    """Notes of one burst that are not said for all together; with the model's name where not true of all models."""
    said: dict[str, list[str]] = {}
    for each in models:
        for part in _parts(each.note):
            if (_key(part), each.model) not in (shared or ()):
                said.setdefault(part, []).append(each.model)
    everywhere = [part for part, names in said.items() if len(names) == len(models)]
    some = [f"{', '.join(names)}: {part}" for part, names in said.items() if len(names) < len(models)]
    return (["; ".join(everywhere)] if everywhere else []) + some


def shared_notes(bursts: dict[str, list[SightlineView]]) -> tuple[list[str], Shared]:
    """Notes that at least half of the bursts share, as sentences, and what is thereby said."""
    every = [view for models in bursts.values() for view in models]
    n_models = len({view.model for view in every})
    found: dict[str, dict[str, dict[str, str]]] = {}  # note -> model -> burst -> as it was put
    for view in every:
        for part in _parts(view.note):
            found.setdefault(_key(part), {}).setdefault(view.model, {})[view.burst] = part
    sentences, shared = [], set()
    for key, by_model in found.items():
        for who, models in _by_bursts(by_model).items():
            if len(who) < LEAST or 2 * len(who) < len(bursts):
                continue
            put = [part for model in models for part in by_model[model].values()]
            prefix = "" if len(models) == n_models else f"{', '.join(models)}: "
            sentences.append(f"{prefix}{_range(key, put)}{_of(who, list(bursts))}")
            shared |= {(key, model) for model in models}
    return sentences, shared


def _parts(note: str) -> Iterable[str]:
    parts = (part.strip().rstrip(".") for part in note.split(";"))
    return dict.fromkeys(part for part in parts if part)


def _key(part: str) -> str:
    return _COUNT.sub("#", part)


def _by_bursts(by_model: dict[str, dict[str, str]]) -> dict[tuple[str, ...], list[str]]:
    """Models of which a note is true for the same bursts."""
    groups: dict[tuple[str, ...], list[str]] = {}
    for model, bursts in by_model.items():
        groups.setdefault(tuple(bursts), []).append(model)
    return groups


def _range(key: str, put: list[str]) -> str:
    """The note with the numbers in which its bursts differ as a range."""
    numbers = [list(map(int, _COUNT.findall(part))) for part in put]
    text = key
    for values in zip(*numbers, strict=True):
        low, high = min(values), max(values)
        text = text.replace("#", str(low) if low == high else f"{low} to {high}", 1)
    return text


def _of(who: tuple[str, ...], every: list[str]) -> str:
    """The bursts a note is about, in square brackets; nothing where it is about all."""
    others = [burst for burst in every if burst not in who]
    if not others:
        return ""
    if len(others) < len(who) and len(others) <= NAMED:
        return f" [all but {', '.join(others)}]"
    return f" [{', '.join(who)}]" if len(who) <= NAMED else f" [{len(who)} of {len(every)} bursts]"
