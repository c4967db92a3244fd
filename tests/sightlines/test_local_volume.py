"""The built-in table of the nearest large haloes: what it holds, and when it is used."""

import numpy as np
import pytest
from astropy.table import Table

from haloledger.audit import audit
from haloledger.catalogs import read_galaxies, read_groups
from haloledger.catalogs.local_volume import local_groups, local_volume
from haloledger.errors import InputError
from haloledger.sightlines.local import uncovered, with_local

M31 = next(h for h in local_volume() if h.id == "M31")
ALONE = {"models": ["blended"], "draws": 400}


def beside(halo, kpc, name="B", z=0.0925, **more) -> Table:
    """A burst whose line passes `kpc` south of a halo of the table."""
    dec = halo.dec - np.degrees(np.arcsin(kpc / (1e3 * halo.distance_mpc)))
    return Table(rows=[{"burst": name, "ra": halo.ra, "dec": dec, "z": z, "dm": 400.0, **more}])


def entries_of(ledgers, halo: str):
    """Rows of one halo, as plain data."""
    entries = ledgers.to_pandas()[1]
    return entries[entries.halo == halo]


def galaxy(**more) -> Table:
    """M31 as a user's galaxy."""
    row = {"id": "A", "ra": M31.ra, "dec": M31.dec, "z": -0.001, "log_mstar": 10.8, "distance_mpc": 0.77}
    return Table(rows=[row | more])


def test_every_halo_has_sources_an_error_and_a_place():
    names = [h.id for h in local_volume()]
    assert len(names) == len(set(names)) >= 15
    assert {"M31", "M33", "LMC", "SMC", "M81", "CenA", "Sculptor", "IC342", "M104"} <= set(names)
    for halo in local_volume():
        assert all(len(s) > 20 for s in (halo.place_source, halo.mass_source)), halo.id
        assert 0 < halo.distance_err_mpc < 0.2 * halo.distance_mpc
        assert 10.5 < halo.log_m200c < 15
        assert 0.1 <= halo.log_m200c_err <= 0.3


def test_positions_are_those_of_the_new_general_catalogue():
    ongc = pytest.importorskip("pyongc.ongc", reason="the catalogue of names and places is not installed")
    known_as = (("M31", "NGC0224"), ("M33", "NGC0598"), ("M81", "NGC3031"), ("CenA", "NGC5128"), ("M104", "NGC4594"))
    for name, known in known_as:
        halo = next(h for h in local_volume() if h.id == name)
        ra, dec = (np.degrees(x) for x in ongc.get(known).rad_coords)
        assert (ra, dec) == pytest.approx((halo.ra, halo.dec), abs=0.01), name


PUBLISHED = [  # range of the DM excess or halo share [pc cm-3], where it stands
    (75.0, 5.9, 59.6, "0-151 kpc, Kahinga et al. 2026, arXiv:2602.23749"),
    (225.0, 25.7, 64.6, "151-302 kpc, Kahinga et al. 2026"),
    (100.0, 7.0, 169.0, "M31 halo towards FRB 20230930A, 90%, Anna-Thomas et al. 2025"),
]


@pytest.mark.parametrize(("kpc", "low", "high", "source"), PUBLISHED)
def test_andromeda_from_the_table_alone_beside_published_ranges(kpc, low, high, source, record_property):
    models = ["blended", "textbook-modified-nfw-wide"]
    ledgers = audit(beside(M31, kpc), models=models, draws=400)
    found = entries_of(ledgers, "local:M31")
    assert found.model.tolist() == models
    assert set(found.kind) == {"local"}
    assert set(found.z_kind) == {"distance"}
    # by distance, not by its negative redshift: D sin(angle), and the distance has 5%
    assert found.impact_kpc_p50.to_numpy() == pytest.approx(kpc, rel=0.02)
    for entry in found.itertuples():
        ours = [round(x, 1) for x in (entry.dm_p16, entry.dm_p50, entry.dm_p84)]
        record_property(f"{entry.model}, {kpc:.0f} kpc", f"{ours} beside {low}-{high}: {source}")
        print(f"M31 at {kpc:.0f} kpc, {entry.model}: {ours}; published {low}-{high} ({source})")
    # one of the two models reaches into each published range: the data ask for an extended halo outside
    assert ((found.dm_p16 < high) & (found.dm_p84 > low)).any()


