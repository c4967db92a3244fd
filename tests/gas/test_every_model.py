"""One battery for every halo model that ships, and a check that no shape or law escapes it."""

from itertools import pairwise

import numpy as np
import pytest
from gas_reference import column_by_quad, columns_by_rule, random_haloes
from scipy.integrate import quad

from haloledger.cosmos.concentration import concentration
from haloledger.gas.kept import LAWS
from haloledger.gas.kept.base import KeptLaw
from haloledger.gas.models import DEFAULT_MODEL, load_model, model_names
from haloledger.gas.projection import DM_UNIT, projection
from haloledger.gas.shapes import SHAPES, Shape

NAMES = model_names()
WITH_THEIR_OWN_TESTS = {"table": "test_density_table.py", "power-law": "test_kept.py"}


@pytest.fixture(params=NAMES)
def model(request):
    return load_model(request.param)


def test_the_models_the_package_promises():
    assert {"textbook-modified-nfw", "weak-feedback", "strong-feedback", DEFAULT_MODEL} <= set(NAMES)
    assert len(NAMES) >= 11


@pytest.mark.parametrize(("base", "registry"), [(Shape, SHAPES), (KeptLaw, LAWS)])
def test_no_class_escapes_its_registry(base, registry):
    assert set(base.__subclasses__()) == set(registry.values())


def test_no_shape_or_law_escapes_the_battery():
    parts = [part for name in NAMES for part in load_model(name).components]
    used = {p.shape.kind for p in parts} | {p.kept.law for p in parts if p.kept}
    assert (set(SHAPES) | set(LAWS)) - used == set(WITH_THEIR_OWN_TESTS)


def test_named_as_its_file(model):
    assert f"{model.name}.toml" == model.file


def test_columns_against_quadrature(model, planck):
    impact, log_m, z, c = random_haloes(1000, model.boundary_r200c)
    expected = columns_by_rule(model, planck, impact, log_m, z, c)
    for k in range(0, 1000, 40):  # the rule itself against adaptive quadrature
        by_quad = column_by_quad(model, planck, impact[k], log_m[k], z[k], c[k])
        assert expected[k] == pytest.approx(by_quad, rel=1e-7)
    got = projection(model, planck).dm_rest(impact, log_m, z, c, planck.r200c_kpc(log_m, z))
    # what the package promises is 1e-3 of the value or 1e-3 pc cm-3; the tables are built for 3e-4
    assert np.all(np.abs(got - expected) <= np.maximum(3e-4 * expected, 1e-3))


def test_column_carries_the_gas_mass(model, planck):
    """The integral of 2 pi b DM_rest db counts the electrons inside the boundary: f_b M gas_share x 7/8 / m_p."""
    log_m, z, c, r200c = 13.2, 0.15, 5.7, 500.0
    table, edge = projection(model, planck), model.boundary_r200c

    def ring(t):  # b = edge sin t, to be smooth at the boundary
        b = edge * np.sin(t)
        return 2 * np.pi * b * float(table.dm_rest(b, log_m, z, c, r200c)) * edge * np.cos(t)

    nodes, weights = np.polynomial.legendre.leggauss(200)
    t = 0.25 * np.pi * (nodes + 1)
    electrons = 0.25 * np.pi * sum(w * ring(x) for x, w in zip(t, weights, strict=True)) * r200c**2
    expected = DM_UNIT * planck.baryon_share * 10**log_m * float(model.gas_share(log_m, z, c, planck))
    assert electrons == pytest.approx(expected, rel=2e-4)


