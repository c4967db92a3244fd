"""Projections and masses that have a closed form, against the quadrature and the tables."""

import numpy as np
import pytest
from gas_reference import write_model
from scipy.special import gamma, hyp2f1

from haloledger.cosmos import electrons
from haloledger.gas.models import load_model
from haloledger.gas.projection import DM_UNIT, projection
from haloledger.gas.quadrature import along_line, enclosed


def modified_nfw_mass(a, y):
    """Integral of y^3/(a+y)^4 dy from 0 to y."""
    t = a + y
    return np.log(t / a) + 3 * a / t - 1.5 * a**2 / t**2 + a**3 / (3 * t**3) - 11 / 6


def modified_nfw_column(a, b, edge):
    """Integral of y/(a+y)^4 ds over the chord, y^2 = b^2 + s^2 < edge^2: F'' + (a/3) F''' with
    F(a) = T - a g(a); the derivatives by Cauchy's formula on a circle, exact to rounding."""
    big_t = np.arcsinh(np.sqrt(edge**2 - b**2) / b)
    n, radius = 64, 0.4 * a
    points = a + radius * np.exp(2j * np.pi * np.arange(n) / n)
    w = np.sqrt((b - points) / (b + points)) * np.tanh(big_t / 2)
    values = big_t - points * 2 / (b + points) * np.tanh(big_t / 2) * np.arctan(w) / w
    taylor = np.fft.fft(values).real / n / radius ** np.arange(n)
    return 2 * taylor[2] + a / 3 * 6 * taylor[3]


def nfw_column(c, x):
    """Takada & Jain 2003 (MNRAS 340, 580), equation 27: truncated at c scale radii, in 2 rho0 r_s."""
    inside = (x**2 + c) / (x * (1 + c))
    first = -np.sqrt(c**2 - x**2) / ((1 - x**2) * (1 + c))
    if x < 1:
        return first + np.arccosh(inside) / (1 - x**2) ** 1.5
    return first - np.arccos(inside) / (x**2 - 1) ** 1.5


def test_modified_nfw_mass_check_value():
    assert modified_nfw_mass(2, 7.7) == pytest.approx(0.303355161, abs=1e-9)
    by_rule = enclosed(lambda y: y / (2 + y) ** 4, 7.7)
    assert by_rule == pytest.approx(modified_nfw_mass(2, 7.7), rel=1e-12)  # rounding alone


@pytest.mark.parametrize(("b", "expected"), [(0.3, 0.04643866942), (0.1, 0.07456717120)])
def test_modified_nfw_column(b, expected):
    c = 8.0
    closed = modified_nfw_column(2, b * c, c)
    by_rule = 2 * along_line(lambda y: y / (2 + y) ** 4, b * c, np.sqrt(1 - b**2) * c)
    assert closed == pytest.approx(expected, rel=1e-9)  # ten digits given
    assert by_rule == pytest.approx(closed, rel=1e-10)


@pytest.mark.parametrize("c", [2.5, 6.0, 12.0, 25.0])
def test_textbook_table_against_closed_form(c, planck):
    b = np.array([0.003, 0.02, 0.11, 0.37, 0.66, 0.93, 0.9995])
    log_m, r200c = 12.3, 250.0
    got = projection(load_model("textbook-modified-nfw"), planck).dm_rest(b, log_m, 0.2, c, r200c)
    shape = np.array([modified_nfw_column(2, x * c, c) for x in b]) / modified_nfw_mass(2, c) * c**2
    amplitude = DM_UNIT * planck.baryon_share * 0.75 * 10**log_m / (4 * np.pi * r200c**2)
    assert got == pytest.approx(amplitude * shape, rel=1.2e-4)  # 1e-4 from u, 6e-5 from c, rarely both


@pytest.mark.parametrize(("x", "expected"), [(0.3, 1.0529932158), (2.5, 0.0872667419)])
def test_nfw_column(x, expected):
    c = 8.0
    by_rule = along_line(lambda y: 1 / (y * (1 + y) ** 2), x, np.sqrt(c**2 - x**2))
    assert nfw_column(c, x) == pytest.approx(expected, rel=1e-9)
    assert by_rule == pytest.approx(nfw_column(c, x), rel=1e-9)


def test_nfw_tracing_far_outside_its_core(planck, tmp_path):
    kept = '[kept]\nlaw = "constant"\nkept = 0.6\n'
    model = write_model(tmp_path, '[shape]\nkind = "nfw"\ncore = 0.001\n' + kept)
    c, b, r200c = 7.0, np.array([0.2, 0.4, 0.8]), 300.0
    column = np.array([nfw_column(c, x * c) for x in b]) * 2 / (np.log(1 + c) - c / (1 + c)) * c**2
    expected = DM_UNIT * planck.baryon_share * 0.6 * 10**12.5 / (4 * np.pi * r200c**2) * column
    got = projection(model, planck).dm_rest(b, 12.5, 0.0, c, r200c)
    assert got == pytest.approx(expected, rel=1.5e-4)  # the core moves b = 0.2 by 2e-5, the table 1e-4


def beta_column(n0, core, beta, b, radius):
    half = np.sqrt(radius**2 - b**2)
    a = 1.5 * beta
    return 2e3 * n0 * half * (1 + (b / core) ** 2) ** -a * hyp2f1(0.5, a, 1.5, -(half**2) / (b**2 + core**2))


def test_beta_column():
    b = np.array([0.0, 100.0, 300.0, 1000.0])
    expected = [1176.902139, 1044.202263, 617.020633, 162.959120]
    closed = beta_column(2e-3, 200.0, 2 / 3, b, 2000.0)
    by_rule = 2e3 * along_line(lambda r: 2e-3 / (1 + (r / 200) ** 2), b, np.sqrt(2000.0**2 - b**2))
    assert closed == pytest.approx(expected, rel=0, abs=5.1e-7)  # six decimals given
    assert by_rule == pytest.approx(closed, rel=1e-9)
    untruncated = np.sqrt(np.pi) * 2e-3 * 2e5 * gamma(0.5) / gamma(1.0) * (1 + (b / 200) ** 2) ** -0.5
    assert untruncated == pytest.approx([1256.637061, 1123.970357, 697.056825, 246.446804], rel=0, abs=5.1e-7)


def test_beta_model_table(planck, tmp_path):
    body = '[shape]\nkind = "steepened-beta"\ncore = 0.15\nbeta = 0.6\n'
    body += '[kept]\nlaw = "constant"\nkept = 0.5\nradius = "r500c"\n'
    model = write_model(tmp_path, body, boundary=1.5)
    log_m, z, c = 14.2, 0.3, 4.5
    r200c = float(planck.r200c_kpc(log_m, z))
    ratio = 0.6443  # r500c/r200c, only a starting value: the core follows from two densities of the model itself
    n0, n1 = model.density_cm3(np.array([1e-6, 0.3]), log_m, z, c, planck)
    core = 0.3 / np.sqrt((n0 / n1) ** (1 / 0.9) - 1)
    assert core == pytest.approx(0.15 * ratio, rel=0.02)
    b = np.array([0.0, 0.05, 0.3, 1.0, 1.49])
    got = projection(model, planck).dm_rest(b, log_m, z, c, r200c)
    assert got == pytest.approx(beta_column(n0, core * r200c, 0.6, b * r200c, 1.5 * r200c), rel=1.5e-4)


def test_dm_unit_against_astropy():
    from astropy import constants, units

    per = (1 * units.Msun / units.kpc**2 / constants.m_p).to_value("pc cm-3")
    assert pytest.approx(per * electrons.PER_PROTON, rel=1e-9) == DM_UNIT
