"""The ledgers on a terminal or in a pipe: a page a burst, or a line a burst where there are many.

Names from catalogues enter as plain text, never as markup, so what a halo is called cannot change the screen.
"""

from __future__ import annotations

import os
import shutil
import sys
from dataclasses import dataclass
from typing import Any, TextIO

import numpy as np
from rich import box
from rich.console import Console, JustifyMethod, RenderableType
from rich.padding import Padding
from rich.rule import Rule
from rich.table import Table
from rich.text import Text

from haloledger.report import text
from haloledger.report.names import plain, shorten
from haloledger.report.views import BUDGET, EntryView, SightlineView, by_burst, localisation, views

MANY = 12  # more bursts than this get a line each
TOP = 8  # entries shown a burst
SHORTEST_NAME = 22  # a column of numbers goes before names get shorter than this
LONGEST_HALO = 28  # in the table of many bursts
WIDTH_IN_A_PIPE = 120

_LINES = box.Box("    \n    \n ── \n    \n ── \n    \n    \n    \n")  # a line under the head and above a total


def console(file: TextIO | None = None, width: int | None = None) -> Console:
    """Console for results: colour only on a terminal and without NO_COLOR, 72 to 140 wide, names never wrapped away."""
    file = file or sys.stdout
    on_terminal = hasattr(file, "isatty") and file.isatty()
    if width is None:
        # COLUMNS, then the terminal's own width; a pipe has none and gets enough for every column
        width = shutil.get_terminal_size((WIDTH_IN_A_PIPE, 24)).columns
    colour = on_terminal and not os.environ.get("NO_COLOR")
    return Console(
        file=file,
        width=max(72, min(width, 140)),
        no_color=not colour,
        color_system="auto" if colour else None,
        highlight=False,
        markup=False,
        emoji=False,
        legacy_windows=False,
    )


def show(ledgers: Any, to: Console, folder: str | None = None) -> None:
    """Print the ledgers; `folder` is where the files are, if any were written."""
    bursts = by_burst(views(ledgers))
    many = len(bursts) > MANY
    pages = [[_many(bursts, to.width)]] if many else [_page(ledgers, m, to.width) for m in bursts.values()]
    for parts in [*pages, _last_words(ledgers, folder, many)]:
        print_parts(to, [*parts, Text()])


def print_parts(to: Console, parts: list[RenderableType]) -> None:
    """Print the parts; in a pipe without the blanks that fill a terminal's lines."""
    if to.is_terminal:
        for part in parts:
            to.print(part)
        return
    with to.capture() as captured:
        for part in parts:
            to.print(part)
    to.file.write("\n".join(line.rstrip() for line in captured.get().split("\n")))


def _words(value: object, style: str = "") -> Text:
    return Text(plain(value), style=style, no_wrap=True, overflow="ellipsis")


def sentence(value: object, style: str = "") -> Text:
    """Text that may run over several lines."""
    return Text(plain(value), style=style)


@dataclass(frozen=True)
class Cells:
    """A column of numbers, or of words; on a narrow screen columns with the highest `spare` go first, 0 never goes."""

    heading: str
    cells: list[str]
    spare: int = 0
    words: bool = False

    @property
    def width(self) -> int:
        return max(map(len, [self.heading, *self.cells])) + 2


def grid(
    first: str, names: list[str], columns: list[Cells], width: int, total: int | None = None, title: str = ""
) -> Table:
    """Rows of a name and numbers. Numbers are never cut, names may be; row `total` stands under a line."""
    kept = list(columns)
    name_width = min(max(map(len, names)), SHORTEST_NAME)
    while sum(c.width for c in kept) + name_width + 2 > width and any(c.spare for c in kept):
        kept.remove(max(kept, key=lambda c: c.spare))
    table = Table(box=_LINES, show_edge=False, pad_edge=False, padding=(0, 1, 0, 0), header_style="bold")
    room = max(width - sum(c.width for c in kept) - 2, 8)
    room = min(room, max(map(len, [first, *names])))
    table.add_column(shorten(first, room), no_wrap=True, width=room)
    for column in kept:
        side: JustifyMethod = "left" if column.words else "right"
        table.add_column(column.heading, justify=side, no_wrap=True, min_width=column.width - 2)
    for i, name in enumerate(names):
        last = i == total
        if last:
            table.add_section()
        table.add_row(_words(shorten(name, room)), *(_words(c.cells[i]) for c in kept), style="bold" if last else "")
    if title:
        table.title, table.title_justify, table.title_style = _words(title), "left", "italic"
    return table


