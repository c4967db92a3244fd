"""Every card on its whole published table: counts after each drop rule and histograms of redshift and mass against a
second reader (csv, gzip and astropy.io.fits raw, with the arithmetic written out here), then facts everybody knows."""

import csv
import gzip
from types import SimpleNamespace

import numpy as np
import pytest

from haloledger.catalogs import read_bursts, read_galaxies, read_groups

C = 299792.458


def unit(ra, dec):
    """Unit vectors, ICRS."""
    ra, dec = np.radians(ra), np.radians(dec)
    return np.stack([np.cos(dec) * np.cos(ra), np.cos(dec) * np.sin(ra), np.sin(dec)], axis=-1)


def along(ra, dec, apex_ra, apex_dec):
    """Cosine of the angle to an apex given in RA and Dec."""
    return (unit(ra, dec) * unit(apex_ra, apex_dec)).sum(axis=-1)


def galactic_to_icrs(lon, lat):
    """By astropy, a road the package does not take."""
    from astropy.coordinates import SkyCoord

    c = SkyCoord(l=lon, b=lat, unit="deg", frame="galactic").icrs
    return c.ra.deg, c.dec.deg


def texts(path, delimiter=","):
    """Columns of a text table as lists of strings."""
    data = path.read_bytes()
    text = (gzip.decompress(data) if path.suffix == ".gz" else data).decode()
    rows = list(csv.reader(text.splitlines(), delimiter=delimiter))
    head = [h.strip() for h in rows[0]]
    return {h: [r[k].strip() for r in rows[1:]] for k, h in enumerate(head)}


def floats(columns, *names):
    return [np.array([float(x or "nan") for x in columns[n]]) for n in names]


def fits_columns(path, *names):
    """Columns of a FITS table, TNULL and NaN both NaN."""
    from astropy.io import fits

    with fits.open(path) as hdus:
        data = hdus[1].data
        return [
            np.array(data[n], dtype=float) if data[n].dtype.kind in "fiu" else np.char.strip(data[n].astype(str))
            for n in names
        ]


def assert_same_histogram(ours, theirs, lowest, highest, width, blurred=0):
    """The two columns fall in the same bins, all values inside. `blurred`: values that rounding may move by a bin."""
    edges = np.arange(lowest, highest + width / 2, width)
    a, b = np.histogram(ours, edges)[0], np.histogram(theirs, edges)[0]
    assert a.sum() == len(ours), "values outside the histogram"
    assert b.sum() == len(theirs)
    assert np.abs(a - b).sum() <= 2 * blurred
    assert (a > 0).sum() > 5


def at(table, ra, dec, arcmin=3.0):
    """Rows within a distance of a position."""
    return np.flatnonzero(along(table.ra_deg, table.dec_deg, ra, dec) > np.cos(np.radians(arcmin / 60)))


def counts(table):
    """First number of each 'left out' note."""
    return [int(n.split(": ", 1)[1].split()[0]) for n in table.notes if "left out" in n]


@pytest.fixture(scope="module")
def real(shared_data):
    """All tables through their cards, read once."""
    g, c = shared_data / "galaxies", shared_data / "clusters"
    return SimpleNamespace(
        twompp=read_galaxies(f"2mpp:{g}/2mpp.csv.gz"),
        mgc=read_galaxies(f"50mgc:{g}/50mgc.fits"),
        zcosmos=read_galaxies(f"zcosmos-bright:{g}/zcosmos_bright.fits"),
        pp_groups=read_groups(f"2mpp-groups:{shared_data}/groups/2mpp_groups.csv"),
        kt=read_groups(f"kourkchi-tully:{shared_data}/groups/kourkchi_tully_2017.txt"),
        mcxc=read_groups(f"mcxc:{c}/mcxc.fits"),
        psz2=read_groups(f"psz2:{c}/psz2.fits"),
        redmapper=read_groups(f"redmapper-sdss:{c}/redmapper_sdss.csv.gz"),
        bursts=read_bursts(shared_data / "bursts/localised_part.csv"),
    )


