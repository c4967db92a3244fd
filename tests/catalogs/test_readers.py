"""Reading tables with our own column names: every format, every kind of input, every default."""

import gzip
from dataclasses import fields

import numpy as np
import pytest
from astropy import units as u
from astropy.table import MaskedColumn, QTable, Table

from haloledger.catalogs import read_bursts, read_galaxies, read_groups
from haloledger.errors import InputError

FORMATS = {"ecsv": "ascii.ecsv", "csv": "ascii.csv", "fits": "fits", "vot": "votable", "parquet": "parquet"}


def galaxy_table() -> Table:
    return Table(
        {
            "id": ["NGC 1", "007", "Größe, <b>"],
            "ra": [0.25, 359.75, 180.0],
            "dec": [-90.0, 12.3456789012345, 45.0],
            "z": MaskedColumn([0.1, 0.012345678901, 0.0], mask=[False, False, True]),
            "z_err": [0.0002, 0.03, 0.0],
            "z_kind": ["spec", "phot", "spec"],
            "log_mstar": [10.5, 9.25, 8.125],
            "log_mstar_err": [0.1, 0.2, 0.3],
            "distance_mpc": MaskedColumn([0.0, 0.0, 0.76], mask=[True, True, False]),
            "mag_r": [17.5, 18.25, 4.0],
        }
    )


def same(a, b, skip=()):
    """Every array and setting of two canonical tables is equal."""
    for f in fields(a):
        if f.name in skip:
            continue
        x, y = getattr(a, f.name), getattr(b, f.name)
        if isinstance(x, dict):
            assert x.keys() == y.keys()
            for key in x:
                np.testing.assert_array_equal(x[key], y[key])
        elif isinstance(x, np.ndarray):
            np.testing.assert_array_equal(x, y, err_msg=f.name)
        else:
            assert x == y, f.name


@pytest.mark.parametrize("ending", FORMATS)
def test_round_trip_in_each_format(tmp_path, ending):
    table = galaxy_table()
    if ending == "fits":
        table["id"] = ["NGC 1", "007", "G, <b>"]  # FITS strings are ASCII
    path = tmp_path / f"galaxies.{ending}"
    table.write(path, format=FORMATS[ending])
    same(read_galaxies(path), read_galaxies(table))  # to the last bit


def test_fits_without_its_last_padding_is_whole(tmp_path):
    path = tmp_path / "g.fits"
    table = galaxy_table()
    table["id"] = ["a", "b", "c"]
    table.write(path)
    whole = read_galaxies(path)
    path.write_bytes(path.read_bytes().rstrip(b"\x00") + b"\x00" * 8)
    same(read_galaxies(path), whole)


def test_values_arrive_as_written():
    got = read_galaxies(galaxy_table())
    assert got.label == "galaxies"
    assert got.row.tolist() == ["galaxies:NGC 1", "galaxies:007", "galaxies:Größe, <b>"]
    assert got.dec_deg[1] == 12.3456789012345
    assert np.isnan(got.z[2])
    assert got.photometric.tolist() == [False, True, False]
    assert got.distance_err_mpc[2] == pytest.approx(0.076)  # 10% where none is given
    assert got.mass_is == "likelihood"
    assert got.mag_system == {"r": "AB"}
    assert not got.refused


def test_names_in_csv_keep_their_digits(tmp_path):
    path = tmp_path / "g.csv"
    path.write_text("id,ra,dec,z\n007,1,2,0.1\n7,1,2,0.1\nNA,1,2,0.1\n1e5,1,2,0.1\n#9,3,4,0.1\n")
    assert read_galaxies(path).row.tolist() == ["g:007", "g:7", "g:NA", "g:1e5"]  # a line with # is a comment


def test_compressed_and_pipe_separated(tmp_path):
    text = "id | ra | dec | z\n a | 10.5 | -3 | 0.1\n b | 11 | -4 | 0.2\n"
    (tmp_path / "t.txt").write_text(text)
    with gzip.open(tmp_path / "t.csv.gz", "wt") as f:
        f.write(text.replace(" | ", ","))
    same(read_galaxies(tmp_path / "t.txt"), read_galaxies(tmp_path / "t.csv.gz"))
    assert read_galaxies(str(tmp_path / "t.txt")).row.tolist() == ["t:a", "t:b"]


