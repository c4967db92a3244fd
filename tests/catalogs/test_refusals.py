"""Bad input: each refusal names the row or column, what was found and what to write instead."""

import numpy as np
import pytest
from astropy import units as u
from astropy.cosmology.units import littleh
from astropy.table import MaskedColumn, QTable, Table

from haloledger.catalogs import read_bursts, read_galaxies, read_groups
from haloledger.errors import InputError

GOOD = {"id": ["good", "bad"], "ra": [10.0, 20.0], "dec": [0.0, 1.0], "z": [0.1, 0.2]}
GROUPS = {**GOOD, "log_mass": [14.0, 13.0], "mass_def": ["200c", "200c"]}
BURSTS = {"burst": ["good", "bad"], "ra": [10.0, 20.0], "dec": [0.0, 1.0], "z": [0.1, 0.2], "dm": [300.0, 400.0]}
READ = {"galaxies": (read_galaxies, GOOD), "groups": (read_groups, GROUPS), "bursts": (read_bursts, BURSTS)}

ROWS = [  # kind, column, cells, found, advice
    ("galaxies", "ra", [10.0, 360.5], "360.5", "from 0 to 360"),
    ("galaxies", "ra", [10.0, -0.5], "-0.5", "from 0 to 360"),
    ("galaxies", "dec", [0.0, 90.5], "90.5", "from -90 to 90"),
    ("galaxies", "ra", [10.0, np.nan], "nothing", "decimal degrees"),
    ("galaxies", "dec", MaskedColumn([0.0, 1.0], mask=[False, True]), "nothing", "decimal degrees"),
    ("galaxies", "ra", ["10", "12:30:00"], "'12:30:00'", "decimal degrees"),
    ("galaxies", "z", [0.1, np.nan], "nothing", "redshift, or a distance"),
    ("galaxies", "z", MaskedColumn([0.1, 0.2], mask=[False, True]), "nothing", "redshift, or a distance"),
    ("galaxies", "z", [0.1, -0.001], "-0.001", "needs a distance"),
    ("galaxies", "z", [0.1, 0.0], "0", "needs a distance"),
    ("galaxies", "z", [0.1, 1283.0], "1283", "divided by 299792.458"),
    ("galaxies", "z", [0.1, np.inf], "inf", "finite number"),
    ("galaxies", "z_err", [0.1, -0.1], "-0.1", "zero or a positive number"),
    ("galaxies", "z_kind", ["spec", "guess"], "guess", "'spec' or 'phot'"),
    ("galaxies", "id", ["good", "good"], "'good' again, first in row 1", "its own name"),
    ("galaxies", "id", ["good", ""], "nothing", "a name of its own"),
    ("galaxies", "log_mstar", [10.0, 3e10], "3e+10", "not a logarithm"),
    ("galaxies", "log_mstar", [10.0, -1.0], "-1", "lies between"),
    ("galaxies", "log_m200c", [12.0, 1.5], "1.5", "no 1e14 units"),
    ("galaxies", "distance_mpc", [10.0, 0.0], "0", "positive distance"),
    ("groups", "log_mass", [14.0, 1e14], "1e+14", "not a logarithm"),
    ("groups", "log_mass", [14.0, 4.28], "4.28", "no 1e14 units"),
    ("groups", "log_mass", [14.0, 16.4], "16.4", "More than any cluster"),
    ("groups", "log_mass", [14.0, np.nan], "nothing", "log10 of the mass"),
    ("groups", "mass_def", ["200c", ""], "nothing", "mass without definition: write one of 200c, 500c"),
    ("groups", "mass_def", ["200c", "200b"], "200b", "Did you mean '200"),
    ("groups", "sigma_v", [100.0, -5.0], "-5", "zero or a positive number"),
    ("bursts", "dm", [300.0, 0.0], "0", "above zero, in pc cm-3"),
    ("bursts", "dm", [300.0, -20.0], "-20", "above zero, in pc cm-3"),
    ("bursts", "dm", [300.0, np.nan], "nothing", "dispersion measure in pc cm-3"),
    ("bursts", "z", [0.1, -0.2], "-0.2", "leave the cell empty"),
    ("bursts", "dec", [0.0, -91.0], "-91", "from -90 to 90"),
    ("bursts", "dm_host_rest", [0.0, -3.0], "-3", "zero or a positive number"),
]  # fmt: skip


@pytest.mark.parametrize(("kind", "column", "cells", "found", "advice"), ROWS)
def test_a_bad_row_costs_that_row(kind, column, cells, found, advice):
    read, good = READ[kind]
    got = read(Table({**good, column: cells}))
    assert len(got) == 1
    (refusal,) = got.refused
    assert refusal.row == 2
    assert refusal.column == column
    assert refusal.file == f"the {kind} table"
    assert refusal.found == found
    assert advice in refusal.advice
    if column not in ("id", "burst"):
        assert refusal.name == "bad"