def test_nothing_is_refused(real):
    """What a card knows to be bad is dropped with a reason; nothing is left to be refused."""
    for name, table in vars(real).items():
        assert table.refused == (), name


def test_2mpp(real, shared_data):
    ra, dec, z_cmb, mag = floats(texts(shared_data / "galaxies/2mpp.csv.gz"), "ra_deg", "dec_deg", "z_cmb", "k2mpp_mag")
    assert len(ra) == 67224
    # Planck 2018 I (A&A 641, A1): 369.82 km/s toward RA 167.942, Dec -6.944
    z = z_cmb - 369.82 / C * along(ra, dec, 167.942, -6.944)
    keep = z > 0
    got = real.twompp
    assert len(got) == keep.sum() == 67207
    assert counts(got) == [17]
    np.testing.assert_allclose(got.z, z[keep], atol=2e-8)  # the apex in RA and Dec is rounded to 0.001 degree
    assert_same_histogram(got.z, z[keep], 0, 0.12, 0.001, blurred=5)
    np.testing.assert_array_equal(got.mag["ks"], mag[keep])
    np.testing.assert_array_equal(got.ra_deg, ra[keep])
    assert got.mag_rest


def test_50mgc(real, shared_data):
    v, d, m, m_err = fits_columns(shared_data / "galaxies/50mgc.fits", "v_h", "bestdist", "logmass", "logmass_error")
    assert len(v) == 15424
    assert np.isnan(v).sum() == 301
    assert np.isfinite(m).sum() == 11740
    near = d < 0.3
    lost = np.isnan(d) & ~(v > 0)
    got = real.mgc
    assert counts(got) == [near.sum(), lost.sum()] == [56, 15]
    keep = ~near & ~lost
    assert len(got) == keep.sum() == 15353
    np.testing.assert_allclose(got.z, v[keep] / C, rtol=1e-14)
    np.testing.assert_array_equal(got.distance_mpc, d[keep])
    m = np.where(m > 12, np.nan, m)[keep]
    np.testing.assert_array_equal(got.log_mstar, m)
    np.testing.assert_array_equal(got.log_mstar_err[np.isfinite(m)], m_err[keep][np.isfinite(m)])
    assert_same_histogram(got.log_mstar[np.isfinite(got.log_mstar)], m[np.isfinite(m)], 2.75, 12, 0.25)
    z_ours = got.z[np.isfinite(got.z)]
    assert_same_histogram(z_ours, v[keep & np.isfinite(v)] / C, -0.003, 0.012, 0.0005)


def test_zcosmos(real, shared_data):
    z, mass, flag, kind = fits_columns(shared_data / "galaxies/zcosmos_bright.fits", "z_spec", "Mass", "Flag", "Type")
    assert len(z) == 17999
    keep = (flag == 1) & (kind == 0)
    got = real.zcosmos
    assert len(got) == keep.sum() == 15647
    assert sum(counts(got)) == 17999 - 15647
    with np.errstate(divide="ignore", invalid="ignore"):
        logm = np.log10(mass[keep])
    good = logm > 5
    assert np.isfinite(got.log_mstar).sum() == good.sum() == 15645
    assert_same_histogram(got.log_mstar[good], logm[good], 6, 12.6, 0.1)
    assert_same_histogram(got.z, z[keep], 0, 2, 0.05)


def test_2mpp_groups(real, shared_data):
    v, sigma, rich = floats(texts(shared_data / "groups/2mpp_groups.csv"), "v_helio_kms", "sigma_kms", "richness")
    assert len(v) == 4002
    keep = (sigma > 0) & (v > 0)
    got = real.pp_groups
    assert counts(got) == [18, 4]
    assert len(got) == keep.sum() == 3980
    np.testing.assert_array_equal(got.sigma_v_kms, sigma[keep])
    np.testing.assert_array_equal(got.n_members, rich[keep])
    assert_same_histogram(got.z, v[keep] / C, 0, 0.07, 0.002)
    assert np.isnan(got.log_mass).all()


