"""Reading a model file: TOML with strict keys, every fault named with the file, the key and what to write instead."""

from __future__ import annotations

import hashlib
import tomllib
from dataclasses import MISSING, fields
from difflib import get_close_matches
from functools import lru_cache
from pathlib import Path
from typing import Any

from haloledger.errors import InputError
from haloledger.gas.components import Component
from haloledger.gas.kept import LAWS, RADII, KeptLaw
from haloledger.gas.models import Model
from haloledger.gas.shapes import SHAPES, Shape
from haloledger.gas.shapes.table import DensityTable
from haloledger.gas.spread import Spread
from haloledger.paths import data_folder

CONCENTRATIONS = ("dutton2014", "duffy2008", "diemer2019")
STATUSES = ("published", "scenario")
PHASES = ("hot", "hot+cool")
BOUNDARIES = (0.3, 3.0)  # r200c; two haloes of one mass share most of their gas beyond that
REQUIRED = ("name", "summary", "status", "phases", "boundary", "concentration", "source", "validity")
OPTIONAL = ("shape", "kept", "component", "handover", "spread", "notes")


def shipped_models() -> dict[str, Path]:
    """Model name -> file, for the models that come with the package."""
    return {p.stem: p for p in sorted(data_folder("halo_models").glob("*.toml"))}


def read_model(name_or_path: str) -> Model:
    """The model of that name or file. A name that ends in .toml, or holds a slash, is a file."""
    text = str(name_or_path)
    if not text.endswith(".toml") and "/" not in text:
        return _shipped(text)
    path = Path(text)
    if not path.is_file():
        raise InputError(f"--model: no file {text}. Write the path of a model file, or one of {_names()}.")
    return _read(path.resolve(), text)


@lru_cache(maxsize=64)
def _shipped(name: str) -> Model:
    shipped = shipped_models()
    if name not in shipped:
        raise InputError(f"--model: no model '{name}'.{_near(name, shipped)} Models: {_names()}; or a .toml file.")
    return _read(shipped[name], shipped[name].name)


def _read(path: Path, shown: str) -> Model:
    content = path.read_bytes()
    try:
        data = tomllib.loads(content.decode("utf-8"))
    except (tomllib.TOMLDecodeError, UnicodeDecodeError) as fault:
        raise InputError(f"{shown}: not TOML: {fault}. Start from one of the files in halo_models/.") from None
    return _model(data, path, shown, content)


def _model(data: dict[str, Any], path: Path, shown: str, content: bytes) -> Model:
    _keys(data, REQUIRED, OPTIONAL, shown, "")
    boundary = _number(data, "boundary", *BOUNDARIES, shown, "")
    validity = _table(data, "validity", shown)
    _keys(validity, ("log_m200c", "z"), (), shown, "validity.")
    components, handover = _components(data, boundary, path, shown)
    spread = _table(data, "spread", shown)
    source = data["source"]
    return Model(
        name=_text(data, "name", shown),
        status=_choice(data, "status", STATUSES, shown),
        summary=_text(data, "summary", shown),
        source=source if isinstance(source, str) else "; ".join(f"{k}: {v}" for k, v in source.items()),
        phases=_choice(data, "phases", PHASES, shown),
        boundary_r200c=boundary,
        concentration=_concentration(data["concentration"], shown),
        components=components,
        handover_log_m200c=_numbers(handover, "log_m200c", shown, "handover.") if handover else (),
        handover_width_dex=_numbers(handover, "width_dex", shown, "handover.") if handover else (),
        spread=_spread(spread, shown),
        log_mass_range=_range(validity, "log_m200c", shown),
        z_range=_range(validity, "z", shown),
        notes=tuple(data.get("notes", ())),
        file=path.name,
        raw=data,
        sha256=_sha256(content, components),
    )


