"""The audit with its draws: one universe a draw, sums of draws, shares, and what may not be printed."""

import numpy as np
import pytest
import sky

from haloledger.audit import audit
from haloledger.errors import InputError
from haloledger.paths import data_folder

MODELS = ["textbook-modified-nfw", "blended"]
DEMO = data_folder("demo_sightlines")
DEMO_TABLES = {"galaxies": [str(DEMO / "galaxies.ecsv")], "groups": [str(DEMO / "groups.ecsv")]}


def rows_of(ledgers, burst):
    """Both tables restricted to one burst, as plain data."""
    sightlines, entries = ledgers.to_pandas()
    return sightlines[sightlines.burst == burst].reset_index(drop=True), entries[entries.burst == burst].reset_index(
        drop=True
    )


@pytest.fixture(scope="module")
def whole():
    return audit(str(DEMO / "bursts.ecsv"), **DEMO_TABLES, models=MODELS, draws=150, keep_draws=True)


def test_order_and_company_change_nothing_to_the_last_bit(whole):
    from astropy.table import Table

    table = Table.read(DEMO / "bursts.ecsv")
    turned, alone = table[::-1], table[3:4]
    for part in (turned, alone):
        other = audit(part, **DEMO_TABLES, models=MODELS, draws=150)
        for burst in part["burst"]:
            for mine, theirs in zip(rows_of(whole, burst), rows_of(other, burst), strict=True):
                assert mine.equals(theirs)
    assert len(alone) == 1


def test_same_run_twice_is_the_same(whole):
    again = audit(str(DEMO / "bursts.ecsv"), **DEMO_TABLES, models=MODELS, draws=150)
    for mine, theirs in zip(whole.to_pandas(), again.to_pandas(), strict=True):
        assert mine.equals(theirs)


def test_another_seed_is_another_run(whole):
    other = audit(str(DEMO / "bursts.ecsv"), **DEMO_TABLES, models=MODELS, draws=150, seed=2)
    assert not whole.to_pandas()[0].equals(other.to_pandas()[0])


def test_one_cluster_has_one_mass_in_all_ledgers_of_a_draw():
    table = sky.bursts(sky.burst("B1"), {**sky.burst("B2"), "ra": sky.HERE[0] + 0.05})
    groups = sky.Table(rows=[sky.group(log_mass=14.5, log_mass_err=0.2, centre_err_kpc=50.0)])
    ledgers = audit(table, groups=[groups], models=MODELS, draws=64, keep_draws=True)
    draws = ledgers.entry_draws
    for model in MODELS:
        first, second = (draws[(draws.burst == b) & (draws.model == model)].iloc[0] for b in ("B1", "B2"))
        assert np.array_equal(first.log_m200c, second.log_m200c)
        assert np.std(first.log_m200c) > 0.1
        assert not np.array_equal(first.impact_kpc, second.impact_kpc)


def test_sum_is_the_sum_of_the_draws(whole):
    draws, terms = whole.entry_draws, whole.draws
    for (burst, model), part in terms.groupby(["burst", "model"]):
        entries = draws[(draws.burst == burst) & (draws.model == model)]
        total = sum((d for d in entries.dm), np.zeros(150))
        assert total == pytest.approx((part.dm_foreground + part.dm_at_source).to_numpy(), abs=1e-9)


def test_every_interval_is_a_quantile_of_draws(whole):
    part = whole.draws[(whole.draws.burst == whole.bursts.burst[0]) & (whole.draws.model == "blended")]
    row = next(r for r in whole.sightlines if r["burst"] == whole.bursts.burst[0] and r["model"] == "blended")
    for term in ("dm_foreground", "dm_diffuse", "dm_after_all", "dm_cosmic_mean_z"):
        low, middle, high = np.quantile(part[term], [0.16, 0.5, 0.84])
        assert [row[f"{term}_p16"].value, row[f"{term}_p50"].value, row[f"{term}_p84"].value] == pytest.approx(
            [low, middle, high]
        )
        assert low < high