def test_kourkchi_tully(real, shared_data):
    columns = texts(shared_data / "groups/kourkchi_tully_2017.txt", "|")
    ra, dec, flag, vls, d, md, share, mass = floats(
        columns, "ra", "dec", "flag", "Vls", "dist", "mDist", "mDistErr", "Mv_lum"
    )
    assert len(ra) == 9699
    milky_way = np.array(columns["pgc"]) == "905064336"
    keep = (flag != 5) & ~milky_way
    got = real.kt
    assert counts(got) == [881, 1]
    assert len(got) == keep.sum() == 8817
    # V_LS = V_h - 26 cos l cos b + 317 sin l cos b - 8 sin b (Tully et al. 2008, ApJ 676, 184, from memory)
    sun = (
        -26 * along(ra, dec, *galactic_to_icrs(0, 0))
        + 317 * along(ra, dec, *galactic_to_icrs(90, 0))
        - 8 * along(ra, dec, *galactic_to_icrs(0, 90))
    )
    z = (vls - sun) / C
    np.testing.assert_allclose(got.z, z[keep], atol=3e-7)  # 0.1 km/s: the apex is rounded to 0.01 degree
    assert_same_histogram(got.z, z[keep], -0.002, 0.014, 0.0005, blurred=8)
    np.testing.assert_allclose(got.log_mass, np.log10(mass[keep]), atol=1e-13)
    assert_same_histogram(got.log_mass, np.log10(mass[keep]), 8.5, 15, 0.25)
    np.testing.assert_array_equal(got.distance_mpc, d[keep])
    error = np.where(md > 0, share * d, np.minimum(300 / 75, 0.5 * d))[keep]
    np.testing.assert_allclose(got.distance_err_mpc, error, rtol=1e-12)
    # where there is no measured distance, `dist` is a velocity over 75
    assert np.abs(d - vls / 75)[keep & (md == 0)].max() < 1.01
    assert set(got.mass_def) == {"200c"}


def test_mcxc(real, shared_data):
    z, m500, r500 = fits_columns(shared_data / "clusters/mcxc.fits", "z", "M500", "R500")
    got = real.mcxc
    assert len(got) == 1743
    np.testing.assert_allclose(got.log_mass, 14 + np.log10(m500), atol=1e-13)
    assert_same_histogram(got.log_mass, np.log10(m500 * 1e14), 11.8, 15.4, 0.2)
    assert_same_histogram(got.z, z, 0, 1.3, 0.05)
    # h: with H0 = 70, Om = 0.3 and G = 4.30092e-9 Mpc km2/s2/Msun, M500 = 500 rho_c(z) 4/3 pi R500^3 needs no other h
    rho = 3 * (70.0**2 * (0.3 * (1 + z) ** 3 + 0.7)) / (8 * np.pi * 4.30092e-9)
    ratio = 10**got.log_mass / (500 * rho * 4 / 3 * np.pi * r500**3)
    assert np.median(ratio) == pytest.approx(1, abs=1e-3)
    assert np.isnan(got.lx_1e44_erg_s).all()


def test_psz2(real, shared_data):
    z, m, up, low = fits_columns(shared_data / "clusters/psz2.fits", "REDSHIFT", "MSZ", "MSZ_ERR_UP", "MSZ_ERR_LOW")
    assert len(z) == 1653
    keep = z > -0.5
    got = real.psz2
    assert counts(got) == [560]
    assert len(got) == keep.sum() == 1093
    np.testing.assert_allclose(got.log_mass, 14 + np.log10(m[keep]), atol=1e-13)
    assert_same_histogram(got.log_mass, 14 + np.log10(m[keep]), 13.6, 15.3, 0.1)
    assert_same_histogram(got.z, z[keep], 0, 1, 0.05)
    m, up, low = m[keep], up[keep], low[keep]
    err = (np.log10(m + up) - np.log10(m - low)) / 2
    np.testing.assert_allclose(got.log_mass_err, err, rtol=1e-9)