def test_later_duplicates_go_and_the_first_stays():
    table = {"id": ["a", "b", "a", "a"], "ra": [1, 2, 3, 4], "dec": [0, 0, 0, 0], "z": [0.1] * 4}
    got = read_galaxies(Table(table))
    assert got.ra_deg.tolist() == [1, 2]
    assert [r.row for r in got.refused] == [3, 4]


def test_negative_redshift_stands_with_a_distance():
    got = read_galaxies(Table({**GOOD, "z": [-0.001, 0.2], "distance_mpc": [0.76, np.nan]}))
    assert len(got) == 2
    assert got.z[0] == -0.001


def test_major_axis_smaller_than_minor():
    axes = {"loc_major_arcsec": [2.0, 1.0], "loc_minor_arcsec": [1.0, 2.0], "loc_pa_deg": [0.0, 0.0]}
    for table in (Table({**BURSTS, **axes}), Table({**BURSTS, **axes, "loc_pa_deg": [0.0, np.nan]})):
        (refusal,) = read_bursts(table).refused
        assert refusal.found == "major axis 1 arcsec smaller than the minor, 2"
        assert "Exchange the two" in refusal.advice
        assert refusal.row == 2


FILES = [  # kind, changed columns (None = left out), message
    ("galaxies", {"dec": None}, r"no column 'dec' for galaxies among id, ra, z\. Add it \(declination, ICRS, deg\)"),
    ("galaxies", {"z": None, "zz": [0.1, 0.2]}, r"no column 'z'.* Did you mean 'zz'\?"),
    ("galaxies", {"dec": None, "decl": [0.0, 1.0]}, r"Did you mean 'decl'\? Rename it, or read the file .* a card"),
    ("galaxies", {"log_mstar_h": [10.0, 10.0]}, r"'log_mstar_h' looks like .* carries h\. Write log10 of .* no h"),
    ("groups", {"log_mass": None, "logM_h": [14.0, 13.0]}, r"'logM_h' looks like a mass that carries h.*'log_mass'"),
    ("groups", {"mass_def": None}, r"a mass without definition.*Add 'mass_def' with 200c, 500c, 200m, 180m or vir"),
    ("bursts", {"dm_host": [1.0, 2.0]}, r"'dm_host': rest or observed frame\? Name it 'dm_host_rest'.*'dm_host_obs'"),
    ("bursts", {"burst": ["A", "A"]}, r"two bursts of one name: 'A' in rows 1, 2"),
    ("bursts", {"dm": None}, r"no column 'dm' for bursts"),
    ("bursts", {"dm": [-1.0, -2.0]}, r"all 2 rows are refused; the first, row 1 \('good'\), for 'dm': found -1"),
]  # fmt: skip


@pytest.mark.parametrize(("kind", "change", "message"), FILES)
def test_a_bad_table_costs_the_run(kind, change, message):
    read, good = READ[kind]
    columns = {k: v for k, v in {**good, **change}.items() if v is not None}
    with pytest.raises(InputError, match=message):
        read(Table(columns))


UNITS = [  # kind, column, values with a unit, message
    ("galaxies", "ra", [1.0, 2.0] * u.Mpc, r"'ra' is in 'Mpc', which does not convert to deg\. Write it in deg"),
    ("galaxies", "z", [1000.0, 2000.0] * u.km / u.s, r"'z' is in 'km / s', which does not convert to a redshift"),
    ("galaxies", "distance_mpc", [10.0, 20.0] * u.s, r"'distance_mpc' is in 's', which does not convert to Mpc"),
    ("galaxies", "distance_mpc", [10.0, 20.0] * u.Mpc / littleh, r"'distance_mpc' is in .*carries h\. Divide by h"),
    ("galaxies", "log_mstar", [10.0, 10.0] * u.kg, r"'log_mstar' is in 'kg', which does not convert to log10 of Msun"),
    ("groups", "log_mass", [14.0, 13.0] * u.Msun / littleh, r"'log_mass' is in .*carries h\. Divide by h"),
    ("bursts", "dm", [300.0, 400.0] * u.pc, r"'dm' is in 'pc', which does not convert to pc/cm3"),
    ("bursts", "loc_major_arcsec", [3.0, 4.0] * u.m, r"'loc_major_arcsec' is in 'm', which does not convert to arcsec"),
]  # fmt: skip


@pytest.mark.parametrize(("kind", "column", "values", "message"), UNITS)
def test_a_unit_that_does_not_convert(kind, column, values, message):
    read, good = READ[kind]
    with pytest.raises(InputError, match=message):
        read(QTable({**good, column: values}))


@pytest.mark.parametrize(
    ("name", "carries"),
    [
        *[(name, True) for name in ("log_mass_h", "logM_h", "m200m_hinv", "log_mstar_h-1", "halo_mass_h70")],
        *[(name, False) for name in ("mag_h", "M_H", "match", "mass", "m_h")],
    ],
)
def test_names_of_masses_that_carry_h(name, carries):
    table = Table({**GROUPS, name: [1.0, 2.0]})
    if carries:
        with pytest.raises(InputError, match="looks like a mass that carries h"):
            read_groups(table)
    else:
        assert len(read_groups(table)) == 2


