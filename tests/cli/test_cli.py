"""The command line: help, exit statuses, streams, messages."""

import os
import subprocess
import sys
import time
from pathlib import Path

import pytest
from click.testing import CliRunner

from haloledger import __version__
from haloledger.cli import exit_codes
from haloledger.cli.group import COMMANDS, cli
from haloledger.cli.talk import level
from haloledger.errors import HaloledgerError, InputError

PROGRAM = [sys.executable, "-m", "haloledger"]


def run(*args: str, **kwargs):
    return CliRunner().invoke(cli, list(args), prog_name="haloledger", **kwargs)


def process(*args: str, **kwargs) -> subprocess.CompletedProcess:
    return subprocess.run([*PROGRAM, *args], capture_output=True, text=True, timeout=120, **kwargs)


def test_help_is_fast():
    times = []
    for _ in range(3):
        start = time.perf_counter()
        done = process("--help")
        times.append(time.perf_counter() - start)
        assert done.returncode == 0
    assert min(times) < 0.5  # best of three: other work on the machine is not ours
    assert "audit" in done.stdout


@pytest.mark.parametrize("args", [["--help"], ["--version"], [], ["audit", "--help"], ["demo", "--help"]])
def test_help_imports_nothing_heavy(args):
    code = (
        "import sys\nfrom haloledger.cli.group import cli\n"
        f"try:\n    cli({args!r}, prog_name='haloledger')\n"
        "except SystemExit as end:\n    assert end.code == 0, end.code\n"
        "print(sorted({'numpy', 'astropy', 'scipy', 'pandas', 'matplotlib', 'rich', 'colossus'} & set(sys.modules)))"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, timeout=60)
    assert done.stdout.rstrip().endswith("[]"), done.stdout + done.stderr


@pytest.mark.parametrize("name", COMMANDS)
def test_every_command_has_help_with_an_example_and_the_statuses(name):
    done = run(name, "--help")
    assert done.exit_code == 0
    assert f"haloledger {name}" in done.output.split("Example:")[1]
    refuses = name in ("audit", "demo")  # the others have no sightlines to refuse
    assert " ".join(done.output.split()).endswith(exit_codes.HELP if refuses else exit_codes.PAGES)


def test_examples_in_the_help_can_be_parsed():
    """The options of every example exist: parsing stops at nothing but missing files."""
    import shlex
    from importlib import import_module

    for name, (module, _) in COMMANDS.items():
        text = import_module(module).EXAMPLE.replace("\\\n", " ")
        for line in filter(None, map(str.strip, text.splitlines())):
            program, command, *args = shlex.split(line)
            assert program == "haloledger"
            import_module(COMMANDS[command][0]).command.make_context(name, args)


def test_help_groups_options():
    done = run("audit", "--help")
    heads = [x.strip() for x in done.output.splitlines() if x.endswith(":") and not x.startswith(" ")]
    assert heads == [
        "Input:",
        "Gas and draws:",
        "Output:",
        "Talk:",
        "Columns (* required):",
        "Nuisances for --hold:",
        "Example:",
    ]


def test_audit_help_lists_every_column_and_nuisance():
    from haloledger.catalogs.schema import FIELDS
    from haloledger.cli import words
    from haloledger.ledger.nuisances import NUISANCES
    from haloledger.sightlines.terms import mw_halo_laws

    assert words.NUISANCES == NUISANCES
    assert set(words.MW_HALO_LAWS) == set(mw_halo_laws())
    said = run("audit", "--help").output.split("Columns (* required):")[1]
    shown = set(said.replace("*", " ").split())
    for kind in FIELDS:
        assert set(FIELDS[kind]) <= shown
    assert "burst* (or name)" in said
    assert set(NUISANCES) <= shown
    assert set(mw_halo_laws()) <= {word.rstrip(",") for word in shown}
    assert "MOC FITS or polygon text" in " ".join(run("audit", "--help").output.split())


