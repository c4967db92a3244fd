"""Haloes at the burst's distance: cut at the burst, at the source, in the sum when asked; hosts named and not found."""

import numpy as np
import pytest
import sky
from scipy.integrate import quad

from haloledger.audit import audit
from haloledger.cosmos.concentration import concentration
from haloledger.sightlines.terms import defaults

WIDE = "textbook-modified-nfw-wide"  # the same gas to two r200c


def columns(planck, log_m, z, b, start, stop) -> float:
    """Observer-frame DM of the textbook gas between two depths [r200c], by scipy's quad."""
    c = float(concentration("dutton2014", log_m, z, planck))
    inner = quad(lambda x: x**2 * c * x / (2 + c * x) ** 4, 0, 1)[0]
    line = quad(lambda s: c * np.hypot(b, s) / (2 + c * np.hypot(b, s)) ** 4, start, stop, limit=200)[0]
    gas = 0.75 * planck.baryon_share * 10**log_m
    return gas / (4 * np.pi * inner * planck.r200c_kpc(log_m, z) ** 2) * line * 0.875 * 4.046285e-8 * 1000 / (1 + z)


def first(ledgers):
    """The first row of both tables, as plain data."""
    sightlines, entries = ledgers.to_pandas()
    return sightlines.iloc[0], entries.iloc[0]


@pytest.mark.parametrize("depth", [-0.9, -0.2, 0.0, 0.5, 1.3, 5.0])
def test_a_halo_beside_the_burst_is_cut_at_the_burst(planck, depth):
    # 1.2 r200c aside: the burst is not in it; the line meets its outer gas and ends `depth` r200c behind the centre
    log_m, z, b = 13.0, 0.1, 1.2
    r200c = float(planck.r200c_kpc(log_m, z))
    end_mpc = float(planck.comoving_distance_mpc(z)) + depth * r200c * (1 + z) / 1e3
    z_burst = float(planck.z_at_comoving_distance(end_mpc))
    line = sky.bursts(sky.burst(z=z_burst))
    ledgers = audit(
        line, galaxies=[sky.galaxies(sky.galaxy_at(planck, log_m, z, b * r200c))], models=[WIDE], fixed=True
    )
    half = np.sqrt(4 - b * b)
    expected = columns(planck, log_m, z, b, -half, min(depth, half))
    # the inverse of the distance is good to 1e-3 Mpc, 2e-3 r200c
    assert first(ledgers)[0].dm_foreground_mean == pytest.approx(expected, rel=5e-3)


def test_a_burst_in_the_middle_of_its_group_meets_half_of_it(planck):
    log_m, z, b = 14.0, 0.1, 0.3
    step = np.degrees(b * planck.r200c_kpc(log_m, z) / planck.angular_distance_kpc(z))
    group = sky.Table(rows=[sky.group(z=z, log_mass=log_m, dec=sky.HERE[1] + step)])
    row, entry = first(audit(sky.bursts(sky.burst(z=0.1005)), groups=[group], models=[WIDE], fixed=True))
    half = np.sqrt(4 - b * b)
    # fixed takes the median depth: the centre; 2e-4 is the table's, 1e-3 the depth grid's
    assert row.dm_at_source_mean == pytest.approx(columns(planck, log_m, z, b, -half, 0), rel=2e-3)
    assert row.dm_foreground_mean == 0
    assert np.isnan(entry.share)


AT_SOURCE = {
    "groups": [sky.Table(rows=[sky.group(z=0.1005, log_mass=14.0, dec=sky.HERE[1] + 0.02)])],
    "galaxies": [sky.Table(rows=[sky.member_host("H", "C1", z=0.1)])],
}
"""A group that lists the host among its members."""