@pytest.mark.parametrize("unit", ["Msun/h", "h-1 Msun", "Msun h^-1", "1e10 Msun/h", "log(Msun/h)"])
def test_h_in_a_unit_written_by_hand(tmp_path, unit):
    from astropy.io.votable import from_table

    table = Table(GROUPS)
    path = tmp_path / "g.vot"
    from_table(table).to_xml(str(path))
    text = path.read_text().replace('name="log_mass"', f'name="log_mass" unit="{unit}"')
    path.write_text(text)
    with pytest.raises(InputError, match=r"'log_mass' is in '.*h.*', which carries h\. Divide by h"):
        read_groups(path)


# ---- files ----------------------------------------------------------------------------------------------------------


def test_absent_file_with_a_near_match(tmp_path):
    (tmp_path / "galaxies.csv").write_text("id,ra,dec,z\na,1,1,0.1\n")
    with pytest.raises(InputError, match=r"galaxy\.csv: no such file\. Did you mean '.*galaxies\.csv'"):
        read_galaxies(tmp_path / "galaxy.csv")


BYTES = [  # name, content, message
    ("a.csv", b"", "is empty"),
    ("a.csv", b"id,ra,dec,z\n", "an empty list: the table has columns but no row"),
    ("a.fits", b"<!DOCTYPE html><html><body>404</body></html>", "is a web page, not a table"),
    ("a.csv", b"\n<html><head>", "is a web page, not a table"),
    ("a.fits", b"not fits at all", "named like fits but does not begin like one"),
    ("a.parquet", b"PAR1 and then nothing", "cannot be read as parquet"),
    ("a.csv.gz", b"\x1f\x8b\x08\x00cut", "cannot be opened"),
    ("a.csv", b"id,ra,dec,z\na,1,1,0.1,7,8\n", "row 1 has 6 cells, the header 4"),
    ("a.csv", b"1,2,3,4\n5,6,7,8\n", "holds numbers. Write a header line"),
    ("a.csv", b"id,ra,ra,dec,z\na,1,1,1,0.1\n", "column 'ra' stands twice"),
    ("a.xyz", b"\x00\x01\x02\x03" * 50, "is a binary file"),
    ("a.ecsv", b"# %ECSV 1.0\n# ---\n# datatype: [\nid ra\n", "cannot be read as ecsv"),
    ("a.vot", b"<?xml version='1.0'?><VOTABLE><RESOURCE>", "cannot be read as votable"),
]  # fmt: skip


@pytest.mark.parametrize(("name", "content", "message"), BYTES)
def test_what_is_no_table(tmp_path, name, content, message):
    path = tmp_path / name
    path.write_bytes(content)
    with pytest.raises(InputError, match=message) as caught:
        read_galaxies(path)
    assert str(path) in str(caught.value)


@pytest.mark.parametrize("keep", [0.3, 0.7, 0.95])
@pytest.mark.parametrize("ending", ["fits", "parquet", "vot", "csv.gz"])
def test_a_file_cut_short(tmp_path, ending, keep):
    n = 2000
    table = Table(
        {"id": np.arange(n).astype(str), "ra": np.linspace(0, 359, n), "dec": np.zeros(n), "z": np.full(n, 0.1)}
    )
    path = tmp_path / f"t.{ending}"
    if ending == "csv.gz":
        import gzip

        table.write(tmp_path / "t.csv", format="ascii.csv")
        path.write_bytes(gzip.compress((tmp_path / "t.csv").read_bytes()))
    else:
        table.write(path, format={"fits": "fits", "parquet": "parquet", "vot": "votable"}[ending])
    data = path.read_bytes()
    path.write_bytes(data[: int(len(data) * keep)])
    with pytest.raises(InputError, match=r"cannot be (read|opened)|does not begin"):
        read_galaxies(path)


def test_folder_and_wrong_object(tmp_path):
    with pytest.raises(InputError, match="is a folder"):
        read_galaxies(tmp_path)
    with pytest.raises(InputError, match=r"found a int\. Give a path"):
        read_galaxies(3)


@pytest.mark.parametrize(
    ("header", "message"),
    [
        ("log_mass [Msun/h]", "It carries h: take log10 of the mass divided by h"),
        ("mass", "Take its log10 and name it 'log_mass'"),
        ("logmass", "Rename it"),
    ],
)
def test_a_mass_under_another_name_is_told_what_to_do(tmp_path, header, message):
    path = tmp_path / "groups.csv"
    path.write_text(f"id,ra,dec,z,{header},mass_def\nA,1,2,0.1,14.2,200c\n", encoding="utf-8")
    with pytest.raises(InputError, match=message):
        read_groups(str(path))


def test_a_misspelt_burst_column_stops_the_run(tmp_path):
    path = tmp_path / "bursts.csv"
    path.write_text("burst,ra,dec,z,dm,pos_major\nA,1,2,0.1,140,600\n", encoding="utf-8")
    with pytest.raises(InputError, match=r"'pos_major' is not one of ours\. Did you mean 'loc_major_arcsec'"):
        read_bursts(str(path))
