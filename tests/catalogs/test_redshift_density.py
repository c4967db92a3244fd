"""p(z) in galaxy tables: quantiles and grids, brought to one form; rows that are no probabilities are refused."""

from __future__ import annotations

import numpy as np
import pytest
from astropy.table import Table
from scipy.special import ndtr

from haloledger.catalogs import read_galaxies
from haloledger.catalogs.redshift_density import SCORES


def table(n: int, **columns) -> Table:
    whole = {"id": [f"g{i}" for i in range(n)], "ra": np.arange(n) * 10.0 + 1, "dec": np.zeros(n), "z": np.full(n, 0.3)}
    return Table(whole | {"log_mstar": np.full(n, 10.0)} | columns)


def test_quantiles_of_a_normal_come_back():
    columns = {
        f"z_p{p}": [0.3 + 0.03 * u] for p, u in (("2.5", -1.959964), ("16", -0.994458), ("50", 0), ("84", 0.994458))
    }
    galaxies = read_galaxies(table(1, **columns))
    # beyond the last quantile the slope goes on
    assert galaxies.z_scores[0] == pytest.approx(0.3 + 0.03 * SCORES, abs=1e-5)
    assert galaxies.photometric.tolist() == [True]
    assert any("p(z) of 1 rows is used" in n for n in galaxies.notes)


def test_grid_of_two_peaks():
    z = np.round(np.arange(0.01, 1.2, 0.01), 2)
    p = 0.7 * np.exp(-0.5 * ((z - 0.3) / 0.03) ** 2) + 0.3 * np.exp(-0.5 * ((z - 0.8) / 0.05) ** 2)
    p /= np.trapezoid(p, z)
    galaxies = read_galaxies(table(1, **{f"pz_{a:g}": [b] for a, b in zip(z, p, strict=True)}))
    assert np.all(np.diff(galaxies.z_scores[0]) > 0)
    share = np.trapezoid(p[z <= 0.55], z[z <= 0.55])
    assert ndtr(np.interp(0.55, galaxies.z_scores[0], SCORES)) == pytest.approx(share, abs=0.02)


def test_rows_that_are_no_probabilities_are_refused_and_the_others_go_on():
    z = [0.1, 0.2, 0.3, 0.4]
    density = {0.1: [0.0, 0.0, 0.0, np.nan], 0.2: [5.0, 2.0, 6.0, np.nan], 0.3: [5.0, 2.0, 5.0, np.nan]}
    density[0.4] = [0.0, 0.0, -1.0, np.nan]
    galaxies = read_galaxies(table(4, **{f"pz_{a:g}": density[a] for a in z}))
    assert galaxies.row.tolist() == ["galaxies:g0", "galaxies:g3"]
    assert [r.name for r in galaxies.refused] == ["g1", "g2"]
    assert "integrates to 0.4" in galaxies.refused[0].found
    assert "sum over the grid times its step is 1" in galaxies.refused[0].advice
    assert "a density of -1" in galaxies.refused[1].found
    assert np.isfinite(galaxies.z_scores[:, 0]).tolist() == [True, False]
    assert galaxies.photometric.tolist() == [True, False]


def test_quantiles_that_fall_are_refused():
    galaxies = read_galaxies(table(2, z_p16=[0.2, 0.3], z_p50=[0.3, 0.25], z_p84=[0.4, 0.4]))
    assert galaxies.row.tolist() == ["galaxies:g0"]
    assert galaxies.refused[0].found == "quantiles 0.3, 0.25, 0.4"
    assert "rise from z_p16 to z_p84" in galaxies.refused[0].advice


def test_redshift_may_be_missing_where_its_density_is_given():
    columns = table(1, z_p16=[0.2], z_p50=[0.3], z_p84=[0.4])
    columns.remove_column("z")
    galaxies = read_galaxies(columns)
    assert galaxies.z[0] == pytest.approx(0.3, abs=1e-6)
    assert galaxies.z_err[0] == pytest.approx(0.1, rel=0.01)


def test_spectroscopic_rows_ignore_their_density():
    galaxies = read_galaxies(table(1, z_p16=[0.2], z_p50=[0.3], z_p84=[0.4], z_kind=["spec"]))
    assert not galaxies.photometric[0]
    assert np.isnan(galaxies.z_scores).all()
