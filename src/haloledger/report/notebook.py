"""The ledgers in a notebook: a short table and the caution, every name escaped."""

from __future__ import annotations

from html import escape
from typing import Any

from haloledger.report import text
from haloledger.report.names import plain
from haloledger.report.views import SightlineView, views

ROWS = 30

_HEAD = (
    ("burst", "name of the burst"),
    ("model", "halo model"),
    ("z", "redshift; - where none was given"),
    ("DM", "observed [pc cm-3]"),
    ("crossed", "haloes crossed, mean of the draws"),
    ("DM haloes", "listed haloes, mean [pc cm-3]"),
    ("16 to 84 %", "interval of the listed haloes [pc cm-3]"),
    ("left over", "observed less every term, median [pc cm-3]"),
    ("largest halo", "the entry that adds most"),
    ("share", "its share of the mean sum"),
)


def html(ledgers: Any) -> str:
    """HTML of the sightlines, the first 30 rows, with numbers of refused rows and the caution."""
    every = views(ledgers)
    head = "".join(f'<th title="{escape(meaning)}">{escape(name)}</th>' for name, meaning in _HEAD)
    body = "".join(f"<tr>{''.join(f'<td>{_safe(c)}</td>' for c in _cells(v))}</tr>" for v in every[:ROWS])
    more = f"<p>and {len(every) - ROWS} more rows in <code>.sightlines</code></p>" if len(every) > ROWS else ""
    refused = len(ledgers.refused)
    lost = f"<p>{refused} row{'' if refused == 1 else 's'} refused, see <code>.refused</code></p>" if refused else ""
    table = f"<table><thead><tr>{head}</tr></thead><tbody>{body}</tbody></table>"
    return f"<div>{table}{more}{lost}<p><small>{escape(text.CAUTION)}</small></p></div>"


def _safe(value: str) -> str:
    return escape(plain(value))


def _cells(view: SightlineView) -> list[str]:
    total = view.terms["dm_foreground"]
    top = text.with_dm(view)[:1]
    return [
        view.burst,
        view.model,
        text.number(view.z, 4),
        text.dm(view.dm),
        text.number(view.n_crossed),
        text.dm(total.mean),
        text.dm_range(total),
        text.dm(view.terms["dm_after_all"].p50),
        top[0].halo if top else text.NONE,
        text.percent(top[0].share) if top else text.NONE,
    ]
