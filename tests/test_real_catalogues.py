"""The audit on published catalogues: bursts of an open table through five of them.

Skipped where the folder of published catalogues is absent; tests/test_open_catalogue.py proves the same path anywhere.
"""

import numpy as np
import pytest

from haloledger.audit import audit

MODELS = ["textbook-modified-nfw", "blended", "gnfw-agn-feedback"]
VIRGO = "kourkchi-tully:500041220"
"""The Virgo row of Kourkchi & Tully 2017 (ApJ 843, 16): 4.06e14 Msun at 15.8 Mpc."""
THROUGH_VIRGO = ("FRB20240304B", "FRB20230907D")


@pytest.fixture(scope="module")
def catalogues(shared_data):
    return {
        "galaxies": [f"2mpp:{shared_data}/galaxies/2mpp.csv.gz", f"50mgc:{shared_data}/galaxies/50mgc.fits"],
        "groups": [
            f"kourkchi-tully:{shared_data}/groups/kourkchi_tully_2017.txt",
            f"mcxc:{shared_data}/clusters/mcxc.fits",
            f"redmapper-sdss:{shared_data}/clusters/redmapper_sdss.csv.gz",
        ],
    }


@pytest.fixture(scope="module")
def whole(shared_data, catalogues):
    bursts = str(shared_data / "bursts" / "localised_part.csv")
    return audit(bursts, **catalogues, models=MODELS, draws=200, keep_draws=True)


@pytest.fixture(scope="module")
def tables(whole):
    return whole.to_pandas()


def test_every_burst_has_a_ledger_for_every_model(tables):
    sightlines, _ = tables
    assert len(sightlines) == 73 * 3
    assert sightlines[sightlines.model == "blended"].z.notna().sum() == 59


@pytest.mark.parametrize("burst", THROUGH_VIRGO)
@pytest.mark.parametrize("model", MODELS)
def test_virgo_is_in_the_ledger_once(tables, burst, model):
    _, entries = tables
    mine = entries[(entries.burst == burst) & (entries.model == model)]
    holds = mine.source_rows.fillna("").str.split(";").apply(lambda rows: VIRGO in rows)
    assert holds.sum() == 1
    # nothing else as heavy stands within a degree of M87 (187.706, +12.391) at Virgo's velocity
    near = (mine.ra - 187.706).abs().lt(1) & (mine.dec - 12.391).abs().lt(1) & mine.z.lt(0.006)
    assert mine[near & mine.log_m200c_p50.gt(13.5)].shape[0] <= 1


def test_virgo_has_one_mass_in_both_ledgers_of_every_draw(whole, tables):
    _, entries = tables
    name = entries[entries.source_rows.fillna("").str.contains(VIRGO)].halo.iloc[0]
    draws = whole.entry_draws[whole.entry_draws.halo == name].set_index(["burst", "model"])
    for model in MODELS:
        first, second = (draws.loc[(burst, model)].log_m200c for burst in THROUGH_VIRGO)
        assert np.array_equal(first, second)


def test_shuffled_and_split_bursts_give_the_same_bits(whole, catalogues, shared_data):
    from astropy.table import Table

    table = Table.read(shared_data / "bursts" / "localised_part.csv")
    order = np.random.default_rng(3).permutation(len(table))
    sightlines, entries = whole.to_pandas()
    for part in (table[order[:9]], table[order[9:14]]):
        other_sightlines, other_entries = audit(part, **catalogues, models=MODELS, draws=200).to_pandas()
        for burst in part["name"]:
            mine, theirs = (
                t[t.burst == burst].drop(columns="note").reset_index(drop=True) for t in (sightlines, other_sightlines)
            )
            assert mine.equals(theirs)
            mine, theirs = (t[t.burst == burst].reset_index(drop=True) for t in (entries, other_entries))
            assert mine.equals(theirs)


def test_poor_localisations_carry_wide_intervals(tables, catalogues, shared_data):
    from astropy.table import Table

    table = Table.read(shared_data / "bursts" / "localised_part.csv")
    poor = table[np.ma.filled(table["pos_major"], 0) > 10].filled(np.nan)
    exact = poor["name", "ra", "dec", "z", "dm"]
    _, without = audit(exact, **catalogues, models=["blended"], draws=200).to_pandas()
    _, entries = tables
    keys = ["burst", "halo"]
    both = entries[entries.model == "blended"].merge(without, on=keys, suffixes=("", "_exact"))
    both = both[both.halo != "shared"]
    width, width_exact = (both[f"impact_kpc_p84{s}"] - both[f"impact_kpc_p16{s}"] for s in ("", "_exact"))
    # the same universes, so only the ellipse differs: never narrower by more than the noise of 200 draws
    assert (width > 0.8 * width_exact).all()
    # the ellipse's 1 sigma along the way to the halo, in kpc there
    of = {c: both.burst.map(dict(zip(poor["name"], poor[c], strict=True))).astype(float) for c in poor.colnames[1:8]}
    way = np.arctan2((both.ra - of["ra"]) * np.cos(np.radians(of["dec"])), both.dec - of["dec"])
    turn = way - np.radians(of["pos_pa"])
    blur_arcsec = np.hypot(of["pos_major"] * np.cos(turn), of["pos_minor"] * np.sin(turn))
    blur_kpc = blur_arcsec / (both.sep_arcmin * 60) * both.impact_kpc_p50
    far = both.sep_arcmin * 60 > 5 * of["pos_major"]  # nearer ones have no one way to the halo
    felt = far & (blur_kpc > 2 * width_exact)
    assert felt.any()
    assert (width[felt] > 0.7 * blur_kpc[felt]).all()


def test_milky_way_limit_burst_has_a_negative_residual(tables):
    # FRB 20220319D (Ravi et al. 2023): DM below what the Milky Way alone is modelled to hold
    sightlines, _ = tables
    row = sightlines[(sightlines.burst == "FRB20220319D") & (sightlines.model == "textbook-modified-nfw")].iloc[0]
    assert row.dm_after_mw_foreground_p50 < 0
    assert row.dm_after_all_p84 < 0


def test_bursts_without_redshift_have_no_residual(tables):
    sightlines, _ = tables
    missing = sightlines[sightlines.z.isna()]
    assert len(missing) == 14 * 3
    assert missing.dm_after_all_p50.isna().all()
    assert missing.dm_foreground_p50.notna().all()
