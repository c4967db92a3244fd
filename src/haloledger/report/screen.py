"""The ledgers on a terminal or in a pipe: a page a burst, or a line a burst where there are many.

Names from catalogues enter as plain text, never as markup, so what a halo is called cannot change the screen.
"""

from __future__ import annotations

import os
import shutil
import sys
from dataclasses import dataclass, replace
from typing import Any, TextIO

import numpy as np
from rich import box
from rich.console import Console, Group, JustifyMethod, RenderableType
from rich.padding import Padding
from rich.rule import Rule
from rich.table import Table
from rich.text import Text

from haloledger.report import text
from haloledger.report.names import plain, shorten, wrapped
from haloledger.report.notes import Shared, burst_notes, shared_notes
from haloledger.report.views import (
    EntryView,
    Settings,
    SightlineView,
    Spread,
    by_burst,
    localisation,
    settings,
    views,
)

MANY = 12  # more bursts than this get a line each
TOP = 8  # entries shown a burst
SHORTEST_NAME = 22  # a column of numbers goes before names get narrower than this
SHORTEST_HALO = 24  # in the table of many bursts
LEAST_NAME = 12  # names are broken over lines rather than pressed narrower
DM_MEAN, RANGE, DISC, LEFT_OVER = "DM mean", "16 to 84 %", "disc mean", "left over, median"
NARROWEST, WIDEST = 60, 140
WIDTH_IN_A_PIPE = 120

_LINES = box.Box("    \n    \n ── \n    \n ── \n    \n    \n    \n")  # a line under the head and above a total


def console(file: TextIO | None = None, width: int | None = None) -> Console:
    """Console for results: colour only on a terminal and without NO_COLOR, 60 to 140 wide."""
    file = file or sys.stdout
    on_terminal = hasattr(file, "isatty") and file.isatty()
    if width is None:
        # COLUMNS, then the terminal's own width; a pipe has none and gets enough for every column
        width = shutil.get_terminal_size((WIDTH_IN_A_PIPE, 24)).columns
    colour = on_terminal and not os.environ.get("NO_COLOR")
    return Console(
        file=file,
        width=max(NARROWEST, min(width, WIDEST)),
        no_color=not colour,
        color_system="auto" if colour else None,
        highlight=False,
        markup=False,
        emoji=False,
        legacy_windows=False,
    )


def show(ledgers: Any, to: Console, folder: str | None = None) -> None:
    """Print the ledgers; `folder` is where the files are, if any were written."""
    bursts, made = by_burst(views(ledgers)), settings(ledgers)
    many = len(bursts) > MANY
    together, shared = shared_notes(bursts)
    head: list[RenderableType] = [sentence(line, "bold") for line in text.conditions(made)]
    if many:
        pages = [[_many(bursts, made, to.width)]]
    else:
        pages = [_page(ledgers, models, shared, made, to.width) for models in bursts.values()]
    last = _last_words(ledgers, bursts, together, folder, many)
    for parts in [*([head] if head else []), *pages, last]:
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
) -> RenderableType:
    """Rows of a name and numbers; row `total` stands under a line. No number is cut; a long name runs over lines."""
    kept = list(columns)
    longest = max(map(len, [first, *names]))
    while sum(c.width for c in kept) + min(longest, SHORTEST_NAME) + 2 > width and any(c.spare for c in kept):
        kept.remove(max(kept, key=lambda c: c.spare))
    table = Table(box=_LINES, show_edge=False, pad_edge=False, padding=(0, 1, 0, 0), header_style="bold")
    room = min(max(width - sum(c.width for c in kept) - 2, LEAST_NAME), longest)
    table.add_column(Text("\n".join(wrapped(first, room))), no_wrap=True, width=room, vertical="top")
    for column in kept:
        side: JustifyMethod = "left" if column.words else "right"
        table.add_column(column.heading, justify=side, no_wrap=True, min_width=column.width - 2)
    for i, name in enumerate(names):
        last = i == total
        if last:
            table.add_section()
        shown = Text("\n".join(wrapped(name, room)), no_wrap=True)
        table.add_row(shown, *(_words(c.cells[i]) for c in kept), style="bold" if last else "")
    return Group(sentence(title, "italic"), table) if title else table


def indented(part: RenderableType, by: int = 2) -> Padding:
    """The part moved to the right."""
    return Padding(part, (0, 0, 0, by))


def _page(
    ledgers: Any, models: list[SightlineView], shared: Shared, made: Settings, width: int
) -> list[RenderableType]:
    """Everything about one burst: head, entries, models, budget, notes. The first model is shown in full."""
    view = models[0]
    parts: list[RenderableType] = [
        Rule(_words(view.burst, "bold"), align="left", characters="─"),
        indented(_words(text.source(view))),
        indented(sentence(text.place(view, localisation(ledgers, view.burst)))),
        Text(),
        indented(_entries(view, made, width - 2)),
    ]
    if len(models) > 1:
        parts += [Text(), indented(_models(models, made, width - 2))]
    parts += [Text(), indented(_budget(view, made, width - 2))]
    said = [f"note: {note}" for note in burst_notes(models, shared)]
    judged = text.judged(view)
    if judged or said:
        parts.append(Text())
    if judged:
        parts.append(indented(sentence(judged)))
    return parts + [indented(sentence(line)) for line in said]


