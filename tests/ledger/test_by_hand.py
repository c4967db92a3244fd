"""Changes by hand: applied, listed with their reasons, refused one by one where they cannot be."""

import re

import numpy as np
import pytest
import sky

from haloledger.audit import audit
from haloledger.errors import InputError

MODEL = "textbook-modified-nfw"
WHY = {"reason": "seen by eye"}


def galaxy(planck, name="G1", log_mstar=10.5, z=0.1, impact_kpc=60.0, **more):
    row = sky.galaxy_at(planck, 12.0, z, impact_kpc, name=name)
    row = {k: v for k, v in row.items() if "m200c" not in k}
    return row | {"log_mstar": log_mstar, "log_mstar_err": 0.1} | more


def run(planck, *overrides, tables=None, model=MODEL, fixed=True, **more):
    tables = tables or {"galaxies": [sky.galaxies(galaxy(planck), galaxy(planck, "G2", z=0.3, impact_kpc=90.0))]}
    line = sky.bursts(sky.burst())
    return audit(line, **tables, models=[model], fixed=fixed, draws=50, overrides=list(overrides) or None, **more)


def entries(ledgers):
    """Entries by halo, as plain data."""
    table = ledgers.to_pandas()[1]
    return table[table.halo != "shared"].set_index("halo")


def test_mass_and_reason_reach_entry_notes_and_record(planck):
    change = {"object": "galaxies:G1", "log_m200c": 12.7, **WHY}
    ledgers = run(planck, change)
    entry = entries(ledgers).loc["galaxies:G1"]
    assert entry.log_m200c_p50 == pytest.approx(12.7, abs=1e-9)
    assert "by hand: log_m200c = 12.7 (seen by eye)" in entry.note
    assert "By hand: galaxies:G1: log_m200c = 12.7 (seen by eye)" in ledgers.notes
    assert ledgers.run["by_hand"] == [change]
    assert not ledgers.refused
    assert "by hand" not in entries(ledgers).loc["galaxies:G2"].note


def test_without_overrides_nothing_is_said(planck):
    ledgers = run(planck)
    assert "by_hand" not in ledgers.run
    assert not any("hand" in n for n in ledgers.notes)


def test_redshift_moves_the_halo_and_its_listed_stellar_mass(planck):
    before, after = entries(run(planck)), entries(run(planck, {"object": "G1", "z": 0.2, **WHY}))
    assert after.z["galaxies:G1"] == 0.2
    grown = planck.angular_distance_kpc(0.2) / planck.angular_distance_kpc(0.1)
    ratio = after.impact_kpc_p50["galaxies:G1"] / before.impact_kpc_p50["galaxies:G1"]
    assert ratio == pytest.approx(grown, rel=1e-9)
    light = 2 * np.log10(planck.luminosity_distance_mpc(0.2) / planck.luminosity_distance_mpc(0.1))
    moved = after.log_mstar["galaxies:G1"] - before.log_mstar["galaxies:G1"]
    assert moved == pytest.approx(float(light), rel=1e-9)


def test_a_redshift_set_by_hand_is_sharp(planck):
    photometric = galaxy(planck, z_err=0.03, z_kind="phot")
    tables = {"galaxies": [sky.galaxies(photometric)]}
    widths = []
    for changes in ((), ({"object": "G1", "z": 0.1, **WHY},)):
        entry = entries(run(planck, *changes, tables=tables, fixed=False)).loc["galaxies:G1"]
        widths.append(entry.impact_kpc_p84 - entry.impact_kpc_p16)
    assert widths[1] < 0.2 * widths[0]
    assert entry.z_kind == "spec"


def test_drop_takes_the_row_away(planck):
    ledgers = run(planck, {"object": "G2", "drop": True, **WHY})
    assert list(entries(ledgers).index) == ["galaxies:G1"]
    assert "By hand: G2: drop = True (seen by eye)" in ledgers.notes


def test_gas_of_one_halo_alone(planck):
    plain = entries(run(planck)).dm_mean
    half = entries(run(planck, {"object": "G1", "kept_factor": 0.5, **WHY})).dm_mean
    assert half["galaxies:G1"] == pytest.approx(0.5 * plain["galaxies:G1"], rel=1e-12)
    assert half["galaxies:G2"] == plain["galaxies:G2"]
    other = run(planck, {"object": "G1", "model": "strong-feedback", **WHY})
    strong = entries(run(planck, model="strong-feedback")).dm_mean
    assert entries(other).dm_mean["galaxies:G1"] == pytest.approx(strong["galaxies:G1"], rel=1e-12)
    assert entries(other).dm_mean["galaxies:G2"] == plain["galaxies:G2"]
    assert {m["name"] for m in other.run["models"]} == {MODEL, "strong-feedback"}


