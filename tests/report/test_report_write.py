"""Files of a run: formats, masked cells, headers, names, and that a failure leaves nothing half done."""

import hashlib
import tomllib

import numpy as np
import pandas as pd
import pytest
from astropy.io import fits
from astropy.table import Table
from synthetic import ledgers as make

from haloledger.errors import InputError
from haloledger.report import tables
from haloledger.report.names import file_name, file_names, plain, shorten
from haloledger.report.tables import SUFFIX
from haloledger.report.write import write

ASTROPY = {"ecsv": "ascii.ecsv", "csv": "ascii.csv", "fits": "fits", "votable": "votable", "parquet": "parquet"}


def read(folder, kind, table_format) -> Table:
    return Table.read(folder / f"{kind}{SUFFIX[table_format]}", format=ASTROPY[table_format])


@pytest.mark.parametrize("table_format", SUFFIX)
def test_values_and_masks_survive_the_format(ledgers, tmp_path, table_format):
    write(ledgers, tmp_path / "out", table_format)
    for kind in ("sightlines", "entries"):
        meant = Table(getattr(ledgers, kind))
        got = read(tmp_path / "out", kind, table_format)
        assert got.colnames == meant.colnames
        for name in meant.colnames:
            mask = np.asarray(getattr(meant[name], "mask", np.zeros(len(meant), bool)))
            found = np.ma.getmaskarray(np.ma.asarray(got[name]))
            if table_format == "parquet" and meant[name].dtype.kind == "f":
                found = np.isnan(got[name])  # astropy's reader turns a null into NaN
            if meant[name].dtype.kind == "U":
                # VOTable and Parquet as astropy reads it have no masked text: there it is an empty one
                blank = found | (np.ma.getdata(got[name]).astype(str) == "")
                np.testing.assert_array_equal(blank, mask, err_msg=name)
                assert list(got[name][~mask].astype(str)) == list(meant[name][~mask])
            else:
                np.testing.assert_array_equal(found, mask, err_msg=name)
                # no format rounds: the digits written are all there are
                np.testing.assert_array_equal(np.ma.getdata(got[name])[~mask], np.ma.getdata(meant[name])[~mask])


@pytest.mark.parametrize("table_format", ["ecsv", "fits", "votable", "parquet"])
def test_every_header_carries_unit_and_meaning(ledgers, tmp_path, table_format):
    write(ledgers, tmp_path / "out", table_format)
    got = read(tmp_path / "out", "entries", table_format)
    assert str(got["dm_p50"].unit.to_string()) == "pc / cm3"
    assert str(got["sep_arcmin"].unit) == "arcmin"
    for kind in ("sightlines", "entries"):
        table = read(tmp_path / "out", kind, table_format)
        assert [n for n in table.colnames if not table[n].description] == []


def test_fits_comment_keyword_holds_the_meaning(ledgers, tmp_path):
    write(ledgers, tmp_path / "out", "fits")
    header = fits.getheader(tmp_path / "out" / "sightlines.fits", 1)
    assert header["TTYPE6"] == "dm"
    assert header["TCOMM6"] == "observed dispersion measure"
    assert header["TUNIT6"] == "pc cm-3"


def test_csv_has_a_legend_for_what_its_header_cannot_hold(ledgers, tmp_path):
    write(ledgers, tmp_path / "out", "csv")
    legend = pd.read_csv(tmp_path / "out" / "columns.csv").set_index(["table", "column"])
    assert legend.loc[("entries", "impact_kpc_p50"), "unit"] == "kpc"
    assert "negative values are results" in legend.loc[("sightlines", "dm_after_all_p50"), "meaning"]
    for kind in ("sightlines", "entries", "refused"):
        assert list(pd.read_csv(tmp_path / "out" / f"{kind}.csv").columns) == list(legend.loc[kind].index)


def test_parquet_nulls_are_seen_by_pandas(ledgers, tmp_path):
    write(ledgers, tmp_path / "out", "parquet")
    frame = pd.read_parquet(tmp_path / "out" / "entries.parquet")
    assert frame["dm_mean"].isna().sum() == 4  # the row `shared` of each ledger
    assert (frame["halo"] == "shared").sum() == 4


def test_refused_rows_are_listed_only_where_there_are_some(ledgers, tmp_path):
    write(ledgers, tmp_path / "some")
    got = read(tmp_path / "some", "refused", "ecsv")
    assert (got["row"][0], got["advice"][0]) == (17, "Dec in degrees between -90 and 90")
    ledgers.refused = []
    write(ledgers, tmp_path / "none")
    assert not (tmp_path / "none" / "refused.ecsv").exists()


def test_run_file_lists_inputs_models_and_the_sum_of_every_file(ledgers, tmp_path):
    ledgers.run |= {"nothing": None, "count": np.int64(4), "model_text": {"blended": 'name = "a"\n"""\\x'}}
    paths = write(ledgers, tmp_path / "out")
    run = tomllib.loads((tmp_path / "out" / "run.toml").read_text())
    assert (run["seed"], run["count"], "nothing" in run) == (1, 4, False)
    assert run["model_text"]["blended"] == 'name = "a"\n"""\\x'
    assert set(run["files"]) | {"run.toml"} == {p.name for p in paths}
    for name, digest in run["files"].items():
        assert hashlib.sha256((tmp_path / "out" / name).read_bytes()).hexdigest() == digest


