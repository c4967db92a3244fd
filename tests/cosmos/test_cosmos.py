"""Distances, mean DM, its scatter, mass definitions, concentration and mass function against outside numbers.

Values marked 'sheet' were computed with astropy 8.0, colossus 1.4, pyccl 3.3 and mpmath 1.3 for Planck18.
"""

import itertools

import numpy as np
import pytest
from astropy import constants as const
from astropy import units as u
from scipy.integrate import quad

from haloledger.cosmos import scatter
from haloledger.cosmos.background import cosmology
from haloledger.cosmos.concentration import concentration
from haloledger.cosmos.electrons import CM3_PER_MSUN_KPC3, PER_PROTON
from haloledger.cosmos.mass_definitions import from_200c, nfw_mass_share, r500c_over_r200c, to_200c
from haloledger.cosmos.mass_function import mass_function
from haloledger.cosmos.mean_dm import dm_per_unit_integral, mean_cosmic_dm
from haloledger.errors import InputError


def test_electron_constant_is_astropys():
    exact = (1 * u.Msun / u.kpc**3 / const.m_p).to_value("cm-3")
    assert pytest.approx(exact, rel=1e-6) == CM3_PER_MSUN_KPC3
    assert PER_PROTON == 7 / 8


@pytest.mark.parametrize("z", [0.003, 0.1, 0.5, 1.0, 3.0])
def test_splines_are_astropys_distances(planck, z):
    # splines over 4,000 nodes: nothing but interpolation error, 1e-8
    exact = planck.astropy
    assert planck.angular_distance_kpc(z) == pytest.approx(exact.angular_diameter_distance(z).to_value("kpc"), rel=1e-8)
    assert planck.luminosity_distance_mpc(z) == pytest.approx(exact.luminosity_distance(z).to_value("Mpc"), rel=1e-8)
    assert planck.critical_density(z) == pytest.approx(exact.critical_density(z).to_value("Msun kpc-3"), rel=1e-8)
    assert planck.volume_element(z) == pytest.approx(
        exact.differential_comoving_volume(z).to_value("Mpc3 sr-1"), rel=1e-7
    )
    # the way back is linear between the nodes, 1e-5
    assert planck.z_at_comoving_distance(planck.comoving_distance_mpc(z)) == pytest.approx(z, rel=1e-5)


def test_r200c(planck):
    assert planck.r200c_kpc(13.0, 0.1) == pytest.approx(439.9874, rel=1e-6)  # sheet


MEAN_DM = [
    (0.01, 8.2204),
    (0.1, 84.0099),
    (0.5, 446.0338),
    (1.0, 911.9382),
    (2.0, 1781.1734),
]  # sheet, f_d = 0.84


def test_mean_dm_prefactor():
    assert dm_per_unit_integral("Planck18") == pytest.approx(976.040073, rel=1e-6)  # sheet


@pytest.mark.parametrize(("z", "expected"), MEAN_DM)
def test_mean_dm(planck, z, expected):
    assert mean_cosmic_dm(z, planck, 0.84) == pytest.approx(expected, rel=1e-5)  # the table has seven digits


def test_mean_dm_with_another_cosmology_library(planck):
    # pyccl 3.x: the same integral over its own H(z), the neutrino mass given to it; 1e-4 is the treatment of neutrinos
    ccl = pytest.importorskip("pyccl")
    other = ccl.Cosmology(
        Omega_c=planck.omega_m - planck.omega_b,  # in astropy Om0 leaves the neutrinos out
        Omega_b=planck.omega_b,
        h=planck.h,
        sigma8=planck.sigma8,
        n_s=planck.n_s,
        T_CMB=2.7255,
        m_nu=0.06,
        mass_split="single",
    )
    integral, _ = quad(lambda z: (1 + z) / ccl.h_over_h0(other, 1 / (1 + z)), 0, 1, epsrel=1e-9)
    assert mean_cosmic_dm(1.0, planck, 1.0) == pytest.approx(dm_per_unit_integral("Planck18") * integral, rel=1e-4)


def test_mean_dm_of_a_plain_universe():
    # closed flat LCDM integral without radiation, by quadrature: H0 = 70, Om = 0.3, Ob = 0.05; sheet value 1155.2317
    integral, _ = quad(lambda z: (1 + z) / np.sqrt(0.3 * (1 + z) ** 3 + 0.7), 0, 1)
    scale = (70 / cosmology().astropy.H0.value) * 0.05 / cosmology().omega_b
    assert dm_per_unit_integral("Planck18") * scale * integral == pytest.approx(1155.2317, rel=1e-6)


