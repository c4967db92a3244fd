"""The halo census: its mean against a closed account, its random lines against its mean, and gas conserved."""

import numpy as np
import pytest

from haloledger.cosmos.mean_dm import mean_cosmic_dm
from haloledger.cosmos.scatter import relative_dm
from haloledger.gas.models import load_model
from haloledger.reach.census import LOG_M, take_census
from haloledger.reach.diffuse import Z_NODES, diffuse_draws, solve_width

ONES = np.ones((len(LOG_M), 1))


@pytest.fixture(scope="module")
def textbook(planck):
    return take_census(load_model("textbook-modified-nfw"), planck)


HALO_SHARE = [(12.0, 95.94), (13.0, 54.93), (14.0, 16.05)]
"""Least log M and mean halo DM to z = 0.5 for 0.75 of the baryons (Tinker 2008 by colossus, not by this code)."""


@pytest.mark.parametrize(("least", "expected"), HALO_SHARE)
def test_mean_halo_dm_above_a_mass(planck, textbook, least, expected):
    above = (LOG_M[:, None] > least).astype(float)
    # 0.1 dex bins in mass and 0.02 steps in z: 1%
    assert textbook.mean(np.array([0.5]), above)[0] == pytest.approx(expected, rel=0.01)


@pytest.mark.parametrize("model", ["textbook-modified-nfw", "textbook-modified-nfw-wide", "gnfw-agn-feedback"])
def test_random_lines_average_to_the_mean(planck, model):
    census = take_census(load_model(model), planck, seed=5)
    z = np.array([0.1, 0.5, 1.0])
    mean = np.array([census.mean(np.array([zz]), ONES)[0] for zz in z])
    lines = np.stack([census.lines(np.full(len(census.sums), zz), np.arange(len(census.sums))) for zz in z], axis=1)
    error = lines.std(axis=0) / np.sqrt(len(lines))
    # concentration scatter moves the mean by much less than the error of 4,000 lines; 3.5 sigma on nine numbers
    assert np.all(np.abs(lines.mean(axis=0) - mean) < 3.5 * error + 0.01 * mean)


def test_nothing_lies_in_front_of_redshift_zero(textbook):
    assert textbook.mean(np.zeros(1), ONES)[0] == 0
    assert textbook.lines(np.zeros(3), np.arange(3)).max() == 0


def test_gas_is_conserved_in_every_draw(planck, textbook):
    # twice the kept fraction: the diffuse mean falls by exactly the haloes' gain
    width, z = solve_width(textbook, planck), np.array([0.5])
    for factor in (0.3, 1.0, 2.0):
        haloes = textbook.mean(z, factor * ONES)
        s = width.at(z)
        diffuse_mean = diffuse_draws(z, haloes, width, s / 2, planck)  # the log-normal's mean lies at score s/2
        assert diffuse_mean + haloes == pytest.approx(mean_cosmic_dm(z, planck), rel=1e-12)


@pytest.mark.parametrize("z", [0.3, 1.0])
def test_diffuse_and_haloes_have_the_named_totals_width(planck, z):
    census = take_census(load_model("blended"), planck)
    width = solve_width(census, planck)
    assert not width.floored_at(z)
    n = 200_000
    rng = np.random.default_rng(11)
    pick, zz = rng.integers(0, len(census.sums), n), np.full(n, z)
    haloes = census.lines(zz, pick)
    mean = np.repeat(census.mean(np.array([z]), ONES), n)
    total = haloes + diffuse_draws(zz, mean, width, rng.standard_normal(n), planck)
    low, high = np.quantile(total, [0.158655, 0.841345])
    wanted = mean_cosmic_dm(z, planck) * np.subtract(*relative_dm(z, np.array([1.0, -1.0])))
    # solved on 4,000 lines: the width of their 16-84 range is known to 2-3%
    assert high - low == pytest.approx(wanted, rel=0.05)


def test_floor_is_said_where_haloes_alone_spread_more(planck):
    width = solve_width(take_census(load_model("textbook-modified-nfw-wide"), planck), planck)
    assert width.floored.any()
    assert np.all(width.width_ln[width.floored] == width.width_ln.min())
    assert len(width.width_ln) == len(Z_NODES)
