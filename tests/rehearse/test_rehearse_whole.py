"""The rehearsal from end to end: calibrated where the audit is given what it assumes, and not where it is not."""

import numpy as np
import pytest
from click.testing import CliRunner

from haloledger.errors import InputError
from haloledger.rehearse.rehearsal import rehearsals, rehearse, true_sums
from haloledger.rehearse.sky.files import read_sky, write_sky
from haloledger.rehearse.sky.simulate import Truth
from haloledger.rehearse.survey import Survey

LINES = 200
SIMPLE = {"lines": LINES, "cells": 64, "cell_mpc": 6.0, "satellites": "none", "host_is_satellite": 0.0}


@pytest.fixture(scope="module")
def simple():
    """Central galaxies only, with spectra: the sky in which only masses and geometry are uncertain."""
    return rehearse(Truth(**SIMPLE), Survey(groups="none"), draws=200, seed=2)


def test_intervals_hold_the_truth(simple):
    # 200 lines: gross faults only; the full run is the command's
    assert simple.rows[0].worst < 3.5
    assert simple.rows[1].worst < 3.5
    assert abs(simple.rows[0].bias) < 4 * simple.rows[0].bias_error / simple.rows[0].mean_truth


def test_a_wrong_zero_point_breaks_calibration():
    off = rehearse(Truth(**SIMPLE), Survey(groups="none"), draws=200, seed=2, hold={"zero_point": "-0.5"})
    assert off.rows[1].worst > 5
    assert off.rows[0].bias > 0.3


def test_scores_add_up(simple):
    assert simple.truth.mean() == pytest.approx(simple.rows[0].mean_truth)
    entries = sum(predicted for _, _, predicted in simple.entry_bias.values())
    assert entries == pytest.approx(simple.sums.mean() + simple.audited.at_source.mean(), rel=1e-4)
    listed, unlisted = true_sums(simple.sky, simple.seen)
    front = ~simple.sky.haloes.holds_burst
    assert (listed + unlisted).sum() == pytest.approx(simple.sky.dm[front].sum())


def test_ideal_posterior_is_calibrated_and_no_wider():
    from haloledger.rehearse.score import ranks, tables

    truth = {**SIMPLE, "lines": 120}
    results, best = rehearsals(truth, {"groups": "none"}, ideal=True, draws=200, seed=3)
    (name,) = results
    rank = ranks(best[name].sums, results[name].truth, np.random.default_rng(1))
    assert tables(rank, best[name].sums, results[name].truth)[0].worst < 3.5
    assert 0.8 < results[name].width / best[name].width < 1.3


def test_a_sky_in_a_file_is_the_same_sky(sky, tmp_path, planck):
    path = tmp_path / "sky.fits"
    write_sky(sky, path)
    back = read_sky(path)
    np.testing.assert_array_equal(back.dm, sky.dm)
    np.testing.assert_array_equal(back.haloes.holds_burst, sky.haloes.holds_burst)
    np.testing.assert_array_equal(back.galaxies.central, sky.galaxies.central)
    result = rehearse(sky=str(path), draws=60)
    assert len(result.truth) == len(sky.lines)


@pytest.mark.parametrize(
    ("table", "column", "value", "said"),
    [
        ("HALOES", "dm", None, "table HALOES has no column 'dm'. It needs line"),
        ("GALAXIES", "halo", 10**7, "table GALAXIES, row 1: halo = 10000000 points to no row of HALOES"),
        ("HALOES", "log_m200c", np.nan, "table HALOES, row 1: 'log_m200c' is not a number"),
    ],
)
def test_a_bad_sky_is_named(sky, tmp_path, table, column, value, said):
    from astropy.io import fits
    from astropy.table import Table

    path = tmp_path / "sky.fits"
    write_sky(sky, path)
    with fits.open(path) as file:
        data = Table(file[table].data)
        if value is None:
            data.remove_column(column)
        else:
            data[column][0] = value
        new = fits.table_to_hdu(data)
        new.name = table
        file[table] = new
        file.writeto(path.with_name("bad.fits"))
    with pytest.raises(InputError, match=said.replace("(", r"\(")):
        read_sky(path.with_name("bad.fits"))


@pytest.mark.parametrize(
    ("truth", "survey", "options", "said"),
    [
        ({"lines": 3}, {}, {}, "--sightlines 3: too few"),
        ({}, {}, {"draws": 5}, "--draws 5: too few"),
        ({}, {"outliers": 1.5}, {}, "--outliers 1.5: a share"),
        ({}, {"photoz": 0.5}, {}, "--photoz 0.5: the error over"),
        ({}, {}, {"model": "blendd"}, "--model blendd: the true sky has no gas"),
        ({}, {}, {"sky": "nowhere.fits"}, "--sky nowhere.fits: no such file"),
        ({"relation": "mostr"}, {}, {}, "relation 'mostr' is not known"),
        ({}, {"photoz": 0.03}, {"ideal": True}, "--ideal: it is worked out"),
    ],
)
def test_bad_input_is_refused_with_what_to_write(truth, survey, options, said):
    with pytest.raises(InputError, match=said):
        rehearsals(truth, survey, **options)


def test_command_writes_its_files(tmp_path):
    from astropy.table import Table

    from haloledger.cli.rehearse import command

    out = tmp_path / "out"
    args = ["--sightlines", "30", "--draws", "60", "--groups", "none", "--out", str(out)]
    run = CliRunner().invoke(command, args, standalone_mode=False)
    assert run.exception is None, run.exception
    assert "holds the burst" in run.output
    assert sorted(p.name for p in out.iterdir()) == ["calibration.ecsv", "pp.png", "run.toml", "sums.ecsv"]
    table = Table.read(out / "calibration.ecsv")
    assert table["n"][0] == 30
    assert len(Table.read(out / "sums.ecsv")) == 30
    again = CliRunner().invoke(command, args, standalone_mode=False)  # an earlier run may be written over
    assert again.exception is None


def test_another_folder_is_left_alone(tmp_path):
    from haloledger.cli.rehearse import command

    (tmp_path / "letter.txt").write_text("dear")
    with pytest.raises(InputError, match="nothing is written over"):
        CliRunner().invoke(command, ["--out", str(tmp_path)], standalone_mode=False, catch_exceptions=False)
