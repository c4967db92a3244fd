"""Columns and densities that were worked out independently (adaptive quadrature, relative error 1e-11), z = 0.1.

Y = 0.25, baryon share 0.158141, Planck18, kept 0.75 for the modified NFW and NFW.
"""

import numpy as np
import pytest
from gas_reference import write_model

from haloledger.gas.models import load_model
from haloledger.gas.projection import DM_UNIT, projection
from haloledger.gas.quadrature import along_line

Z = 0.1
IMPACTS = np.array([0.1, 0.3, 0.5, 1.0])
# kernel: the tables are good to 1e-4 (two axes) or 2e-4 (three); references have 7 digits
COLUMNS = {  # log M, c: model -> columns at IMPACTS
    (12, 8): {
        "textbook": [119.9487, 74.7012, 43.0819, 0.0],
        "textbook to 2": [129.3210, 84.3095, 53.2314, 20.2427],
        "nfw": [332.7864, 73.2037, 28.8793, 0.0],
        "agn to 1": [73.8130, 40.5493, 23.0589, 0.0],
        "agn to 2": [78.8175, 45.6801, 28.4790, 10.8222],
        "shock to 1": [257.7919, 95.6483, 43.7620, 0.0],
        "shock to 2": [263.7052, 101.7174, 50.1904, 13.5987],
    },
    (13, 6): {
        "textbook": [209.8226, 151.2749, 95.5750, 0.0],
        "textbook to 2": [234.2530, 176.3132, 122.0054, 51.8896],
        "nfw": [652.8342, 162.1352, 66.8116, 0.0],
        "agn to 1": [240.6725, 120.8463, 65.0706, 0.0],
        "agn to 2": [253.0700, 133.5604, 78.5119, 27.2788],
        "shock to 1": [584.0705, 210.1336, 95.1244, 0.0],
        "shock to 2": [596.7855, 223.1839, 108.9476, 29.2640],
    },
    (14, 5): {
        "textbook": [399.2049, 311.3967, 208.2637, 0.0],
        "textbook to 2": [458.8054, 372.4669, 272.6965, 125.0592],
        "nfw": [1316.4847, 353.4375, 150.1311, 0.0],
        "agn to 1": [750.9479, 339.3077, 171.7627, 0.0],
        "agn to 2": [779.3581, 368.4534, 202.6000, 63.6913],
        "shock to 1": [1310.6845, 457.0148, 204.6623, 0.0],
        "shock to 2": [1337.7355, 484.7797, 234.0724, 62.3115],
    },
}
TOLERANCE = {"textbook": 1e-4, "textbook to 2": 1e-4, "nfw": 2e-4}


@pytest.fixture(scope="module")
def models(tmp_path_factory):
    folder = tmp_path_factory.mktemp("models")
    kept = '[kept]\nlaw = "constant"\nkept = 0.75\n'
    found = {
        "textbook": load_model("textbook-modified-nfw"),
        "textbook to 2": load_model("textbook-modified-nfw-wide"),
        # the smallest core allowed moves the column at b = 0.1 r200c by 6e-5
        "nfw": write_model(folder, '[shape]\nkind = "nfw"\ncore = 0.001\n' + kept, name="nfw"),
        "agn to 2": load_model("gnfw-agn-feedback"),
        "shock to 2": load_model("gnfw-shock-heating"),
    }
    for short, full in (("agn", "gnfw-agn-feedback"), ("shock", "gnfw-shock-heating")):
        shape = load_model(full).components[0].shape
        triples = "\n".join(f"{k} = {list(getattr(shape, k))}" for k in ("amplitude", "sharpness", "outer"))
        body = f'[shape]\nkind = "gnfw-fit"\n{triples}\nscale = 0.5\ninner = -0.2\n'
        found[f"{short} to 1"] = write_model(folder, body, 1.0, f"{short}-1")
    return found


@pytest.mark.parametrize(("halo", "name"), [(h, n) for h in COLUMNS for n in COLUMNS[h]])
def test_columns(halo, name, models, planck):
    log_m, c = halo
    r200c = planck.r200c_kpc(log_m, Z)
    got = projection(models[name], planck).dm_rest(IMPACTS, log_m, Z, c, r200c)
    assert got == pytest.approx(COLUMNS[halo][name], rel=TOLERANCE.get(name, 2e-4), abs=0)


@pytest.mark.parametrize(
    ("log_m", "expected"),
    [
        (12, [81.1415, 48.0153, 30.8376, 13.3048]),
        (13, [257.8607, 138.3758, 83.3781, 32.4159]),
        (14, [788.4717, 377.6162, 211.8645, 73.4987]),
    ],
)
def test_agn_fit_without_a_boundary(log_m, expected, planck):
    part = load_model("gnfw-agn-feedback").components[0]
    column = 2 * along_line(lambda x: part.density(x, log_m, Z, 6.0, planck), IMPACTS, 1000.0)
    amplitude = DM_UNIT * planck.baryon_share * 10**log_m / (4 * np.pi * planck.r200c_kpc(log_m, Z) ** 2)
    assert amplitude * column == pytest.approx(expected, rel=2e-6)  # seven digits given


