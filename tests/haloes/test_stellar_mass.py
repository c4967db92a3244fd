"""Stellar masses from light."""

from __future__ import annotations

import numpy as np
import pytest

from haloledger.haloes import k_corrections
from haloledger.haloes.distances import point_luminosity_distance_mpc
from haloledger.haloes.stellar_mass import mass_from_gi, mass_from_ks, mass_from_w1, stellar_masses


def masses(galaxies, planck):
    return stellar_masses(galaxies, point_luminosity_distance_mpc(galaxies, planck), planck)


def test_published_values():
    # M/L_Ks = 0.6 with the Sun at 3.27 (Willmer 2018)
    assert mass_from_ks(-24.0) == pytest.approx(10.686, abs=5e-4)
    # Taylor et al. 2011, eq. 8
    assert mass_from_gi(1.0, -22.0) == pytest.approx(10.65, abs=1e-9)
    # Jarrett et al. 2023: polynomial at log L_W1 = 10, 10.5, 11 with the Sun at 3.24
    light = np.array([10.0, 10.5, 11.0])
    assert mass_from_w1(3.24 - 2.5 * light) == pytest.approx([9.4667, 9.9830, 10.5311], abs=1e-4)


def test_light_beyond_the_polynomial_keeps_its_ratio():
    faint = 3.24 - 2.5 * np.array([6.5, 5.5])
    assert np.diff(mass_from_w1(faint)) == pytest.approx(-1.0)


def test_order_of_calibrations(make_galaxies, planck):
    mags = {"ks": [12.0, 12.0, np.nan, np.nan], "w1": [12.5, 12.5, 12.5, np.nan]}
    mags |= {"g": [15.0] * 4, "i": [14.0] * 4}
    galaxies = make_galaxies(
        "g",
        4,
        z=0.03,
        mag={k: np.array(v) for k, v in mags.items()},
        log_mstar=np.array([10.1, np.nan, np.nan, np.nan]),
    )
    found = masses(galaxies, planck)
    for note, word in zip(found.note, ["as listed", "Ks", "W1", "g - i"], strict=True):
        assert word in note
    assert found.log_mstar[0] == 10.1
    assert np.all((found.err >= 0.15) & (found.err <= 0.25))


def test_k_correction_only_in_the_observed_frame(make_galaxies, planck):
    columns = {"z": 0.2, "mag": {"ks": np.array([14.0])}}
    observed, rest = (masses(make_galaxies("g", 1, mag_rest=r, **columns), planck).log_mstar for r in (False, True))
    # K = -6 log10(1+z): the galaxy is fainter at rest
    assert observed - rest == pytest.approx(-0.4 * 6 * np.log10(1.2))


def test_ab_magnitudes_are_brought_to_vega(make_galaxies, planck):
    vega = make_galaxies("g", 1, mag={"ks": np.array([12.0])}, mag_system={"ks": "Vega"})
    ab = make_galaxies("g", 1, mag={"ks": np.array([13.81])}, mag_system={"ks": "AB"})
    assert masses(ab, planck).log_mstar == pytest.approx(masses(vega, planck).log_mstar)


def test_near_galaxies_use_their_distance(make_galaxies, planck):
    # M31: Ks = 0.984 (2MASS large galaxy atlas), 0.76 Mpc, moving towards us
    m31 = make_galaxies("g", 1, z=-0.001, distance_mpc=0.76, mag={"ks": np.array([0.984])})
    absolute = 0.984 - 5 * np.log10(0.76) - 25
    assert masses(m31, planck).log_mstar == pytest.approx(mass_from_ks(absolute))
    assert 10.3 < masses(m31, planck).log_mstar[0] < 11.1


def test_colours_without_correction_stop_at_low_redshift(make_galaxies, planck, monkeypatch):
    monkeypatch.setattr(k_corrections, "available", lambda: False)
    mags = {"g": np.array([18.0, 18.0]), "i": np.array([17.0, 17.0])}
    z = np.array([0.05, 0.3])
    assert np.isfinite(masses(make_galaxies("g", 2, z=z, mag=mags), planck).log_mstar).tolist() == [True, False]
    assert np.all(np.isfinite(masses(make_galaxies("g", 2, z=z, mag=mags, mag_rest=True), planck).log_mstar))


def test_reach_of_a_calibration_is_said(make_galaxies, planck):
    note = masses(make_galaxies("g", 1, z=0.4, mag={"w1": np.array([15.0])}), planck).note[0]
    assert "beyond its z 0.15" in note


UGRIZ = {"u": 19.8, "g": 18.1, "r": 17.2, "i": 16.8, "z": 16.5}


def test_published_corrections_of_the_library():
    pytest.importorskip("kcorrect", reason="the extra `photometry` is not installed")
    k = k_corrections.k_corrections({b: np.array([m]) for b, m in UGRIZ.items()}, np.array([0.1]))
    # kcorrect 5.1.9, 2 per cent errors; the library's finer redshift table differs by less than 0.001
    for band, expected in zip("ugriz", (0.3747, 0.2901, 0.1231, 0.0572, 0.0431), strict=True):
        assert k[band][0] == pytest.approx(expected, abs=1e-3)


def test_colours_are_corrected_where_the_library_is(make_galaxies, planck):
    pytest.importorskip("kcorrect", reason="the extra `photometry` is not installed")
    mag = {b: np.full(3, m) for b, m in UGRIZ.items() if b != "u"}
    mag["i"] = np.array([16.8, np.nan, 16.8])
    galaxies = make_galaxies("g", 3, z=np.array([0.1, 0.1, 0.9]), mag=mag)
    found = masses(galaxies, planck)
    # beyond 0.65, and without i, there is no mass
    assert np.isfinite(found.log_mstar).tolist() == [True, False, False]
    assert "K-corrected by kcorrect" in found.note[0]
    modulus = 5 * np.log10(planck.luminosity_distance_mpc(0.1)) + 25
    # with u as well K is 0.2901 and 0.0572; four bands give them to 0.04
    expected = mass_from_gi(18.1 - 16.8 - 0.2901 + 0.0572, 16.8 - 0.0572 - modulus)
    assert found.log_mstar[0] == pytest.approx(expected, abs=0.05)
    uncorrected = mass_from_gi(18.1 - 16.8, 16.8 - modulus)
    # 0.7 x (0.2901 - 0.0572) - 0.4 x 0.0572
    assert uncorrected - found.log_mstar[0] == pytest.approx(0.140, abs=0.05)
