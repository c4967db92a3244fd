"""The audit on a real galaxy table that every machine can have: OpenNGC (CC-BY-SA-4.0) from the package pyongc.

Two invented bursts pass M31 and NGC 4889 (the brightest galaxy of Coma).
"""

import numpy as np
import pytest
from astropy.table import Table

from haloledger.audit import audit


@pytest.fixture(scope="module")
def open_ngc():
    data = pytest.importorskip("pyongc.data", reason="the package with OpenNGC (extra 'test') is not installed")
    frame = data.galaxies()
    frame = frame[frame["kmag"].notna()].reset_index()
    table = Table(
        {
            "id": list(frame["name"]),
            "ra": np.degrees(frame["ra"].to_numpy(float)) % 360,
            "dec": np.degrees(frame["dec"].to_numpy(float)),
            "z": frame["redshift"].to_numpy(float),
            "mag_ks": frame["kmag"].to_numpy(float),
            "distance_mpc": np.where(frame["name"] == "NGC0224", 0.76, np.nan),  # M31, Cepheids; common practice
        }
    )
    return table[np.isfinite(table["z"]) & ((table["z"] > 0) | np.isfinite(table["distance_mpc"]))]


@pytest.fixture(scope="module")
def tables(open_ngc):
    bursts = Table(
        {
            "burst": ["behind M31", "behind NGC 4889"],
            "ra": [10.685 + 4.0, 195.034],
            "dec": [41.269, 27.977 + 0.03],
            "z": [0.2, 0.3],
            "dm": [400.0, 600.0],
        }
    )
    return audit(bursts, galaxies=[open_ngc], models=["textbook-modified-nfw", "blended"], draws=300).to_pandas()


def test_m31_is_crossed_where_geometry_says(tables):
    _, entries = tables
    mine = entries[(entries.burst == "behind M31") & (entries.model == "blended")].set_index("halo")
    andromeda = mine[mine.index.str.contains("NGC0224")].iloc[0]
    # 4 deg of right ascension at dec 41.27 are 3.006 deg: 0.76 Mpc x sin = 39.9 kpc
    assert andromeda.sep_arcmin / 60 == pytest.approx(3.006, abs=0.005)
    assert andromeda.impact_kpc_p50 == pytest.approx(39.9, rel=0.05)
    assert andromeda.z_kind == "distance"
    # Kahinga et al. 2026 (arXiv:2602.23749) find 5.9 to 59.6 within 151 kpc; a wide range on purpose
    assert 3 < andromeda.dm_p50 < 150
    assert "Ks" in andromeda.note


def test_coma_galaxy_is_crossed(tables):
    _, entries = tables
    mine = entries[(entries.burst == "behind NGC 4889") & (entries.model == "blended")]
    row = mine[mine.halo.fillna("").str.contains("NGC4889")].iloc[0]
    assert row.p_crossed > 0.95
    assert row.log_m200c_p50 > 12.5


def test_every_interval_is_in_order(tables):
    sightlines, entries = tables
    for table, terms in ((sightlines, ["dm_foreground", "dm_diffuse", "dm_after_all"]), (entries, ["dm"])):
        for term in terms:
            rows = table.dropna(subset=[f"{term}_p16"])
            assert (rows[f"{term}_p16"] <= rows[f"{term}_p50"]).all()
            assert (rows[f"{term}_p50"] <= rows[f"{term}_p84"]).all()
