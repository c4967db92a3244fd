"""The audit with every spread off against numbers a person would compute."""

import numpy as np
import pytest
import sky
from scipy.integrate import quad

from haloledger.audit import audit
from haloledger.cosmos.concentration import concentration
from haloledger.cosmos.mass_function import mass_function

TEXTBOOK = "textbook-modified-nfw"

CHECKS = [  # log M200c, c, b/r200c, rest-frame DM of the textbook model at z = 0.1 (scipy quad, epsrel 1e-11)
    (12, 8, 0.1, 119.9487),
    (12, 8, 0.3, 74.7012),
    (12, 8, 0.5, 43.0819),
    (13, 6, 0.1, 209.8226),
    (13, 6, 0.3, 151.2749),
    (13, 6, 0.5, 95.5750),
    (14, 5, 0.1, 399.2049),
    (14, 5, 0.3, 311.3967),
    (14, 5, 0.5, 208.2637),
]


def fixed(bursts, *rows, model=TEXTBOOK, **more):
    return audit(bursts, galaxies=[sky.galaxies(*rows)], models=[model], fixed=True, **more)


def entry(ledgers, column) -> float:
    """A number of the first entry."""
    return float(np.asarray(ledgers.to_pandas()[1][column])[0])


@pytest.mark.parametrize(("log_m", "c", "b", "rest"), CHECKS)
def test_textbook_check_table(planck, tmp_path, log_m, c, b, rest):
    model = sky.fixed_concentration(tmp_path, TEXTBOOK, c)
    z = 0.1
    row = sky.galaxy_at(planck, log_m, z, b * planck.r200c_kpc(log_m, z))
    ledgers = fixed(sky.bursts(sky.burst()), row, model=model)
    assert entry(ledgers, "dm_mean") * (1 + z) == pytest.approx(rest, rel=2e-4)


def test_textbook_against_hand_integrals(planck):
    # thirty haloes, each integrated from the published density with scipy's quad; 2e-4 is the table's
    rng = np.random.default_rng(8)
    for _ in range(30):
        log_m, z, b = rng.uniform(11, 15), rng.uniform(0.02, 0.45), rng.uniform(0.02, 0.98)
        r200c = planck.r200c_kpc(log_m, z)
        c = float(concentration("dutton2014", log_m, z, planck))
        inner = quad(lambda x, c=c: x**2 * c * x / (2 + c * x) ** 4, 0, 1)[0]
        line = (
            2 * quad(lambda s, b=b, c=c: c * np.hypot(b, s) / (2 + c * np.hypot(b, s)) ** 4, 0, np.sqrt(1 - b * b))[0]
        )
        gas = 0.75 * planck.baryon_share * 10**log_m
        by_hand = gas / (4 * np.pi * inner * r200c**2) * line * 0.875 * 4.046285e-8 * 1000 / (1 + z)
        ledgers = fixed(sky.bursts(sky.burst()), sky.galaxy_at(planck, log_m, z, b * r200c))
        assert entry(ledgers, "dm_mean") == pytest.approx(by_hand, rel=2e-4)


PINNED = [(12.0, 90.34), (12.3, 115.36), (12.5, 133.44)]
"""FRB 20181112A (Prochaska et al. 2019, Science 366, 231: b = 29 kpc at z = 0.3674): log M200c and the textbook model's
DM, computed apart from this code; the published range is about 50 to 120."""


@pytest.mark.parametrize(("log_m", "expected"), PINNED)
def test_published_sightline_with_one_galaxy(planck, log_m, expected):
    ledgers = fixed(sky.bursts(sky.burst(z=0.4755, dm=589.27)), sky.galaxy_at(planck, log_m, 0.3674, 29.04))
    assert entry(ledgers, "impact_kpc_p50") == pytest.approx(29.04, rel=1e-6)
    assert entry(ledgers, "dm_mean") == pytest.approx(expected, rel=5e-4)  # values printed to 0.01


def test_two_haloes_on_one_line_add_exactly(planck):
    near = sky.galaxy_at(planck, 12.5, 0.1, 80.0, 10.0, "G1")
    far = sky.galaxy_at(planck, 13.0, 0.3, 150.0, 200.0, "G2")
    line = sky.bursts(sky.burst())
    alone = [entry(fixed(line, row), "dm_mean") for row in (near, far)]
    both = fixed(line, near, far)
    assert both.sightlines["dm_foreground_mean"][0].value == pytest.approx(sum(alone), rel=1e-14)
    shares = [float(x) for x in both.entries["share"][:2]]
    assert shares == pytest.approx(sorted(np.array(alone) / sum(alone))[::-1])


def test_halo_behind_the_burst_adds_nothing(planck):
    ledgers = fixed(sky.bursts(sky.burst(z=0.2)), sky.galaxy_at(planck, 13.0, 0.3, 20.0))
    assert len(ledgers.entries) == 0
    assert ledgers.sightlines["dm_foreground_mean"][0].value == 0


