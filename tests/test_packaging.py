"""What travels: the wheel holds the data folders, and the README's lines are the ones that are run."""

from __future__ import annotations

import os
import re
import stat
import subprocess
import sys
import tarfile
import zipfile
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[1]
SOURCE = ROOT / "src" / "haloledger"
TEST_LINE = "python3 -m venv .venv && .venv/bin/pip install -e '.[test]' && .venv/bin/pytest"
DEMO_LINE = "python3 -m venv .venv && .venv/bin/pip install . && .venv/bin/haloledger demo"


def build(where: Path, target: str, out: Path) -> Path:
    """The one file that the build backend makes of `where`; no network is needed."""
    command = [sys.executable, "-m", "hatchling", "build", "-t", target, "-d", str(out)]
    subprocess.run(command, cwd=where, check=True, capture_output=True)
    (made,) = out.iterdir()
    return made


@pytest.fixture(scope="session")
def wheel(tmp_path_factory) -> Path:
    if not (ROOT / "pyproject.toml").is_file():
        pytest.skip("not a checkout")
    return build(ROOT, "wheel", tmp_path_factory.mktemp("wheel"))


@pytest.fixture(scope="session")
def wheel_names(wheel) -> set[str]:
    return set(zipfile.ZipFile(wheel).namelist())


def data_files(folder: Path, prefix: str) -> set[str]:
    """Where each file of a folder should stand in the wheel; caches apart."""
    files = [p for p in folder.rglob("*") if p.is_file() and "__pycache__" not in p.parts]
    return {f"{prefix}/{p.relative_to(folder).as_posix()}" for p in files}


@pytest.mark.parametrize(
    ("folder", "prefix", "pattern"),
    [
        (ROOT / "halo_models", "haloledger/halo_models", r"\.toml$"),
        (ROOT / "demo_sightlines", "haloledger/demo_sightlines", r"galaxies\.ecsv$"),
        (SOURCE / "catalogs" / "cards", "haloledger/catalogs/cards", r"\.toml$"),
        (SOURCE / "haloes" / "relations", "haloledger/haloes/relations", r"\.toml$"),
        (SOURCE, "haloledger", r"\.py$"),
    ],
    ids=["halo models", "demo sightlines", "cards", "relations", "code"],
)
def test_wheel_holds_every_file_of(wheel_names, folder, prefix, pattern):
    expected = data_files(folder, prefix)
    assert any(re.search(pattern, name) for name in expected), f"{folder.name} holds no such file"
    assert expected - wheel_names == set()


def test_wheel_from_the_sdist_holds_the_same_files(wheel_names, tmp_path):
    sdist = build(ROOT, "sdist", tmp_path / "sdist")
    with tarfile.open(sdist) as archive:
        archive.extractall(tmp_path / "source", filter="data")
    (unpacked,) = (tmp_path / "source").iterdir()
    again = build(unpacked, "wheel", tmp_path / "wheel")
    assert set(zipfile.ZipFile(again).namelist()) == wheel_names


def test_data_folders_are_found_in_the_wheel_and_in_the_checkout(wheel, tmp_path):
    zipfile.ZipFile(wheel).extractall(tmp_path)
    code = "from haloledger.paths import data_folder as f; print(f('halo_models')); print(f('demo_sightlines'))"
    for path, parent in ((tmp_path, tmp_path / "haloledger"), (ROOT / "src", ROOT)):
        env = os.environ | {"PYTHONPATH": str(path), "PYTHONDONTWRITEBYTECODE": "1"}
        run = subprocess.run([sys.executable, "-c", code], env=env, capture_output=True, text=True, check=True)
        assert run.stdout.split() == [str(parent / "halo_models"), str(parent / "demo_sightlines")]
        assert (parent / "demo_sightlines" / "bursts.ecsv").is_file()


def shell_lines(markdown: Path) -> list[str]:
    """Lines of the indented and fenced code blocks of a page."""
    text = markdown.read_text(encoding="utf-8")
    return [line.strip() for line in text.splitlines() if line.startswith(("    ", "python3 ", "haloledger "))]


def test_readme_and_ci_run_the_same_test_line():
    assert TEST_LINE in shell_lines(ROOT / "README.md")
    script = (ROOT / ".ci" / "run").read_text(encoding="utf-8").splitlines()
    commands = [line.split(" | ")[0].strip() for line in script if not line.lstrip().startswith("#")]
    assert TEST_LINE in commands


def test_readme_shows_the_demo_line():
    assert DEMO_LINE in shell_lines(ROOT / "README.md")


def test_ci_script_can_be_run_and_stops_at_the_first_fault():
    script = ROOT / ".ci" / "run"
    assert script.stat().st_mode & stat.S_IXUSR
    text = script.read_text(encoding="utf-8")
    assert text.startswith("#!/usr/bin/env bash\n")
    assert "set -euo pipefail" in text  # without pipefail a failing test run would pass through tee unseen
    subprocess.run(["bash", "-n", str(script)], check=True)
