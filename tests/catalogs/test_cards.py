"""The cards as documents: strict keys, units with h, drop rules, IMF, frames; and a small native file for each card."""

import numpy as np
import pytest
from astropy.table import MaskedColumn, Table

from haloledger.catalogs import read_bursts, read_galaxies, read_groups
from haloledger.catalogs.cards import card_names, list_cards, load_card
from haloledger.catalogs.frames import C_KM_S
from haloledger.errors import InputError

GALAXIES = """
kind = "galaxies"
title = "invented"
reference = "nobody"
sure = "from memory"
{top}
[columns]
id = "NAME"
ra = "RAJ"
dec = "DEJ"
z = {z}
log_mstar = {mstar}
{more}
"""
GROUPS = """
kind = "groups"
title = "invented"
reference = "nobody"
sure = "from memory"
{top}
[columns]
id = "NAME"
ra = "RAJ"
dec = "DEJ"
z = "Z"
log_mass = {mass}
{more}
"""
Z = '"Z"'
NATIVE = {"NAME": ["a", "b"], "RAJ": [10.0, 200.0], "DEJ": [5.0, -20.0], "Z": [0.1, 0.2], "M": [1e12, 2e12]}


def galaxy_card(tmp_path, top="", z=Z, mstar='{ column = "M", unit = "Msun" }', more=""):
    path = tmp_path / "mine.toml"
    path.write_text(GALAXIES.format(top=top, z=z, mstar=mstar, more=more))
    return path


def group_card(tmp_path, top="", mass='{ column = "M", unit = "Msun" }', more='[mass]\ndefinition = "500c"'):
    path = tmp_path / "mine.toml"
    path.write_text(GROUPS.format(top=top, mass=mass, more=more))
    return path


# ---- the document ---------------------------------------------------------------------------------------------------

BROKEN = [
    ({"top": 'tittle = "x"'}, r"unknown key 'tittle' at the top\. Did you mean 'title'\?"),
    ({"more": '[redshift]\nfrmae = "cmb"'}, r"unknown key 'frmae' at \[redshift\]\. Did you mean 'frame'\?"),
    ({"more": '[redshift]\nframe = "CMBR"'}, r"redshift\.frame = 'CMBR' is not known\. Did you mean 'cmb'\? Write one"),
    ({"more": "[redshift]\nerror = true"}, r"redshift\.error = True is not a float"),
    ({"more": 'ma_r = "R"'}, r"columns\.ma_r is no column of galaxies\. Did you mean 'mag_r'\?"),
    ({"mstar": '{ column = "M", unti = "Msun" }'}, r"'unti' at \[columns\.log_mstar\]\. Did you mean 'unit'"),
    ({"mstar": '{ column = "M", unit = "Mpc" }'}, r"columns\.log_mstar\.unit = 'Mpc' does not convert to 'Msun'"),
    ({"mstar": '{ column = "M", unit = "Msun/h2" }'}, r"the card does not say which: add h = 0\.7"),
    ({"mstar": '{ unit = "Msun" }'}, r"\[columns\.log_mstar\] lacks 'column'"),
    ({"more": '[mass]\nimf = "Scalo"'}, r"mass\.imf = 'Scalo' is not known"),
    ({"more": '[[drop]]\ncolumn = "Q"\nop = "~"\nwhy = ""'}, r"drop\.op = '~' is not known"),
    ({"more": '[[drop]]\ncolumn = "Q"\nop = "<"\nwhy = ""'}, r"with op = '<' needs a value"),
    ({"more": '[[drop]]\nop = "<"\nvalue = 1\nwhy = ""'}, r"must name either 'column' \(native\) or 'ours'"),
    ({"more": '[drop]\nop = "<"'}, r"write \[\[drop\]\], not \[drop\]"),
    ({"more": 'x = ['}, r"is no TOML"),
]  # fmt: skip


@pytest.mark.parametrize(("change", "message"), BROKEN)
def test_a_broken_card_is_told_where(tmp_path, change, message):
    with pytest.raises(InputError, match=message):
        load_card(galaxy_card(tmp_path, **change))


def test_group_cards_need_a_definition_or_a_proxy(tmp_path):
    with pytest.raises(InputError, match=r'a mass without definition\. Add definition = "200c"'):
        load_card(group_card(tmp_path, more=""))
    path = tmp_path / "none.toml"
    path.write_text(GROUPS.format(top="", mass='"M"', more="").replace('log_mass = "M"', ""))
    with pytest.raises(InputError, match="neither a mass nor a proxy"):
        load_card(path)
    with pytest.raises(InputError, match=r"mass\.one_minus_b = \[20\.0, 0\.1\]: write \[value, error\]"):
        load_card(group_card(tmp_path, more='[mass]\ndefinition = "500c"\none_minus_b = [20.0, 0.1]'))


