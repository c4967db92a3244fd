"""The halo density of the sky: bias, two-point function, counts."""

import numpy as np
import pytest
from scipy import fft

from haloledger.cosmos.mass_function import mass_function
from haloledger.rehearse.sky.matter import halo_bias, make_box, matter_power
from haloledger.rehearse.sky.placing import CLASS_EDGES, class_bias, class_of, place_haloes

N, CELL = 96, 6.0


def correlation(field):
    """xi at separations of whole cells along the axes, by Fourier transform."""
    power = np.abs(fft.rfftn(field - 1)) ** 2
    xi = fft.irfftn(power, s=field.shape) / field.size
    return (xi[:8, 0, 0] + xi[0, :8, 0] + xi[0, 0, :8]) / 3


def linear_correlation(r_mpc, z, cosmos):
    """xi(r) = integral of P(k) k^2 sin(kr)/(kr) dk / 2 pi^2, damped where it cannot matter at these r."""
    k = np.geomspace(1e-4, 20, 30000)
    p = matter_power(k, z, cosmos) * np.exp(-((0.4 * k) ** 2))
    return np.array([np.trapezoid(p * k**3 * np.sinc(k * r / np.pi), np.log(k)) for r in r_mpc]) / (2 * np.pi**2)


def test_two_point_function_is_bias_squared_times_linear(planck):
    biases = (0.8, 1.5, 3.0)
    boxes = [make_box(biases, 0.2, planck, np.random.default_rng(s), N, CELL) for s in range(6)]
    r = CELL * np.arange(2, 5)
    wanted = linear_correlation(r, 0.2, planck)
    for k, bias in enumerate(biases):
        found = np.mean([correlation(box.densities[k])[2:5] for box in boxes], axis=0)
        # smoothing to the cell costs 1 to 4 per cent at two cells, six boxes scatter by 3 per cent
        np.testing.assert_allclose(found, bias**2 * wanted, rtol=0.10)


def test_one_bias_does_not_pass_for_another(planck):
    box = make_box((1.0, 1.3), 0.2, planck, np.random.default_rng(1), 64, CELL)
    low, high = (correlation(f)[2] for f in box.densities)
    # same phases: the ratio scatters far less than each
    assert high / low == pytest.approx(1.3**2, rel=0.05)


def test_bias_is_that_of_the_library(planck):
    # Tinker et al. 2010, figure 4 and 6: near 1 for haloes at the peak of nu, above 2 for clusters; from memory
    low, group, cluster = halo_bias(np.array([11.0, 13.0, 14.5]), 0.0, planck)
    assert 0.6 < low < 0.75
    assert 1.1 < group < 1.5
    assert 2.2 < cluster < 3.5


def test_counts_follow_the_mass_function(planck):
    box = make_box(class_bias(0.2, planck), 0.2, planck, np.random.default_rng(3), 64, CELL)
    lines = 300
    first, last = (np.full(lines, planck.comoving_distance_mpc(z)) for z in (0.03, 0.2))
    placed = place_haloes(box, first, last, np.ones(7), planck, np.random.default_rng(4))
    inner = np.hypot(placed.east_mpc, placed.north_mpc) < 1.6
    d = np.linspace(first[0], last[0], 200)
    z = planck.z_at_comoving_distance(d)
    for k in range(4):
        m = np.linspace(CLASS_EDGES[k], CLASS_EDGES[k + 1], 100)
        density = np.trapezoid(mass_function(m[None], z[:, None], planck), m, axis=1)
        wanted = lines * np.pi * 1.6**2 * np.trapezoid(density, d)
        found = np.sum(inner & (class_of(placed.log_m200c) == k))
        # Poisson, and structure along 300 lines through one box: 6 per cent at most for the classes tried
        assert found == pytest.approx(wanted, rel=0.08), CLASS_EDGES[k]