def test_host_named_by_hand_is_no_foreground(planck):
    change = {"burst": "B1", "host": "galaxies:G1", **WHY}
    ledgers = run(planck, change)
    assert list(entries(ledgers).index) == ["galaxies:G2"]
    assert "by hand: host = galaxies:G1 (seen by eye)" in ledgers.sightlines["note"][0]
    assert ledgers.run["by_hand"] == [{"object": "B1", **change}]


def test_an_object_is_added(planck):
    step = 60 / planck.angular_distance_kpc(0.2)
    place = {"ra": 150.0, "dec": 20.0 - float(np.degrees(step))}
    dwarf = {"add": "galaxy", "object": "dwarf", **place, "z": 0.2, "log_mstar": 9.5, **WHY}
    group = {"add": "group", "object": "pair", **place, "z": 0.4, "log_mass": 13.0, "mass_def": "500c", **WHY}
    found = entries(run(planck, dwarf, group))
    assert {"by-hand:dwarf", "by-hand:pair", "galaxies:G1"} <= set(found.index)
    assert found.kind["by-hand:pair"] == "group"
    assert "by hand: add = galaxy" in found.note["by-hand:dwarf"]


def test_a_mass_set_on_a_group_carries_no_hydrostatic_bias(planck, shared_data):
    cluster = next(g for g in [_mcxc(shared_data)])
    line = sky.Table(rows=[{"burst": "B", "ra": cluster["ra"], "dec": cluster["dec"], "z": 0.9, "dm": 900.0}])
    change = {"object": cluster["row"], "log_m200c": 14.5, **WHY}
    ledgers = audit(line, groups=[cluster["file"]], models=[MODEL], draws=30, overrides=[change])
    assert entries(ledgers).log_m200c_p50[cluster["row"]] == pytest.approx(14.5, abs=1e-9)


def _mcxc(shared_data) -> dict:
    from haloledger.catalogs import read_groups

    file = f"mcxc:{shared_data}/clusters/mcxc.fits"
    groups = read_groups(file)
    i = int(np.argmin(np.abs(groups.z - 0.2)))
    return {"file": file, "row": str(groups.row[i]), "ra": groups.ra_deg[i], "dec": groups.dec_deg[i]}


def test_haloes_of_the_built_in_table_can_be_set_and_dropped():
    line = sky.Table(rows=[{"burst": "B", "ra": 10.6847, "dec": 33.8, "z": 0.09, "dm": 400.0}])
    heavy = {"object": "local:M31", "log_m200c": 12.5, **WHY}
    found = entries(audit(line, models=[MODEL], fixed=True, overrides=[heavy]))
    assert found.log_m200c_p50["local:M31"] == 12.5
    gone = {"object": "M31", "drop": True, **WHY}
    assert "local:M31" not in entries(audit(line, models=[MODEL], fixed=True, overrides=[gone])).index


@pytest.mark.parametrize(
    ("change", "column", "said"),
    [
        (
            {"object": "galaxies:G9", "z": 0.1},
            "object",
            "no such row in any.*Did you mean 'galaxies:G[12]'",
        ),
        ({"object": "G1", "drop": True, "reason": " "}, "reason", "nothing; .*needs its reason"),
        ({"burst": "B9", "host": "G1"}, "burst", "no burst of this name; .*Bursts: B1"),
        ({"object": "G1", "log_m200c": 16.2}, "log_m200c", "16.2; .*No cluster is heavier"),
        ({"object": "G1", "z": -0.1}, "z", "-0.1; .*between 0 and 20"),
        ({"object": "G1"}, "object", "nothing set; Set one of z"),
        ({"object": "G1", "drop": True, "z": 0.1}, "drop", "drop, z; .*nothing else to set"),
        ({"object": "G1", "host": "G2"}, "host", "host is set with burst, host and reason"),
        ({"add": "galxy", "object": "X"}, "add", "galxy; .*Did you mean 'galaxy'"),
        (
            {"add": "galaxy", "object": "X", "ra": 400.0, "dec": 0.0, "z": 0.1, "log_mstar": 9.0},
            "add",
            "for 'ra': found 400",
        ),
        ({"add": "group", "object": "X", "ra": 40.0, "dec": 0.0, "z": 0.1}, "add", "for 'log_mass': found nothing"),
    ],
)
def test_a_change_that_cannot_be_made_is_named_and_the_run_goes_on(planck, change, column, said):
    good = {"object": "G2", "log_m200c": 12.0, **WHY}
    ledgers = run(planck, WHY | change, good)
    (refusal,) = ledgers.refused
    assert (refusal.file, refusal.row, refusal.column) == ("the overrides", 1, column)

    assert re.search(said, f"{refusal.found}; {refusal.advice}")
    assert entries(ledgers).log_m200c_p50["galaxies:G2"] == 12.0


