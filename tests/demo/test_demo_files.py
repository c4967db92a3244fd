"""The invented survey: the script gives its files back, and each sightline plays its role in the sky that was put in.

Geometry is worked out here a second time, by astropy's coordinates and cosmology, from the truth tables alone.
"""

from __future__ import annotations

import ast
import runpy
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

from haloledger.paths import data_folder

FOLDER = data_folder("demo_sightlines")
FILES = ("bursts.ecsv", "footprint.txt", "galaxies.ecsv", "groups.ecsv", "truth.ecsv", "truth_haloes.ecsv")
PC_CM3 = "pc / cm3"


@pytest.fixture(scope="module")
def tables():
    from astropy.table import QTable

    return {Path(f).stem: QTable.read(FOLDER / f) for f in FILES if f.endswith("ecsv")}


@pytest.fixture(scope="module")
def of_burst(tables):
    """Truth row and burst row of a burst."""

    def rows(name: str):
        (t,) = np.flatnonzero(tables["truth"]["burst"] == name)
        (b,) = np.flatnonzero(tables["bursts"]["burst"] == name)
        return tables["truth"][t], tables["bursts"][b]

    return rows


@pytest.fixture(scope="module")
def script():
    return runpy.run_path(str(FOLDER / "simulate.py"))


def listed(tables, name: str):
    """The row `name` of the galaxy or group table."""
    for table in (tables["galaxies"], tables["groups"]):
        (found,) = (np.flatnonzero(table["id"] == name),)
        if found.size:
            return table[found[0]]
    raise KeyError(name)


def r200c_kpc(log_m: float, z: float) -> float:
    from astropy.cosmology import Planck18

    return (3 * 10**log_m / (800 * np.pi * Planck18.critical_density(z).to_value("Msun / kpc3"))) ** (1 / 3)


def separation_deg(a, b) -> float:
    from astropy.coordinates import SkyCoord

    return SkyCoord(a["ra"], a["dec"]).separation(SkyCoord(b["ra"], b["dec"])).deg


def impact_kpc(burst, halo) -> float:
    """Proper kpc at the halo's redshift, or at the distance where one is listed."""
    from astropy.cosmology import Planck18

    return np.radians(separation_deg(burst, halo)) * Planck18.angular_diameter_distance(halo["z"]).to_value("kpc")


def test_script_gives_the_same_bytes(tmp_path):
    subprocess.run([sys.executable, str(FOLDER / "simulate.py"), str(tmp_path)], check=True)
    assert sorted(p.name for p in tmp_path.iterdir()) == sorted(FILES)
    for name in FILES:
        assert (tmp_path / name).read_bytes() == (FOLDER / name).read_bytes(), name


def test_script_stands_on_general_libraries_only():
    tree = ast.parse((FOLDER / "simulate.py").read_text(encoding="utf-8"))
    names = {n.module for n in ast.walk(tree) if isinstance(n, ast.ImportFrom)}
    names |= {a.name for n in ast.walk(tree) if isinstance(n, ast.Import) for a in n.names}
    outside = {n.split(".")[0] for n in names} - set(sys.stdlib_module_names)
    assert outside == {"numpy", "astropy", "colossus"}


@pytest.mark.parametrize("name", FILES)
def test_every_file_says_that_it_is_simulated(tables, name):
    assert "SIMULATED" in (FOLDER / name).read_text(encoding="utf-8")[:2500]
    if name.endswith("ecsv"):
        assert tables[Path(name).stem].meta["simulated"] is True


def test_files_are_small_enough_to_travel():
    assert sum((FOLDER / name).stat().st_size for name in FILES) < 300_000


