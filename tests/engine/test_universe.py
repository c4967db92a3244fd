"""Random numbers hang on names alone."""

import numpy as np
from scipy import stats

from haloledger.engine.universe import Universe


def test_rows_do_not_depend_on_order_or_company():
    universe = Universe(seed=3, n_draws=50)
    all_rows = universe.normals("mass", ["a", "b", "c"])
    assert np.array_equal(universe.normals("mass", ["c", "a"]), all_rows[[2, 0]])


def test_more_draws_keep_the_first():
    assert np.array_equal(
        Universe(seed=3, n_draws=200).normals("mass", ["a"])[:, :50],
        Universe(seed=3, n_draws=50).normals("mass", ["a"]),
    )


def test_seed_parameter_and_id_each_change_the_row():
    base = Universe(seed=3, n_draws=8).normals("mass", ["a"])
    for other in (
        Universe(seed=4, n_draws=8).normals("mass", ["a"]),
        Universe(seed=3, n_draws=8).normals("centre", ["a"]),
        Universe(seed=3, n_draws=8).normals("mass", ["b"]),
        Universe(seed=3, n_draws=8).normals("mas", ["sea"]),
    ):
        assert not np.any(base == other)


def test_normals_are_normal_and_rows_independent():
    rows = Universe(seed=1, n_draws=20_000).normals("mass", [str(i) for i in range(20)])
    # fixed seed; 0.01 is far inside what 400,000 independent normals give
    assert stats.kstest(rows.ravel(), "norm").pvalue > 0.01
    correlation = np.corrcoef(rows)[np.triu_indices(20, 1)]
    assert np.abs(correlation).max() < 4.5 / np.sqrt(20_000)


def test_fixed_switches_every_spread_off():
    universe = Universe(n_draws=500, fixed=True)
    assert universe.n_draws == 1
    assert np.array_equal(universe.normals("mass", ["a", "b"]), np.zeros((2, 1)))
    assert np.array_equal(universe.shared_uniform("relation"), [0.5])