def test_aliases_in_the_help_are_read(tmp_path):
    from haloledger.catalogs import read_bursts
    from haloledger.cli.words import ALIASES

    header = {"burst": "b1", "ra": "10", "dec": "20", "z": "0.1", "dm": "300"}
    for column, other in ALIASES.items():
        path = tmp_path / f"{other}.csv"
        path.write_text(",".join(other if c == column else c for c in header) + "\n" + ",".join(header.values()) + "\n")
        assert list(read_bursts(str(path)).burst) == ["b1"]


def test_bare_command_orients_and_ends_well():
    done = run()
    assert done.exit_code == exit_codes.DONE
    assert "haloledger demo" in done.output
    assert "All commands: haloledger --help" in done.output


def test_version():
    assert run("--version").output == f"haloledger {__version__}\n"


def test_a_mistyped_command_gets_its_neighbour():
    done = run("audti")
    assert done.exit_code == exit_codes.BAD_INPUT
    assert "No command 'audti'. Did you mean 'audit'?" in done.stderr
    assert "Commands: audit, rehearse, models, cards, demo." in run("xyzzy").stderr


def test_a_mistyped_option_gets_its_neighbour():
    done = run("audit", "b.csv", "--galaxie", "g.csv")
    assert done.exit_code == exit_codes.BAD_INPUT
    assert "--galaxies" in done.stderr


def test_options_reach_the_function(asked):
    done = run(
        *("audit", "b.csv", "--galaxies", "2mpp:a.fits", "--galaxies", "b.csv", "--groups", "mcxc:c.csv"),
        *("--footprint", "f.txt", "--model", "blended", "--model", "own.toml", "--draws", "50", "--seed", "7"),
        *("--cosmology", "WMAP9", "--fixed", "--hold", "zero_point=0", "--hold", "relation=moster2013"),
        *("--disc", "ne2001"),
    )
    assert done.exit_code == exit_codes.REFUSED, done.output
    progress = asked.pop("progress")
    assert progress is None  # no terminal, nobody sees a bar
    assert asked == {
        "bursts": "b.csv",
        "galaxies": ("2mpp:a.fits", "b.csv"),
        "groups": ("mcxc:c.csv",),
        "footprints": ("f.txt",),
        "models": ("blended", "own.toml"),
        "draws": 50,
        "seed": 7,
        "cosmology": "WMAP9",
        "fixed": True,
        "hold": {"zero_point": "0", "relation": "moster2013"},
        "disc": "ne2001",
        "overrides": None,
        "local": True,
        "source_in_sum": False,
        "combine": "weighted",
        "keep_draws": False,
    }
    run("audit", "b.csv", "--no-local", "--source-in-sum", "--overrides", "o.toml")
    assert (asked["local"], asked["source_in_sum"], asked["overrides"]) == (False, True, "o.toml")


def test_every_option_is_an_argument_of_the_function(asked):
    """Names on both sides agree, without an audit."""
    import inspect

    from haloledger.audit import Ledgers  # noqa: F401

    run("audit", "b.csv", "--model", "blended")
    source = inspect.getsource(sys.modules["haloledger.audit"])
    signature = source[source.index("def audit(") : source.index(") -> Ledgers", source.index("def audit("))]
    for name in asked:
        assert f"    {name}" in signature, name


def test_without_model_the_default_of_the_function_is_used(asked):
    run("audit", "b.csv")
    assert "models" not in asked


def test_refused_rows_make_status_1_and_none_status_0(asked, tmp_path):
    from synthetic import ledgers

    assert run("audit", "b.csv").exit_code == exit_codes.REFUSED
    clean = ledgers()
    clean.refused = []
    asked["answer"] = clean
    assert run("audit", "b.csv").exit_code == exit_codes.DONE


def test_results_to_stdout_talk_to_stderr(asked, tmp_path):
    done = run("audit", "b.csv", "--out", str(tmp_path / "out"))
    assert "sum of listed haloes" in done.stdout
    assert "2 bursts, 2 models:" in done.stderr
    assert "2 bursts, 2 models:" not in done.stdout
    assert "\x1b" not in done.stdout + done.stderr
    assert (tmp_path / "out" / "run.toml").exists()


