"""What can be said of the reach without depths."""

import numpy as np
import pytest
from shapely.geometry import Point, box

from haloledger.gas.models import load_model
from haloledger.reach.census import LOG_M, take_census
from haloledger.reach.coverage import Reach, deepest_by_mass, place, reach_bounds


class Field:
    """A footprint of 10 x 10 degrees."""

    label = "field"

    def contains(self, ra_deg, dec_deg):
        return np.array([box(10, -5, 20, 5).contains(Point(r, d)) for r, d in zip(ra_deg, dec_deg, strict=True)])


def test_place():
    assert place(15.0, 0.0, [Field()])[0] is False
    outside, said = place(35.0, 0.0, [Field()])
    assert outside
    assert "list nothing here" in said
    assert "no footprint given" in place(35.0, 0.0, [])[1]


def test_a_shallow_list_cannot_reach_far(planck):
    census = take_census(load_model("textbook-modified-nfw"), planck)
    rng = np.random.default_rng(2)
    log_m, z = rng.uniform(10.5, 15.9, 20_000), rng.uniform(0, 0.05, 20_000)
    deepest = deepest_by_mass(log_m, z)
    assert np.all(deepest < 0.05)
    near, far = (reach_bounds(zb, census, deepest, outside=False).highest for zb in (0.05, 0.5))
    assert near > 0.95
    # mean halo DM grows about as z: a list to 0.05 holds about a tenth of that to 0.5
    assert far == pytest.approx(0.1, abs=0.03)


def test_a_list_of_clusters_alone_reaches_only_clusters(planck):
    census = take_census(load_model("textbook-modified-nfw"), planck)
    rng = np.random.default_rng(2)
    deepest = deepest_by_mass(rng.uniform(14.0, 15.5, 5000), np.full(5000, 0.6))
    assert np.all(deepest[LOG_M < 13.9] == 0)
    # clusters above 1e14 hold 16.05 of the 145 pc cm-3 of haloes above 1e10.5 to z = 0.5 (mass function, 0.75 kept)
    assert reach_bounds(0.5, census, deepest, outside=False).highest == pytest.approx(16.05 / 145, abs=0.01)


def test_outside_is_zero_and_known():
    reach = Reach(0.0, 0.0)
    assert reach.known == 0
    assert np.all(reach.draws(np.array([0.2, 0.9])) == 0)
    assert np.isnan(Reach(0.0, 0.6).known)
    assert Reach(0.0, 0.6).draws(np.array([0.5])) == pytest.approx([0.3])