def test_columns_and_units(tables):
    bursts, galaxies, groups = tables["bursts"], tables["galaxies"], tables["groups"]
    assert len(bursts) == 8
    assert 1500 <= len(galaxies) <= 3000
    assert 40 <= len(groups) <= 80
    for table in (bursts, galaxies, groups):
        assert table["ra"].unit == "deg"
        assert table["dec"].unit == "deg"
        assert len(set(table.columns[0])) == len(table)  # names are unique
    assert {str(bursts[c].unit) for c in ("dm", "dm_err", "dm_disc", "dm_disc_err")} == {PC_CM3}
    assert galaxies["distance_mpc"].unit == "Mpc"
    assert groups["centre_err_kpc"].unit == "kpc"
    assert set(galaxies["z_kind"]) == {"spec", "phot"}
    assert 0.3 < np.mean(galaxies["z_kind"] == "spec") < 0.7
    assert 0 < np.sum(bursts["dm_disc"].mask) < len(bursts)  # given for some, missing for others


def test_names_point_to_rows_that_are_there(tables):
    groups, galaxies = set(tables["groups"]["id"]), set(tables["galaxies"]["id"])
    named = np.ma.filled(tables["galaxies"]["group_id"], "")
    assert set(named) - {""} == groups  # every group has members, every named group is listed
    hosts = set(np.ma.filled(tables["bursts"]["host_id"], "")) - {""}
    assert hosts
    assert hosts <= galaxies
    rows = set(np.ma.filled(tables["truth_haloes"]["row"], "")) - {""}
    assert rows <= groups | galaxies


def test_listed_masses_scatter_about_the_truth_by_their_errors(tables):
    rows = [(r, listed(tables, r["row"])) for r in tables["truth_haloes"] if str(r["row"]).startswith("SMG")]
    pulls = [(seen["log_mass"] - true["log_m200c"]) / seen["log_mass_err"] for true, seen in rows]
    assert len(pulls) >= 3
    assert np.max(np.abs(pulls)) < 3.5  # a handful of groups: beyond 3.5 sigma something else than noise is at work


def test_listed_redshifts_scatter_about_the_truth_by_their_errors(tables):
    rows = [(r, listed(tables, r["row"])) for r in tables["truth_haloes"] if not np.ma.is_masked(r["row"]) and r["row"]]
    # the true redshift is the one that gives the distance: peculiar motion of 300 km/s comes on top of the error
    width = [float(np.hypot(seen["z_err"], 0.001 * (1 + true["z"]))) for true, seen in rows]
    pulls = np.array([float(seen["z"] - true["z"]) for true, seen in rows]) / width
    assert len(pulls) > 10
    assert np.max(np.abs(pulls)) < 4
    assert np.std(pulls) > 0.3  # errors are there


def test_dm_is_the_sum_of_what_was_put_in(tables):
    t, b = tables["truth"], tables["bursts"]
    parts = sum(t[n] for n in ("dm_mw_disc", "dm_mw_halo", "dm_haloes", "dm_diffuse", "dm_host_obs"))
    assert t["dm"].to_value(PC_CM3) == pytest.approx(parts.to_value(PC_CM3), abs=0.03)  # five numbers of two decimals
    assert b["dm"].to_value(PC_CM3) == pytest.approx(t["dm"].to_value(PC_CM3), abs=0.051)  # listed with one decimal
    for row in t:
        crossed = tables["truth_haloes"]["burst"] == row["burst"]
        total = tables["truth_haloes"]["dm"][crossed].sum().to_value(PC_CM3)
        assert row["dm_haloes"].to_value(PC_CM3) == pytest.approx(total, abs=0.05)


def test_mean_cosmic_dm_is_the_closed_integral(tables):
    from astropy.cosmology import Planck18
    from scipy.integrate import quad

    for row in tables["truth"]:
        integral = quad(lambda z: (1 + z) / Planck18.efunc(z), 0, row["z"])[0]
        # prefactor 976.040073 of the closed integral for Planck18 with 7/8 electron per proton mass; two decimals
        assert row["dm_cosmic_mean_z"].to_value(PC_CM3) == pytest.approx(976.040073 * 0.84 * integral, abs=0.01)


