"""The halo models on screen: a table of all, or one explained. Numbers come from `haloledger.gas.inventory`."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from rich.console import Console, RenderableType
from rich.table import Table
from rich.text import Text

from haloledger.report.screen import Cells, grid, indented, print_parts, sentence

OVER = "!"  # beside a kept fraction above what there is
OUTSIDE = "*"  # beside a mass outside the model's validity
_HEADS = ("name", "summary", "status", "phases", "notes", "source", "boundary", "concentration", "validity")
# every other table of a model file is shown as it stands

KEY = (
    f"kept: gas inside a radius over f_b x total mass there; {OVER} more than is left beside the stars; "
    f"{OUTSIDE} outside the model's validity. Gas beyond the boundary belongs to the diffuse term."
)


def show_models(inventories: Sequence[Any], few: Sequence[float], to: Console) -> None:
    """A line a model: status, boundary, kept fractions at the masses `few`, validity; then a sentence each."""
    names = [i.model.name for i in inventories]
    columns = [
        Cells("status", [i.model.status for i in inventories], spare=len(few), words=True),
        Cells("edge/r200c", [f"{i.model.boundary_r200c:g}" for i in inventories]),
        *(
            Cells(f"kept {log_m:g}", [_three(i, k) for i in inventories], spare=k, words=True)
            for k, log_m in enumerate(few)
        ),
        Cells("log M200c", [_range(i.model.log_mass_range) for i in inventories], spare=len(few) + 1),
        Cells("z", [_range(i.model.z_range) for i in inventories], spare=len(few) + 2),
    ]
    radii = f"kept fraction inside {', '.join(inventories[0].kept)}, at log10 M200c {', '.join(f'{m:g}' for m in few)}"
    parts: list[RenderableType] = [grid("model", names, columns, to.width, title=radii), sentence(KEY, "dim")]
    if to.width < sum(c.width for c in columns) + max(map(len, names)):
        parts.append(sentence("A wider screen shows more columns.", "dim"))
    parts.append(Text())
    for each in inventories:
        parts += [sentence(each.model.name, "bold"), indented(sentence(each.model.summary))]
    hint = "One model in full: haloledger models NAME; a picture: haloledger models NAME --plot FILE.png"
    print_parts(to, [*parts, Text(), sentence(hint, "dim")])


def show_model(inventory: Any, to: Console) -> None:
    """One model: what its file states, the kept fractions over mass, sources."""
    model = inventory.model
    head = {
        "status": model.status,
        "gas": model.phases,
        "boundary": f"{model.boundary_r200c:g} r200c",
        "concentration": model.concentration,
        "validity": f"log10 M200c {_range(model.log_mass_range)}, z {_range(model.z_range)}",
        "file": model.file,
    }
    parts: list[RenderableType] = [sentence(model.name, "bold"), sentence(model.summary), Text()]
    parts += [_pair(name, value, 2) for name, value in head.items()]
    for name, value in model.raw.items():
        if name not in _HEADS:
            parts += [Text(), indented(sentence(name, "bold")), *_tree(value, 4)]
    parts += [Text(), _kept_table(inventory, to.width), sentence(KEY, "dim")]
    if model.notes:
        parts += [Text(), *(sentence(f"note: {note}") for note in model.notes)]
    parts += [Text(), sentence("sources", "bold"), *_sources(model)]
    print_parts(to, parts)


def _kept_table(inventory: Any, width: int) -> RenderableType:
    masses = [f"{m:.1f}{OUTSIDE if out else ''}" for m, out in zip(inventory.log_m200c, inventory.outside, strict=True)]
    columns = [Cells("c200c", [f"{c:.1f}" for c in inventory.c200c])]
    columns += [Cells(r, [_one(inventory, r, k) for k in range(len(masses))]) for r in inventory.kept]
    columns.append(Cells("less stars", [f"{a:.3f}" for a in inventory.available]))
    return grid("log10 M200c", masses, columns, width, title=f"kept fraction, z = {inventory.z:g}")


def _one(inventory: Any, radius: str, k: int) -> str:
    return f"{inventory.kept[radius][k]:.3f}{OVER if inventory.over[radius][k] else ' '}"


def _three(inventory: Any, k: int) -> str:
    """Kept fractions inside the three radii at mass k."""
    parts = [f"{inventory.kept[r][k]:.2f}{OVER if inventory.over[r][k] else ''}" for r in inventory.kept]
    return " ".join(parts) + (OUTSIDE if inventory.outside[k] else "")


def _range(limits: tuple[float, float]) -> str:
    return f"{limits[0]:g} to {limits[1]:g}"


def _sources(model: Any) -> list[RenderableType]:
    source = model.raw.get("source", model.source)
    return _tree(source, 2) if isinstance(source, dict) else [indented(sentence(source))]


def _tree(value: Any, indent: int) -> list[RenderableType]:
    """A TOML value as lines: nested tables indented, lists in one line."""
    if isinstance(value, dict):
        lines: list[RenderableType] = []
        for key, inner in value.items():
            if isinstance(inner, dict):
                lines += [indented(sentence(key), indent), *_tree(inner, indent + 2)]
            else:
                lines.append(_pair(key, _flat(inner), indent))
        return lines
    if isinstance(value, list) and value and isinstance(value[0], dict):
        numbered = [[indented(sentence(f"{n}."), indent), *_tree(v, indent + 2)] for n, v in enumerate(value, start=1)]
        return [line for lines in numbered for line in lines]
    return [indented(sentence(_flat(value)), indent)]


def _pair(name: str, value: object, indent: int) -> RenderableType:
    """Name and value side by side; a long value stays in its column."""
    pair = Table.grid(padding=(0, 2, 0, 0))
    pair.add_column(width=20)
    pair.add_column()
    pair.add_row(sentence(name), sentence(value))
    return indented(pair, indent)


def _flat(value: Any) -> str:
    if isinstance(value, list):
        shown = ", ".join(_flat(v) for v in value[:12])
        return f"{shown}, ... ({len(value)} values)" if len(value) > 12 else shown
    return f"{value:g}" if isinstance(value, float) else str(value)
