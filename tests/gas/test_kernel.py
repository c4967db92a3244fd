"""The packed tables and their look-up, against plain multilinear interpolation."""

import numpy as np
import pytest
from scipy.interpolate import RegularGridInterpolator

from haloledger.gas.kernel import Axis, Table, columns


@pytest.mark.parametrize(
    "names", [("concentration", "u"), ("mass", "redshift", "u"), ("mass", "redshift", "concentration", "u")]
)
def test_look_up_is_multilinear(names):
    rng = np.random.default_rng(5)
    every = {
        "mass": Axis(9.0, 16.0, 8),
        "redshift": Axis(0.0, 2.0, 5, np.log1p),
        "concentration": Axis(0.0, 4.0, 6, np.log),
        "u": Axis(0.0, 1.0, 9),
    }
    axes = {name: every[name] for name in names}
    values = rng.normal(size=[a.size for a in axes.values()])
    n, boundary = 5000, 1.3
    given = {
        "impact": boundary * rng.uniform(0.01, 1, n),
        "mass": rng.uniform(8.5, 16.5, n),  # beyond the grid too: the edge is taken
        "redshift": rng.uniform(0, 7, n),
        "concentration": rng.uniform(0.5, 60, n),
    }
    r200c = rng.uniform(50, 900, n)
    got = columns([[Table.pack(names, values)]], axes, boundary, given, r200c)
    u = given["impact"] / boundary
    place = {
        "mass": given["mass"],
        "redshift": np.log1p(given["redshift"]),
        "concentration": np.log(given["concentration"]),
    }
    place["u"] = np.sqrt(u)
    points = np.stack([np.clip(place[a], axes[a].low, axes[a].high) for a in names], axis=-1)
    ln_t = RegularGridInterpolator([a.points for a in axes.values()], values)(points)
    expected = np.exp(ln_t) * 10 ** given["mass"] * np.sqrt(1 - u**2) / r200c**2
    assert got == pytest.approx(expected, rel=1e-4)  # single precision, slopes of up to 5 a cell; shipped: 0.1


def test_terms_add_and_tables_of_a_term_multiply():
    axes = {"mass": Axis(9.0, 16.0, 3), "concentration": Axis(0.0, 4.0, 3, np.log), "u": Axis(0.0, 1.0, 3)}
    ones = np.ones((3, 3))
    shape, amount = Table.pack(("concentration", "u"), 0.7 * ones), Table.pack(("mass", "concentration"), -0.2 * ones)
    given = {"impact": np.array([0.6]), "mass": np.array([0.0]), "concentration": np.array([5.0])}
    got = columns([[shape, amount], [shape]], axes, 1.0, given, np.array([2.0]))
    assert got == pytest.approx([(np.exp(0.5) + np.exp(0.7)) * 0.8 / 4], rel=1e-6)


def test_nan_in_nan_out_and_no_halo_no_column():
    axes = {"concentration": Axis(0.0, 4.0, 3, np.log), "u": Axis(0.0, 1.0, 3)}
    table = Table.pack(("concentration", "u"), np.zeros((3, 3)))
    given = {"impact": np.array([np.nan, 0.5]), "mass": np.ones(2), "concentration": np.full(2, 3.0)}
    got = columns([[table]], axes, 1.0, given, np.ones(2))
    assert np.isnan(got[0])
    assert got[1] == pytest.approx(10 * np.sqrt(0.75), rel=1e-6)
    empty = {k: v[:0] for k, v in given.items()}
    assert columns([[table]], axes, 1.0, empty, np.ones(0)).size == 0
