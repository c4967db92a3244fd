"""The ledgers in a notebook: a short table and the caution, every name escaped."""

from __future__ import annotations

from html import escape
from typing import Any

from haloledger.report import text
from haloledger.report.names import plain
from haloledger.report.views import Settings, SightlineView, settings, views

ROWS = 30

_HEAD = {
    "burst": "name of the burst",
    "model": "halo model",
    "z": "redshift; - where none was given",
    "DM": "observed [pc cm-3]",
    "crossed": "haloes crossed, mean of the draws",
    "DM haloes, mean": "listed haloes [pc cm-3]",
    "16 to 84 %": "interval of the listed haloes [pc cm-3]",
    "left over, median": "observed less every term [pc cm-3]",
    "its 16 to 84 %": "interval of what is left over [pc cm-3]",
    "largest halo": "the entry that adds most",
    "share": "its share of the mean sum",
}
_WITHOUT_SPREAD = {"DM haloes, mean": "DM haloes", "left over, median": "left over"}
_INTERVALS = ("16 to 84 %", "its 16 to 84 %")


def html(ledgers: Any) -> str:
    """HTML of the sightlines, the first 30 rows, with what was held, refused rows and the caution.

    A run without spread has no intervals and no means.
    """
    every, made = views(ledgers), settings(ledgers)
    columns = [name for name in _HEAD if not (made.fixed and name in _INTERVALS)]
    head = "".join(f'<th title="{escape(_HEAD[name])}">{escape(_shown(name, made))}</th>' for name in columns)
    body = "".join(f"<tr>{_row(view, columns)}</tr>" for view in every[:ROWS])
    said = [_safe(line) for line in text.conditions(made)]
    if len(every) > ROWS:
        said.append(f"and {len(every) - ROWS} more rows in <code>.sightlines</code>")
    if ledgers.refused:
        said.append(f"{text.counted(len(ledgers.refused), 'row')} refused, see <code>.refused</code>")
    if any(view.terms["dm_foreground"].mean_outside for view in every[:ROWS]):
        said.append(escape(text.MEAN_OUTSIDE))
    table = f"<table><thead><tr>{head}</tr></thead><tbody>{body}</tbody></table>"
    lines = "".join(f"<p>{line}</p>" for line in said)
    return f"<div>{table}{lines}<p><small>{escape(text.CAUTION)}</small></p></div>"


def _shown(name: str, made: Settings) -> str:
    return _WITHOUT_SPREAD.get(name, name) if made.fixed else name


def _safe(value: str) -> str:
    return escape(plain(value))


def _row(view: SightlineView, columns: list[str]) -> str:
    cells = _cells(view)
    return "".join(f"<td>{_safe(cells[name])}</td>" for name in columns)


def _cells(view: SightlineView) -> dict[str, str]:
    total, left = view.terms["dm_foreground"], view.terms["dm_after_all"]
    top = text.with_dm(view)[:1]
    values = [
        view.burst,
        view.model,
        text.number(view.z, 4),
        text.dm(view.dm),
        text.number(view.n_crossed),
        text.dm(total.mean),
        text.dm_range(total),
        text.dm(left.p50),
        text.dm_range(left),
        top[0].halo if top else text.NONE,
        text.percent(top[0].share) if top else text.NONE,
    ]
    return dict(zip(_HEAD, values, strict=True))
