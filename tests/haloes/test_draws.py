"""Draws: one universe, whatever is asked for; the fixed number; held nuisances."""

from __future__ import annotations

from dataclasses import fields

import numpy as np
import pytest

from haloledger.engine.universe import Universe
from haloledger.errors import InputError
from haloledger.haloes.build import halo_list, mass_ceiling
from haloledger.haloes.draws import draw_haloes, relation_notes
from haloledger.haloes.nuisances import relation_of_draw, zero_point
from haloledger.haloes.relations import STELLAR_TO_HALO
from haloledger.haloes.table import HaloDraws


@pytest.fixture(scope="module")
def mixed(make_galaxies, make_groups, planck):
    """Every kind of row: spectroscopic, photometric, near, by proxy, by mass in several definitions, part members."""
    rng, n = np.random.default_rng(2), 60
    ra, dec = rng.uniform(0, 360, n), rng.uniform(-60, 60, n)
    z = rng.uniform(0.003, 0.5, n)
    near = np.where(np.arange(n) % 10 == 0, rng.uniform(1, 45, n), np.nan)
    photometric = np.arange(n) % 2 == 0
    galaxies = make_galaxies(
        "g",
        n,
        ra_deg=ra,
        dec_deg=dec,
        z=np.where(np.isfinite(near), 0.003, z),
        z_err=np.where(photometric, 0.03, 1e-4),
        photometric=photometric,
        distance_mpc=near,
        log_mstar=rng.uniform(8, 11.6, n),
        log_mstar_err=0.15,
    )
    defs = np.array(["200c", "500c", "200m", "vir"] * 5, dtype=object)
    common = {"ra_deg": ra[:20] + 0.05, "dec_deg": dec[:20], "z": z[:20], "centre_err_kpc": 40.0}
    groups = [
        make_groups("m", 20, log_mass=13.6, log_mass_err=0.2, mass_def=defs, one_minus_b=(0.8, 0.07), **common),
        make_groups(
            "l", 20, log_mass=13.6, log_mass_err=0.2, mass_is="likelihood", **(common | {"dec_deg": -dec[:20]})
        ),
        make_groups("s", 20, sigma_v_kms=400.0, n_members=8, proxy="sigma_v", **(common | {"dec_deg": dec[20:40]})),
        make_groups("r", 20, richness=30.0, proxy="richness", **(common | {"dec_deg": dec[40:60]})),
    ]
    return halo_list([galaxies], groups, planck)


def test_rows_of_a_part_equal_those_of_the_whole_to_the_last_bit(mixed, planck):
    universe = Universe(seed=3, n_draws=64)
    whole = draw_haloes(mixed, np.arange(len(mixed)), universe, "dutton2014", planck)
    parts = [np.arange(7, 30, 3), np.array([11]), np.arange(len(mixed))[::-1], np.array([5, 90, 2])]
    for index in parts:
        part = draw_haloes(mixed, index, universe, "dutton2014", planck)
        for f in fields(HaloDraws):
            assert np.array_equal(getattr(part, f.name), getattr(whole, f.name)[index]), f.name


def test_draws_are_finite_and_stay_below_the_ceiling(mixed, planck):
    drawn = draw_haloes(mixed, np.arange(len(mixed)), Universe(1, 2000), "dutton2014", planck)
    for f in fields(HaloDraws):
        assert np.all(np.isfinite(getattr(drawn, f.name))), f.name
    above = drawn.log_m200c > mass_ceiling(mixed, planck)[:, None]
    assert np.mean(above) < 1e-3
    assert np.all(above.mean(axis=1) < 0.01)
    assert np.all(drawn.distance_kpc > 0)


def test_another_seed_is_another_universe(mixed, planck):
    one, other = (draw_haloes(mixed, [0, 1], Universe(s, 20), "dutton2014", planck) for s in (1, 2))
    assert not np.any(one.log_m200c == other.log_m200c)