def test_unknown_card_and_absent_file(tmp_path):
    with pytest.raises(InputError, match=r"no catalogue card 'mcxcc'\. Did you mean 'mcxc'\?"):
        load_card("mcxcc")
    with pytest.raises(InputError, match="no such card file"):
        load_card(tmp_path / "x.toml")


def test_a_table_that_is_not_the_cards(tmp_path):
    table = Table(NATIVE)
    table.rename_column("RAJ", "RA_J")
    with pytest.raises(InputError, match=r"no column 'RAJ', which card 'mine' reads\. Did you mean 'RA_J'\?"):
        read_galaxies(table, galaxy_card(tmp_path))


# ---- what the keys do -----------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("unit", "h", "log10", "expected"),
    [
        ("Msun", None, False, 12.0),
        ("1e2 Msun", None, False, 14.0),
        ("Msun/h", 0.7, False, 12.0 - np.log10(0.7)),  # M[Msun] = M[Msun/h] / h
        ("Msun/h2", 0.7, False, 12.0 - 2 * np.log10(0.7)),
        ("Msun/h", 0.5, True, None),
    ],
)
def test_h_and_factors_of_masses(tmp_path, unit, h, log10, expected):
    table = Table(NATIVE)
    if log10:
        table["M"] = np.log10(table["M"])
        expected = 12.0 + np.log10(2)
    mstar = f'{{ column = "M", unit = "{unit}", log10 = {str(log10).lower()} }}'
    got = read_galaxies(table, galaxy_card(tmp_path, top=f"h = {h}" if h else "", mstar=mstar))
    assert got.log_mstar[0] == pytest.approx(expected, abs=1e-12)


def test_h_of_distances_and_luminosities(tmp_path):
    more = (
        'distance_mpc = { column = "D", unit = "Mpc/h" }\nlx = { column = "L", unit = "1e44 erg/s/h2" }\n'
        '[mass]\ndefinition = "200m"'
    )
    table = Table({**NATIVE, "D": [10.0, 20.0], "L": [1.0, 2.0]})
    got = read_groups(table, group_card(tmp_path, top="h = 0.7", more=more))
    assert got.distance_mpc[0] == pytest.approx(10 / 0.7)
    assert got.lx_1e44_erg_s[1] == pytest.approx(2 / 0.49)
    assert got.mass_def.tolist() == ["200m", "200m"]


def test_errors_up_and_down_on_the_linear_mass(tmp_path):
    more = 'log_mass_err = { column = ["UP", "LOW"], unit = "Msun" }\n[mass]\ndefinition = "500c"'
    table = Table({**NATIVE, "UP": [1e11, 0.0], "LOW": [2e11, 0.0]})
    got = read_groups(table, group_card(tmp_path, more=more))
    assert got.log_mass_err[0] == pytest.approx(0.5 * (np.log10(1.1) - np.log10(0.8)))
    assert got.log_mass_err[1] == 0.2  # no error in the row: the card's


def test_velocities_frames_and_imf(tmp_path):
    table = Table({**NATIVE, "V": [3000.0, 6000.0]})
    z = '{ column = "V", unit = "km/s" }'
    plain = read_galaxies(table, galaxy_card(tmp_path, z=z))
    np.testing.assert_allclose(plain.z, np.array([3000, 6000]) / 299792.458, rtol=1e-14)
    moved = read_galaxies(table, galaxy_card(tmp_path, z=z, more='[redshift]\nframe = "cmb"\n[mass]\nimf = "Salpeter"'))
    assert 50 < np.abs(moved.z - plain.z).max() * C_KM_S < 372
    assert moved.log_mstar[0] == pytest.approx(12.0 - 0.215)