SCATTER = [  # sigma, C0, A, median, 16%, 84%: sheet, mpmath quadrature with 25 digits
    (0.10, 1.1044988112, 4.0435408490, 0.976289, 0.89852, 1.09167),
    (0.32, 1.8350213679, 1.4558723463, 0.844986, 0.72297, 1.12958),
    (1.00, 2.5429817952, 0.6432025815, 0.740980, 0.57625, 1.22482),
    (2.00, 0.4354678487, 0.5165071138, 0.713143, 0.51879, 1.27513),
]


@pytest.mark.parametrize(("sigma", "c0", "a", "median", "low", "high"), SCATTER)
def test_scatter_form(sigma, c0, a, median, low, high):
    assert scatter.centre(sigma) == pytest.approx(c0, rel=1e-8)
    assert scatter.norm(sigma) == pytest.approx(a, rel=1e-8)
    z = (scatter.FEEDBACK_F / sigma) ** 2
    # quantiles come from a table over ln sigma and score: 2e-5; the sheet's 16 and 84% points are those at +-1 sigma
    assert scatter.relative_dm(z, 0.0) == pytest.approx(median, rel=2e-5)
    assert scatter.relative_dm(z, -1.0) == pytest.approx(low, rel=5e-5)
    assert scatter.relative_dm(z, 1.0) == pytest.approx(high, rel=5e-5)


def test_scatter_c0_has_its_maximum_where_it_should():
    sigmas = np.linspace(0.87, 0.905, 36)
    values = [scatter.centre(s) for s in sigmas]
    assert max(values) == pytest.approx(2.56754, abs=1e-5)
    assert sigmas[int(np.argmax(values))] == pytest.approx(0.88755, abs=1e-3)


@pytest.mark.parametrize("sigma", [0.05, 0.4, 1.5])
def test_scatter_norm_and_mean_by_quadrature(sigma):
    c0, a = scatter.centre(sigma), scatter.norm(sigma)

    def density(d):
        return a * d**-3 * np.exp(-((d**-3 - c0) ** 2) / (18 * sigma**2))

    edges = [0.2, 0.6, 1.0, 1.5, 4.0, np.inf]
    total = sum(quad(density, lo, hi, epsrel=1e-10)[0] for lo, hi in itertools.pairwise(edges))
    mean = sum(quad(lambda d: d * density(d), lo, hi, epsrel=1e-10)[0] for lo, hi in itertools.pairwise(edges))
    # below sigma = 0.05 a limit takes over; at 0.05 itself the closed form holds
    assert total == pytest.approx(1, abs=1e-7)
    assert mean == pytest.approx(1, abs=1e-7)


DEFINITIONS = [  # c200c, z, M500c, M200m, Mvir over M200c: sheet, NFW with astropy's densities
    (10, 0.0, 0.796358, 1.271301, 1.153673),
    (8, 0.5, 0.775473, 1.129947, 1.093053),
    (5, 0.5, 0.722114, 1.165701, 1.118364),
    (4, 0.0, 0.691916, 1.444487, 1.248029),
]


@pytest.mark.parametrize(("c", "z", "m500c", "m200m", "mvir"), DEFINITIONS)
def test_mass_definitions(planck, c, z, m500c, m200m, mvir):
    assert 10 ** from_200c(0.0, "500c", z, c, planck) == pytest.approx(m500c, rel=2e-5)
    # colossus' neutrinos are massless: its mean density, and with it the ratio, moves by up to 6e-4 at z = 0.5
    assert 10 ** from_200c(0.0, "200m", z, c, planck) == pytest.approx(m200m, rel=1e-3)
    assert 10 ** from_200c(0.0, "vir", z, c, planck) == pytest.approx(mvir, rel=1e-3)
    assert r500c_over_r200c(c) == pytest.approx(np.cbrt(m500c * 0.4), rel=1e-5)


@pytest.mark.parametrize("mass_def", ["500c", "200m", "180m", "vir"])
def test_mass_definition_there_and_back(planck, mass_def):
    log_m = np.linspace(10.5, 15.5, 11)
    c = concentration("dutton2014", log_m, 0.3, planck) * 10**0.2
    there = from_200c(log_m, mass_def, 0.3, c, planck)
    back = to_200c(there, mass_def, 0.3, "dutton2014", planck, 0.2)
    assert back == pytest.approx(log_m, abs=2e-5)  # five fixed-point steps


def test_nfw_500c_share_solves_its_definition():
    x = r500c_over_r200c(6.0)
    # mean density inside r500c is 2.5 times that inside r200c; 1e-5 is the table's
    assert nfw_mass_share(x, 6.0) / x**3 == pytest.approx(2.5, rel=1e-4)


