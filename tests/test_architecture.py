"""The floors of the house: who may import whom, and what each part knows nothing of."""

from __future__ import annotations

import ast
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[1]
SOURCE = ROOT / "src" / "haloledger"

FLOORS = {
    **dict.fromkeys(("errors", "paths", "__version__"), 0),
    **dict.fromkeys(("cosmos", "catalogs", "engine"), 1),
    **dict.fromkeys(("haloes", "gas"), 2),
    "sightlines": 3,
    "reach": 4,
    "ledger": 5,
    # floor 6 has two steps: a result of the audit writes and shows itself, so `audit` stands on `report`
    "report": 6.0,
    **dict.fromkeys(("audit", "rehearse"), 6.5),
    "cli": 7,
    **dict.fromkeys(("__init__", "__main__"), 8),  # the front door, which opens every room when asked
}

# What the floors alone would allow and the design does not: "knows nothing of".
FORBIDDEN = {
    "gas": {"catalogs", "sightlines"},
    "sightlines": {"gas"},
    "report": {"cosmos", "haloes", "gas", "sightlines", "reach"},
    "rehearse.sky": {"haloes", "gas"},
}
FORBIDDEN_LIBRARIES = {
    "engine": {"astropy", "colossus", "scipy"},  # no science
    "ledger": {"click", "rich", "pathlib", "os", "shutil", "io", "csv", "matplotlib", "jinja2", "tomllib", "tomli_w"},
}
FORBIDDEN_CALLS = {"ledger": {"open", "print"}}

TOP_LEVEL = {
    "README.md",
    "DEVELOPERS.md",
    "pyproject.toml",
    "src",
    "tests",
    "halo_models",
    "demo_sightlines",
    "LICENSE",
}
HEAVY = ("scipy", "astropy", "matplotlib", "pandas", "pyarrow", "colossus", "shapely", "mocpy")


def module_name(path: Path, source: Path) -> str:
    """`gas.models` for gas/models.py, `gas` for gas/__init__.py, `__init__` for the package's own."""
    parts = list(path.relative_to(source).with_suffix("").parts)
    if len(parts) > 1 and parts[-1] == "__init__":
        parts.pop()
    return ".".join(parts)


def imported(tree: ast.AST, path: Path, source: Path) -> list[tuple[int, str]]:
    """(line, dotted name) of everything a module imports, at its top, inside functions, or by a written name."""
    package = ["haloledger", *path.relative_to(source).parent.parts]
    found = []
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            found += [(node.lineno, a.name) for a in node.names]
        elif isinstance(node, ast.ImportFrom):
            base = package[: len(package) - node.level + 1] if node.level else []
            stem = ".".join([*base, *([node.module] if node.module else [])])
            found += [(node.lineno, f"{stem}.{a.name}") for a in node.names]
        elif isinstance(node, ast.Call) and called(node) in {"import_module", "__import__"} and node.args:
            name = node.args[0]
            if isinstance(name, ast.Constant):
                found.append((node.lineno, str(name.value)))
    return found


def called(node: ast.Call) -> str:
    return getattr(node.func, "attr", getattr(node.func, "id", ""))


def complaints(source: Path) -> list[str]:
    """Every arrow that goes up or sideways, and everything used by a part that should know nothing of it."""
    out = []
    for path in sorted(source.rglob("*.py")):
        module = module_name(path, source)
        package = module.split(".")[0]
        where = f"{path.relative_to(source)}"
        if package not in FLOORS:
            out.append(f"{where}: '{package}' stands on no floor; add it to the table in DEVELOPERS.md and here")
            continue
        tree = ast.parse(path.read_text(encoding="utf-8"))
        for line, name in imported(tree, path, source):
            first, *rest = name.split(".")
            if first in banned(FORBIDDEN_LIBRARIES, module):
                out.append(f"{where}:{line}: {package} imports {first}")
            if first != "haloledger":
                continue
            target = rest[0] if rest else "__init__"
            if target == package or package in {"__init__", "__main__"}:
                continue
            if FLOORS.get(target, 99) >= FLOORS[package]:
                out.append(f"{where}:{line}: {package} (floor {FLOORS[package]}) imports {target}")
            elif target in banned(FORBIDDEN, module):
                out.append(f"{where}:{line}: {package} knows nothing of {target}, yet imports it")
        calls = [n for n in ast.walk(tree) if isinstance(n, ast.Call) and isinstance(n.func, ast.Name)]
        out += [
            f"{where}:{n.lineno}: {package} calls {called(n)}()"
            for n in calls
            if called(n) in banned(FORBIDDEN_CALLS, module)
        ]
    return out