def test_the_table_can_be_left_away():
    with pytest.raises(InputError, match="no catalogue given"):
        audit(beside(M31, 100.0), local=False, **ALONE)
    assert not len(audit(beside(M31, 100.0), galaxies=[galaxy(ra=200.0)], local=False, **ALONE).entries)


def test_a_sightline_far_from_all_of_them_is_untouched_to_the_last_bit():
    burst = Table(rows=[{"burst": "B", "ra": 150.0, "dec": 20.0, "z": 0.5, "dm": 500.0}])
    group = Table(rows=[{"id": "C", "ra": 150.0, "dec": 20.01, "z": 0.1, "log_mass": 14.0, "mass_def": "200c"}])
    with_table, without = (audit(burst, groups=[group], local=use, **ALONE).to_pandas() for use in (True, False))
    for mine, theirs in zip(with_table, without, strict=True):
        assert mine.equals(theirs)


def test_what_a_catalogue_lists_is_not_added(planck):
    for table, covered in (
        (galaxy(), True),
        (galaxy(dec=M31.dec + 3.0), True),  # a centre by light
        (galaxy(log_mstar=8.5), False),  # a dwarf beside it
        (galaxy(z=0.02, distance_mpc=80.0), False),  # behind it
        (galaxy(dec=M31.dec + 12.0), False),
    ):
        left = uncovered(local_groups(), [read_galaxies(table)], [], planck)
        assert ("local:M31" in left.row) is not covered, table
        assert ("local:M33" in left.row) is not covered  # a satellite is covered with its host


def test_table_and_catalogue_add_the_same_halo_once():
    ledgers = audit(beside(M31, 100.0), galaxies=[galaxy(log_m200c=12.2, log_m200c_err=0.15)], **ALONE)
    halos = [str(h) for h in ledgers.entries["halo"] if str(h) != "shared"]
    assert halos == ["galaxies:A"]


def test_a_satellite_of_ours_has_no_halo_but_its_disc_is_met():
    lmc = next(h for h in local_volume() if h.id == "LMC")
    ledgers = audit(beside(lmc, 1.0), **ALONE)
    entry = entries_of(ledgers, "local:LMC").iloc[0]
    assert entry.dm_mean == 0
    assert np.isnan(entry.dm_crossed_p50)
    assert entry.dm_disc_crossing_p50 > 20
    assert "disc crossing" in entry.note
    assert "no gas of its own inside the Milky Way" in entry.note


def test_a_likely_satellite_has_gas_in_half_of_the_draws():
    m33 = next(h for h in local_volume() if h.id == "M33")
    ledgers = audit(beside(m33, 30.0), **ALONE)
    entry = entries_of(ledgers, "local:M33").iloc[0]
    assert entry.p_crossed == pytest.approx(0.5, abs=0.08)  # 3 sigma of 400 draws
    assert entry.p_member == 0.5


def test_the_notes_say_which_haloes_came_from_the_table():
    notes = audit(beside(M31, 100.0), **ALONE).notes
    assert any("built-in table" in n and "M31" in n and "CenA" in n for n in notes)


def test_published_groups_cover_the_table(planck, shared_data):
    groups = read_groups(f"kourkchi-tully:{shared_data}/groups/kourkchi_tully_2017.txt")
    left = uncovered(local_groups(), [], [groups], planck)
    haloes = with_local([], [groups], left, planck)
    # the Clouds lie inside the Milky Way's halo and are no groups: only their discs are met
    assert set(haloes.id[haloes.kind == "local"]) == {"local:LMC", "local:SMC"}
    for name, row in (("M31", "900002557"), ("M81", "700028630"), ("CenA", "700046957"), ("Virgo", "500041220")):
        held = [r for r in haloes.source_rows if f"kourkchi-tully:{row}" in str(r).split(";")]
        assert len(held) == 1, name