CONCENTRATION = [  # relation, log M, z, c: sheet, colossus
    ("dutton2014", 13, 0.5, 5.5182),
    ("dutton2014", 11, 1.0, 6.5382),
    ("duffy2008", 13, 0.5, 4.2600),
    ("diemer2019", 12, 0.0, 8.3247),
]


@pytest.mark.parametrize(("relation", "log_m", "z", "expected"), CONCENTRATION)
def test_concentration(planck, relation, log_m, z, expected):
    assert concentration(relation, log_m, z, planck) == pytest.approx(expected, rel=1e-4)


def test_concentration_closed_form_between_the_nodes(planck):
    # Dutton & Maccio 2014, table 3 (200c): log c = a + b log(M / 1e12 h-1 Msun), a closed form of our own
    log_m, z = np.array([11.234, 12.777, 14.111]), 0.337
    a = 0.520 + 0.385 * np.exp(-0.617 * z**1.21)
    b = -0.101 + 0.026 * z
    closed = 10 ** (a + b * (log_m + np.log10(planck.h) - 12))
    assert concentration("dutton2014", log_m, z, planck) == pytest.approx(closed, rel=1e-4)


def test_concentration_with_another_library(planck):
    ccl = pytest.importorskip("pyccl")
    other = ccl.CosmologyVanillaLCDM()
    duffy = ccl.halos.ConcentrationDuffy08(mass_def=ccl.halos.MassDef200c)
    # its h is 0.67, ours 0.6766: (0.67 / 0.6766)^0.084 = 8e-4
    assert concentration("duffy2008", 13.0, 0.5, planck) == pytest.approx(duffy(other, 1e13, 1 / 1.5), rel=1.5e-3)


def test_unknown_concentration_and_definition_say_what_to_write(planck):
    with pytest.raises(InputError, match="Write one of dutton2014"):
        concentration("dutton", 12.0, 0.0, planck)
    with pytest.raises(InputError, match="Write one of 200c, 500c"):
        from_200c(12.0, "200x", 0.0, 5.0, planck)


def test_another_cosmology_brings_its_own_spectrum():
    # WMAP9 as astropy states it: sigma8 = 0.82, n_s = 0.9608 (Hinshaw et al. 2013, ApJS 208, 19)
    wmap = cosmology("WMAP9")
    assert (wmap.sigma8, wmap.n_s) == pytest.approx((0.82, 0.9608))
    assert mass_function(14.0, 0.0, wmap) != pytest.approx(mass_function(14.0, 0.0, cosmology("Planck18")), rel=0.02)


def test_unknown_cosmology_lists_names():
    with pytest.raises(InputError, match="Planck18"):
        cosmology("Planck99")


HALOES_PER_DEX = [  # z, log M, dn/dlog10M of M200c: sheet, colossus
    (0.0, 12, 3.66685e-3),
    (0.5, 13, 4.06198e-4),
    (1.0, 14, 9.72163e-6),
]


@pytest.mark.parametrize(("z", "log_m", "expected"), HALOES_PER_DEX)
def test_mass_function(planck, z, log_m, expected):
    assert mass_function(log_m, z, planck) == pytest.approx(expected, rel=1e-4)


@pytest.mark.parametrize(
    ("log_m", "tolerance"), [(11.0, 0.015), (12.0, 0.015), (13.0, 0.015), (14.0, 0.025), (15.0, 0.05)]
)
def test_mass_function_with_another_library(planck, log_m, tolerance):
    # pyccl 3.x, Tinker 2008 at 200c; libraries differ in the overdensity interpolation, most at the steep end
    ccl = pytest.importorskip("pyccl")
    other = ccl.Cosmology(
        Omega_c=planck.omega_m - planck.omega_b,
        Omega_b=planck.omega_b,
        h=planck.h,
        sigma8=planck.sigma8,
        n_s=planck.n_s,
        transfer_function="eisenstein_hu",
    )
    tinker = ccl.halos.MassFuncTinker08(mass_def=ccl.halos.MassDef200c)
    for z in (0.0, 0.5):
        expected = tinker(other, 10**log_m, 1 / (1 + z))
        assert mass_function(log_m, z, planck) == pytest.approx(expected, rel=tolerance)


def test_matter_share_in_haloes(planck):
    # share of matter in haloes above 1e12 Msun at z = 0.3: 0.2375 (sheet, colossus); 1% for the trapezium steps
    log_m = np.linspace(12, 16, 801)
    density = np.trapezoid(10**log_m * mass_function(log_m, 0.3, planck), log_m)
    mean = planck.omega_m * planck.critical_density(0.0) * 1e9
    assert density / mean == pytest.approx(0.2375, rel=0.01)