def _entries(view: SightlineView, made: Settings, width: int) -> RenderableType:
    lines, top, source = text.with_dm(view), text.worth_a_line(view, TOP), text.at_source(view)
    if not lines + source:
        return sentence(f"model {view.model}: no listed halo adds DM here ({view.n_haloes} in the ledger)")
    rest = [e for e in lines if e not in top]
    total = view.terms["dm_foreground"]
    rows = [_entry(e) for e in top] + ([_more(rest)] if rest else [])
    last = len(rows)
    rows.append({"": "sum of listed haloes", DM_MEAN: text.dm(total.mean), RANGE: text.dm_range(total)})
    if source:
        rows += [{"": "at the source, apart:"}, *(_entry(e) | {"share": ""} for e in source)]
    spare = {"kind": 4, "log M200c": 2, "b [kpc]": 6, "in front": 5, "crossed": 3, "b/r200c": 1, DISC: 1}
    headings = ["kind", "z", "log M200c", "b [kpc]", "b/r200c", "in front", "crossed", DM_MEAN, RANGE, DISC, "share"]
    shown = top + source
    absent = {"in front": all(e.p_front >= 0.995 for e in shown), DISC: all(e.disc.zero for e in shown)}
    if made.fixed:
        absent |= {"in front": True, "crossed": True, RANGE: True}
    headings = [h for h in headings if not absent.get(h)]
    columns = [
        Cells(_heading(h, made), [row.get(h, "") for row in rows], spare.get(h, 0), words=h == "kind") for h in headings
    ]
    return grid("halo", [row[""] for row in rows], columns, width, total=last, title=_title(view, made))


def _title(view: SightlineView, made: Settings) -> str:
    if made.fixed:
        crossed = text.counted(round(view.n_crossed), "halo", "haloes")
        said = f"model {view.model}: {crossed} crossed; DM in pc cm-3"
    else:
        crossed = text.number(view.n_crossed)
        said = f"model {view.model}: {crossed} haloes crossed on average; DM in pc cm-3; log M200c and b are medians"
    inside = [plain(e.halo) for e in view.entries if e.holds_burst and not e.at_source and e.dm.mean > 0]
    return f"{said}; in the sum as asked, though the burst sits in it: {', '.join(inside)}" if inside else said


def _heading(name: str, made: Settings) -> str:
    return {DM_MEAN: "DM", DISC: "disc DM"}.get(name, name) if made.fixed else name


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
        DM_MEAN: text.dm(e.dm.mean),
        RANGE: text.dm_range(e.dm),
        DISC: "" if e.disc.zero else text.dm(e.disc.mean),
        "share": text.percent(e.share),
    }


def _more(rest: list[EntryView]) -> dict[str, str]:
    """The haloes that are not shown one by one; of their sum only the mean can be had from entries."""
    mean, share = sum(e.dm.mean for e in rest), sum(e.share for e in rest)
    return {"": f"{len(rest)} more", DM_MEAN: text.dm(mean), "share": text.percent(share)}


def _models(models: list[SightlineView], made: Settings, width: int) -> RenderableType:
    totals = [m.terms["dm_foreground"] for m in models]
    left = [m.terms["dm_after_all"] for m in models]
    names, first = [m.model for m in models], "sum of listed haloes, by model"
    if made.fixed:
        plain_columns = [
            Cells("DM", [text.dm(t.mean) for t in totals]),
            Cells("left over", [text.dm(x.p50) for x in left]),
        ]
        return grid(first, names, plain_columns, width)
    columns = [
        Cells("crossed, mean", [text.number(m.n_crossed) for m in models], spare=2),
        Cells(DM_MEAN, [text.dm(t.mean) for t in totals]),
        Cells(RANGE, [text.dm_range(t) for t in totals]),
        Cells("median", [text.dm(t.p50) for t in totals], spare=1),
        Cells(LEFT_OVER, [text.dm(x.p50) for x in left]),
        Cells(RANGE, [text.dm_range(x) for x in left], spare=1),
    ]
    return grid(first, names, columns, width)