def test_shares_add_to_one_and_so_do_variance_shares(whole):
    _, entries = whole.to_pandas()
    sightlines, _ = whole.to_pandas()
    seen = 0
    for key, part in entries.groupby(["burst", "model"]):
        total = sightlines[(sightlines.burst == key[0]) & (sightlines.model == key[1])].dm_foreground_mean.iloc[0]
        if total == 0:
            continue
        seen += 1
        assert part.share.sum() == pytest.approx(1.0, abs=1e-9)
        assert part.variance_share.sum() == pytest.approx(1.0, abs=1e-9)
        assert list(part.halo)[-1] == "shared"
    assert seen >= 10


def test_less_gas_in_haloes_is_more_gas_outside(whole):
    # draw by draw, the diffuse mean falls as the shared kept fraction rises: the two move against each other
    held = {h: _diffuse(h) for h in ("-0.3", "0", "0.2")}
    assert held["-0.3"] > held["0"] > held["0.2"]


def _diffuse(kept: str) -> float:
    table = sky.bursts(sky.burst(z=0.6))
    groups = sky.Table(rows=[sky.group()])
    ledgers = audit(table, groups=[groups], models=["blended"], draws=64, hold={"kept": kept})
    return ledgers.sightlines["dm_diffuse_mean"][0].value


def test_burst_without_redshift_gets_no_residual():
    table = sky.bursts(sky.burst(z=np.nan, dm=800.0))
    groups = sky.Table(rows=[sky.group()])
    row = audit(table, groups=[groups], models=["blended"], draws=64).sightlines[0]
    assert np.ma.is_masked(row["z"])
    assert np.all(row["dm_after_all_p50"].mask)
    assert np.all(row["dm_after_mw_foreground_mean"].mask)
    assert row["dm_foreground_mean"].value > 0
    assert "no residual" in row["note"]


def test_group_that_lists_the_host_is_at_the_source():
    table = sky.bursts(sky.burst(z=0.1, host_id="H"))
    groups = sky.Table(rows=[sky.group(z=0.1005, log_mass=14.0, dec=sky.HERE[1] + 0.02)])
    hosts = sky.Table(rows=[sky.member_host()])
    ledgers = audit(table, galaxies=[hosts], groups=[groups], models=["blended"], draws=400, keep_draws=True)
    row = ledgers.sightlines[0]
    assert row["dm_foreground_mean"].value == 0
    assert row["dm_at_source_mean"].value > 0
    assert "burst sits in" in ledgers.entries["note"][0]
    # the depth is drawn: the burst is as often in front of the centre as behind it; 3 sigma of 400 draws
    assert ledgers.entries["p_front"][0] == pytest.approx(0.5, abs=0.08)


def test_a_group_that_may_hold_the_burst_does_so_in_a_share_of_draws():
    # nobody lists the host: the share falls with the velocity between burst and group; else it is in front or behind
    share = {}
    for kms in (0, 900, 1500):
        z = 0.1 + 1.1 * kms / 299792.458
        groups = sky.Table(rows=[sky.group(z=0.1, log_mass=14.0, log_mass_err=0.01, dec=sky.HERE[1] + 0.02)])
        ledgers = audit(sky.bursts(sky.burst(z=z)), groups=[groups], models=["blended"], draws=2000, keep_draws=True)
        terms = ledgers.draws
        assert not np.any((terms.dm_foreground > 0) & (terms.dm_at_source > 0))  # in one draw it is one or the other
        share[kms] = (terms.dm_at_source > 0).mean()
    # sigma_v = 445 km/s and a chord of 1.9 Mpc, by hand: odds 200 / Om(z) x H chord x N(dv)
    by_hand = {k: (o := 200 / 0.3737 * 134 * np.exp(-0.5 * (k / 445) ** 2) / (2.507 * 445)) / (1 + o) for k in share}
    for kms, expected in by_hand.items():
        assert share[kms] == pytest.approx(expected, abs=0.06)
    assert share[0] > 0.95
    assert share[1500] < 0.35