def test_marks_ranges_and_rules(tmp_path):
    native = {**NATIVE, "Q": [1, 4], "W": ["yes", "no"]}
    mstar = '{ column = "M", unit = "Msun", valid = [11.0, 12.2] }'
    got = read_galaxies(Table(native), galaxy_card(tmp_path, mstar=mstar))
    assert np.isnan(got.log_mstar).tolist() == [False, True]
    got = read_galaxies(Table(native), galaxy_card(tmp_path, z='{ column = "Z", missing = [0.2] }'))
    assert [r.column for r in got.refused] == ["z"]
    for rule, left in [
        ('column = "Q"\nop = ">="\nvalue = 4', ["mine:a"]),
        ('column = "W"\nop = "=="\nvalue = "yes"', ["mine:b"]),
        ('column = "Q"\nop = "in"\nvalue = [1, 2]', ["mine:b"]),
        ('ours = "z"\nop = "<"\nvalue = 0.15', ["mine:b"]),
    ]:
        got = read_galaxies(Table(native), galaxy_card(tmp_path, more=f'[[drop]]\n{rule}\nwhy = "a reason"'))
        assert got.row.tolist() == left
        assert "mine: 1 row left out: a reason" in got.notes
    gone = galaxy_card(tmp_path, more='[[drop]]\ncolumn = "Q"\nop = ">"\nvalue = 0\nwhy = "all"')
    with pytest.raises(InputError, match="an empty list: card 'mine' leaves out every row"):
        read_galaxies(Table(native), gone)


def test_row_numbers_are_those_of_the_file(tmp_path):
    native = {
        "NAME": list("abc"),
        "RAJ": [10.0, 20.0, 999.0],
        "DEJ": [0.0] * 3,
        "Z": [0.1] * 3,
        "M": [1e10] * 3,
        "Q": [9, 1, 1],
    }
    card = galaxy_card(tmp_path, more='[[drop]]\ncolumn = "Q"\nop = "=="\nvalue = 9\nwhy = "bad"')
    got = read_galaxies(Table(native), card)
    assert [(r.row, r.name) for r in got.refused] == [(3, "c")]


def test_card_in_front_of_a_path(tmp_path):
    Table(NATIVE).write(tmp_path / "t.csv", format="ascii.csv")
    got = read_galaxies(f"{galaxy_card(tmp_path)}:{tmp_path / 't.csv'}")
    assert got.label == "mine"
    assert got.row.tolist() == ["mine:a", "mine:b"]


def test_every_card_explains_itself():
    names = [card.name for card in list_cards()]
    assert names == card_names()
    assert {"2mpp", "2mpp-groups", "50mgc", "kourkchi-tully", "localised-bursts", "mcxc", "psz2"} <= set(names)
    for card in list_cards():
        words = card.explain()
        assert words.startswith(f"{card.name}: {card.title} ({card.kind})")
        for part in [card.reference, card.sure, *[rule.why for rule in card.drop]]:
            assert part in words
        for native in card.columns.values():
            assert all(name in words for name in native.names)
        if card.kind != "bursts":
            assert card.depth.text in words
            assert card.redshift.frame in words
    assert "(1-b) = 0.8" in load_card("psz2").explain()
    assert "(1-b) = 0.8" in load_card("mcxc").explain()


def test_precedence_of_mass_sources():
    order = ["psz2", "mcxc", "redmapper-sdss", "2mpp-groups", "kourkchi-tully"]  # SZ, X-ray, richness, dynamics, light
    assert sorted(order, key=lambda name: load_card(name).precedence) == order


# ---- a small native file for each card ------------------------------------------------------------------------------


def test_2mpp_native():
    # at RA 167.942, Dec -6.944, the apex, the Sun moves at 369.82 km/s toward the object
    rows = {
        "id": [1, 2],
        "ra_deg": [167.942, 167.942],
        "dec_deg": [-6.944, -6.944],
        "z_cmb": [0.01, 0.0005],
        "k2mpp_mag": [10.0, 9.0],
    }
    got = read_galaxies(Table(rows), "2mpp")
    assert got.row.tolist() == ["2mpp:1"]
    assert got.z[0] == pytest.approx(0.01 - 369.82 / C_KM_S, abs=1e-9)
    assert (got.mag_rest, got.mag_system, got.mag["ks"].tolist()) == (True, {"ks": "Vega"}, [10.0])
    assert got.z_err[0] == 0.00017
    assert "1 row left out: heliocentric redshift" in got.notes[0]


def test_2mpp_groups_native():
    rows = {
        "gid": [1, 2, 3],
        "ra_deg": [1.0] * 3,
        "dec_deg": [1.0] * 3,
        "v_helio_kms": [3000, 2000, -5],
        "sigma_kms": [300, 0, 50],
        "richness": [5, 3, 3],
    }
    got = read_groups(Table(rows), "2mpp-groups")
    assert got.row.tolist() == ["2mpp-groups:1"]
    assert (got.proxy, got.sigma_v_kms[0], got.n_members[0]) == ("sigma_v", 300, 5)
    assert got.z[0] == pytest.approx(3000 / C_KM_S)
    assert np.isnan(got.log_mass[0])