def test_pandas_and_capitals():
    frame = galaxy_table().to_pandas().rename(columns={"ra": "RA", "dec": "Dec"})
    same(read_galaxies(frame), read_galaxies(galaxy_table()))


def test_units_are_converted():
    table = QTable(
        {
            "id": ["a"],
            "ra": [1.0] * u.hourangle,
            "dec": [0.5] * u.rad,
            "z": [0.1],
            "distance_mpc": [4e5] * u.kpc,
            "log_mstar": [10.0] * u.dex(u.Msun),
        }
    )
    got = read_galaxies(table)
    assert got.ra_deg[0] == pytest.approx(15.0, rel=1e-14)
    assert got.dec_deg[0] == pytest.approx(np.degrees(0.5), rel=1e-14)
    assert got.distance_mpc[0] == pytest.approx(400.0, rel=1e-14)
    assert got.log_mstar[0] == 10.0
    groups = QTable(
        {
            "id": ["a"],
            "ra": [1.0],
            "dec": [0.0],
            "z": [0.1],
            "log_mass": [14.0],
            "mass_def": ["M500c"],
            "sigma_v": [5e5] * u.m / u.s,
            "lx": [3e37] * u.W,
            "centre_err_kpc": [0.1] * u.Mpc,
        }
    )
    got = read_groups(groups)
    assert got.sigma_v_kms[0] == pytest.approx(500.0)
    assert got.lx_1e44_erg_s[0] == pytest.approx(3.0)  # 1e37 W = 1e44 erg/s
    assert got.centre_err_kpc[0] == pytest.approx(100.0)
    bursts = QTable(
        {
            "burst": ["a"],
            "ra": [1.0],
            "dec": [0.0],
            "dm": [1e6] * u.pc / u.m**3 * 1e3,
            "loc_major_arcsec": [1.0] * u.arcmin,
        }
    )
    got = read_bursts(bursts)
    assert got.dm[0] == pytest.approx(1000.0)
    assert got.loc_major_arcsec[0] == pytest.approx(60.0)
    assert got.loc_minor_arcsec[0] == pytest.approx(60.0)


def test_defaults_are_said():
    table = Table(
        {
            "id": ["a", "b"],
            "ra": [1, 2],
            "dec": [1, 2],
            "z": [0.1, 0.4],
            "z_kind": ["spec", "phot"],
            "log_mstar": [10.0, 11.0],
        }
    )
    got = read_galaxies(table)
    assert got.z_err.tolist() == [0.0, pytest.approx(0.042)]
    assert got.log_mstar_err.tolist() == [0.2, 0.2]
    said = "\n".join(got.notes)
    assert "1 spectroscopic rows: taken as exact" in said
    assert "1 photometric rows: 0.03 (1+z)" in said
    assert "no log_mstar_err in 2 rows: 0.2 dex" in said


def test_unknown_column_with_a_near_match_is_said():
    table = Table({"id": ["a"], "ra": [1], "dec": [1], "z": [0.1], "log_mstr": [10.0], "colour": [1.0]})
    got = read_galaxies(table)
    assert [n for n in got.notes if "log_mstr" in n and "'log_mstar'" in n]
    assert not [n for n in got.notes if "colour" in n]


def group_table(**more) -> Table:
    return Table({"id": ["a", "b"], "ra": [1.0, 2.0], "dec": [1.0, 2.0], "z": [0.1, 0.2], **more})


def test_group_definition_is_per_row():
    got = read_groups(group_table(log_mass=[14.0, 13.0], mass_def=["500c", "Mvir"]))
    assert got.mass_def.tolist() == ["500c", "vir"]
    assert got.mass_is == "posterior"
    assert got.log_mass_err.tolist() == [0.2, 0.2]


def test_group_proxy_stands_in_for_a_mass():
    got = read_groups(group_table(sigma_v=[500.0, 300.0]))
    assert (got.proxy, got.proxy_relation) == ("sigma_v", "munari2013")
    assert np.isnan(got.log_mass).all()
    assert got.mass_def.tolist() == ["", ""]


BURSTS = {"burst": ["A", "B", "C"], "ra": [1.0, 2.0, 3.0], "dec": [1.0, 2.0, 3.0], "dm": [300.0, 400.0, 500.0]}