def _budget(view: SightlineView, made: Settings, width: int) -> RenderableType:
    """The terms as they add up: means do, medians do not; what is left over is skewed, so its median is given."""
    spreads = [view.terms[term] for term in view.budget]
    left = view.terms["dm_after_all"]
    names = [*view.budget.values(), "observed DM", "left over" if left.known else "left over (needs a redshift)"]
    if made.fixed:
        values = [text.dm(s.mean) for s in spreads] + [text.dm(view.dm), text.dm(left.p50)]
        return grid("budget", names, [Cells("DM", values)], width, total=len(names) - 1)
    columns = [
        Cells(DM_MEAN, [text.dm(s.mean) for s in spreads] + [text.dm(view.dm), ""]),
        Cells(RANGE, [text.dm_range(s) for s in spreads] + ["", text.dm_range(left)]),
        Cells("median", [text.dm(s.p50) for s in spreads] + ["", text.dm(left.p50)]),
    ]
    return grid("budget", names, columns, width, total=len(names) - 1)


def _many(bursts: dict[str, list[SightlineView]], made: Settings, width: int) -> RenderableType:
    """A line a burst."""
    first = [models[0] for models in bursts.values()]
    totals = [view.terms["dm_foreground"] for view in first]
    tops = [text.with_dm(view)[:1] for view in first]
    columns = [
        Cells("z", [text.number(view.z, 4) for view in first]),
        Cells("DM", [text.dm(view.dm) for view in first], spare=4),
        Cells("crossed", [text.number(view.n_crossed) for view in first], spare=5),
        Cells("DM haloes", [text.dm(t.mean) for t in totals]),
        Cells(RANGE, [text.dm_range(t) for t in totals]),
        Cells("all models", [_span(models) for models in bursts.values()], spare=2),
        Cells("left over", [text.dm(view.terms["dm_after_all"].p50) for view in first], spare=3),
        Cells("largest halo", [top[0].halo if top else text.NONE for top in tops], spare=1, words=True),
        Cells("share", [text.percent(top[0].share) if top else text.NONE for top in tops], spare=1),
    ]
    if all(len(models) == 1 for models in bursts.values()):
        columns = [c for c in columns if c.heading != "all models"]
    if made.fixed:
        columns = [c for c in columns if c.heading not in (RANGE, "crossed")]
    names = [view.burst for view in first]
    columns = _fitted(columns, "largest halo", max(map(len, names)), width)
    title = f"model {first[0].model}; DM in pc cm-3"
    if not made.fixed:
        title += "; haloes crossed and DM haloes: means; left over: median"
    return grid("burst", names, columns, width, title=title)


def _fitted(columns: list[Cells], heading: str, name: int, width: int) -> list[Cells]:
    """The columns with the words under `heading` cut as far as needed to fit the width, and no further.

    The most dispensable column goes before.
    """
    if sum(c.width for c in columns) + min(name, SHORTEST_NAME) + 2 > width:
        columns = [c for c in columns if c.spare < max(c.spare for c in columns)]
    over = sum(c.width for c in columns) + min(name, SHORTEST_NAME) + 2 - width
    at = next(i for i, c in enumerate(columns) if c.heading == heading)
    room = max(columns[at].width - 2 - max(over, 0), SHORTEST_HALO)
    cut = replace(columns[at], cells=[shorten(cell, room) for cell in columns[at].cells])
    return [*columns[:at], cut, *columns[at + 1 :]]


def _span(models: list[SightlineView]) -> str:
    means = [m.terms["dm_foreground"].mean for m in models]
    return f"{text.dm(float(np.min(means)))} to {text.dm(float(np.max(means)))}"


def _last_words(
    ledgers: Any, bursts: dict[str, list[SightlineView]], together: list[str], folder: str | None, many: bool
) -> list[RenderableType]:
    every = [view for models in bursts.values() for view in models]
    notes = [*together, *ledgers.notes]
    if any(s.mean_outside for view in every for s in shown_spreads(view, every_entry=not many)):
        notes.append(text.MEAN_OUTSIDE)
    parts: list[RenderableType] = [sentence(f"note: {note}") for note in notes]
    if ledgers.refused:
        parts.append(sentence(f"{text.counted(len(ledgers.refused), 'row')} refused:"))
        for r in ledgers.refused[:5]:
            name = f" ({r.name})" if r.name else ""
            parts.append(indented(sentence(f"{r.file} row {r.row}{name}: {r.column} is {r.found}. {r.advice}")))
        if len(ledgers.refused) > 5:
            parts.append(indented(sentence(f"and {len(ledgers.refused) - 5} more, see the table refused")))
    if folder:
        what = "every halo and every note of every burst is in the tables there" if many else "all entries are there"
        parts.append(sentence(f"Files are in {folder}: {what}."))
    elif many:
        parts.append(sentence("--out DIR writes every halo and every note of every burst."))
    return [*parts, sentence(text.CAUTION, "italic dim")]


def shown_spreads(view: SightlineView, every_entry: bool = True) -> list[Spread]:
    """What a page shows with a mean and an interval."""
    entries = [e.dm for e in text.worth_a_line(view, TOP) + text.at_source(view)] if every_entry else []
    return [view.terms[t] for t in (view.budget if every_entry else ("dm_foreground",))] + entries