def test_50mgc_native():
    rows = Table(
        {
            "objname": ["M31", "LMC", "lost", "giant", "quiet"],
            "ra": [10.685, 80.9, 1.0, 2.0, 3.0],
            "dec": [41.269, -69.8, 1.0, 2.0, 3.0],
            "v_h": MaskedColumn([-296.0, 278.0, -50.0, 2000.0, 0.0], mask=[0, 0, 0, 0, 1]),
            "bestdist": MaskedColumn([0.76, 0.05, 0.0, 30.0, 20.0], mask=[0, 0, 1, 0, 0]),
            "bestdist_error": MaskedColumn([0.03, 0.001, 0.0, 5.0, 0.0], mask=[0, 0, 1, 0, 0]),
            "logmass": [10.73, 9.06, 8.0, 12.8, 9.0],
            "logmass_error": [0.136, 0.1, 0.1, 0.5, 0.2],
        }
    )
    got = read_galaxies(rows, "50mgc")
    assert got.row.tolist() == ["50mgc:M31", "50mgc:giant", "50mgc:quiet"]
    assert got.z[0] == pytest.approx(-296 / C_KM_S)
    assert np.isnan(got.z[2])
    assert np.isnan(got.log_mstar[1])
    assert got.distance_err_mpc.tolist() == [0.03, 5.0, 3.0]
    assert got.mass_err_holds_z


def test_zcosmos_native():
    rows = {
        "ID": [1, 2, 3, 4],
        "RA": [150.0] * 4,
        "Dec": [2.0] * 4,
        "z_spec": [0.5, 0.5, 0.5, 0.6],
        "Type": [0, 1, 0, 0],
        "Mass": [1e10, 1e10, 1e10, 1e-41],
        "Flag": [1, 1, 0, 1],
        "m_I": [21.0] * 4,
    }
    got = read_galaxies(Table(rows), "zcosmos-bright")
    assert got.row.tolist() == ["zcosmos-bright:1", "zcosmos-bright:4"]
    assert got.log_mstar[0] == pytest.approx(10.0)
    assert np.isnan(got.log_mstar[1])


def test_kourkchi_tully_native(tmp_path):
    path = tmp_path / "kt.txt"
    path.write_text(
        "       pgc | flag |   ra |  dec | Vls | dist | mDist | mDistErr | sigmaP_dyn |   Mv_lum | No_Galaxies\n"
        " 500041220 |    4 | 187.7 | 12.4 | 1242 | 15.76 | 15.76 |   0.01 |      818.1 | 4.06e+14 | 713\n"
        " 905064336 |    4 | 265.9 | -29. |  -36 |  0.01 |  0.01 |   0.01 |      258.8 | 1.90e+12 | 16\n"
        "        11 |    5 | 187.0 | 11.0 | 1130 | 15.10 | 15.67 |   0.00 |      657.9 | 6.65e+14 | 1720\n"
        "        12 |    0 |  10.0 |  1.0 | 3000 | 40.00 |  0.00 |   0.00 |        0.0 | 1.00e+12 | 1\n"
        "        13 |    0 |  11.0 |  1.0 | 1500 |  0.00 |  0.00 |   0.00 |        0.0 | 1.00e+11 | 1\n"
        "        14 |    0 |  12.0 |  1.0 |  150 |  2.00 |  0.00 |   0.00 |        0.0 | 1.00e+10 | 1\n"
    )
    got = read_groups(f"kourkchi-tully:{path}")
    assert [r.split(":")[1] for r in got.row] == ["500041220", "12", "13", "14"]
    np.testing.assert_allclose(got.log_mass, np.log10([4.06e14, 1e12, 1e11, 1e10]))
    np.testing.assert_allclose(got.distance_mpc, [15.76, 40.0, 1500 / 75, 2.0])
    # 1% measured; 300/75 = 4 Mpc by velocity; not more than half of it
    np.testing.assert_allclose(got.distance_err_mpc, [0.1576, 4.0, 4.0, 1.0])
    assert np.isnan(got.sigma_v_kms[1])
    # Tully et al. 2008 (ApJ 676, 184, from memory): V_LS = V_h - 26 cos l cos b + 317 sin l cos b - 8 sin b
    lon, lat = np.radians(283.74), np.radians(74.49)  # galactic coordinates of RA 187.7, Dec 12.4
    sun = -26 * np.cos(lon) * np.cos(lat) + 317 * np.sin(lon) * np.cos(lat) - 8 * np.sin(lat)
    assert got.z[0] * C_KM_S == pytest.approx(1242 - sun, abs=0.2)  # positions rounded to 0.01 degree and less
    assert set(got.mass_def) == {"200c"}


