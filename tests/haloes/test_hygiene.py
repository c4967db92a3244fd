"""Copies within one list, pieces of large galaxies, stars."""

from __future__ import annotations

import numpy as np
import pytest
from astropy.table import Table

from haloledger.catalogs import read_galaxies
from haloledger.errors import InputError
from haloledger.haloes.build import halo_list

KMS = 1 / 299792.458


def test_copies_within_a_list_count_once(make_galaxies, planck):
    # 1 arcsec apart; 8 arcsec at z 0.02, which are 3.3 kpc; and the same two with redshifts that differ
    galaxies = make_galaxies(
        "g",
        8,
        ra_deg=150 + np.array([0.0, 1.0, 3600.0, 3608.0, 7200.0, 7201.0, 10800.0, 10808.0]) / 3600,
        dec_deg=0.0,
        z=np.array([0.1, 0.1002, 0.02, 0.0205, 0.1, 0.3, 0.02, 0.0232]),
        z_err=np.array([1e-4, 5e-4] + [1e-4] * 6),
        log_mstar=9.5 + np.array([0, 0, 0, 0, 0, 1.1, 0, 0]),
    )
    haloes = halo_list([galaxies], [], planck)
    assert haloes.source_rows.tolist() == [
        "g:000000;g:000001",
        "g:000002;g:000003",
        "g:000004",
        "g:000005",
        "g:000006",
        "g:000007",
    ]
    assert "listed again as g:000001" in haloes.note[0]
    assert "Galaxy rows listed twice in g: 2." in haloes.notes


def test_the_sharper_redshift_stays(make_galaxies, planck):
    galaxies = make_galaxies("g", 2, z=np.array([0.11, 0.1]), z_err=np.array([0.03, 1e-4]), log_mstar=10.0)
    haloes = halo_list([galaxies], [], planck)
    assert haloes.id.tolist() == ["g:000001"]
    assert haloes.z[0] == 0.1


def test_dwarf_beside_a_giant_is_not_its_copy(make_galaxies, planck):
    galaxies = make_galaxies("g", 2, ra_deg=150 + np.array([0.0, 1.0]) / 3600, log_mstar=np.array([11.0, 9.0]))
    assert not any("listed twice" in n for n in halo_list([galaxies], [], planck).notes)


def test_pieces_of_a_galaxy_of_ten_arcminutes_become_one_halo(make_galaxies, planck):
    rng, n = np.random.default_rng(5), 40
    angle, radius = rng.uniform(0, 2 * np.pi, n), 290 * np.sqrt(rng.uniform(0, 1, n)) / 3600
    big = make_galaxies(
        "big", 1, z=0.0035, z_err=1e-4, log_mstar=10.8, distance_mpc=15.0, radius_arcsec=np.array([300.0])
    )
    photo_z = rng.uniform(0.02, 0.2, n)
    # knots of 1e7 to 1e9 Msun at 15 Mpc, placed by their photometric redshifts far behind
    light = rng.uniform(7, 9, n) + 2 * np.log10(planck.luminosity_distance_mpc(photo_z) / 15.0)
    knots = make_galaxies(
        "knots",
        n,
        ra_deg=150 + radius * np.cos(angle),
        dec_deg=2 + radius * np.sin(angle),
        z=photo_z,
        z_err=0.03,
        photometric=True,
        log_mstar=light,
    )
    haloes = halo_list([knots, big], [], planck)
    assert haloes.id.tolist() == ["big:000000"]
    assert haloes.source_rows[0].count("knots:") == n
    assert "holds the pieces knots:" in haloes.note[0]
    assert haloes.optical_radius_kpc[0] == pytest.approx(np.radians(300 / 3600) * 15e3, rel=0.01)
    assert f"Pieces of larger galaxies, not counted: {n}." in haloes.notes
    # a galaxy seen through it with a redshift of its own stays, and so does one beside it
    through = make_galaxies("far", 2, ra_deg=np.array([150.02, 150.1]), z=0.1, z_err=1e-4, log_mstar=10.0)
    assert len(halo_list([knots, big, through], [], planck)) == 3


def test_stars_are_left_out_with_a_note():
    table = Table(
        {
            "id": ["a", "b"],
            "ra": [10.0, 20.0],
            "dec": [0.0, 0.0],
            "z": [0.1, 0.1],
            "log_mstar": [10.0, 10.0],
            "object_class": ["Star", "galaxy"],
        }
    )
    galaxies = read_galaxies(table)
    assert galaxies.row.tolist() == ["galaxies:b"]
    assert any("1 rows left out: stars by 'object_class'" in n for n in galaxies.notes)
    assert galaxies.refused == ()
    with pytest.raises(InputError, match="every row is a 'star' in 'object_class'"):
        read_galaxies(table[:1])