def column_by_quadrature(script, log_m: float, z: float, x: float, start: float | None) -> float:
    """Observer-frame DM of one halo, integrals by scipy and constants by astropy."""
    from astropy import constants, units
    from astropy.cosmology import Planck18
    from scipy.integrate import quad

    c, r200 = float(script["concentration"](log_m, z)), r200c_kpc(log_m, z)
    electrons = 7 / 8 * (constants.M_sun / constants.m_p / units.kpc**3).to_value("cm-3")
    gas_mass = float(script["kept"](log_m)) * Planck18.Ob0 / Planck18.Om0 * 10**log_m

    def shape(r: float) -> float:
        return c * r / (2 + c * r) ** 4

    half = np.sqrt(1 - x**2)
    column = quad(lambda s: shape(np.hypot(x, s)), -half if start is None else start, half)[0]
    norm = gas_mass / (4 * np.pi * r200**3 * quad(lambda r: r**2 * shape(r), 0, 1)[0])
    return electrons * norm * column * r200 * 1000 / (1 + z)


@pytest.mark.parametrize(
    ("log_m", "z", "x", "start"), [(14.5, 0.112, 0.2, None), (12.3, 0.081, 0.5, None), (13.7, 0.17, 0.35, 0.0)]
)
def test_halo_columns_agree_with_adaptive_quadrature(script, log_m, z, x, start):
    got = script["halo_dm"](np.array([x]), np.array([log_m]), np.array([z]), np.array([1.0]), start)
    # r200c is interpolated on a grid of 0.0005 in z, good to 1e-6; 64 nodes are good to 1e-6 on this shape
    assert got[0] == pytest.approx(column_by_quadrature(script, log_m, z, x, start), rel=1e-5)


def test_the_readers_take_every_row(tables):
    from haloledger.catalogs import read_bursts, read_galaxies, read_groups

    bursts = read_bursts(str(FOLDER / "bursts.ecsv"))
    galaxies = read_galaxies(str(FOLDER / "galaxies.ecsv"))
    groups = read_groups(str(FOLDER / "groups.ecsv"))
    for read, name in ((bursts, "bursts"), (galaxies, "galaxies"), (groups, "groups")):
        assert read.refused == ()
        assert len(read) == len(tables[name])
    assert np.isnan(bursts.dm_disc).any()
    assert (galaxies.group != "").sum() > 200
    assert set(np.atleast_1d(groups.mass_def)) == {"200c"}


def test_a_galaxy_that_names_its_group_adds_no_halo_of_its_own(planck):
    from haloledger.catalogs import read_galaxies, read_groups
    from haloledger.haloes.build import halo_list

    galaxies = read_galaxies(str(FOLDER / "galaxies.ecsv"))
    haloes = halo_list([galaxies], [read_groups(str(FOLDER / "groups.ecsv"))], planck)
    alone = set(haloes.id[haloes.p_member < 1])
    members = galaxies.row[galaxies.group != ""]
    assert len(members) > 200
    assert [name for name in members if name in alone] == []


# ---------------------------------------------------------------- the eight roles


def test_roles_are_eight(tables):
    assert len(set(tables["truth"]["role"])) == 8


def test_avocet_goes_through_a_cluster(of_burst, tables):
    from colossus.cosmology import cosmology
    from colossus.halo import mass_defs

    truth, _ = of_burst("Avocet")
    cosmology.setCosmology("planck18")
    c = 4.7  # median of relaxed haloes of this mass; r500c/r200c moves by 1% for 20% in c
    r500 = mass_defs.changeMassDefinition(10 ** truth["key_log_m200c"] * 0.6766, c, 0.112, "200c", "500c")[1] / 0.6766
    assert truth["key_log_m200c"] > 14
    assert float(truth["key_impact_kpc"].to_value("kpc")) / r500 == pytest.approx(0.3, rel=0.02)
    assert impact_kpc(truth, halo_of(tables, "Avocet")) == pytest.approx(
        float(truth["key_impact_kpc"].to_value("kpc")), rel=1e-3
    )
    assert str(truth["key_row"]).startswith("SMG")


def halo_of(tables, name: str):
    """The true halo that makes the role of a burst."""
    truth = tables["truth"][tables["truth"]["burst"] == name][0]
    haloes = tables["truth_haloes"]
    return haloes[(haloes["burst"] == name) & (haloes["row"] == truth["key_row"])][0]