def indented(part: RenderableType, by: int = 2) -> Padding:
    """The part moved to the right."""
    return Padding(part, (0, 0, 0, by))


def _page(ledgers: Any, models: list[SightlineView], width: int) -> list[RenderableType]:
    """Everything about one burst: head, entries, models, budget, notes. The first model is shown in full."""
    view = models[0]
    parts: list[RenderableType] = [
        Rule(_words(view.burst, "bold"), align="left", characters="─"),
        indented(_words(text.source(view))),
        indented(_words(text.place(view, localisation(ledgers, view.burst)))),
        Text(),
        indented(_entries(view, width - 2)),
    ]
    if len(models) > 1:
        parts += [Text(), indented(_models(models, width - 2))]
    parts += [Text(), indented(_budget(view, width - 2)), Text(), indented(_words(text.judged(view), "dim"))]
    return parts + [indented(sentence(f"note: {note}")) for note in text.notes(models)]


def _entries(view: SightlineView, width: int) -> RenderableType:
    lines, top, source = text.with_dm(view), text.worth_a_line(view, TOP), text.at_source(view)
    if not lines + source:
        return sentence(f"model {view.model}: no listed halo adds DM here ({view.n_haloes} in the ledger)")
    rest = lines[len(top) :]
    total = view.terms["dm_foreground"]
    more = [_more(rest)] if rest else []
    rows = [_entry(e) for e in top] + more
    rows.append({"": "sum of listed haloes", "DM mean": text.dm(total.mean), "16 to 84 %": text.dm_range(total)})
    rows += [_entry(e) | {"share": "at source"} for e in source]  # under the sum, to which it does not belong
    spare = {"kind": 3, "log M200c": 1, "b [kpc]": 5, "in front": 4, "crossed": 2}
    headings = ["kind", "z", "log M200c", "b [kpc]", "b/r200c", "in front", "crossed", "DM mean", "16 to 84 %", "share"]
    if all(e.p_front >= 0.995 for e in top + source):
        headings.remove("in front")
    columns = [Cells(h, [row.get(h, "") for row in rows], spare.get(h, 0), words=h == "kind") for h in headings]
    title = f"model {view.model}: {text.number(view.n_crossed)} haloes crossed on average; DM in pc cm-3"
    return grid("halo", [row[""] for row in rows], columns, width, total=len(top + more), title=title)


def _entry(e: EntryView) -> dict[str, str]:
    """Cells of one halo by heading; "" is its name."""
    return {
        "": e.halo,
        "kind": e.kind,
        "z": text.redshift(e.z, e.z_kind),
        "log M200c": text.mass(e.log_m200c),
        "b [kpc]": text.length(e.impact_kpc.p50),
        "b/r200c": text.number(e.impact_r200c, 2),
        "in front": text.percent(e.p_front),
        "crossed": text.percent(e.p_crossed),
        "DM mean": text.dm(e.dm.mean),
        "16 to 84 %": text.dm_range(e.dm),
        "share": text.percent(e.share),
    }


def _more(rest: list[EntryView]) -> dict[str, str]:
    """The haloes that are not shown one by one; of their sum only the mean can be had from entries."""
    mean, share = sum(e.dm.mean for e in rest), sum(e.share for e in rest)
    return {"": f"{len(rest)} more", "DM mean": text.dm(mean), "share": text.percent(share)}


