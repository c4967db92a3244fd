"""The survey: what is listed, where, and what its errors are."""

from dataclasses import replace

import numpy as np
import pytest

from haloledger.catalogs import read_bursts, read_galaxies, read_groups
from haloledger.rehearse.survey import Survey, flux_limit, look
from haloledger.sightlines.geometry import separation_deg


def again(sky, planck, **kind):
    return look(sky, Survey(**kind), planck, np.random.default_rng(9))


def test_tables_pass_the_border_without_refusals(seen):
    bursts = read_bursts(seen.bursts)
    galaxies, groups = read_galaxies(seen.galaxies[0]), read_groups(seen.groups[0])
    assert [*bursts.refused, *galaxies.refused, *groups.refused] == []
    assert len(galaxies) == len(seen.rows)


def test_impact_parameters_survive_the_sky(sky, seen, planck):
    """Angle between burst and central x angular-diameter distance = the true offset."""
    table, g, h = seen.galaxies[0], sky.galaxies, sky.haloes
    rows = seen.rows
    line = h.line[g.halo[rows]]
    apart = separation_deg(table["ra"], table["dec"], sky.lines.ra_deg[line], sky.lines.dec_deg[line])
    distance = planck.comoving_distance_mpc(h.z[g.halo[rows]])
    offset = np.hypot(g.east_mpc[rows], g.north_mpc[rows])
    # the tangent plane against the sphere: tan x instead of x, at most 2 degrees
    np.testing.assert_allclose(np.radians(apart), np.arctan(offset / distance), rtol=1e-6, atol=1e-12)


def test_lines_are_far_apart(sky):
    ra, dec = sky.lines.ra_deg, sky.lines.dec_deg
    apart = separation_deg(ra[:, None], dec[:, None], ra[None], dec[None]) + 999 * np.eye(len(ra))
    assert apart.min() > 10


def test_nothing_below_the_limit(sky, seen, planck):
    table = seen.galaxies[0]
    hosts = np.isin(seen.rows, sky.lines.host)
    faint = table["log_mstar"] < flux_limit(np.asarray(table["z"]), Survey(), planck)
    assert not np.any(faint & ~hosts)
    assert hosts.sum() == len(sky.lines)


def test_errors_are_those_stated(sky, planck):
    seen = again(sky, planck, photoz=0.03, spec_share=0.5)
    table, g = seen.galaxies[0], sky.galaxies
    phot = np.asarray(table["z_kind"]) == "phot"
    pull = (table["z"] - g.z_seen[seen.rows])[phot] / (0.03 * (1 + g.z_seen[seen.rows][phot]))
    assert phot.mean() == pytest.approx(0.5, abs=0.03)
    # a flux limit in a mass that follows the redshift leaves the redshift error alone
    assert np.std(pull) == pytest.approx(1.0, abs=0.05)


def test_outliers_are_wide(sky, planck):
    seen = again(sky, planck, photoz=0.03, outliers=0.05)
    off = np.abs(seen.galaxies[0]["z"] - sky.galaxies.z_seen[seen.rows]) / (1 + sky.galaxies.z_seen[seen.rows])
    assert 0.02 < np.mean(off > 0.12) < 0.05  # 69 per cent of 5, less those at negative redshift
    none = again(sky, planck, photoz=0.03)
    assert np.mean(np.abs(none.galaxies[0]["z"] - sky.galaxies.z_seen[none.rows]) > 0.2) < 0.001


def test_true_groups_have_all_members(sky, seen):
    counts = np.bincount(sky.galaxies.halo[seen.rows], minlength=len(sky.haloes))
    assert np.array_equal(seen.grouped, counts >= 2)
    named = np.asarray(seen.galaxies[0]["group_id"]) != ""
    assert np.array_equal(named, seen.grouped[sky.galaxies.halo[seen.rows]])


def test_imperfect_groups_err(sky, planck):
    seen = again(sky, planck, groups="imperfect")
    true = again(sky, planck)
    assert seen.grouped.sum() / true.grouped.sum() == pytest.approx(0.8, abs=0.05)
    assert "group_id" not in seen.galaxies[0].colnames
    index = np.flatnonzero(seen.grouped)
    off = np.asarray(seen.groups[0]["log_mass"]) - sky.haloes.log_m200c[index]
    err = float(seen.groups[0]["log_mass_err"][0])
    # a posterior: unbiased, and narrower than the measurement
    assert np.mean(off) == pytest.approx(0, abs=4 * err / np.sqrt(len(index)))
    assert np.std(off) == pytest.approx(err, rel=0.01)
    assert err < 0.25


def test_second_catalogue_repeats_rows(sky, planck):
    seen = again(sky, planck, doubles=0.3)
    first, second = seen.galaxies
    assert len(second) / len(first) == pytest.approx(0.3, abs=0.03)
    place = {name: k for k, name in enumerate(first["id"])}
    k = np.array([place[name[1:]] for name in second["id"]])
    apart = separation_deg(first["ra"][k], first["dec"][k], second["ra"], second["dec"]) * 3600
    assert 0.2 < np.median(apart) < 0.8


def test_no_groups(sky, planck):
    assert again(sky, planck, groups="none").groups == []


def test_zero_point_moves_measured_masses_only(sky):
    g, line = sky.galaxies, sky.haloes.line[sky.galaxies.halo]
    planted = np.zeros(len(g), dtype=bool)
    planted[sky.lines.host] = True
    off = (g.measured - g.log_mstar - sky.lines.zero_point[line])[~planted]
    assert np.mean(off) == pytest.approx(0, abs=0.002)
    assert np.std(off) == pytest.approx(sky.mass_err, rel=0.01)
    assert replace(sky).mass_err == 0.15