def test_beyond_the_boundary_is_zero_and_not_nan(planck):
    r200c = planck.r200c_kpc(12.0, 0.1)
    ledgers = fixed(sky.bursts(sky.burst()), sky.galaxy_at(planck, 12.0, 0.1, 1.0001 * r200c))
    assert ledgers.sightlines["dm_foreground_mean"][0].value == 0


def test_budget_adds_up(planck):
    line = sky.bursts(sky.burst(dm=640.0, dm_disc=40.0, dm_mw_halo=30.0, dm_host_rest=90.0))
    row = fixed(line, sky.galaxy_at(planck, 13.0, 0.3, 60.0)).sightlines[0]
    terms = ("mw_disc", "mw_halo", "foreground", "unlisted", "diffuse", "at_source", "host_obs", "after_all")
    assert sum(row[f"dm_{t}_mean"].value for t in terms) == pytest.approx(640.0, rel=1e-12)
    assert row["dm_mw_disc_mean"].value == 40.0
    assert row["dm_host_obs_mean"].value == 60.0
    cosmic = row["dm_foreground_mean"] + row["dm_unlisted_mean"] + row["dm_diffuse_mean"]
    assert row["dm_cosmic_with_foreground_mean"].value == pytest.approx(cosmic.value)


def test_negative_residual_is_a_result(planck):
    # FRB 20220319D (Ravi et al. 2023): DM 110.95 at z = 0.0112 is below what disc models alone give
    line = sky.bursts({"burst": "X", "ra": 32.17792, "dec": 71.03526, "z": 0.0112, "dm": 110.95, "dm_disc": 130.0})
    ledgers = audit(line, galaxies=[sky.galaxies(sky.galaxy_at(planck, 12.0, 0.3, 20.0))], models=[TEXTBOOK], draws=200)
    row = ledgers.sightlines[0]
    assert row["dm_after_mw_foreground_p84"].value < 0
    assert row["dm_after_all_p50"].value < 0


def _random_haloes(planck, side_deg, least_log_m, rng):
    """Haloes from the mass function (Tinker 2008 by colossus) placed at random in a field, to z = 0.5."""
    log_m = np.arange(least_log_m + 0.025, 15.8, 0.05)
    z_edges = np.linspace(0.002, 0.5, 250)
    z_mid = (z_edges[1:] + z_edges[:-1]) / 2
    half = np.radians(side_deg / 2)
    slab_volume = planck.volume_element(z_mid) * np.diff(z_edges) * 2 * half * 2 * np.sin(half)
    counts = rng.poisson(mass_function(log_m[:, None], z_mid, planck) * 0.05 * slab_volume)
    mass, slab = (np.repeat(a.ravel(), counts.ravel()) for a in np.meshgrid(log_m, np.arange(249), indexing="ij"))
    n = len(mass)
    return sky.Table(
        {
            "id": [f"h{i}" for i in range(n)],
            "ra": 180 + rng.uniform(-side_deg / 2, side_deg / 2, n),
            "dec": np.degrees(np.arcsin(rng.uniform(-1, 1, n) * np.sin(half))),
            "z": z_edges[slab] + rng.random(n) * np.diff(z_edges)[slab],
            "log_m200c": mass + rng.uniform(-0.025, 0.025, n),
            "log_m200c_err": np.zeros(n),
        }
    )


def test_halo_share_of_the_mean_comes_back_over_random_lines(planck):
    """Entries summed over random simulated lines give the mean halo DM: of this sky, and of the mass function.

    Haloes above 1e12 Msun, to z = 0.5, 0.75 of the baryons: 95.94 (colossus, computed apart from this code).
    """
    rng = np.random.default_rng(21)
    side, lines = 5.0, 1500
    table = _random_haloes(planck, side, 12.0, rng)
    inner = side / 2 - 0.5
    at = sky.Table(
        {
            "burst": [f"B{i}" for i in range(lines)],
            "ra": 180 + rng.uniform(-inner, inner, lines),
            "dec": rng.uniform(-inner, inner, lines),
            "z": np.full(lines, 0.5),
            "dm": np.full(lines, 600.0),
        }
    )
    sums = audit(at, galaxies=[table], models=[TEXTBOOK], fixed=True).sightlines["dm_foreground_mean"].value
    # this sky: every halo's electrons spread over the field; no line is drawn
    inside = (np.abs(table["ra"] - 180) < inner) & (np.abs(table["dec"]) < inner)
    z, mass = np.array(table["z"]), 10 ** np.array(table["log_m200c"])
    electrons_kpc2 = 0.75 * planck.baryon_share * mass * 0.875 * 4.046285e-8 * 1000  # pc cm-3 kpc2
    per_halo = electrons_kpc2 / (1 + z) / planck.angular_distance_kpc(z) ** 2 / np.radians(2 * inner) ** 2
    this_sky = per_halo[inside].sum()
    error = sums.std() / np.sqrt(lines)
    assert sums.mean() == pytest.approx(this_sky, abs=3 * error)
    assert error < 0.04 * this_sky
    # the mass function: this sky has as many clusters as chance gave it
    chance = np.sqrt((per_halo[inside] ** 2).sum())
    assert this_sky == pytest.approx(95.94, abs=3 * chance + 0.01 * 95.94)
    assert chance < 0.1 * 95.94