def test_draws_keep_the_index_of_the_universe(ledgers, tmp_path):
    index = pd.MultiIndex.from_product([["A"], ["blended"], range(3)], names=["burst", "model", "universe"])
    ledgers.draws = pd.DataFrame({"dm_foreground": [1.0, 2.0, 3.0]}, index=index)
    write(ledgers, tmp_path / "out")
    pd.testing.assert_frame_equal(pd.read_parquet(tmp_path / "out" / "draws.parquet"), ledgers.draws)
    from pyarrow import parquet

    field = parquet.read_schema(tmp_path / "out" / "draws.parquet").field("dm_foreground")
    assert field.metadata[b"unit"] == b"pc cm-3"


def test_stale_files_of_an_earlier_run_go_and_those_of_others_stay(ledgers, tmp_path):
    out = tmp_path / "out"
    write(ledgers, out, "csv")
    (out / "my_notes.txt").write_text("mine")
    ledgers.refused = []
    write(ledgers, out, "fits")
    assert {p.name for p in out.iterdir()} == {"sightlines.fits", "entries.fits", "run.toml", "my_notes.txt"}


def test_a_run_file_cannot_name_files_outside_its_folder(ledgers, tmp_path):
    out = tmp_path / "out"
    write(ledgers, out)
    victim = tmp_path / "victim.txt"
    victim.write_text("kept")
    text = (
        out / "run.toml"
    ).read_text() + f'"../victim.txt" = "0"\n"{victim}" = "0"\n"figures/../../victim.txt" = "0"\n'
    (out / "run.toml").write_text(text)
    write(ledgers, out)
    assert victim.read_text() == "kept"


def test_a_folder_that_is_not_ours_is_refused(ledgers, tmp_path):
    (tmp_path / "thesis.tex").write_text("mine")
    with pytest.raises(InputError, match=r"no run\.toml of an earlier run.*Name a new or empty folder"):
        write(ledgers, tmp_path)
    (tmp_path / "run.toml").write_text("title = 'another program'")
    with pytest.raises(InputError, match=r"no run\.toml of an earlier run"):
        write(ledgers, tmp_path)
    with pytest.raises(InputError, match="is a file; results go into a folder"):
        write(ledgers, tmp_path / "thesis.tex")
    assert {p.name for p in tmp_path.iterdir()} == {"thesis.tex", "run.toml"}


def test_unknown_format_lists_the_known_ones(ledgers, tmp_path):
    with pytest.raises(InputError, match=r"No table format 'hdf5'\. Write one of: ecsv, csv, fits, votable, parquet"):
        write(ledgers, tmp_path / "out", "hdf5")


@pytest.mark.parametrize("fault", [OSError("disk full"), KeyboardInterrupt()])
def test_a_failing_writer_leaves_nothing_behind(ledgers, tmp_path, monkeypatch, fault):
    def fails_on_entries(table, path, table_format):
        path.write_text("half a tab")
        if path.name.startswith("entries"):
            raise fault

    monkeypatch.setattr(tables, "write_table", fails_on_entries)
    with pytest.raises(type(fault)):
        write(ledgers, tmp_path / "out")
    assert list(tmp_path.iterdir()) == []


def test_a_failing_second_run_leaves_the_first_as_it_was(ledgers, tmp_path, monkeypatch):
    out = tmp_path / "out"
    before = {p: p.read_bytes() for p in write(ledgers, out)}
    monkeypatch.setattr(tables, "write_draws", lambda *_: (_ for _ in ()).throw(OSError("disk full")))
    ledgers.draws = pd.DataFrame({"x": [1.0]})
    with pytest.raises(OSError, match="disk full"):
        write(ledgers, out, "csv")
    assert {p: p.read_bytes() for p in out.iterdir()} == before
    assert list(tmp_path.iterdir()) == [out]


def test_hostile_names_are_data(tmp_path):
    names = ("../../x", "<script>alert(1)</script>")
    hostile = make(names=names, halo="[red]é\u202e:")
    for table_format in SUFFIX:
        write(hostile, tmp_path / table_format, table_format)
        assert sorted(set(read(tmp_path / table_format, "sightlines", table_format)["burst"])) == sorted(names)
    assert sorted(p.name for p in tmp_path.iterdir()) == sorted(SUFFIX)


def test_file_names_are_clean_and_different():
    assert file_name("../../etc/passwd") == "etc_passwd"
    assert file_name("...") == "unnamed"
    assert file_name("FRB 20220319D (host é)") == "FRB_20220319D_host_e"
    assert file_names(["a/b", "a b", "A_B"]) == {"a/b": "a_b", "a b": "a_b-2", "A_B": "A_B-3"}


def test_long_names_keep_both_ends_and_their_catalogue():
    assert shorten("kourkchi-tully:700028630", 22) == "kourkchi-tully:700…630"
    assert shorten("kourkchi-tully:700028630", 20) == "kourkchi-…:700028630"  # no room for the whole label
    assert shorten("short", 22) == "short"
    assert [len(shorten("x" * 40, n)) for n in (8, 9, 40)] == [8, 9, 40]


def test_plain_text_cannot_steer_a_terminal():
    assert plain("a\x1b[31mb\nc") == "a?[31mb?c"
