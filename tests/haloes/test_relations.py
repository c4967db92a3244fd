"""Every relation file against published numbers."""

from __future__ import annotations

import numpy as np
import pytest
from astropy.cosmology import FlatLambdaCDM

from haloledger.cosmos.background import Cosmos
from haloledger.errors import InputError
from haloledger.haloes.masses import read_backwards
from haloledger.haloes.posterior import mean_of_200c
from haloledger.haloes.relations import GIVES, STELLAR_TO_HALO, load_relation, relation_names
from haloledger.haloes.relations.forms import FORMS, five_parameter

# log M* at log M (each relation's own definition), worked out from the parameters of the papers by separate code
STELLAR = {
    "moster2013": {
        0.0: [9.0061, 10.0016, 10.5350, 10.7863, 10.9884, 11.3810],
        0.5: [8.6355, 9.6399, 10.4313, 10.8148, 10.9980, 11.2864],
        1.0: [8.5107, 9.4690, 10.3093, 10.8071, 11.0138, 11.2575],
    },
    "behroozi2013": {
        0.0: [8.6698, 9.7096, 10.4281, 10.7648, 10.9537, 11.2044],
        0.5: [8.6244, 9.6644, 10.4620, 10.8185, 10.9978, 11.2120],
        1.0: [8.4970, 9.4819, 10.4419, 10.8628, 11.0327, 11.1874],
    },
    "behroozi2019": {
        0.0: [8.5596, 9.5245, 10.3475, 10.7920, 11.0551, 11.5466],
        0.5: [8.3524, 9.4934, 10.4096, 10.7019, 10.9021, 11.4267],
        1.0: [8.1881, 9.2960, 10.3329, 10.7399, 10.8737, 11.2933],
    },
    "kravtsov2018": {0.0: [8.8709, 10.0056, 10.6506, 11.0224, 11.3091, 11.7993]},
}
LOG_M = np.array([11.0, 11.5, 12.0, 12.5, 13.0, 14.0])


@pytest.mark.parametrize(("name", "z"), [(n, z) for n, table in STELLAR.items() for z in table])
def test_stellar_mass_at_halo_mass(name, z, planck):
    # the table is printed to four digits
    assert load_relation(name).mean(LOG_M, z, planck) == pytest.approx(STELLAR[name][z], abs=1e-4)


def test_every_stellar_relation_has_its_numbers_here():
    assert set(STELLAR) == set(STELLAR_TO_HALO)


@pytest.mark.parametrize("name", relation_names())
def test_file_is_whole_and_rises(name, planck):
    relation = load_relation(name)
    assert relation.name == name
    assert relation.gives in GIVES
    assert relation.form in FORMS
    assert relation.source
    assert relation.scatter_dex[0] > 0
    x = np.linspace(11, 15, 81) if relation.needs_prior else np.linspace(1, 2.5, 81)
    for z in np.linspace(*np.clip(relation.z_range, 0, 1), 3):
        assert np.all(np.diff(relation.mean(x, z, planck)) > 0)


@pytest.mark.parametrize("name", [n for n in relation_names() if load_relation(n).needs_prior])
def test_read_backwards_comes_home(name, planck):
    relation, mass = load_relation(name), np.linspace(11.2, 15.2, 9)
    back = read_backwards(relation, relation.mean(mass, 0.2, planck), 0.2, planck)
    assert back == pytest.approx(mass, abs=1e-8)  # bisection of 9 dex, 34 times


def test_only_richness_gives_the_mass():
    assert [n for n in relation_names() if not load_relation(n).needs_prior] == ["mcclintock2019"]


def test_velocity_dispersions(planck):
    # sigma [km/s] at 1e13, 1e14, 1e15 Msun, z 0.1, from the published fits; printed to 0.1
    mass = np.array([13.0, 14.0, 15.0])
    evrard, munari = (10 ** load_relation(n).mean(mass, 0.1, planck) for n in ("evrard2008", "munari2013"))
    assert evrard == pytest.approx([205.4, 445.26, 965.4], abs=0.05)
    assert munari == pytest.approx([194.4, 449.5, 1039.4], abs=0.05)


@pytest.mark.parametrize(
    ("richness", "z", "m200m"), [(20, 0.2, 1.2469e14), (40, 0.35, 3.081e14), (100, 0.5, 1.0341e15)]
)
def test_mass_at_richness(richness, z, m200m, planck):
    got = 10 ** load_relation("mcclintock2019").mean(np.log10(richness), z, planck)
    assert got == pytest.approx(m200m, rel=1e-4)


def test_luminosities_give_back_catalogue_masses(shared_data):
    # Piffaretti et al. 2011: M500 was made from L500 with this relation, H0 = 70, Om = 0.3
    from astropy.table import Table

    table = Table.read(shared_data / "clusters" / "mcxc.fits")
    flat = Cosmos("flat70", FlatLambdaCDM(H0=70, Om0=0.3, Ob0=0.05))
    z, luminosity, mass = (np.asarray(table[c], dtype=float) for c in ("z", "L500", "M500"))
    relation = load_relation("pratt2009")
    back = 10 ** (read_backwards(relation, np.log10(luminosity), z, flat) - 14) / mass
    assert np.median(back) == pytest.approx(1.0, abs=1e-3)  # the catalogue rounds its luminosities
    assert np.mean(np.abs(back - 1) < 0.01) > 0.98  # a few entries come from elsewhere


def test_luminosity_of_one_cluster():
    # MCXC J1230.7+1220: z 0.0036, M500 1.2092e14, L500 0.425069e44 erg/s (H0 = 70, Om = 0.3)
    flat = Cosmos("flat70", FlatLambdaCDM(H0=70, Om0=0.3, Ob0=0.05))
    log_l = load_relation("pratt2009").mean(np.log10(1.2092e14), 0.0036, flat)
    assert 10**log_l == pytest.approx(0.425069, rel=1e-3)  # the mass is printed to 1e-4, the constant to 1e-3


def test_kravtsov_in_other_definitions(planck):
    # the same paper's 500c column, with scatter: the relation carried to 500c by an NFW profile must follow it roughly
    p = {
        "log_m1": [11.28, 0, 0, 0],
        "log_eps": [-1.556, 0, 0, 0],
        "alpha": [-1.835, 0, 0, 0],
        "delta": [4.437, 0, 0, 0],
        "gamma": [0.567, 0, 0, 0],
    }
    at_500 = five_parameter(np.array([11.0, 12.0, 13.0, 14.0]), 0.0, p, planck)
    assert at_500 == pytest.approx([9.0496, 10.7326, 11.3821, 11.8891], abs=1e-4)


def test_virial_relation_is_read_at_the_virial_mass(planck):
    # at z = 0 a halo of M200c = 1e13 has 18 to 21 per cent more mass inside its virial radius
    relation = load_relation("behroozi2019")
    own = read_backwards(relation, mean_of_200c(relation, 13.0, 0.0, planck), 0.0, planck)
    assert 0.07 < own - 13.0 < 0.085


def test_unknown_relation_lists_the_names():
    with pytest.raises(InputError, match=r"'moster2012' is not known.*moster2013"):
        load_relation("moster2012")