def _components(data, boundary: float, path: Path, shown: str) -> tuple[tuple[Component, ...], dict[str, Any] | None]:
    if "component" not in data:
        if "shape" not in data:
            raise InputError(f"{shown}: no [shape]. Write a table [shape] with kind = one of {', '.join(SHAPES)}.")
        if "handover" in data:
            raise InputError(f"{shown}: [handover] needs two or more [[component]] tables. Leave it out.")
        return (_component(data, boundary, path, shown, ""),), None
    if "shape" in data or "kept" in data:
        raise InputError(f"{shown}: [shape] and [kept] beside [[component]]. Write them inside the components.")
    parts = data["component"]
    if not isinstance(parts, list) or len(parts) < 2:
        raise InputError(f"{shown}: a mixture needs two or more [[component]] tables, from low to high mass.")
    for k, part in enumerate(parts):
        _keys(part, ("shape",), ("kept",), shown, f"component {k + 1}: ")
    handover = _table(data, "handover", shown)
    _keys(handover, ("log_m200c", "width_dex"), (), shown, "handover.")
    middles, widths = (_numbers(handover, key, shown, "handover.") for key in ("log_m200c", "width_dex"))
    if not len(middles) == len(widths) == len(parts) - 1 or min(widths) < 0.05:
        raise InputError(
            f"{shown}: handover of {len(parts)} components: log_m200c = {list(middles)}, width_dex = {list(widths)}. "
            f"Write lists of {len(parts) - 1}, each width 0.05 or more."
        )
    where = (f"component {k + 1}: " for k in range(len(parts)))
    return tuple(_component(p, boundary, path, shown, w) for p, w in zip(parts, where, strict=True)), handover


def _component(data, boundary: float, path: Path, shown: str, where: str) -> Component:
    shape_data = dict(_table(data, "shape", shown))
    if "file" in shape_data:
        shape_data["file"] = str(path.parent / str(shape_data["file"]))
    shape: Shape = _build(shape_data, "kind", SHAPES, shown, f"{where}shape.")
    if boundary > shape.x_max:
        raise InputError(f"{shown}: {where}boundary = {boundary} is beyond this shape, which ends at {shape.x_max:g}.")
    kept: KeptLaw | None = None
    if "kept" in data:
        if shape.fixes == "gas":
            raise InputError(f"{shown}: {where}[kept] with the absolute shape '{shape.kind}'. Leave [kept] out.")
        kept = _build(_table(data, "kept", shown), "law", LAWS, shown, f"{where}kept.")
        if kept.radius not in RADII:
            raise InputError(f"{shown}: {where}kept.radius = '{kept.radius}'. Write one of {', '.join(RADII)}.")
    elif shape.fixes == "nothing":
        raise InputError(f"{shown}: {where}no [kept]. Write a table [kept] with law = one of {', '.join(LAWS)}.")
    return Component(shape, kept, boundary)


def _build(data: dict[str, Any], tag: str, registry: dict[str, type], shown: str, where: str) -> Any:
    kind = data.get(tag)
    if kind not in registry:
        raise InputError(
            f"{shown}: {where}{tag} = '{kind}' is not known.{_near(str(kind), registry)} "
            f"Write one of {', '.join(registry)}."
        )
    cls = registry[kind]
    needed = [f.name for f in fields(cls) if f.default is MISSING]
    free = [f.name for f in fields(cls) if f.default is not MISSING]
    _keys(data, (tag, *needed), free, shown, where)
    values = {k: _value(v, _is_text(cls, k), shown, where + k) for k, v in data.items() if k != tag}
    for f in fields(cls):
        if f.name in values and isinstance(values[f.name], tuple) != str(f.type).startswith("tuple"):
            want = "a list of numbers" if str(f.type).startswith("tuple") else "one value"
            raise InputError(f"{shown}: {where}{f.name} = {data[f.name]!r}. Write {want}.")
    built = cls(**values)
    fault = built.check()
    if fault:
        raise InputError(f"{shown}: {where}{fault}.")
    return built


def _is_text(cls: type, name: str) -> bool:
    return any(f.name == name and str(f.type) == "str" for f in fields(cls))


def _value(value: Any, text: bool, shown: str, where: str) -> Any:
    if text:
        if isinstance(value, str) and value:
            return value
        raise InputError(f"{shown}: {where} = {value!r}. Write a text in quotes.")
    if isinstance(value, list):
        return tuple(_value(v, False, shown, where) for v in value)
    if isinstance(value, bool) or not isinstance(value, int | float) or not abs(value) < 1e30:
        raise InputError(f"{shown}: {where} = {value!r}. Write a number.")
    return float(value)