def test_quiet_is_silent_and_still_writes(asked, tmp_path):
    done = run("audit", "b.csv", "--out", str(tmp_path / "out"), "-q", "--format", "fits", "--figures")
    assert done.stdout + done.stderr == ""
    names = sorted(p.name for p in (tmp_path / "out").iterdir())
    assert names == ["entries.fits", "figures", "refused.fits", "run.toml", "sightlines.fits"]


@pytest.mark.parametrize("args", [["--figures"], ["--keep-draws"], ["-q"], ["--format", "csv"]])
def test_what_needs_a_folder_says_so_before_any_work(asked, args):
    done = run("audit", "b.csv", *args)
    assert done.exit_code == exit_codes.BAD_INPUT
    assert "needs a folder for the files. Add --out DIR." in done.stderr
    assert asked == {}


def test_a_second_run_says_what_became_of_the_first(asked, tmp_path):
    out = str(tmp_path / "out")
    first = run("audit", "b.csv", "--out", out, "--figures")
    assert "earlier run" not in first.stderr
    second = run("audit", "b.csv", "--out", out, "--format", "csv")
    removed = "figures/FRB20990101A.png, figures/FRB20990202B.png, entries.ecsv, refused.ecsv"
    assert f"{out} held an earlier run: 1 file replaced, 5 removed" in second.stderr
    for name in removed.split(", ")[:2]:
        assert name in second.stderr
    assert "and 1 more" in second.stderr
    third = run("audit", "b.csv", "--out", out, "--format", "csv")
    assert f"{out} held an earlier run: 5 files replaced." in third.stderr
    assert run("audit", "b.csv", "--out", out, "-q").stderr == ""


def test_verbose_tells_stages_with_seconds_and_counts_and_very_verbose_the_notes(asked):
    done = run("audit", "b.csv", "-v")
    progress = asked["progress"]
    assert progress is not None
    assert "haloledger: blended: 8 pairs of a burst and a halo it meets in some draw, 4 haloes in all" in done.stderr
    assert "1 row refused" in done.stderr
    assert "outside the footprint" not in done.stderr
    assert "haloledger:" not in done.stdout
    more = run("audit", "b.csv", "-vv")
    assert "haloledger: FRB20990101A, blended: outside the footprint of the survey" in more.stderr
    assert "haloledger:" not in run("audit", "b.csv").stderr


def test_stages_are_timed(caplog):
    import logging

    from haloledger.cli.talk import Stages

    with caplog.at_level(logging.INFO, logger="haloledger"):
        stages = Stages()
        stages(0, 1, "reading")
        stages(0, 40, "sightlines")
        stages(40, 40, "sightlines")
        stages.close()
        stages.close()
    said = [record.getMessage() for record in caplog.records]
    assert [line.rpartition(":")[0] for line in said] == ["reading", "sightlines (40)"]
    assert all(line.endswith(" s") for line in said)


def test_a_folder_of_somebody_else_is_refused_before_any_work(asked, tmp_path):
    (tmp_path / "thesis.tex").write_text("mine")
    done = run("audit", "b.csv", "--out", str(tmp_path))
    assert done.exit_code == exit_codes.BAD_INPUT
    assert "Name a new or empty folder" in done.stderr
    assert asked == {}


@pytest.mark.parametrize(
    ("given", "said"),
    [
        (["--hold", "zero_point"], "'zero_point' is not NUISANCE=VALUE. Write for example --hold zero_point=0."),
        (["--hold", "=3"], "'=3' is not NUISANCE=VALUE"),
        (["--hold", "kept=1", "--hold", "kept=2"], "'kept' is held twice. Give it once."),
        (["--draws", "0"], "--draws"),
        (["--disc", "flat"], "'flat' is not one of"),
        (["--format", "xls"], "'xls' is not one of"),
    ],
)
def test_bad_options_are_status_2(asked, given, said):
    done = run("audit", "b.csv", "--out", "never", *given)
    assert done.exit_code == exit_codes.BAD_INPUT
    assert said in done.stderr
    assert asked == {}