def banned(table: dict[str, set[str]], module: str) -> set[str]:
    """What the module, or a package it lies in, must not use."""
    return set().union(*(names for part, names in table.items() if f"{module}.".startswith(f"{part}.")))


def test_no_package_imports_from_its_own_floor_or_above():
    assert complaints(SOURCE) == []


@pytest.mark.parametrize(
    ("file", "code", "complaint"),
    [
        ("cosmos/a.py", "from haloledger.gas import models", "cosmos (floor 1) imports gas"),
        ("cosmos/a.py", "def f():\n    from haloledger.catalogs.cards import load_card", "(floor 1) imports catalogs"),
        ("gas/a.py", "from ..haloes.build import halo_list", "gas (floor 2) imports haloes"),
        ("gas/shapes/a.py", "from ...catalogs import canonical", "gas knows nothing of catalogs"),
        ("sightlines/a.py", "import haloledger.gas.models as m", "sightlines knows nothing of gas"),
        ("engine/a.py", "import astropy.units as u", "engine imports astropy"),
        ("engine/a.py", "from haloledger import audit", "engine (floor 1) imports audit"),
        ("ledger/a.py", "def f(x):\n    print(x)", "ledger calls print()"),
        ("ledger/a.py", "from rich.console import Console", "ledger imports rich"),
        ("report/a.py", "from haloledger.gas.models import load_model", "report knows nothing of gas"),
        ("haloes/a.py", "from importlib import import_module\nimport_module('haloledger.ledger')", "imports ledger"),
        ("errors.py", "from haloledger import paths", "errors (floor 0) imports paths"),
        ("attic/a.py", "", "'attic' stands on no floor"),
        ("ledger/a.py", "import haloledger", "ledger (floor 5) imports __init__"),
    ],
)
def test_a_planted_violation_is_found(tmp_path, file, code, complaint):
    path = tmp_path / file
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_text(code, encoding="utf-8")
    found = complaints(tmp_path)
    assert len(found) == 1, found
    assert complaint in found[0]


@pytest.mark.parametrize(
    ("file", "code"),
    [
        ("ledger/a.py", "from haloledger.gas.models import Model\nfrom haloledger import __version__"),
        ("gas/shapes/a.py", "from ..quadrature import nodes\nfrom haloledger.errors import InputError"),
        ("cli/a.py", "def f():\n    from haloledger.report import tables\n    print(tables)"),
        ("__init__.py", "def audit():\n    from haloledger.audit import audit"),
    ],
)
def test_an_arrow_downwards_is_allowed(tmp_path, file, code):
    path = tmp_path / file
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_text(code, encoding="utf-8")
    assert complaints(tmp_path) == []


def test_importing_the_package_loads_nothing_heavy():
    run = subprocess.run(
        [sys.executable, "-X", "importtime", "-c", "import haloledger"], capture_output=True, text=True, check=True
    )
    loaded = {line.rsplit("|", 1)[-1].strip().split(".")[0] for line in run.stderr.splitlines() if "|" in line}
    assert "haloledger" in loaded  # the listing was read
    assert loaded.isdisjoint(HEAVY), f"import haloledger loads {sorted(loaded & set(HEAVY))}"


@pytest.mark.parametrize("package", sorted(p.parent.name for p in SOURCE.glob("*/__init__.py")))
def test_package_doors_are_light(package):
    # numpy is allowed: every array in the house is one; the rest waits until it is asked for
    code = f"import haloledger.{package}, sys; print(*{{m.split('.')[0] for m in sys.modules}})"
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    loaded = set(run.stdout.split()) & set(HEAVY)
    assert not loaded, f"import haloledger.{package} loads {sorted(loaded)}"


def test_top_level_holds_the_agreed_names_only():
    if not (ROOT / ".git").exists():
        pytest.skip("not a checkout")
    listed = subprocess.run(["git", "ls-files"], cwd=ROOT, capture_output=True, text=True, check=True).stdout
    top = {line.split("/")[0] for line in listed.splitlines()}
    assert {name for name in top if not name.startswith(".")} <= TOP_LEVEL