@pytest.mark.parametrize(("name", "impact"), [("Bittern", 0.5), ("Egret", 0.3), ("Fulmar", 0.35), ("Gannet", 0.6)])
def test_planted_halo_lies_at_its_impact_parameter(of_burst, tables, name, impact):
    truth, _ = of_burst(name)
    halo = halo_of(tables, name)
    assert halo["z"] <= truth["z"]
    got = impact_kpc(truth, halo) / r200c_kpc(halo["log_m200c"], halo["z"])
    assert got == pytest.approx(impact, abs=2e-3)  # places are written to 1e-5 deg


def test_bittern_skirts_a_galaxy_with_a_spectrum(of_burst, tables):
    truth, _ = of_burst("Bittern")
    row = listed(tables, truth["key_row"])
    assert truth["key_log_m200c"] == pytest.approx(12.3)
    assert row["z_kind"] == "spec"
    assert row["log_mstar"] == pytest.approx(10.7, abs=0.3)
    assert not row["group_id"] or np.ma.is_masked(row["group_id"])


def test_curlew_is_clean(of_burst, tables):
    truth, _ = of_burst("Curlew")
    assert not np.any(tables["truth_haloes"]["burst"] == "Curlew")
    assert truth["dm_haloes"].to_value(PC_CM3) == 0
    for row in tables["groups"]:
        if row["z"] < truth["z"]:
            assert impact_kpc(truth, row) > 2 * r200c_kpc(row["log_mass"], row["z"])


def test_dunlin_lies_outside_the_footprint_and_the_others_inside(tables):
    import shapely

    outline = shapely.Polygon(np.loadtxt(FOLDER / "footprint.txt"))
    bursts = tables["bursts"]
    inside = shapely.contains_xy(outline, bursts["ra"].value, bursts["dec"].value)
    assert list(bursts["burst"][~inside]) == ["Dunlin"]
    galaxies = tables["galaxies"]
    assert shapely.contains_xy(outline, galaxies["ra"].value, galaxies["dec"].value).all()


def test_egret_hangs_on_one_photometric_redshift(of_burst, tables):
    truth, burst = of_burst("Egret")
    row = listed(tables, truth["key_row"])
    assert row["z_kind"] == "phot"
    assert row["log_mstar"] > 11
    assert abs(row["z"] - burst["z"]) < row["z_err"]  # in front or behind: the list does not say
    assert truth["key_z"] < truth["z"]  # it is in front
    haloes = tables["truth_haloes"]
    mine = haloes["burst"] == "Egret"
    assert haloes["dm"][mine].max() > 0.9 * haloes["dm"][mine].sum()


def test_fulmar_lies_in_the_group_of_its_host(of_burst, tables):
    truth, burst = of_burst("Fulmar")
    host = listed(tables, burst["host_id"])
    assert host["group_id"] == truth["key_row"]
    assert host["z"] == pytest.approx(truth["z"], abs=1e-3)
    assert separation_deg(host, burst) * 3600 < 2
    group = listed(tables, truth["key_row"])
    assert impact_kpc(truth, group) < r200c_kpc(group["log_mass"], group["z"])


def test_gannet_has_a_large_localisation_region(of_burst, tables):
    truth, burst = of_burst("Gannet")
    assert burst["loc_major_arcsec"].value == 60
    assert burst["loc_minor_arcsec"].value == 20
    assert separation_deg(truth, burst) * 3600 < 3 * 60
    others = tables["bursts"]["loc_major_arcsec"][tables["bursts"]["burst"] != "Gannet"]
    assert others.max().value < 1


def test_heron_is_local_and_seen_through_a_near_halo(of_burst, tables):
    truth, _ = of_burst("Heron")
    assert 0.01 < truth["z"] < 0.02
    row = listed(tables, truth["key_row"])
    distance = float(row["distance_mpc"].to_value("Mpc"))
    assert 5 < distance < 10
    impact = np.radians(separation_deg(truth, row)) * distance * 1000
    assert impact / r200c_kpc(float(truth["key_log_m200c"]), 0) == pytest.approx(
        0.3, rel=0.1
    )  # 5% error on the distance
    assert np.sum(~tables["galaxies"]["distance_mpc"].mask) == 1
