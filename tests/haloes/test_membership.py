"""Centrals, satellites of listed haloes and of unlisted ones, against a small simulated volume with known truth."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.integrate import quad

from haloledger.catalogs.canonical import take
from haloledger.cosmos.concentration import concentration
from haloledger.cosmos.mass_function import mass_function
from haloledger.engine.universe import Universe
from haloledger.haloes.build import halo_list, mass_ceiling
from haloledger.haloes.draws import draw_haloes
from haloledger.haloes.nfw_place import radius_r200c, surface_per_r200c2
from haloledger.haloes.posterior import mean_of_200c
from haloledger.haloes.relations import load_relation
from haloledger.haloes.satellites import LOG_M, Y_NODES, Y_STEP, galaxies_of_host, numbers_of_nature, occupation

RELATION = "moster2013"
Z_RANGE = (0.04, 0.07)
FIELD_DEG = 16.0
FAINTEST = 9.6
KMS = 1 / 299792.458


class Sky:
    """Haloes at random places in a slab, each with a central and satellites; arrays of galaxies, and of haloes."""

    def __init__(self, planck, seed: int):
        rng = np.random.default_rng(seed)
        relation = load_relation(RELATION)
        z_mid = np.mean(Z_RANGE)
        volume = (FIELD_DEG * np.pi / 180) ** 2 * quad(planck.volume_element, *Z_RANGE)[0]
        log_m = np.arange(10.8, 15.3, 0.01)
        number = rng.poisson(mass_function(log_m, z_mid, planck) * 0.01 * volume)
        self.mass = np.repeat(log_m, number)
        n = self.mass.size
        self.x, self.y = rng.uniform(-FIELD_DEG / 2, FIELD_DEG / 2, (2, n))
        self.z = np.cbrt(rng.uniform(Z_RANGE[0] ** 3, Z_RANGE[1] ** 3, n))
        central = mean_of_200c(relation, self.mass, z_mid, planck) + relation.scatter(0.0) * rng.standard_normal(n)
        _, per_dex, _ = galaxies_of_host(relation, z_mid, planck)
        use = Y_NODES >= FAINTEST - 0.5
        expected = np.array([np.interp(self.mass, LOG_M, row) for row in per_dex[use]]) * Y_STEP
        many = rng.poisson(expected)
        host = np.concatenate([np.repeat(np.arange(n), row) for row in many])
        light = np.repeat(Y_NODES[use], many.sum(axis=1)) + rng.uniform(-0.5, 0.5, host.size) * Y_STEP
        self.host = np.concatenate([np.arange(n), host])
        self.log_mstar = np.concatenate([central, light])
        self.central = np.arange(self.host.size) < n
        c = concentration("dutton2014", self.mass[host], z_mid, planck)
        r_kpc = radius_r200c(rng.random(host.size), c) * planck.r200c_kpc(self.mass[host], z_mid)
        sin = np.sqrt(1 - rng.uniform(-1, 1, host.size) ** 2)
        angle = rng.uniform(0, 2 * np.pi, host.size)
        scale = np.degrees(r_kpc * sin / planck.angular_distance_kpc(self.z[host]))
        self.gx = np.concatenate([self.x, self.x[host] + scale * np.cos(angle)])
        self.gy = np.concatenate([self.y, self.y[host] + scale * np.sin(angle)])
        sigma = 10 ** load_relation("evrard2008").mean(self.mass[host], z_mid, planck)
        self.gz = np.concatenate([self.z, self.z[host] + sigma * rng.standard_normal(host.size) * KMS * (1 + z_mid)])
        self.seen = self.log_mstar > FAINTEST

    def galaxies(self, make_galaxies, keep, error_dex: float = 0.1, seed: int = 5):
        """The galaxies `keep` as a catalogue, with measured stellar masses."""
        index = np.flatnonzero(self.seen & keep)
        rng = np.random.default_rng(seed)
        return make_galaxies(
            "g",
            index.size,
            ra_deg=180 + self.gx[index],
            dec_deg=self.gy[index],
            z=self.gz[index],
            z_err=1e-4,
            log_mstar=self.log_mstar[index] + error_dex * rng.standard_normal(index.size),
            log_mstar_err=error_dex,
        ), index


@pytest.fixture(scope="module")
def sky(planck):
    """Haloes at random: they have no companions beyond the mean, and the audit is told so."""
    neighbours = numbers_of_nature()["neighbours"]
    usual, neighbours["projected_mpc"] = neighbours["projected_mpc"], 0.0
    yield Sky(planck, 2)
    neighbours["projected_mpc"] = usual


HELD = {"relation": RELATION, "zero_point": "0"}


def drawn_numbers(haloes, planck, held=HELD):
    """Mean number of haloes in the draws, and of their mass."""
    drawn = draw_haloes(haloes, np.arange(len(haloes)), Universe(2, 60, held=held), "dutton2014", planck)
    mass = np.where(drawn.own, 10**drawn.log_m200c, 0.0).sum(axis=0).mean()
    return drawn.own.sum(axis=0).mean(), mass, drawn


def test_complete_list_has_as_many_haloes_as_there_are(sky, make_galaxies, planck):
    galaxies, index = sky.galaxies(make_galaxies, np.ones(sky.host.size, bool))
    true = sky.central[index]
    assert 0.25 < 1 - true.mean() < 0.35  # there is something to get wrong
    haloes = halo_list([galaxies], [], planck)
    number, mass, _ = drawn_numbers(haloes, planck)
    naive, heavy, _ = drawn_numbers(halo_list([galaxies], [], planck, membership=False), planck)
    true_mass = (10 ** sky.mass[sky.host[index[true]]]).sum()
    # 4,478 haloes; satellites are told from neighbours by place and speed, not by name
    assert number == pytest.approx(true.sum(), rel=0.03)
    # the heaviest haloes carry much of the mass, and a central's stellar mass says little of theirs
    assert mass == pytest.approx(true_mass, rel=0.10)
    # every galaxy in a halo of its own is 44 per cent too many
    assert naive > 1.3 * true.sum()
    assert heavy > 1.2 * true_mass


def test_probabilities_mean_what_they_say(sky, make_galaxies, planck):
    galaxies, index = sky.galaxies(make_galaxies, np.ones(sky.host.size, bool))
    haloes = halo_list([galaxies], [], planck)
    p = np.ones(len(galaxies))  # those that are left out are members for sure
    at = {row: k for k, row in enumerate(galaxies.row)}
    p[[at[i] for i in haloes.id]] = haloes.p_member
    true = ~sky.central[index]
    for low, high in ((0.0, 0.1), (0.1, 0.4), (0.4, 0.7), (0.7, 0.95), (0.95, 1.01)):
        part = (p >= low) & (p < high)
        error = np.sqrt(0.25 / part.sum())
        assert true[part].mean() == pytest.approx(p[part].mean(), abs=0.05 + 2.5 * error), (low, high, part.sum())


def test_hosts_that_are_missing_from_the_list_come_in_once(sky, make_galaxies, planck):
    # a tenth of the centrals are not in the list; their satellites are
    rng = np.random.default_rng(3)
    lost = sky.central & (rng.random(sky.host.size) < 0.1)
    galaxies, index = sky.galaxies(make_galaxies, ~lost)
    haloes = halo_list([galaxies], [], planck)
    number, _, drawn = drawn_numbers(haloes, planck)
    true = np.unique(sky.host[index]).size
    assert number == pytest.approx(true, rel=0.06)
    assert drawn.hosted.any()


def test_group_list_takes_its_members(sky, make_galaxies, make_groups, planck):
    galaxies, index = sky.galaxies(make_galaxies, np.ones(sky.host.size, bool))
    heavy = np.flatnonzero(sky.mass > 13.3)
    groups = make_groups(
        "c",
        heavy.size,
        ra_deg=180 + sky.x[heavy],
        dec_deg=sky.y[heavy],
        z=sky.z[heavy],
        log_mass=sky.mass[heavy],
        log_mass_err=0.05,
    )
    haloes = halo_list([galaxies], [groups], planck)
    number, mass, _ = drawn_numbers(haloes, planck)
    held = np.unique(np.concatenate([sky.host[index], heavy]))
    assert number == pytest.approx(held.size, rel=0.04)
    assert mass == pytest.approx((10 ** sky.mass[held]).sum(), rel=0.15)
    giants = {galaxies.row[k] for k in np.flatnonzero(sky.central[index] & np.isin(sky.host[index], heavy))}
    own = {row: 1 - p for row, p in zip(haloes.id, haloes.p_member, strict=True)}
    assert np.mean([own.get(row, 0.0) for row in giants]) < 0.02


def test_company_tells_the_mass(sky, make_galaxies, planck):
    galaxies, index = sky.galaxies(make_galaxies, np.ones(sky.host.size, bool))
    haloes = halo_list([galaxies], [], planck)
    at = {row: k for k, row in enumerate(galaxies.row)}
    truth = sky.mass[sky.host[index[[at[i] for i in haloes.id]]]]
    central = sky.central[index[[at[i] for i in haloes.id]]]
    # with `membership` held at 0 a mass comes from the galaxy's own light alone
    told, alone = (
        drawn_numbers(haloes, planck, h)[2].log_m200c.mean(axis=1) for h in (HELD, HELD | {"membership": "0"})
    )
    cluster = central & (truth > 13.9)
    assert cluster.sum() >= 5
    assert (told - truth)[cluster].mean() == pytest.approx(0.0, abs=0.15)
    assert (alone - truth)[cluster].mean() < -0.4
    scatter = [np.std((m - truth)[central & (truth > 12.3)]) for m in (told, alone)]
    assert scatter[0] < 0.85 * scatter[1]
    lonely = central & (haloes.n_satellites < 0.3) & (haloes.log_mstar > 10.7)
    assert (told - truth)[lonely].mean() == pytest.approx(0.0, abs=0.06)
    assert (alone - truth)[lonely].mean() > 0.1


def test_galaxies_in_no_group_of_a_complete_list_are_light(sky, make_galaxies, make_groups, planck):
    # every halo with two listed galaxies is a listed group with a member list: what is left is lone
    galaxies, index = sky.galaxies(make_galaxies, np.ones(sky.host.size, bool))
    host = sky.host[index]
    many = np.flatnonzero(np.bincount(host, minlength=sky.mass.size) > 1)
    groups = make_groups(
        "c", many.size, ra_deg=180 + sky.x[many], dec_deg=sky.y[many], z=sky.z[many], log_mass=sky.mass[many]
    )
    groups = replace(groups, row=np.array([f"c:{h}" for h in many], dtype=object), log_mass_err=np.zeros(many.size))
    named = replace(galaxies, group=np.array([f"c:{h}" if h in set(many) else "" for h in host], dtype=object))
    haloes = halo_list([named], [groups], planck)
    lone = np.flatnonzero(haloes.kind == "galaxy")
    truth = (10 ** sky.mass[np.setdiff1d(host, many)]).sum()
    drawn = drawn_numbers(haloes, planck)[2]
    mass = np.where(drawn.own, 10**drawn.log_m200c, 0.0)[lone].sum(axis=0).mean()
    assert mass == pytest.approx(truth, rel=0.1)
    naive = drawn_numbers(haloes, planck, HELD | {"membership": "0"})[2]
    assert (10 ** naive.log_m200c[lone]).sum(axis=0).mean() > 1.3 * truth


def test_draws_of_a_part_equal_those_of_the_whole_to_the_last_bit(sky, make_galaxies, planck):
    galaxies, _ = sky.galaxies(make_galaxies, np.ones(sky.host.size, bool))
    haloes = halo_list([galaxies], [], planck)
    assert np.nanmax(haloes.n_satellites) > 10
    index = np.argsort(-np.nan_to_num(haloes.n_satellites))[:60]
    universe = Universe(3, 40)
    whole = draw_haloes(haloes, index, universe, "dutton2014", planck)
    for part in (np.arange(60)[::-1], np.array([7]), np.arange(0, 60, 7)):
        some = draw_haloes(haloes, index[part], universe, "dutton2014", planck)
        for name in vars(whole):
            assert np.array_equal(getattr(some, name), getattr(whole, name)[part]), name


def test_photometric_galaxies_are_lone_only_where_members_are_published(sky, make_galaxies, make_groups, planck):
    galaxies, _ = sky.galaxies(make_galaxies, np.ones(sky.host.size, bool))
    n = len(galaxies)
    photo = replace(galaxies, photometric=np.ones(n, bool), z_err=np.full(n, 0.03))
    assert np.isnan(halo_list([photo], [], planck).n_satellites).all()
    group = make_groups("c", 1, ra_deg=20.0, dec_deg=-60.0, log_mass=13.5)
    named = replace(photo, group=np.array(["c:000000", *[""] * (n - 1)], dtype=object))
    haloes = halo_list([named], [group], planck)
    assert np.all(haloes.n_satellites[haloes.kind == "galaxy"] == 0)


@pytest.mark.parametrize("z", [0.0, 0.5])
def test_satellite_fraction_and_hosts_as_by_integration(z, planck):
    # of the mean over relations, without error; a plain sum over the mass function
    central, satellites, first, weight = 0.0, 0.0, 0.0, 0.0
    y = 10.0
    k = int(np.argmin(np.abs(Y_NODES - y)))
    number = mass_function(LOG_M, z, planck)
    for name in ("behroozi2013", "behroozi2019", "kravtsov2018", "moster2013"):
        a, b, c = galaxies_of_host(load_relation(name), z, planck)
        central += np.trapezoid(number * a[k], LOG_M) / 4
        satellites += np.trapezoid(number * b[k], LOG_M) / 4
        first += np.trapezoid(number * c[k], LOG_M) / 4
        weight = weight + number * c[k]
    found = occupation(planck).numbers(Y_NODES[k], z, 0.0)
    # z 0.5 lies between nodes of the table
    assert found == pytest.approx((central, satellites, first), rel=0.02)
    # 25 to 30 per cent of galaxies are satellites (common practice), fewer at earlier times
    assert 0.2 < found[1] / (found[0] + found[1]) < 0.31
    middle = np.interp(0.5, np.cumsum(weight) / weight.sum(), LOG_M + 0.025)
    assert occupation(planck).host(Y_NODES[k], z, 0.0, 0.0) == pytest.approx(middle, abs=0.03)


def test_occupation_above_a_mass_is_the_integral_of_its_parts(planck):
    # S(y | M) from its own formula, against the sum over the tabulated dN/dy: a halo far heavier than the satellites
    relation = load_relation("moster2013")
    _, per_dex, _ = galaxies_of_host(relation, 0.1, planck)
    column = per_dex[:, int(np.argmin(np.abs(LOG_M - 15.0)))]
    mean = mean_of_200c(relation, LOG_M, 0.1, planck)
    for y in (9.0, 10.0):
        mh = 10 ** np.interp(y, mean, LOG_M)
        s = 1e15 / (10.62e12 * (mh / 1e12) ** 0.859) * np.exp(-1.47e12 * (mh / 1e12) ** -0.13 / 1e15)
        use = y <= Y_NODES
        # satellites as heavy as the central are cut, which S does not know
        assert np.trapezoid(column[use], Y_NODES[use]) == pytest.approx(s, rel=0.03)


@pytest.mark.parametrize("c", [3.0, 12.0])
def test_places_follow_the_profile(c):
    r = radius_r200c((np.arange(20_000) + 0.5) / 20_000, c)
    y = c * np.array([0.1, 0.3, 0.7])
    enclosed = (np.log1p(y) - y / (1 + y)) / (np.log1p(c) - c / (1 + c))
    assert [(r < x / c).mean() for x in y] == pytest.approx(enclosed, abs=2e-3)
    x = np.linspace(0, 1, 4001)
    ring = surface_per_r200c2(x, c) * 2 * np.pi * x
    assert np.trapezoid(ring, x) == pytest.approx(1.0, abs=5e-3)
    for b in (0.2, 0.6):
        along = quad(lambda s, b=b: 1 / (c * np.hypot(b, s)) / (1 + c * np.hypot(b, s)) ** 2, 0, np.sqrt(1 - b * b))[0]
        whole = 4 * np.pi * (np.log1p(c) - c / (1 + c)) / c**3
        assert surface_per_r200c2(b, c) == pytest.approx(2 * along / whole, rel=0.01)
    assert surface_per_r200c2(1.01, c) == 0


def test_host_draws_stand_off_the_galaxy_and_stay_within_reach(make_galaxies, planck):
    galaxies = make_galaxies("g", 1, log_mstar=10.5, log_mstar_err=0.1, z_err=1e-4)
    haloes = halo_list([galaxies], [], planck)
    assert 0.02 < haloes.p_hosted[0] < 0.1
    assert "the halo is that of an unlisted host" in haloes.note[0]
    universe = Universe(1, 20_000, held={"relation": "moster2013"})
    drawn = draw_haloes(haloes, [0], universe, "dutton2014", planck)
    off = np.hypot(drawn.centre_east_kpc, drawn.centre_north_kpc)
    assert np.all(off[~drawn.hosted] == 0)
    r200c = planck.r200c_kpc(drawn.log_m200c, drawn.z)
    assert np.all((off < r200c)[drawn.hosted])
    assert 0.2 < np.median((off / r200c)[drawn.hosted]) < 0.5
    assert np.median(drawn.log_m200c[drawn.hosted]) > np.median(drawn.log_m200c[~drawn.hosted]) + 0.4
    reach = planck.r200c_kpc(mass_ceiling(haloes, planck), drawn.z.min())
    assert np.mean(off + r200c > reach) < 2e-3


def test_fixed_draws_no_host(make_galaxies, planck):
    haloes = halo_list([make_galaxies("g", 1, log_mstar=10.5)], [], planck)
    drawn = draw_haloes(haloes, [0], Universe(fixed=True), "dutton2014", planck)
    assert drawn.own.all()
    assert not drawn.hosted.any()


def test_heavier_galaxy_claims_its_neighbours_in_any_order(make_galaxies, planck):
    # a rich group outside every catalogue: 30 galaxies within 200 kpc and 300 km/s of a giant
    rng, n = np.random.default_rng(4), 30
    galaxies = make_galaxies(
        "g",
        n + 1,
        ra_deg=150 + np.append(rng.normal(0, 0.02, n), 0.0),
        dec_deg=2 + np.append(rng.normal(0, 0.02, n), 0.0),
        z=0.1 + np.append(rng.normal(0, 250, n), 0.0) * 1.1 * KMS,
        z_err=1e-4,
        log_mstar=np.append(rng.uniform(9.3, 10.5, n), 11.3),
        log_mstar_err=0.15,
    )
    haloes = halo_list([galaxies], [], planck)
    own = 1 - haloes.p_member
    giant = haloes.id == "g:000030"
    assert own[giant] > 0.85
    assert own[~giant].sum() < 3
    shuffled = halo_list([take(galaxies, rng.permutation(n + 1))], [], planck)
    assert np.array_equal(shuffled.p_member, haloes.p_member)
    assert np.array_equal(shuffled.id, haloes.id)


def test_group_id_that_names_nothing_is_told_row_by_row(make_galaxies, make_groups, planck):
    galaxies = make_galaxies(
        "g", 2, ra_deg=np.array([10.0, 20.0]), log_mstar=10.0, group=np.array(["c:9", "c:000000"], dtype=object)
    )
    haloes = halo_list([galaxies], [make_groups("c", 1, ra_deg=99.0, log_mass=13.5)], planck)
    assert any("names no listed group" in n and "g:000000 (c:9)" in n and "000001" not in n for n in haloes.notes)
    assert "g:000001" not in haloes.id