def test_one_bad_row_among_those_added_is_refused_alone(planck):
    good, bad = (
        {"add": "galaxy", "object": name, "ra": 150.0, "dec": dec, "z": 0.2, "log_mstar": 9.5, **WHY}
        for name, dec in (("X", 20.003), ("Y", 97.0))
    )
    ledgers = run(planck, bad, good)
    (refusal,) = ledgers.refused
    assert (refusal.row, refusal.name, refusal.column, refusal.found) == (1, "Y", "dec", "97")
    assert "by-hand:X" in entries(ledgers).index


def test_an_id_that_two_catalogues_have_is_refused_with_both_names(planck):
    tables = {
        "galaxies": [sky.galaxies(galaxy(planck, "A"))],
        "groups": [sky.Table(rows=[sky.group("A", z=0.3)])],
    }
    ledgers = run(planck, {"object": "A", "z": 0.2, **WHY}, tables=tables)
    assert "2 rows: galaxies:A, groups:A" in ledgers.refused[0].found


FILE = """
[[override]]
object = "galaxies:G1"
{line}
reason = "ours"
"""


def test_file_on_disk(planck, tmp_path):
    path = tmp_path / "changes.toml"
    path.write_text(FILE.format(line="log_m200c = 12.7"), encoding="utf-8")
    line, table = sky.bursts(sky.burst()), sky.galaxies(galaxy(planck))
    ledgers = audit(line, galaxies=[table], models=[MODEL], fixed=True, overrides=str(path))
    assert entries(ledgers).log_m200c_p50["galaxies:G1"] == 12.7
    record = next(i for i in ledgers.run["inputs"] if i["kind"] == "overrides")
    assert len(record["sha256"]) == 64


@pytest.mark.parametrize(
    ("text", "message"),
    [
        (FILE.format(line="redshift = 0.1"), "override 1: unknown key 'redshift'.*Known keys: z"),
        (FILE.format(line="log_m200 = 12"), "unknown key 'log_m200'. Did you mean 'log_m200c'"),
        (FILE.format(line='z = "0.1"'), "'z' is '0.1'. Write a number"),
        (FILE.format(line="drop = 1"), "'drop' is 1. Write true or false"),
        (FILE.format(line="model = 3"), "'model' is 3. Write a text in quotes"),
        (FILE.format(line='model = "blendd"'), "blended"),
        (FILE.replace("[[override]]", "[[overide]]").format(line="z = 0.1"), "Did you mean 'override'"),
        (FILE.format(line="z = "), "not TOML"),
        ("", "an empty list"),
    ],
)
def test_a_bad_file_stops_the_run(planck, tmp_path, text, message):
    path = tmp_path / "changes.toml"
    path.write_text(text, encoding="utf-8")
    tables = {"galaxies": [sky.galaxies(galaxy(planck))]}
    with pytest.raises(InputError, match=message):
        audit(sky.bursts(sky.burst()), **tables, models=[MODEL], overrides=str(path))


def test_a_missing_file_is_named():
    with pytest.raises(InputError, match=r"nowhere.toml: cannot be read"):
        audit(sky.bursts(sky.burst()), models=[MODEL], overrides="nowhere.toml")


def test_a_group_heavier_than_any_cluster_is_a_refused_row():
    groups = sky.Table(rows=[sky.group("A", log_mass=16.2), sky.group("B", log_mass=15.2, z=0.3)])
    ledgers = audit(sky.bursts(sky.burst()), groups=[groups], models=[MODEL], fixed=True)
    (refusal,) = ledgers.refused
    assert (refusal.name, refusal.column, refusal.found) == ("A", "log_mass", "16.2")
    assert "More than any cluster" in refusal.advice
    assert list(entries(ledgers).index) == ["groups:B"]
