"""Scores on draws whose calibration is known."""

import numpy as np
import pytest

from haloledger.rehearse.score import LEVELS, calibration, crps, median_width, ranks, tables
from haloledger.rehearse.show import bias_text, cell

RNG = np.random.default_rng(0)
N = 4000


def sums(width=1.0, shift=0.0, zero=0.4):
    """Draws and truths of sums that are zero with probability `zero`; the truths have width 1 and no shift."""
    centre = 10 + 3 * RNG.standard_normal(N)
    truth = np.where(RNG.random(N) < zero, 0.0, np.abs(centre + RNG.standard_normal(N)))
    draws = np.abs(centre[:, None] + shift + width * RNG.standard_normal((N, 400)))
    return np.where(RNG.random((N, 400)) < zero, 0.0, draws), truth


def held(**kind):
    draws, truth = sums(**kind)
    return tables(ranks(draws, truth, RNG), draws, truth)[0]


def test_calibrated_draws_hold_what_they_say():
    row = held()
    assert row.worst < 3.5
    assert row.bias == pytest.approx(0, abs=4 * row.bias_error / row.mean_truth)


@pytest.mark.parametrize("kind", [{"width": 0.6}, {"width": 1.8}, {"shift": 1.0}])
def test_wrong_draws_are_seen(kind):
    assert held(zero=0.0, **kind).worst > 6


def test_ranks_of_equal_values_are_spread():
    rank = ranks(np.zeros((5000, 100)), np.zeros(5000), np.random.default_rng(1))
    assert np.histogram(rank, 10, (0, 1))[0] / 500 == pytest.approx(np.ones(10), abs=0.15)


def test_single_precision_truth_meets_its_equals():
    draws = np.full((1, 100), 0.1, dtype=np.float32)
    rank = [ranks(draws, np.array([0.1]), np.random.default_rng(s))[0] for s in range(40)]
    assert np.std(rank) > 0.2


def test_crps_of_a_normal():
    # mean over truths of the CRPS of N(0, 1) draws: 1 / sqrt(pi) (Gneiting & Raftery 2007, JASA 102, 359, eq. 21)
    truth = np.random.default_rng(2).standard_normal(3000)
    draws = np.random.default_rng(3).standard_normal((3000, 400))
    assert crps(draws, truth).mean() == pytest.approx(1 / np.sqrt(np.pi), rel=0.03)


def test_crps_of_exact_draws_is_zero():
    assert crps(np.full((2, 50), 3.0), np.array([3.0, 4.0])) == pytest.approx([0, 1])


def test_width():
    draws = 5 * np.random.default_rng(4).standard_normal((200, 2000))
    assert median_width(draws) == pytest.approx(9.94, rel=0.03)  # 2 x 0.9945 sigma


def test_quintiles_are_by_prediction_not_by_truth():
    draws, truth = sums(zero=0.0)
    rows = {r.name: r for r in tables(ranks(draws, truth, RNG), draws, truth)}
    assert [rows[f"fifth {k}"].n for k in range(1, 6)] == [N // 5] * 5
    # a choice by truth would push the ranks of the ends to the ends
    assert max(rows[f"fifth {k}"].worst for k in range(1, 6)) < 4


def test_empty_set_says_so():
    assert calibration("none", *np.zeros((3, 4)), np.zeros(4, bool)).n == 0


def test_far_departures_are_marked():
    assert "!" in cell(0.60, 0.68, 0.01)
    assert "!" not in cell(0.67, 0.68, 0.01)
    assert len(LEVELS) == 4


def test_bias_without_truth_has_a_unit():
    row = calibration("x", np.full(4, 0.5), np.ones(4), np.zeros(4), np.ones(4, bool))
    assert bias_text(row) == "+1.00 pc cm-3"