def test_exact_mass_identity(model, planck):
    """The same without the table: columns by quadrature, summed over the disc, against `gas_share`."""
    log_m, z, c, n = 12.6, 0.3, 7.0, 400
    edge, r200c = model.boundary_r200c, float(planck.r200c_kpc(log_m, z))
    nodes, weights = np.polynomial.legendre.leggauss(n)
    t = 0.25 * np.pi * (nodes + 1)
    b = edge * np.sin(t)
    column = columns_by_rule(model, planck, b, np.full(n, log_m), np.full(n, z), np.full(n, c))
    electrons = 0.25 * np.pi * np.sum(weights * 2 * np.pi * b * column * edge * np.cos(t))
    expected = DM_UNIT * planck.baryon_share * 10**log_m * float(model.gas_share(log_m, z, c, planck)) / r200c**2
    assert electrons == pytest.approx(expected, rel=1e-8)


def test_zero_from_the_boundary_on_and_positive_inside(model, planck):
    table, edge = projection(model, planck), model.boundary_r200c
    outside = table.dm_rest(edge * np.array([1.0, 1.0 + 1e-12, 1.5, 1e6, np.inf]), 12.5, 0.2, 7.0, 250.0)
    assert np.array_equal(outside, np.zeros(5))
    inside = table.dm_rest(edge * np.array([0.0, 1e-9, 0.5, 1 - 1e-9]), 12.5, 0.2, 7.0, 250.0)
    assert np.all(np.isfinite(inside))
    assert np.all(inside > 0)
    assert np.array_equal(model.density_cm3(edge * np.array([1.0001, 3.0]), 12.5, 0.2, 7.0, planck), np.zeros(2))


def test_any_grouping_gives_the_same_bits(model, planck):
    table = projection(model, planck)
    args = random_haloes(40000, model.boundary_r200c, seed=8)
    args = (*args, planck.r200c_kpc(args[1], args[2]))
    whole = table.dm_rest(*args)
    order = np.random.default_rng(2).permutation(40000)
    assert np.array_equal(table.dm_rest(*(a[order] for a in args)), whole[order])
    for size in (1, 7, 999):
        pieces = [table.dm_rest(*(a[s : s + size] for a in args)) for s in range(0, 200 * size, size)][:40]
        joined = np.concatenate(pieces)
        assert np.array_equal(joined, whole[: joined.size])
    assert float(table.dm_rest(*(a[5] for a in args))) == whole[5]
    assert np.array_equal(table.dm_rest(*(a[:400].reshape(20, 20) for a in args)), whole[:400].reshape(20, 20))


def test_any_grouping_of_cut_lines_gives_the_same_bits(model, planck):
    table = projection(model, planck)
    args = random_haloes(700, model.boundary_r200c, seed=9)
    args = (*args, planck.r200c_kpc(args[1], args[2]), np.full(700, -0.3), np.linspace(-0.2, 0.8, 700))
    whole = table.dm_rest_between(*args)
    order = np.random.default_rng(3).permutation(700)
    assert np.array_equal(table.dm_rest_between(*(a[order] for a in args)), whole[order])
    for size in (1, 3, 50):
        pieces = [table.dm_rest_between(*(a[s : s + size] for a in args)) for s in range(0, 20 * size, size)]
        joined = np.concatenate(pieces)[:700]
        assert np.array_equal(joined, whole[: joined.size])


def test_parts_of_a_line_add_up(model, planck):
    table = projection(model, planck)
    impact, log_m, z, c = random_haloes(300, model.boundary_r200c, seed=4)
    halo = (impact, log_m, z, c, planck.r200c_kpc(log_m, z))
    cuts = [-np.inf, -0.4, 0.0, 0.03, 0.9, np.inf]
    parts = [table.dm_rest_between(*halo, a, b) for a, b in pairwise(cuts)]
    whole = table.dm_rest(*halo)
    assert np.array_equal(table.dm_rest_between(*halo, -np.inf, np.inf), whole)
    assert np.sum(parts, axis=0) == pytest.approx(whole, rel=1e-12)
    assert parts[0] + parts[1] == pytest.approx(0.5 * whole, rel=1e-12)  # the near half
    assert np.all(np.array(parts) >= 0)


