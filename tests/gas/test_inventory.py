"""The table of kept fractions, and the flag where a model holds more than there is."""

import numpy as np
import pytest

from haloledger.gas.inventory import LOG_M200C, RADII, inventory
from haloledger.gas.models import load_model


def test_textbook_inside_r200c_holds_what_it_says(planck):
    table = inventory(load_model("textbook-modified-nfw"), planck)
    assert table.log_m200c[[0, -1]] == pytest.approx([10.5, 15.5])
    assert table.kept["r200c"] == pytest.approx(np.full(11, 0.75), rel=1e-12)
    # no gas is counted beyond the boundary, while the total mass goes on
    assert np.all(table.kept["2 r200c"] < 0.56)
    assert not any(flags.any() for flags in table.over.values())


def test_wide_textbook_model_holds_more_than_there_is(planck):
    table = inventory(load_model("textbook-modified-nfw-wide"), planck)
    assert table.over["2 r200c"].all()
    assert not table.over["r200c"].any()


def test_flag_is_kept_above_available(planck):
    for name in ("blended", "weak-feedback", "gnfw-shock-heating"):
        table = inventory(load_model(name), planck)
        for radius in RADII:
            assert np.array_equal(table.over[radius], table.kept[radius] > table.available)
    assert np.array_equal(table.outside, (LOG_M200C < 13.5) | (LOG_M200C > 15.5))


@pytest.mark.parametrize("name", ["blended", "weak-feedback", "strong-feedback", "nfw-tracing", "maller-bullock"])
def test_scenarios_stay_within_the_baryons(name, planck):
    model = load_model(name)
    low, high = model.log_mass_range
    table = inventory(model, planck, np.arange(low, high + 0.01, 0.25))
    assert not any(flags.any() for flags in table.over.values()), f"{name}: {table.over}"


def test_available_is_what_stars_leave(planck):
    table = inventory(load_model("blended"), planck, [12.0])
    assert table.available == pytest.approx([1 - 10 ** (10.5350 - 12) / planck.baryon_share], rel=5e-3)
