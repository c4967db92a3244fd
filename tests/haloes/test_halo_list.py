"""One list of haloes: doubles, parts and members."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from haloledger.catalogs.canonical import take
from haloledger.engine.universe import Universe
from haloledger.errors import InputError
from haloledger.haloes.build import halo_list
from haloledger.haloes.draws import draw_haloes
from haloledger.haloes.neighbours import Places, close_pairs, separation_rad

KMS = 1 / 299792.458


def test_virgo_under_two_names_counts_once(make_groups, planck):
    one = make_groups("near", 1, ra_deg=187.71, dec_deg=12.36, z=1242 * KMS, log_mass=14.6, log_mass_err=0.2)
    # 0.3 degrees and 200 km/s away, half as massive
    other = make_groups(
        "far", 1, ra_deg=188.02, dec_deg=12.36, z=1442 * KMS, log_mass=14.3, precedence=20, mass_def=np.array(["500c"])
    )
    haloes = halo_list([], [one, other], planck)
    assert len(haloes) == 1
    assert haloes.id[0] == "far:000000"  # its catalogue goes before
    assert haloes.source_rows[0] == "far:000000;near:000000"
    assert "also listed as near:000000" in haloes.note[0]
    assert "Group rows that name a halo, or a part of one, of another catalogue: 1." in haloes.notes


def test_measured_distance_leads_within_50_mpc(make_groups, planck):
    columns = {"ra_deg": 187.7, "dec_deg": 12.4, "z": 0.004}
    wide = make_groups("wide", 1, log_mass=14.6, distance_mpc=15.8, distance_err_mpc=0.8, **columns)
    core = make_groups("core", 1, log_mass=14.1, precedence=1, **columns)
    assert halo_list([], [core, wide], planck).id.tolist() == ["wide:000000"]


def test_clump_inside_a_cluster_neither_replaces_it_nor_adds_a_halo(make_groups, planck):
    cluster = make_groups("a", 1, ra_deg=187.7, dec_deg=12.4, z=0.0042, log_mass=14.6, precedence=40)
    clumps = make_groups(
        "b", 2, ra_deg=np.array([187.44, 187.9]), dec_deg=np.array([11.9, 13.0]), z=0.0036, log_mass=13.3, precedence=1
    )
    haloes = halo_list([], [cluster, clumps], planck)
    assert haloes.id.tolist() == ["a:000000"]
    assert haloes.source_rows[0] == "a:000000;b:000000;b:000001"
    assert "holds 2 lesser rows" in haloes.note[0]
    assert haloes.value[0] == 14.6


def test_rows_of_one_catalogue_stay_apart(make_groups, planck):
    groups = make_groups(
        "a", 2, ra_deg=np.array([187.7, 187.9]), dec_deg=12.4, z=0.0042, log_mass=np.array([14.6, 13.0])
    )
    assert len(halo_list([], [groups], planck)) == 2


@pytest.mark.parametrize(
    ("ra", "expected"),
    [(150.16, ["a:000000;b:000000", "b:000001"]), (150.06, ["a:000000;b:000000;b:000001"])],
)
def test_second_row_of_a_catalogue_is_another_halo_or_a_part(ra, expected, make_groups, planck):
    # b lists two comparable haloes where a lists one (r200c 0.2 degrees): a halo of its own outside half of r200c, a
    # part of a's inside it
    a = make_groups("a", 1, ra_deg=150.0, dec_deg=2.0, z=0.1, log_mass=14.5)
    b = make_groups("b", 2, ra_deg=np.array([150.01, ra]), dec_deg=2.0, z=0.1, log_mass=np.array([14.4, 14.2]))
    assert halo_list([], [a, b], planck).source_rows.tolist() == expected


def test_own_catalogue_keeps_a_clump_apart_though_another_makes_it_a_part(make_groups, planck):
    # a lists cluster and clump as two haloes; b's clump, a part of a's cluster, must not pull a's clump in with it
    ra, mass = np.array([187.7, 187.44]), np.array([14.6, 13.0])
    a = make_groups("a", 2, ra_deg=ra, dec_deg=np.array([12.4, 11.9]), z=0.0042, log_mass=mass)
    b = make_groups("b", 1, ra_deg=187.44, dec_deg=11.92, z=0.0042, log_mass=13.3)
    assert halo_list([], [a, b], planck).source_rows.tolist() == ["a:000000;b:000000", "a:000001"]


def test_same_place_other_redshift_is_another_halo(make_groups, planck):
    a = make_groups("a", 1, z=0.10, log_mass=14.5)
    b = make_groups("b", 1, z=0.16, log_mass=14.5)
    assert len(halo_list([], [a, b], planck)) == 2


def test_photometric_cluster_joins_the_spectroscopic_one(make_groups, planck):
    xray = make_groups("x", 1, z=0.200, log_mass=14.6, precedence=20)
    optical = make_groups(
        "o", 1, ra_deg=150.02, z=0.212, z_err=0.007, photometric=True, richness=60.0, proxy="richness"
    )
    haloes = halo_list([], [optical, xray], planck)
    assert haloes.id.tolist() == ["x:000000"]


def test_distances_part_what_velocities_cannot(make_groups, planck):
    # two groups 0.2 degrees apart, both moving at 1,100 km/s, at 16 and 28 Mpc with 5 per cent errors: 5 of them
    columns = {"z": 1100 * KMS, "log_mass": 13.0}
    a = make_groups("a", 1, distance_mpc=16.0, distance_err_mpc=0.8, **columns)
    for ra, mpc, left in ((150.2, 28.0, 2), (150.2, 20.0, 1), (150.005, 28.0, 1)):
        b = make_groups("b", 1, ra_deg=ra, distance_mpc=mpc, distance_err_mpc=0.05 * mpc, **columns)
        # at one place and speed they are one object, whatever the distances say
        assert len(halo_list([], [a, b], planck)) == left, (ra, mpc)


def test_galaxy_and_its_group_of_one_at_other_distances_are_one_halo(make_galaxies, make_groups, planck):
    # NGC 3557 stands at 46 Mpc in one list and at 31 in another
    group = make_groups("kt", 1, z=0.0095, log_mass=12.9, distance_mpc=31.0, distance_err_mpc=2.0, n_members=1)
    galaxy = make_galaxies("g", 1, ra_deg=150.003, z=0.0096, z_err=2e-4, log_mstar=11.2, distance_mpc=46.0)
    haloes = halo_list([galaxy], [group], planck)
    assert haloes.id.tolist() == ["kt:000000"]
    assert haloes.members.tolist() == ["g:000000"]


def test_redshifts_of_concentric_clusters_may_differ_by_more(make_groups, planck):
    # 4 sigma: photometric 0.21 +- 0.007 at the place of an X-ray cluster at 0.18; beside it the two stay apart
    for ra, left in ((150.01, 1), (150.08, 2)):
        xray = make_groups("x", 1, z=0.18, log_mass=14.6)
        optical = make_groups("o", 1, ra_deg=ra, z=0.213, z_err=0.0072, photometric=True, log_mass=14.4)
        assert len(halo_list([], [xray, optical], planck)) == left, ra


def test_centre_errors_are_cut_at_a_share_of_the_halo(make_groups, planck):
    groups = make_groups("c", 2, ra_deg=np.array([10.0, 90.0]), log_mass=np.array([11.3, 14.0]), centre_err_kpc=50.0)
    whole = halo_list([], [groups], planck).centre_err_kpc
    cut = halo_list([], [replace(groups, centre_err_share=0.15)], planck).centre_err_kpc
    assert whole.tolist() == [50.0, 50.0]
    assert cut[0] == pytest.approx(0.15 * planck.r200c_kpc(11.3, 0.1))
    assert cut[1] == 50.0


def test_group_too_slow_for_a_distance_is_left_out_or_takes_one(make_groups, planck):
    slow = make_groups("s", 1, z=0.0006, sigma_v_kms=80.0, n_members=4, proxy="sigma_v")
    far = make_groups("f", 1, ra_deg=20.0, log_mass=13.0)
    haloes = halo_list([], [slow, far], planck)
    assert haloes.id.tolist() == ["f:000000"]
    assert any("Groups below 600 km/s without a distance" in n and "distance_mpc" in n for n in haloes.notes)
    known = make_groups("k", 1, z=0.0007, log_mass=12.6, distance_mpc=3.5, distance_err_mpc=0.2)
    assert halo_list([], [slow, known], planck).source_rows.tolist() == ["k:000000;s:000000"]


def test_members_add_no_halo_and_background_galaxies_keep_theirs(make_galaxies, make_groups, planck):
    group = make_groups("c", 1, z=0.1, log_mass=14.0, log_mass_err=0.1)
    galaxies = make_galaxies(
        "g",
        5,
        # centre; inside in velocity; background by 3,000 km/s; outside r200c (0.14 degrees); far away but listed
        ra_deg=np.array([150.0, 150.05, 150.02, 150.4, 151.5]),
        z=np.array([0.1, 0.1 + 800 * 1.1 * KMS, 0.1 + 3000 * 1.1 * KMS, 0.1, 0.1]),
        z_err=1e-4,
        log_mstar=np.array([11.2, 10.0, 10.5, 10.0, 10.0]),
        group=np.array(["", "", "", "", "c:000000"], dtype=object),
    )
    haloes = halo_list([galaxies], [group], planck)
    p = dict(zip(haloes.id, haloes.p_member - haloes.p_hosted, strict=True))
    assert {"g:000000", "g:000004"} & set(p) == set()
    assert 0.9 < p["g:000001"] < 1  # 800 km/s of 450: a member, but perhaps a halo beside the cluster
    assert p["g:000002"] < 0.1
    assert p["g:000003"] < 0.1
    assert "Galaxies that listed haloes hold, without a halo of their own: 2." in haloes.notes


def test_group_that_is_not_listed_holds_nobody(make_galaxies, planck):
    galaxies = make_galaxies("g", 1, log_mstar=10.0, group=np.array(["elsewhere:1"], dtype=object))
    assert len(halo_list([galaxies], [], planck)) == 1


def test_listed_member_of_a_merged_group(make_galaxies, make_groups, planck):
    # the galaxy's group stands in the list under another catalogue's name
    a = make_groups("a", 1, log_mass=14.0, precedence=1)
    b = make_groups("b", 1, ra_deg=150.02, log_mass=14.1)
    galaxies = make_galaxies("g", 1, ra_deg=151.0, log_mstar=10.0, group=np.array(["b:000000"], dtype=object))
    assert halo_list([galaxies], [a, b], planck).id.tolist() == ["a:000000"]


def test_photometric_member_is_drawn(make_galaxies, make_groups, planck):
    group = make_groups("c", 1, z=0.1, log_mass=14.5, log_mass_err=0.1)
    galaxies = make_galaxies(
        "g",
        3,
        ra_deg=np.array([150.02, 150.02, 150.9]),
        dec_deg=np.array([2.0, 2.05, 2.0]),
        z=np.array([0.11, 0.19, 0.10]),
        z_err=0.03,
        photometric=True,
        log_mstar=10.0,
    )
    haloes = halo_list([galaxies], [group], planck)
    p = dict(zip(haloes.id, haloes.p_member, strict=True))
    assert 0.5 < p["g:000000"] < 1
    assert p["g:000001"] < 0.2  # three errors away: what is left is the chance of an unlisted host
    assert p["g:000002"] < 0.2  # outside on the sky
    drawn = draw_haloes(haloes, np.arange(len(haloes)), Universe(1, 4000), "dutton2014", planck)
    assert (drawn.own & ~drawn.hosted).mean(axis=1) == pytest.approx(1 - haloes.p_member, abs=0.03)
    assert drawn.hosted.mean(axis=1) == pytest.approx(haloes.p_hosted, abs=0.02)
    assert np.all(drawn.own[haloes.kind == "group"])


@pytest.mark.parametrize(("ra", "left"), [(150.04, 2), (150.005, 1)])
def test_giant_beside_a_small_group_keeps_its_halo_unless_it_is_the_group(ra, left, make_galaxies, make_groups, planck):
    group = make_groups("c", 1, z=0.02, log_mass=11.0, log_mass_err=0.1)
    galaxies = make_galaxies("g", 1, z=0.02, z_err=1e-4, ra_deg=ra, log_mstar=11.3)
    haloes = halo_list([galaxies], [group], planck)
    assert len(haloes) == left
    assert ("g:000000 at its centre is a galaxy of a heavier halo" in haloes.note[0]) == (left == 1)


def test_one_galaxy_of_two_catalogues(make_galaxies, planck):
    first = make_galaxies("a", 2, ra_deg=np.array([150.0, 150.5]), z=0.1, z_err=1e-4, log_mstar=np.array([10.5, 10.0]))
    second = make_galaxies(
        "b", 2, ra_deg=np.array([150.0008, 150.5]), z=np.array([0.1005, 0.13]), z_err=1e-4, log_mstar=10.4
    )
    haloes = halo_list([first, second], [], planck)
    assert haloes.source_rows.tolist() == ["a:000000;b:000000", "a:000001", "b:000001"]
    assert haloes.log_mstar[0] == 10.5
    assert "Galaxies listed in more than one catalogue, counted once: 1." in haloes.notes
    # the user's order decides which of the two describes it
    assert halo_list([second, first], [], planck).id.tolist() == ["a:000001", "b:000000", "b:000001"]


def test_what_one_catalogue_lacks_comes_from_the_other(make_galaxies, planck):
    photo = make_galaxies(
        "a",
        2,
        ra_deg=np.array([10.0, 50.0]),
        z=np.array([0.12, 0.004]),
        z_err=0.03,
        photometric=np.array([True, False]),
        log_mstar=10.5,
    )
    other = make_galaxies(
        "b",
        2,
        ra_deg=np.array([10.0, 50.0]),
        z=np.array([0.1, 0.004]),
        z_err=1e-4,
        distance_mpc=np.array([np.nan, 10.0]),
        log_mstar=10.3,
    )
    haloes = halo_list([photo, other], [], planck)
    assert haloes.z[0] == 0.1
    assert not haloes.photometric[0]
    assert "spectroscopic redshift from b:000000" in haloes.note[0]
    # light is the same, so the mass follows the distance
    step = 2 * np.log10(planck.luminosity_distance_mpc(0.1) / planck.luminosity_distance_mpc(0.12))
    assert haloes.log_mstar[0] == pytest.approx(10.5 + step)
    assert haloes.distance_mpc[1] == 10.0
    assert haloes.log_mstar[1] == pytest.approx(10.5 + 2 * np.log10(10.0 / planck.luminosity_distance_mpc(0.004)))


def test_companion_is_not_a_double(make_galaxies, planck):
    # M32 beside M31, 24 arcmin, at one distance: one catalogue has the giant, the other the dwarf
    giant = make_galaxies("a", 1, ra_deg=10.685, dec_deg=41.269, z=-0.001, distance_mpc=0.76, log_mstar=10.9)
    dwarf = make_galaxies("b", 1, ra_deg=10.674, dec_deg=40.865, z=-0.0007, distance_mpc=0.77, log_mstar=9.1)
    haloes = halo_list([giant, dwarf], [], planck)
    assert not any("counted once" in n for n in haloes.notes)
    # it is a satellite: two haloes would count the giant's gas twice
    assert haloes.id.tolist() == ["a:000000"]
    assert "Galaxies that listed haloes hold, without a halo of their own: 1." in haloes.notes


def test_rows_without_mass_are_counted(make_galaxies, make_groups, planck):
    galaxies = make_galaxies("g", 3, ra_deg=np.array([1.0, 2.0, 3.0]), log_mstar=np.array([10.0, np.nan, np.nan]))
    groups = make_groups("c", 2, ra_deg=np.array([80.0, 90.0]), log_mass=np.array([13.0, np.nan]))
    haloes = halo_list([galaxies], [groups], planck)
    assert len(haloes) == 2
    assert any(n.startswith("g: 2 of 3 rows left out: no usable mass") and "Ks, W1" in n for n in haloes.notes)
    assert any(n.startswith("c: 1 of 2 rows left out: no usable mass") and "richness" in n for n in haloes.notes)


def test_empty_catalogue_is_no_fault(make_galaxies, make_groups, planck):
    haloes = halo_list([make_galaxies("g", 0)], [make_groups("c", 1, log_mass=13.0)], planck)
    assert haloes.id.tolist() == ["c:000000"]
    assert len(halo_list([make_galaxies("g", 0)], [], planck)) == 0


def test_order_of_rows_changes_nothing(make_galaxies, make_groups, planck):
    rng, n = np.random.default_rng(6), 300
    ra, dec, z = rng.uniform(150, 153, n), rng.uniform(0, 3, n), rng.choice([0.05, 0.052, 0.1], n)
    galaxies = [
        make_galaxies(label, n, ra_deg=ra + shift, dec_deg=dec, z=z, z_err=1e-4, log_mstar=rng.uniform(9, 11, n))
        for label, shift in (("a", 0.0), ("b", 0.0005))
    ]
    groups = [
        make_groups(label, 40, ra_deg=ra[:40] + shift, dec_deg=dec[:40], z=z[:40], log_mass=rng.uniform(12.5, 14.5, 40))
        for label, shift in (("c", 0.0), ("d", 0.01), ("e", -0.01))
    ]
    straight = halo_list(galaxies, groups, planck)
    mixed_up = halo_list(
        [take(g, rng.permutation(n)) for g in galaxies], [take(g, rng.permutation(40)) for g in groups], planck
    )
    assert len(straight) < 640  # there was something to put together
    for name in ("id", "source_rows", "note", "z", "value", "p_member"):
        assert np.array_equal(getattr(straight, name), getattr(mixed_up, name)), name


def test_each_row_of_a_halo_is_named_once(make_groups, planck):
    rng = np.random.default_rng(9)
    groups = [
        make_groups(
            x, 60, ra_deg=rng.uniform(150, 151, 60), dec_deg=rng.uniform(0, 1, 60), log_mass=rng.uniform(12, 14.8, 60)
        )
        for x in "abc"
    ]
    named = [row for text in halo_list([], groups, planck).source_rows for row in text.split(";")]
    assert sorted(named) == sorted(row for g in groups for row in g.row)


def test_labels_must_differ(make_galaxies, planck):
    galaxies = make_galaxies("g", 1, log_mstar=10.0)
    with pytest.raises(InputError, match=r"'g:000000' stands twice. Give each catalogue its own label"):
        halo_list([galaxies, galaxies], [], planck)


def test_no_catalogue_is_refused(planck):
    with pytest.raises(InputError, match=r"no catalogue given.*--galaxies or --groups"):
        halo_list([], [], planck)


def test_close_pairs_as_by_brute_force():
    rng, n = np.random.default_rng(0), 400
    ra, dec = rng.uniform(0, 360, n), np.degrees(np.arcsin(rng.uniform(-1, 1, n)))
    z = rng.uniform(0, 0.4, n)
    places = Places(ra, dec, z - 0.02, z + 0.02)
    radius = np.radians(rng.uniform(0.1, 30, n))
    i, j = close_pairs(places, places, radius)
    apart = separation_rad(ra[:, None], dec[:, None], ra, dec)
    expected = (apart < radius[:, None]) & (np.abs(z[:, None] - z) <= 0.04)
    assert sorted(zip(i.tolist(), j.tolist(), strict=True)) == sorted(map(tuple, np.argwhere(expected).tolist()))
