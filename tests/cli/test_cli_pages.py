"""`models`, `cards` and `demo` as a user meets them."""

import subprocess
import sys

import numpy as np
import pytest
from astropy.table import Table
from click.testing import CliRunner

from haloledger.cli import exit_codes
from haloledger.cli.group import cli


def run(*args: str):
    return CliRunner().invoke(cli, list(args), prog_name="haloledger", env={"COLUMNS": "120"})


def test_models_lists_every_shipped_model():
    from haloledger.gas.models import model_names

    done = run("models")
    assert done.exit_code == exit_codes.DONE, done.output
    rows = {x.split()[0]: x for x in done.stdout.splitlines() if x.strip()}
    assert set(model_names()) <= set(rows)
    assert model_names()


@pytest.mark.parametrize("columns", ["60", "72", "120"])
def test_model_names_stay_apart_on_any_screen(columns):
    from haloledger.gas.models import model_names

    done = CliRunner().invoke(cli, ["models"], prog_name="haloledger", env={"COLUMNS": columns})
    lines = done.stdout.split("kept: gas inside")[0].splitlines()
    assert max(map(len, lines)) <= int(columns)
    assert "…" not in "".join(lines)
    table = "".join(lines).replace(" ", "")
    assert all(name in table or name.rpartition("-")[0] in table for name in model_names())
    assert "A wider screen shows more columns." in done.stdout


def test_kept_fractions_on_screen_are_those_of_the_model(planck):
    from haloledger.cosmos.concentration import concentration
    from haloledger.gas.models import load_model

    model = load_model("textbook-modified-nfw")
    done = run("models", "textbook-modified-nfw")
    row = next(x.split() for x in done.stdout.splitlines() if x.startswith("12.0"))
    c200c = concentration(model.concentration, np.array([12.0]), 0.0, planck)
    assert float(row[1]) == pytest.approx(float(c200c[0]), abs=0.05)  # one decimal is printed
    # kept 0.75 of f_b M200c inside r200c by the file's own words; nothing beyond, so less of a larger total mass
    assert float(row[3]) == 0.75
    assert float(row[4].rstrip("!")) == pytest.approx(float(model.kept(12.0, 0.0, c200c, planck, 2.0)[0]), abs=5e-4)
    assert "Dutton" in done.stdout
    assert "log10 M200c" in done.stdout


def test_a_model_that_holds_too_much_is_marked():
    done = run("models", "textbook-modified-nfw-wide")
    row = next(x.split() for x in done.stdout.splitlines() if x.startswith("12.0"))
    assert row[4].endswith("!")  # 0.75 inside r200c and as much again outside is more than there is
    assert not row[3].endswith("!")
    assert "! more than is left beside the stars" in done.stdout


def test_models_plots_png_and_svg(tmp_path):
    for suffix in ("png", "svg"):
        path = tmp_path / f"m.{suffix}"
        done = run("models", "nfw-tracing", "--plot", str(path), "--mass", "12", "--mass", "14.5")
        assert done.exit_code == exit_codes.DONE, done.output
        assert path.stat().st_size > 5000
        assert done.stderr == f"Picture written: {path}\n"


def test_models_messages():
    done = run("models", "textbook-modified-nwf")
    assert done.exit_code == exit_codes.BAD_INPUT
    assert "Did you mean 'textbook-modified-nfw'?" in done.stderr
    assert "--plot and --mass need a model" in run("models", "--plot", "a.png").stderr
    assert "pictures are written as .png or .svg" in run("models", "nfw-tracing", "--plot", "a.pdf").stderr


def test_cards_lists_and_explains():
    from haloledger.catalogs.cards import card_names

    done = run("cards")
    assert done.exit_code == exit_codes.DONE, done.output
    assert set(card_names()) <= {x.split()[0] for x in done.stdout.splitlines() if x.strip()}
    one = run("cards", "mcxc")
    assert "Piffaretti et al. 2011" in one.stdout
    wrong = run("cards", "mcxx")
    assert wrong.exit_code == exit_codes.BAD_INPUT
    assert "Did you mean 'mcxc'?" in wrong.stderr


def test_demo_writes_tables_and_a_picture_per_burst(tmp_path):
    done = subprocess.run(
        [sys.executable, "-m", "haloledger", "demo"], cwd=tmp_path, capture_output=True, text=True, timeout=120
    )
    assert done.returncode == exit_codes.DONE, done.stderr
    out = tmp_path / "demo_out"
    sightlines = Table.read(out / "sightlines.ecsv")
    bursts = sorted(set(sightlines["burst"]))
    assert len(bursts) == 8
    assert sorted(p.stem for p in (out / "figures").iterdir()) == bursts
    for burst in bursts:
        assert burst in done.stdout
    assert "Tables and pictures of the demo are in demo_out" in done.stderr
    assert "arning" not in done.stderr
    assert [p.name for p in tmp_path.iterdir()] == ["demo_out"]


def test_demo_does_not_write_over_what_is_not_its_own(tmp_path):
    (tmp_path / "letter.txt").write_text("mine")
    done = run("demo", "--out", str(tmp_path))
    assert done.exit_code == exit_codes.BAD_INPUT
    assert "Name a new or empty folder" in done.stderr
    assert [p.name for p in tmp_path.iterdir()] == ["letter.txt"]