def answer_with(monkeypatch, fault):
    import haloledger.audit  # noqa: F401

    def fails(**_):
        raise fault

    monkeypatch.setattr(sys.modules["haloledger.audit"], "audit", fails)


def test_bad_input_is_status_2_and_its_message(monkeypatch, tmp_path):
    answer_with(monkeypatch, InputError("b.csv: no column 'z'.\nDid you mean 'zed\x1b[31m'?"))
    done = run("audit", "b.csv", "--out", str(tmp_path / "out"))
    assert done.exit_code == exit_codes.BAD_INPUT
    assert done.stderr == "Error: b.csv: no column 'z'.\nDid you mean 'zed?[31m'?\n"
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize("fault", [ZeroDivisionError("division by zero"), HaloledgerError("no table for this model")])
def test_a_fault_of_ours_is_status_3_with_a_log_and_no_traceback(monkeypatch, tmp_path, fault):
    monkeypatch.setattr("tempfile.tempdir", str(tmp_path))
    answer_with(monkeypatch, fault)
    done = run("audit", "b.csv")
    assert done.exit_code == exit_codes.FAULT
    assert "this is a fault of haloledger" in done.stderr
    assert "Please report it" in done.stderr
    assert "Traceback" not in done.output
    (log,) = tmp_path.iterdir()
    assert str(log) in done.stderr
    assert "Traceback" in log.read_text()
    assert f"haloledger {__version__}" in log.read_text()


def test_ctrl_c_is_clean(monkeypatch, tmp_path):
    answer_with(monkeypatch, KeyboardInterrupt())
    done = run("audit", "b.csv", "--out", str(tmp_path / "out"))
    assert done.exit_code == exit_codes.STOPPED
    assert done.stderr.strip() == "Stopped. Files are written in one go at the end, so none is half written."
    assert list(tmp_path.iterdir()) == []


def test_verbosity_is_arithmetic():
    import logging

    assert [level(False, v) for v in (0, 1, 2, 5)] == [logging.WARNING, logging.INFO, logging.DEBUG, logging.DEBUG]
    assert level(True, 0) == logging.ERROR


def test_statuses_of_the_real_program(tmp_path):
    assert process().returncode == exit_codes.DONE
    assert process("audit").returncode == exit_codes.BAD_INPUT  # click's own usage error
    absent = process("audit", "absent.csv", "--galaxies", "absent_too.csv", "--out", "out", cwd=tmp_path)
    assert absent.returncode == exit_codes.BAD_INPUT, absent.stderr
    assert "absent.csv" in absent.stderr
    assert "Traceback" not in absent.stderr
    assert absent.stdout == ""
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize("args", ["models", "cards", "audit --help", "audit b.csv"])
def test_a_reader_that_goes_away_is_no_error(tmp_path, args):
    """The reader is gone before anything is written: the status is that of a closed pipe, no error is said."""
    code = (
        "import sys\n"
        "import haloledger.audit\n"
        "from synthetic import ledgers\n"
        "sys.modules['haloledger.audit'].audit = lambda **_: ledgers()\n"
        "sys.stdin.readline()\n"  # until the reader is gone
        "from haloledger.cli import main\n"
        f"sys.argv[1:] = {args.split()!r}\n"
        "main()\n"
    )
    read, write = os.pipe()
    env = {**os.environ, "PYTHONPATH": str(Path(__file__).parents[1] / "report")}
    pipes = {"stdin": subprocess.PIPE, "stdout": write, "stderr": subprocess.PIPE}
    program = subprocess.Popen([sys.executable, "-c", code], cwd=tmp_path, env=env, text=True, **pipes)
    os.close(write)
    os.close(read)
    _, said = program.communicate("\n", timeout=120)
    assert "rror" not in said
    assert "Traceback" not in said
    assert program.returncode == exit_codes.PIPE_CLOSED