def test_all_relations_are_drawn_alike_and_shared():
    relation = relation_of_draw(Universe(1, 8000))
    share = np.bincount(relation.index, minlength=4) / 8000
    assert relation.names == STELLAR_TO_HALO
    assert share == pytest.approx(0.25, abs=0.02)
    assert zero_point(Universe(1, 8000)).std() == pytest.approx(0.1, rel=0.03)


def test_shared_zero_point_moves_all_galaxies_together(make_galaxies, planck):
    galaxies = make_galaxies("g", 2, ra_deg=np.array([10.0, 200.0]), log_mstar=9.5, log_mstar_err=0.0)
    haloes = halo_list([galaxies], [], planck)
    free, held = (
        draw_haloes(haloes, [0, 1], Universe(1, 4000, held=h), "dutton2014", planck).log_m200c
        for h in ({"membership": "0"}, {"relation": "moster2013", "zero_point": "0", "membership": "0"})
    )
    assert np.corrcoef(held)[0, 1] == pytest.approx(0.0, abs=0.05)
    assert np.corrcoef(free)[0, 1] > 0.4


def test_fixed_reads_the_relation_backwards(make_galaxies, planck):
    # FRB 20181112A's foreground galaxy: log M* 10.69, z 0.3674; naive 12.270 (Moster) and 12.044 (Kravtsov, 200c)
    galaxies = make_galaxies("g", 1, z=0.3674, z_err=0.0001, log_mstar=10.69, log_mstar_err=0.2)
    haloes = halo_list([galaxies], [], planck)
    for held, expected in (({}, 12.270), ({"relation": "kravtsov2018"}, 12.044)):
        drawn = draw_haloes(haloes, [0], Universe(1, 1000, fixed=True, held=held), "dutton2014", planck)
        assert drawn.log_m200c.shape == (1, 1)
        assert drawn.log_m200c == pytest.approx(expected, abs=5e-4)
        assert drawn.z[0, 0] == 0.3674
        assert drawn.log_c_offset[0, 0] == 0
        # 5.524 arcsec there are 29.04 kpc
        assert drawn.distance_kpc[0, 0] * np.radians(5.524 / 3600) == pytest.approx(29.04, abs=0.01)


def test_fixed_centre_is_exact(make_groups, planck):
    groups = make_groups("s", 1, log_mass=14.0, centre_err_kpc=200.0)
    haloes = halo_list([], [groups], planck)
    fixed = draw_haloes(haloes, [0], Universe(fixed=True), "dutton2014", planck)
    assert fixed.centre_east_kpc == 0
    drawn = draw_haloes(haloes, [0], Universe(1, 20_000), "dutton2014", planck)
    for offset in (drawn.centre_east_kpc, drawn.centre_north_kpc):
        assert offset.std() == pytest.approx(200.0, rel=0.02)
    assert abs(np.corrcoef(drawn.centre_east_kpc[0], drawn.centre_north_kpc[0])[0, 1]) < 0.03


@pytest.mark.parametrize(
    ("held", "message"),
    [
        ({"relation": "mostre2013"}, r"relation=mostre2013: not known.*moster2013"),
        ({"zero_point": "small"}, r"zero_point=small: not a number.*zero_point=0"),
    ],
)
def test_unusable_held_value_is_refused(held, message, mixed, planck):
    with pytest.raises(InputError, match=message):
        draw_haloes(mixed, [0], Universe(1, 10, held=held), "dutton2014", planck)


def test_relations_beyond_their_redshifts_are_named(make_galaxies, planck):
    haloes = halo_list(
        [make_galaxies("g", 2, z=np.array([0.05, 0.4]), ra_deg=np.array([1.0, 99.0]), log_mstar=10.0)], [], planck
    )
    notes = relation_notes(haloes, [0, 1], Universe(1, 200))
    assert any("kravtsov2018" in n and "(0 to 0.1) for 1 " in n for n in notes)
    assert not any("moster2013" in n for n in notes)
    assert relation_notes(haloes, [0, 1], Universe(1, 200, held={"relation": "moster2013"})) == []