def test_mcxc_native():
    rows = Table(
        {
            "MCXC": ["J1259.7+2756"],
            "RAdeg": [194.93],
            "DEdeg": [27.94],
            "z": [0.0231],
            "M500": [4.2846],
            "L500": [3.455556],
        }
    )
    got = read_groups(rows, "mcxc")
    assert got.log_mass[0] == pytest.approx(np.log10(4.2846e14), abs=1e-12)  # h = 0.7 is no unit: nothing is divided
    assert got.mass_def[0] == "500c"
    assert got.one_minus_b == (0.8, 0.07)
    assert (got.mass_from, got.proxy) == ("lx", "")  # the luminosity behind the mass is not used again
    assert np.isnan(got.lx_1e44_erg_s[0])


def test_psz2_native():
    rows = Table({"NAME": ["A", "B"], "RA": [1.0, 2.0], "DEC": [1.0, 2.0], "REDSHIFT": [0.2, -1.0], "MSZ": [5.0, 0.0],
                  "MSZ_ERR_UP": [0.5, 0.0], "MSZ_ERR_LOW": [0.6, 0.0]})  # fmt: skip
    got = read_groups(rows, "psz2")
    assert got.row.tolist() == ["psz2:A"]
    assert got.log_mass[0] == pytest.approx(np.log10(5e14))
    assert got.log_mass_err[0] == pytest.approx(0.5 * np.log10(5.5 / 4.4))
    assert got.one_minus_b == (0.8, 0.07)


def test_redmapper_native():
    rows = Table(
        {"ID": [1], "name": ["RMJ1"], "RA": [1.0], "dec": [2.0], "redshift": [0.3], "lambda": [40.0], "r500": [0.2]}
    )
    got = read_groups(rows, "redmapper-sdss")
    assert got.row.tolist() == ["redmapper-sdss:RMJ1"]
    assert (got.proxy, got.proxy_relation, got.richness[0]) == ("richness", "mcclintock2019", 40.0)
    assert got.photometric[0]
    assert got.z_err[0] == pytest.approx(0.006 * 1.3)


def test_localised_bursts_are_recognised(tmp_path):
    path = tmp_path / "community.csv"
    path.write_text(
        "name,ra,dec,z,dm,pos_major,pos_minor,pos_pa,refs\n"
        'A,10,20,0.1,300,2.0,1.0,-53.56,"x,y"\nB,11,21,,400,0.28,0.48,,z\nC,12,22,0.3,500,,,,z\nD,13,23,0.3,500,1.0,2.0,10,z\n'
    )
    got = read_bursts(path)
    assert got.burst.tolist() == ["A", "B", "C"]
    assert "read through the card 'localised-bursts'" in got.notes[0]
    assert got.loc_pa_deg[0] == -53.56
    assert (got.loc_major_arcsec[1], got.loc_minor_arcsec[1]) == (0.48, 0.48)
    assert "axes 0.28 and 0.48 arcsec, no position angle: a circle of 0.48 arcsec is used" in got.note[1]
    assert got.note[2] == "no localisation given: position taken as exact"
    assert np.isnan(got.loc_major_arcsec[2])
    assert np.isnan(got.z[1])
    (refusal,) = got.refused  # with an angle given, a major axis below the minor stays a mistake
    assert refusal.name == "D"


def test_a_native_table_without_its_card_is_told_which_fits(tmp_path):
    rows = {"objname": ["a"], "ra": [1.0], "dec": [1.0], "v_h": [900.0], "bestdist": [9.0], "bestdist_error": [1.0]}
    table = Table({**rows, "logmass": [9.0], "logmass_error": [0.2]})
    with pytest.raises(InputError, match=r"no column 'id'.* The card '50mgc' fits these columns: 50mgc:FILE\."):
        read_galaxies(table)
    with pytest.raises(InputError, match=r"The card '50mgc' fits these columns \(it lists galaxies\)"):
        read_groups(table)


def test_share_of_outliers_is_a_share(tmp_path):
    from haloledger.catalogs.cards.loader import FOLDER

    text = (FOLDER / "redmapper-sdss.toml").read_text(encoding="utf-8")
    path = tmp_path / "mine.toml"
    path.write_text(text.replace('kind = "phot"', 'kind = "phot"\noutliers = 5.0'), encoding="utf-8")
    with pytest.raises(InputError, match=r"redshift.outliers = 5: write a share, such as 0.05"):
        load_card(path)