def _models(models: list[SightlineView], width: int) -> Table:
    totals = [m.terms["dm_foreground"] for m in models]
    columns = [
        Cells("crossed", [text.number(m.n_crossed) for m in models], spare=2),
        Cells("DM mean", [text.dm(t.mean) for t in totals]),
        Cells("16 to 84 %", [text.dm_range(t) for t in totals]),
        Cells("median", [text.dm(t.p50) for t in totals], spare=1),
        Cells("left over", [text.dm(m.terms["dm_after_all"].p50) for m in models]),
    ]
    return grid("sum of listed haloes, by model", [m.model for m in models], columns, width)


def _budget(view: SightlineView, width: int) -> Table:
    """The terms as they add up: means do, medians do not."""
    spreads = [view.terms[term] for term in BUDGET]
    left = view.terms["dm_after_all"]
    last = [text.dm(left.mean), text.dm_range(left), text.dm(left.p50)]
    columns = [
        Cells("DM mean", [text.dm(s.mean) for s in spreads] + [text.dm(view.dm), last[0]]),
        Cells("16 to 84 %", [text.dm_range(s) for s in spreads] + ["", last[1]]),
        Cells("median", [text.dm(s.p50) for s in spreads] + ["", last[2]]),
    ]
    names = [*BUDGET.values(), "observed DM", "left over" if left.known else "left over (needs a redshift)"]
    return grid("budget", names, columns, width, total=len(names) - 1)


def _many(bursts: dict[str, list[SightlineView]], width: int) -> Table:
    """A line a burst."""
    first = [models[0] for models in bursts.values()]
    totals = [view.terms["dm_foreground"] for view in first]
    tops = [text.with_dm(view)[:1] for view in first]
    largest = [shorten(top[0].halo, LONGEST_HALO) if top else text.NONE for top in tops]
    columns = [
        Cells("z", [text.number(view.z, 4) for view in first]),
        Cells("DM", [text.dm(view.dm) for view in first], spare=4),
        Cells("crossed", [text.number(view.n_crossed) for view in first], spare=5),
        Cells("DM haloes", [text.dm(t.mean) for t in totals]),
        Cells("16 to 84 %", [text.dm_range(t) for t in totals]),
        Cells("all models", [_span(models) for models in bursts.values()], spare=2),
        Cells("left over", [text.dm(view.terms["dm_after_all"].p50) for view in first], spare=3),
        Cells(
            "largest halo",
            largest,
            spare=1,
            words=True,
        ),
        Cells("share", [text.percent(top[0].share) if top else text.NONE for top in tops], spare=1),
    ]
    if all(len(models) == 1 for models in bursts.values()):
        columns.pop(5)
    title = f"model {first[0].model}; DM in pc cm-3, means of the draws; left over: median"
    return grid("burst", [view.burst for view in first], columns, width, title=title)


def _span(models: list[SightlineView]) -> str:
    means = [m.terms["dm_foreground"].mean for m in models]
    return f"{text.dm(float(np.min(means)))} to {text.dm(float(np.max(means)))}"


def _last_words(ledgers: Any, folder: str | None, many: bool) -> list[RenderableType]:
    parts: list[RenderableType] = [sentence(f"note: {note}") for note in ledgers.notes]
    if ledgers.refused:
        parts.append(sentence(f"{text.counted(len(ledgers.refused), 'row')} refused:"))
        for r in ledgers.refused[:5]:
            name = f" ({r.name})" if r.name else ""
            parts.append(indented(sentence(f"{r.file} row {r.row}{name}: {r.column} is {r.found}. {r.advice}")))
        if len(ledgers.refused) > 5:
            parts.append(indented(sentence(f"and {len(ledgers.refused) - 5} more, see the table refused")))
    if folder:
        what = "every halo of every burst is in the table entries there" if many else "all entries are there"
        parts.append(sentence(f"Files are in {folder}: {what}."))
    return [*parts, sentence(text.CAUTION, "italic dim")]