@pytest.mark.parametrize(
    ("offset", "slope", "expected"),
    [(4, 2, [74.6796, 63.1767, 45.1748]), (2, 1, [174.8894, 78.0999, 39.6194]), (2, 0, [260.1976, 76.7660, 33.9231])],
)
def test_modified_nfw_variants(offset, slope, expected, planck, tmp_path):
    core = "core = 0.001\n" if slope == 0 else ""  # moves b = 0.1 by 6e-5
    body = f'[shape]\nkind = "modified-nfw"\ninner_slope = {slope}\ninner_offset = {offset}\n{core}'
    model = write_model(tmp_path, body + '[kept]\nlaw = "constant"\nkept = 0.75\n')
    got = projection(model, planck).dm_rest(IMPACTS[:3], 12, Z, 8, planck.r200c_kpc(12, Z))
    assert got == pytest.approx(expected, rel=2e-4)


def test_central_columns(planck):
    got = [
        float(projection(load_model("textbook-modified-nfw"), planck).dm_rest(0.0, m, Z, c, planck.r200c_kpc(m, Z)))
        for m, c in COLUMNS
    ]
    assert got == pytest.approx([120.1088, 203.7753, 383.6804], rel=1e-4)


@pytest.mark.parametrize(
    ("name", "expected"),
    [
        ("textbook-modified-nfw", [5.18905e-4, 3.41168e-4, 5.78924e-5]),
        ("gnfw-agn-feedback", [1.07653e-3, 3.26654e-4, 3.26751e-5]),
    ],
)
def test_densities(name, expected, planck):
    got = load_model(name).density_cm3(np.array([0.1, 0.3, 1.0]), 13, Z, 6, planck)
    assert got == pytest.approx(expected, rel=1e-5)  # six digits given


def test_parameters_of_the_agn_fit():
    amplitude, sharpness, outer = load_model("gnfw-agn-feedback").components[0].shape.parameters([12, 13, 14], Z)
    assert amplitude == pytest.approx([987.9633, 1926.3749, 3756.1318], rel=1e-7)
    assert sharpness == pytest.approx([1.028839, 0.960168, 0.896081], rel=1e-6)
    assert outer == pytest.approx([3.178074, 3.484688, 3.820885], rel=1e-6)
    amplitude, sharpness, outer = load_model("gnfw-shock-heating").components[0].shape.parameters(14, Z)
    assert [amplitude, sharpness, outer] == pytest.approx([17355.2371, 0.718247, 4.445650], rel=1e-6)


@pytest.mark.parametrize("name", ["gnfw-agn-feedback", "gnfw-shock-heating"])
def test_outer_slope_is_minus_outer(name):
    shape = load_model(name).components[0].shape
    x = np.array([1e5, 1e6])  # the bracket's 1 is then below 1e-4 of it
    slope = np.diff(np.log(shape.density(x, 13.7, 0.4, 5.0)))[0] / np.log(10)
    assert slope == pytest.approx(-float(shape.parameters(13.7, 0.4)[2]), rel=1e-3)


def test_gas_of_the_agn_fit(models, planck):
    wide, masses = models["agn to 2"], np.array([12.0, 13.0, 14.0, 15.0])
    share = [wide.gas_share(masses, Z, 5.0, planck, within=x) for x in (0.65, 1.0, 2.0)]
    expected = [
        [0.2261, 0.3194, 0.4273, 0.5367],
        [0.4104, 0.5502, 0.6963, 0.8250],
        [0.8626, 1.0627, 1.2331, 1.3380],
    ]
    assert np.array(share) == pytest.approx(np.array(expected), abs=6e-5)  # four digits given
    # the sign of the exponent: with outer - inner the run without feedback would hold 0.60 of f_b M at 1e14, z = 0
    assert float(models["shock to 2"].gas_share(14, 0.0, 5.0, planck, within=1.0)) == pytest.approx(0.914, abs=0.003)


def test_mass_of_the_wide_textbook_model(planck):
    wide = load_model("textbook-modified-nfw-wide")
    c = np.array([8.0, 6.0, 5.0])
    inner, outer = (wide.gas_share(12.0, Z, c, planck, within=x) for x in (1.0, 2.0))
    assert inner == pytest.approx(0.75, rel=1e-12)
    assert inner / outer == pytest.approx([0.4694, 0.4192, 0.3870], abs=6e-5)


def test_milky_way_like_halo_beyond_the_sun(planck, tmp_path):
    """1.5e12, c = 7.7, from 8 kpc out to 200 kpc towards the pole: 61.94 pc cm-3, by `dm_rest_between`.

    200 kpc is 0.828 r200c, so the line ends inside the halo.
    """
    model = load_model("textbook-modified-nfw")
    log_m, r200c = np.log10(1.5e12), float(planck.r200c_kpc(np.log10(1.5e12), 0.0))
    sun, end = 8 / r200c, np.sqrt(200**2 - 8**2) / r200c
    got = projection(model, planck).dm_rest_between(sun, log_m, 0.0, 7.7, r200c, 0.0, end)
    assert float(got) == pytest.approx(61.94, rel=2e-4)