def test_bursts_without_redshift_or_localisation():
    got = read_bursts(Table(BURSTS))
    assert np.isnan(got.z).all()
    assert got.dm_err.tolist() == [0, 0, 0]
    assert np.isnan(got.loc_major_arcsec).all()
    assert set(got.note) == {"no localisation given: position taken as exact"}


def test_name_is_accepted_for_burst_and_order_is_kept():
    table = Table(BURSTS)[[2, 0, 1]]
    table.rename_column("burst", "name")
    assert read_bursts(table).burst.tolist() == ["C", "A", "B"]


def test_axes_without_angle_become_the_larger_circle():
    got = read_bursts(Table({**BURSTS, "loc_major_arcsec": [3.0, 2.0, 1.0], "loc_minor_arcsec": [1.0, 2.0, 1.0]}))
    assert got.loc_minor_arcsec.tolist() == [3.0, 2.0, 1.0]
    assert "circle of 3 arcsec" in got.note[0]
    assert got.note[1] == ""


def test_a_path_with_a_colon_is_a_path(tmp_path):
    path = tmp_path / "odd:name.csv"
    path.write_text("id,ra,dec,z\na,1,2,0.1\n")
    assert len(read_galaxies(str(path))) == 1


def test_unknown_card_names_the_cards(tmp_path):
    path = tmp_path / "g.csv"
    path.write_text("id,ra,dec,z\na,1,2,0.1\n")
    with pytest.raises(InputError, match=r"no catalogue card '2mmp'. Did you mean '2mpp'\?"):
        read_galaxies(f"2mmp:{path}")
    with pytest.raises(InputError, match=r"card 'mcxc' is for groups, not for galaxies"):
        read_galaxies(f"mcxc:{path}")


def test_columns_that_are_no_list_of_numbers_are_left_out():
    from astropy.coordinates import SkyCoord
    from astropy.utils.masked import Masked

    table = QTable(
        {
            "id": ["a", "b"],
            "ra": [1.0, 2.0] * u.deg,
            "dec": [1.0, 2.0] * u.deg,
            "z": [0.1, 0.2],
            "place": SkyCoord([1, 2], [3, 4], unit="deg"),
            "flux": np.ones((2, 5)),
            "distance_mpc": Masked([10.0, 20.0] * u.Mpc, mask=[False, True]),
        }
    )
    got = read_galaxies(table)
    assert got.distance_mpc.tolist() == [10.0, pytest.approx(np.nan, nan_ok=True)]
    table = Table(galaxy_table(), units={"ra": "deg", "distance_mpc": "kpc"})
    assert read_galaxies(table).distance_mpc[2] == pytest.approx(0.00076)
    assert np.isnan(read_galaxies(table).distance_mpc[:2]).all()  # masks live through a unit


@pytest.mark.parametrize(
    "unit", ["dex", "dex(solMass)", "log(solMass)", "[Msun]", "log10(Msun)", "Msun", "solMass", ""]
)
def test_ways_to_write_the_unit_of_a_logarithm(tmp_path, unit):
    path = tmp_path / "g.ecsv"
    Table({"id": ["a"], "ra": [1.0], "dec": [1.0], "z": [0.1], "log_mstar": [10.5]}).write(path, format="ascii.ecsv")
    if unit:
        path.write_text(path.read_text().replace("{name: log_mstar,", f"{{name: log_mstar, unit: '{unit}',"))
    assert read_galaxies(path).log_mstar[0] == 10.5


def test_windows_lines_quotes_and_a_byte_order_mark(tmp_path):
    path = tmp_path / "g.csv"
    path.write_bytes('\ufeffid,ra,dec,z\r\n"A, 1",1,2,0.1\r\n"say ""b""",3,4,0.2\r\n'.encode())
    assert read_galaxies(path).row.tolist() == ["g:A, 1", 'g:say "b"']


def test_a_frame_with_missing_cells_of_every_kind():
    import pandas as pd

    frame = pd.DataFrame(
        {"id": ["a", None, "c"], "ra": [1, 2, 3], "dec": [1.0, 2.0, None], "z": pd.array([0.1, 0.2, None])}
    )
    got = read_galaxies(frame)
    assert got.row.tolist() == ["galaxies:a"]
    assert [(r.row, r.column, r.found) for r in got.refused] == [(2, "id", "nothing"), (3, "dec", "nothing")]