def test_host_is_never_foreground(planck):
    host = sky.galaxy_at(planck, 12.5, 0.3, 5.0, name="HOST")
    other = sky.galaxy_at(planck, 12.5, 0.1, 40.0, name="OTHER")
    table = sky.bursts(sky.burst(z=0.3, host_id="HOST"))
    ledgers = audit(table, galaxies=[sky.galaxies(host, other)], models=["blended"], draws=32)
    assert not any("HOST" in str(h) for h in ledgers.entries["halo"])
    # and by position and redshift alone, when nobody names it
    ledgers = audit(sky.bursts(sky.burst(z=0.3)), galaxies=[sky.galaxies(host, other)], models=["blended"], draws=32)
    assert not any("HOST" in str(h) for h in ledgers.entries["halo"])


def test_poor_localisation_widens_the_interval(planck):
    row = sky.galaxy_at(planck, 12.5, 0.1, 60.0)
    widths = []
    for major in (0.5, 40.0):
        table = sky.bursts(sky.burst(loc_major_arcsec=major, loc_minor_arcsec=major, loc_pa_deg=0.0))
        ledgers = audit(table, galaxies=[sky.galaxies(row)], models=["textbook-modified-nfw"], draws=800)
        entry = ledgers.entries[0]
        widths.append((entry["impact_kpc_p84"] - entry["impact_kpc_p16"]).value)
    assert widths[1] > 5 * widths[0]


def test_outside_the_footprint_reach_is_zero(tmp_path):
    path = tmp_path / "field.txt"
    path.write_text("10 -5\n20 -5\n20 5\n10 5\n", encoding="utf-8")
    far, here = (sky.Table(rows=[sky.group(ra=ra, dec=dec)]) for ra, dec in ((15.0, 0.0), sky.HERE))
    row, other = (
        audit(sky.bursts(sky.burst()), groups=[g], footprints=[str(path)], models=["blended"], draws=32).sightlines[0]
        for g in (far, here)
    )
    assert row["reach"] == 0
    assert "could list nothing here" in row["note"]
    # a list that shows a halo out here has no such footprint: nothing is known of its reach
    assert np.ma.is_masked(other["reach"])
    assert "not all lists have one" in other["note"]


@pytest.mark.parametrize(
    ("options", "message"),
    [
        ({"draws": 0}, "at least one universe"),
        ({"models": ["blendd"]}, "blended"),
        ({"hold": {"relatoin": "moster2013"}}, "Did you mean --hold relation"),
        ({"hold": {"relation": "moster"}}, "Write one of"),
        ({"hold": {"zero_point": "none"}}, "not a number"),
        ({"hold": {"mw_disc": "-1"}}, "out of range"),
        ({"cosmology": "Planck99"}, "Planck18"),
        ({"disc": "ne1999"}, "Write one of plane"),
        ({"models": []}, "--model"),
        ({"models": ["blended", "blended"]}, "given twice"),
        ({"hold": {"kept": "-5"}}, "out of range"),
        ({"draws": "many"}, "at least one universe"),
    ],
)
def test_bad_options_stop_before_any_work(options, message):
    with pytest.raises(InputError, match=message):
        audit(sky.bursts(sky.burst()), groups=[sky.Table(rows=[sky.group()])], **{"models": ["blended"], **options})


def test_one_name_or_table_alone_counts_as_a_list():
    line, group = sky.bursts(sky.burst()), sky.Table(rows=[sky.group()])
    alone, listed = (
        audit(line, groups=g, models=m, fixed=True) for g, m in ((group, "blended"), ([group], ["blended"]))
    )
    assert alone.to_pandas()[1].equals(listed.to_pandas()[1])
    assert repr(alone).startswith("Ledgers of 1 bursts")


def test_held_relation_and_mass_spread(planck):
    galaxy = {
        "id": "G",
        "ra": sky.HERE[0],
        "dec": sky.HERE[1] + 0.01,
        "z": 0.1,
        "log_mstar": 11.0,
        "log_mstar_err": 0.1,
    }
    table, rows = sky.bursts(sky.burst()), sky.galaxies(galaxy)
    free, held = (
        audit(table, galaxies=[rows], models=["blended"], draws=600, hold=h).entries[0]
        for h in ({}, {"relation": "kravtsov2018", "zero_point": "0"})
    )
    assert held["log_m200c_p84"] - held["log_m200c_p16"] < free["log_m200c_p84"] - free["log_m200c_p16"]