def test_at_source_counts_in_the_sum_when_asked():
    line = sky.bursts(sky.burst(z=0.1, host_id="H"))
    apart, asked = (
        first(audit(line, **AT_SOURCE, models=["blended"], draws=300, source_in_sum=use)) for use in (False, True)
    )
    assert asked[0].dm_foreground_mean == apart[0].dm_at_source_mean > 0
    assert asked[0].dm_at_source_mean == apart[0].dm_foreground_mean == 0
    assert asked[0].dm_after_all_p50 == pytest.approx(apart[0].dm_after_all_p50, abs=1e-9)
    assert asked[1].share == 1
    assert "in the foreground sum, as asked" in asked[1].note
    assert "outside the foreground sum" in apart[1].note
    assert asked[0].n_haloes == 1
    assert apart[0].n_haloes == 0


def test_host_without_its_halo_beside_the_group_it_sits_in():
    line = sky.bursts(
        sky.burst("A", z=0.1, host_id="H"), {**sky.burst("B", z=0.1, host_id=""), "ra": sky.HERE[0] + 3.0}
    )
    rows = audit(line, **AT_SOURCE, models=["blended"], draws=2000).to_pandas()[0].set_index("burst")
    inner, whole = defaults()["host_without_halo"], defaults()["host"]
    # 2000 draws know the median to 0.027 in the logarithm
    assert rows.dm_host_obs_p50["A"] * 1.1 == pytest.approx(inner["median_rest"], rel=0.09)
    assert rows.dm_host_obs_p50["B"] * 1.1 == pytest.approx(whole["median_rest"], rel=0.09)
    assert "host without its own halo (khrykin-2024-inner) in 100% of draws" in rows.note["A"]
    assert "khrykin" not in rows.note["B"]


def test_a_host_that_is_found_nowhere_is_said_and_sought_by_place(planck):
    host = sky.galaxy_at(planck, 12.5, 0.3, 5.0, name="HOST")
    for named, said in (("HOST", False), ("galaxies:HOST", False), ("HOTS", True)):
        table = sky.bursts(sky.burst(z=0.3, host_id=named))
        ledgers = audit(table, galaxies=[sky.galaxies(host)], models=["blended"], draws=32)
        assert not len(ledgers.entries)
        note = str(ledgers.sightlines["note"][0])
        assert (f"host_id '{named}' is in no catalogue given: the host is sought by position" in note) is said


def test_a_host_that_is_named_and_listed_decides_alone(planck):
    # the named host is listed, far from the line; the galaxy beside the burst is another one and stays
    named = sky.galaxy_at(planck, 12.5, 0.3, 400.0, name="HOST")
    beside = sky.galaxy_at(planck, 12.0, 0.3 - 0.0008, 8.0, name="NEAR")
    table = sky.bursts(sky.burst(z=0.3, host_id="HOST"))
    ledgers = audit(table, galaxies=[sky.galaxies(named, beside)], models=["blended"], draws=32)
    assert "galaxies:NEAR" in [str(h) for h in ledgers.entries["halo"]]


def test_members_of_the_burst_s_group_do_not_take_the_burst_from_it():
    # six satellites around the burst: in draws where they have no halo of their own, the burst cannot sit in theirs
    rng = np.random.default_rng(3)
    places = rng.normal(0, 0.01, (6, 2))
    rows = [
        {**sky.member_host(f"S{i}", "", z=0.1003), "ra": sky.HERE[0] + p[0], "dec": sky.HERE[1] + p[1]}
        for i, p in enumerate(places)
    ]
    for row in rows:
        del row["group_id"]
    group = sky.Table(rows=[sky.group(z=0.1, log_mass=14.3, dec=sky.HERE[1] + 0.01)])
    ledgers = audit(
        sky.bursts(sky.burst(z=0.1)),
        galaxies=[sky.Table(rows=rows)],
        groups=[group],
        models=[WIDE],
        draws=1000,
        keep_draws=True,
    )
    # odds 200 / Om(z) x H chord x N(0) = 100: the group holds the burst in 99% of draws
    assert (ledgers.draws.dm_at_source > 0).mean() > 0.95