def test_redmapper(real, shared_data):
    z, rich = floats(texts(shared_data / "clusters/redmapper_sdss.csv.gz"), "redshift", "lambda")
    got = real.redmapper
    assert len(got) == 26350
    np.testing.assert_array_equal(got.richness, rich)
    assert_same_histogram(got.z, z, 0, 0.6, 0.02)
    assert_same_histogram(np.log10(got.richness), np.log10(rich), 1.2, 2.5, 0.1)
    assert got.photometric.all()


def test_bursts(real, shared_data):
    columns = texts(shared_data / "bursts/localised_part.csv")
    z, dm, major, minor = floats(columns, "z", "dm", "pos_major", "pos_minor")
    got = real.bursts
    assert got.burst.tolist() == columns["name"]
    assert len(got) == 73
    assert np.isfinite(got.z).sum() == np.isfinite(z).sum() == 59
    np.testing.assert_array_equal(got.dm, dm)
    exact = np.isnan(major)
    assert np.isnan(got.loc_major_arcsec).sum() == exact.sum() == 2
    circle = major < minor
    assert got.burst[circle].tolist() == ["FRB20240304B", "FRB20230125D", "FRB20230907D"]
    np.testing.assert_array_equal(got.loc_major_arcsec[circle], minor[circle])
    np.testing.assert_array_equal(got.loc_minor_arcsec[~exact], minor[~exact])
    assert [bool(n) for n in got.note] == (exact | circle).tolist()
    assert np.nanmin(got.loc_pa_deg) < -70


def test_what_everybody_knows(real):
    """Positions and values as the folder's README lists them."""
    m31 = at(real.mgc, 10.685, 41.269)
    assert real.mgc.distance_mpc[m31].tolist() == [pytest.approx(0.76, abs=0.02)]
    assert real.mgc.z[m31][0] < 0
    m87 = at(real.mgc, 187.706, 12.391, 1.0)
    assert real.mgc.z[m87][0] * C == pytest.approx(1283, abs=1)
    ngc4889 = at(real.twompp, 195.034, 27.977, 1.0)
    assert real.twompp.z[ngc4889][0] * C == pytest.approx(6495, abs=60)  # 6495 km/s heliocentric (from memory)
    coma = at(real.mcxc, 194.95, 27.98, 10)
    assert 10 ** real.mcxc.log_mass[coma][0] == pytest.approx(4.28e14, rel=2e-3)
    assert real.mcxc.z[coma][0] == pytest.approx(0.0231)
    perseus = at(real.mcxc, 49.95, 41.51, 5)
    assert real.mcxc.z[perseus][0] == pytest.approx(0.0179, abs=1e-3)
    virgo = np.flatnonzero(real.kt.row == "kourkchi-tully:500041220")
    assert 10 ** real.kt.log_mass[virgo][0] == pytest.approx(4.06e14, rel=1e-9)
    assert real.kt.distance_mpc[virgo][0] == pytest.approx(15.8, abs=0.05)
    assert not len(at(real.psz2, 49.95, 41.51, 30))
    assert len(at(real.psz2, 194.95, 27.98, 10)) == 1


def test_all_tables_are_read_in_a_moment(shared_data):
    """The five tables of an audit of the whole sky; the machine of the measurement needed 0.7 s."""
    import time

    start = time.perf_counter()
    read_galaxies(f"2mpp:{shared_data}/galaxies/2mpp.csv.gz")
    read_galaxies(f"50mgc:{shared_data}/galaxies/50mgc.fits")
    read_groups(f"kourkchi-tully:{shared_data}/groups/kourkchi_tully_2017.txt")
    read_groups(f"mcxc:{shared_data}/clusters/mcxc.fits")
    read_groups(f"redmapper-sdss:{shared_data}/clusters/redmapper_sdss.csv.gz")
    assert time.perf_counter() - start < 4.0
