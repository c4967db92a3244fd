"""Milky Way halo laws by name, and the host law without its halo."""

import numpy as np
import pytest
from scipy.integrate import quad
from test_terms import bursts

from haloledger.engine.universe import Universe
from haloledger.ledger.nuisances import checked
from haloledger.sightlines.milky_way import halo_column
from haloledger.sightlines.terms import defaults, host_obs, host_rest, mw_halo, mw_halo_laws

LAWS = defaults()["mw_halo_laws"]
POLE, ANTICENTRE, CENTRE = (90.0, 0.0), (180.0, 0.0), (0.0, 0.0)


@pytest.mark.parametrize(
    ("name", "towards", "expected"),
    [  # modified NFW with M = 1.5e12, c = 7.7, 0.75 of the baryons, to 200 kpc (scipy quad, apart from this code)
        ("prochaska-zheng-2019", POLE, 61.94),
        ("prochaska-zheng-2019", ANTICENTRE, 57.42),
        ("prochaska-zheng-2019", CENTRE, 62.38),
        # Miller & Bregman 2015 with their masses, to 250 kpc
        ("miller-bregman-2015", (0.0, 90.0), 36.0),
        ("miller-bregman-2015", ANTICENTRE, 26.1),
    ],
)
def test_columns_of_the_milky_way_halo(name, towards, expected):
    # the radius r200c of the check and the file differ by 1e-4; expected is printed to 0.1 or 0.01
    assert halo_column(LAWS[name], *towards) == pytest.approx(expected, abs=max(1e-3 * expected, 0.05))


def test_column_is_the_integral_over_the_line():
    law = LAWS["miller-bregman-2015"]
    l_deg, b_deg = 40.0, 25.0
    cosine = np.cos(np.radians(l_deg)) * np.cos(np.radians(b_deg))
    end = 8 * cosine + np.sqrt((8 * cosine) ** 2 + 250**2 - 64)
    by_hand, _ = quad(lambda s: 0.0135 / 0.3 * (64 + s * s - 16 * s * cosine) ** -0.75, 0, end, limit=200)
    assert halo_column(law, l_deg, b_deg) == pytest.approx(1e3 * by_hand, rel=1e-4)


@pytest.mark.parametrize(
    ("name", "low", "high"),
    [
        ("yamasaki-totani-2020", 24.4, 61.3),  # mean 43, 0.2 dex to both sides
        ("hoffmann-2026", 44.0, 95.0),  # 68 +27 -24: made symmetric in the logarithm
        ("prochaska-zheng-2019", 50.0, 80.0),  # the range; this direction lies at 59
    ],
)
def test_laws_by_name_have_their_published_range(name, low, high):
    universe = Universe(n_draws=20_000, held=checked({"mw_halo": name}))
    draws, said = mw_halo(bursts(), 0, universe)
    assert said == f"Milky Way halo by {name}"
    # 8%: the direction of the modified NFW, and what making an error symmetric costs
    assert np.quantile(draws, [0.16, 0.84]) == pytest.approx([low, high], rel=0.08)


def test_mean_of_the_law_is_the_published_mean():
    draws, _ = mw_halo(bursts(), 0, Universe(n_draws=40_000, held={"mw_halo": "yamasaki-totani-2020"}))
    assert draws.mean() == pytest.approx(43.0, rel=0.01)  # 40,000 draws of 0.46 know it to 0.25%


def test_every_law_has_a_source_and_a_width():
    assert set(mw_halo_laws()) >= {"yamasaki-totani-2020", "hoffmann-2026", "prochaska-zheng-2019"}
    assert all(law["source"] and law["scatter_dex"] > 0 for law in LAWS.values())


def test_a_law_in_the_table_column_is_stronger():
    universe = Universe(n_draws=10, held={"mw_halo": "hoffmann-2026"})
    draws, said = mw_halo(bursts(dm_mw_halo=33.0, dm_mw_halo_err=0.0), 0, universe)
    assert np.all(draws == 33.0)
    assert "from the table" in said


def test_host_without_its_halo_only_where_one_is_modelled():
    universe = Universe(n_draws=20_000)
    inside = np.arange(universe.n_draws) % 2 == 0
    plain, _ = host_rest(bursts(), 0, universe)
    both, said = host_rest(bursts(), 0, universe, inside)
    assert np.array_equal(both[~inside], plain[~inside])
    # Khrykin et al. 2024: interstellar medium and source 69
    assert np.median(both[inside]) == pytest.approx(69.0, rel=0.03)
    assert "khrykin-2024-inner) in 50% of draws" in said
    same, said = host_rest(bursts(), 0, universe, np.zeros(universe.n_draws, bool))
    assert np.array_equal(same, plain)
    assert "sang-lin-2025" in said


def test_a_host_from_the_table_stays_whatever_is_modelled():
    universe = Universe(n_draws=4)
    z, inside = np.full(4, 0.5), np.ones(4, bool)
    assert np.all(host_obs(bursts(dm_host_rest=90.0), 0, z, universe, inside)[0] == 60.0)
