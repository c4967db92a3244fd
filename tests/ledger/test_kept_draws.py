"""The kept fraction in draws: mean 1, never more than all baryons, the same in entries and census."""

import numpy as np
import pytest
import sky

from haloledger.audit import audit
from haloledger.cosmos.concentration import concentration
from haloledger.engine.universe import Universe
from haloledger.gas.models import load_model, model_names
from haloledger.gas.projection import projection
from haloledger.ledger.kept import census_factor, kept_factor
from haloledger.reach.census import LOG_M

MANY = Universe(seed=5, n_draws=4000)


@pytest.mark.parametrize("name", ["blended", "weak-feedback", "strong-feedback", "xray-akino"])
@pytest.mark.parametrize("log_m", [11.3, 12.4, 13.2, 14.6])
def test_mean_factor_is_one_and_no_halo_is_overfull(planck, name, log_m):
    model = load_model(name)
    ids = [f"h{i}" for i in range(40)]
    factor = kept_factor(np.full((40, MANY.n_draws), log_m), ids, model, MANY, planck)
    # 4,000 universes share their part: its mean is known to sigma / 63
    assert factor.mean() == pytest.approx(1.0, abs=3.5 * factor.mean(axis=0).std() / np.sqrt(MANY.n_draws) + 2e-3)
    c200c = concentration(model.concentration, log_m, 0.2, planck)
    kept = model.kept(log_m, 0.2, c200c, planck, model.boundary_r200c)
    assert (factor * kept).max() <= max(1.0, kept) + 1e-3


@pytest.mark.parametrize("name", ["blended", "weak-feedback"])
def test_census_and_entries_have_the_same_factor_in_every_universe(planck, name):
    model, universe = load_model(name), Universe(seed=5, n_draws=30)
    census = census_factor(model, universe, planck)
    for i in (5, 20, 40):
        ids = [f"h{j}" for j in range(4000)]
        entries = kept_factor(np.full((4000, 30), LOG_M[i]), ids, model, universe, planck)
        error = entries.std(axis=0) / np.sqrt(4000)
        assert np.all(np.abs(entries.mean(axis=0) - census[i]) < 4.5 * error + 1e-3)


def test_small_fractions_spread_as_the_model_says(planck):
    model = load_model("blended")
    factor = kept_factor(np.full((1, 40_000), 11.0), ["h"], model, Universe(n_draws=40_000), planck)
    dex = np.interp(11.0, model.spread.log_m200c, np.hypot(model.spread.shared_dex, model.spread.own_dex))
    # kept 0.4 of what is there: the ceiling narrows the log-normal's upper side
    assert 0.4 * dex < np.log10(factor).std() < dex


@pytest.mark.parametrize("name", model_names())
def test_fixed_gives_the_models_own_number(planck, name):
    log_m, z, impact = 13.6, 0.1, 120.0
    model = load_model(name)
    ledgers = audit(
        sky.bursts(sky.burst()),
        galaxies=[sky.galaxies(sky.galaxy_at(planck, log_m, z, impact))],
        models=[name],
        fixed=True,
    )
    r200c = planck.r200c_kpc(log_m, z)
    c200c = concentration(model.concentration, log_m, z, planck)
    by_model = projection(model, planck).dm_rest(impact / r200c, log_m, z, c200c, r200c) / (1 + z)
    assert ledgers.to_pandas()[1].dm_mean[0] == pytest.approx(float(by_model), rel=1e-6)


def test_held_kept_moves_all_gas_by_what_it_says(planck):
    line, row = sky.bursts(sky.burst()), sky.galaxies(sky.galaxy_at(planck, 12.3, 0.1, 60.0))
    plain, lower = (
        audit(line, galaxies=[row], models=["blended"], fixed=True, hold={"kept": k}).to_pandas()[1].dm_mean[0]
        for k in ("0", "-0.3")
    )
    assert lower == pytest.approx(plain * 10**-0.3, rel=1e-12)