def _sha256(content: bytes, components: tuple[Component, ...]) -> str:
    """Of the model file and the density tables it names: equal where the numbers are."""
    digest = hashlib.sha256(content)
    for part in components:
        if isinstance(part.shape, DensityTable):
            digest.update(Path(part.shape.file).read_bytes())
    return digest.hexdigest()


def _spread(data: dict[str, Any], shown: str) -> Spread:
    if not data:
        return Spread()
    _keys(data, ("shared_dex", "own_dex"), ("log_m200c", "b_over_r200c", "shape_scatter_dex"), shown, "spread.")
    given = {key: _numbers(data, key, shown, "spread.") for key in data}
    for key in ("shared_dex", "own_dex", "shape_scatter_dex"):
        if key in given and not all(0 <= v <= 1.5 for v in given[key]):
            raise InputError(f"{shown}: spread.{key} = {data[key]}. Write values in dex between 0 and 1.5.")
    for axis, keys in (("log_m200c", ("shared_dex", "own_dex")), ("b_over_r200c", ("shape_scatter_dex",))):
        n = len(given.get(axis, (0,)))
        for key in keys:
            if len(given.get(key, (0,) * n)) != n:
                raise InputError(f"{shown}: spread.{key} has {len(given[key])} values and {axis} {n}. Write as many.")
        if any(b <= a for a, b in zip(given.get(axis, ()), given.get(axis, ())[1:], strict=False)):
            raise InputError(f"{shown}: spread.{axis} = {data[axis]} must rise. Sort it.")
    return Spread(**given)


def _concentration(value: Any, shown: str) -> str | float:
    if value in CONCENTRATIONS:
        return value
    if isinstance(value, int | float) and not isinstance(value, bool) and 1 <= value <= 40:
        return float(value)
    raise InputError(
        f"{shown}: concentration = {value!r}.{_near(str(value), CONCENTRATIONS)} "
        f"Write one of {', '.join(CONCENTRATIONS)}, or a number from 1 to 40."
    )


def _range(data, key: str, shown: str) -> tuple[float, float]:
    values = _numbers(data, key, shown, "validity.")
    if len(values) != 2 or values[0] >= values[1]:
        raise InputError(f"{shown}: validity.{key} = {data[key]}. Write [lowest, highest].")
    return values[0], values[1]


def _numbers(data, key: str, shown: str, where: str) -> tuple[float, ...]:
    value = _value(data[key], False, shown, where + key)
    return value if isinstance(value, tuple) else (value,)


def _number(data, key: str, low: float, high: float, shown: str, where: str) -> float:
    value = _value(data[key], False, shown, where + key)
    if isinstance(value, tuple) or not low <= value <= high:
        raise InputError(f"{shown}: {where}{key} = {data[key]!r}. Write one number from {low} to {high}.")
    return value


def _text(data, key: str, shown: str) -> str:
    return _value(data[key], True, shown, key)


def _choice(data, key: str, choices: tuple[str, ...], shown: str) -> str:
    if data[key] not in choices:
        raise InputError(f"{shown}: {key} = {data[key]!r}. Write one of {', '.join(choices)}.")
    return data[key]


def _table(data, key: str, shown: str) -> dict[str, Any]:
    value = data.get(key, {})
    if not isinstance(value, dict):
        raise InputError(f"{shown}: {key} = {value!r}. Write it as a table [{key}].")
    return value


def _keys(data: dict[str, Any], needed, free, shown: str, where: str) -> None:
    known = (*needed, *free)
    place = f"in {where.rstrip('.: ')}: " if where else ""
    for key in data:
        if key not in known:
            raise InputError(f"{shown}: {place}unknown key '{key}'.{_near(key, known)} Known: {', '.join(known)}.")
    lacking = [key for key in needed if key not in data]
    if lacking:
        keys = ", ".join(f"'{key}'" for key in lacking)
        write = ", ".join(f"{key} = ..." for key in lacking)
        raise InputError(f"{shown}: {place}missing {'keys' if len(lacking) > 1 else 'key'} {keys}. Write {write}")


def _near(word: str, known) -> str:
    near = get_close_matches(word, list(known), n=1, cutoff=0.6)
    return f" Did you mean '{near[0]}'?" if near else ""


def _names() -> str:
    return ", ".join(sorted(shipped_models()))