def test_cut_column_against_quad(model, planck):
    """A line ending inside the halo, also through the very centre of a cuspy one."""
    table, log_m, z, c = projection(model, planck), 12.4, 0.2, 9.0
    r200c = float(planck.r200c_kpc(log_m, z))
    for impact, start, stop in ((0.002, -np.inf, 0.01), (0.3, 0.1, 0.5), (0.0, -0.02, 0.7)):
        half = np.sqrt(model.boundary_r200c**2 - impact**2)

        def along(s, impact=impact):
            return float(model.density_cm3(max(np.hypot(impact, s), 1e-8), log_m, z, c, planck))

        low, high = max(start, -half), min(stop, half)
        kinks = [p for p in (-0.01, 0.0, 0.01) if low < p < high]
        expected, _ = quad(along, low, high, epsrel=1e-9, limit=500, points=kinks or None)
        got = float(table.dm_rest_between(impact, log_m, z, c, r200c, start, stop))
        assert got == pytest.approx(1e3 * r200c * expected, rel=3e-4)


def test_kept_fractions_are_fractions(model, planck):
    """Between nothing and the cosmic share, inside every radius, over the stated range; the stated exception apart."""
    log_m = np.linspace(*model.log_mass_range, 9)
    c200c = concentration(model.concentration, log_m, 0.1, planck)
    ceiling = 1.4 if model.name == "textbook-modified-nfw-wide" else 1.0
    for radius in (0.65, 1.0, 2.0):
        kept = model.kept(log_m, 0.1, c200c, planck, radius)
        assert np.all((kept > 0.005) & (kept < ceiling))


def test_gas_share_is_the_integral_of_the_density(model, planck):
    log_m, z, c, within = 13.4, 0.25, 5.0, 0.8
    r200c = float(planck.r200c_kpc(log_m, z))
    shells, _ = quad(lambda x: x**2 * float(model.density_cm3(x, log_m, z, c, planck)), 0, within, epsrel=1e-10)
    electrons = 4 * np.pi * shells * r200c**3 * 1e3
    expected = DM_UNIT * planck.baryon_share * 10**log_m * float(model.gas_share(log_m, z, c, planck, within))
    assert electrons == pytest.approx(expected, rel=1e-8)


def test_says_what_it_rests_on(model):
    stated = model.stated()
    assert stated["status"] in ("published", "scenario")
    assert len(model.source) > 30
    assert len(stated["sha256"]) == 64
    assert model.phases in ("hot", "hot+cool")


def test_yardstick_has_no_spread():
    yardstick = load_model("textbook-modified-nfw")
    assert yardstick.spread_shared_dex == yardstick.spread_own_dex == 0
    assert np.array_equal(yardstick.shape_scatter_dex([0.0, 0.7]), [0.0, 0.0])
    assert (yardstick.boundary_r200c, yardstick.concentration) == (1.0, "dutton2014")
    assert yardstick.components[0].kept.kept == 0.75


def test_default_hands_over_smoothly(planck):
    blended = load_model(DEFAULT_MODEL)
    log_m = np.linspace(11, 15.3, 400)
    weights = np.array(blended.weights(log_m))
    assert np.sum(weights, axis=0) == pytest.approx(np.ones(400), abs=1e-14)
    assert weights[0, 0] > 0.9999
    assert weights[1, -1] > 0.9999
    share = blended.gas_share(log_m, 0.1, 6.0, planck, within=1.0)
    assert np.max(np.abs(np.diff(np.log(share)))) < 0.02  # no jump: at most 2% from one hundredth of a dex to the next
    galaxy, cluster = float(share[0]), float(share[-1])
    assert 0.25 < galaxy < 0.4
    assert 0.8 < cluster < 1.0
    assert np.interp(14.0, log_m, share) == pytest.approx(
        float(blended.gas_share(14.0, 0.1, 6.0, planck, 1.0)), rel=1e-4
    )
