"""Footprints: across RA 0, around a pole, MOC maps; each against closed forms or another library."""

import numpy as np
import pytest

from haloledger.catalogs import read_footprint
from haloledger.errors import InputError

SKY = np.random.default_rng(3)
RA = SKY.uniform(0, 360, 4000)
DEC = np.degrees(np.arcsin(SKY.uniform(-1, 1, 4000)))


def write(tmp_path, corners, name="area.txt"):
    path = tmp_path / name
    path.write_text("# an outline\nra dec\n" + "\n".join(f"{r} {d}" for r, d in corners) + "\n")
    return path


def circle(ra0, dec0, radius, n=720):
    """Corners of a small circle, by astropy's own spherical offset."""
    import astropy.units as u
    from astropy.coordinates import SkyCoord

    ring = SkyCoord(ra0, dec0, unit="deg").directional_offset_by(
        np.linspace(0, 360, n, endpoint=False) * u.deg, radius * u.deg
    )
    return np.column_stack([ring.ra.deg, ring.dec.deg])


@pytest.mark.parametrize(("ra0", "dec0"), [(0.5, 10.0), (359.5, -30.0), (120.0, 90.0), (40.0, -86.0), (180.0, 0.0)])
def test_circles_anywhere(tmp_path, ra0, dec0):
    area = read_footprint(write(tmp_path, circle(ra0, dec0, 25.0)))
    cosine = np.sin(np.radians(DEC)) * np.sin(np.radians(dec0)) + np.cos(np.radians(DEC)) * np.cos(
        np.radians(dec0)
    ) * np.cos(np.radians(RA - ra0))
    distance = np.degrees(np.arccos(np.clip(cosine, -1, 1)))
    clear = np.abs(distance - 25.0) > 0.01  # the 720-gon lies inside its circle by less than that
    inside = area.contains(RA, DEC)
    np.testing.assert_array_equal(inside[clear], (distance < 25.0)[clear])
    assert inside.sum() > 100
    # cap area 2 pi (1 - cos r): share (1 - cos r) / 2; the 720-gon is 1e-5 smaller
    assert area.sky_fraction == pytest.approx((1 - np.cos(np.radians(25.0))) / 2, rel=1e-4)


def test_negative_and_wrapped_right_ascension_are_the_same(tmp_path):
    corners = np.array([(-20.0, -10.0), (20.0, -10.0), (20.0, 15.0), (-20.0, 15.0)])
    a = read_footprint(write(tmp_path, corners))
    b = read_footprint(write(tmp_path, np.column_stack([corners[:, 0] % 360, corners[:, 1]]), "b.txt"))
    np.testing.assert_array_equal(a.contains(RA, DEC), b.contains(RA, DEC))
    assert a.contains([0.0, 359.0, -1.0, 30.0], [0.0, 0.0, 0.0, 0.0]).tolist() == [True, True, True, False]
    assert a.label == "area"


def test_two_outlines_and_a_closing_corner(tmp_path):
    path = tmp_path / "two.txt"
    path.write_text("0 0\n10 0\n10 10\n0 10\n0 0\n\n# the second\n100,0\n110,0\n105,10\n")
    area = read_footprint(path)
    assert area.contains([5, 105, 50], [5, 3, 5]).tolist() == [True, True, False]
    assert area.contains(5.0, 5.0).shape == ()


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("", "is empty"),
        ("# nothing\n", "no corner found"),
        ("1 2\n3 4\n", "an outline with 2 corners"),
        ("1 2\n3 north\n", r"line 2: found '3 north'\. Write RA and Dec"),
        ("1 2\n3 95\n4 5", "line 2: found RA 3, Dec 95"),
        ("0 0\n120 0\n240 0\n", "goes around half the sky"),
    ],
)
def test_outlines_that_are_none(tmp_path, text, message):
    path = tmp_path / "o.txt"
    path.write_text(text)
    with pytest.raises(InputError, match=message):
        read_footprint(path)


def test_moc_against_the_cone_it_was_made_from(tmp_path):
    import astropy.units as u
    from astropy.coordinates import Latitude, Longitude
    from mocpy import MOC

    path = tmp_path / "cone.moc.fits"
    MOC.from_cone(lon=Longitude(1.0 * u.deg), lat=Latitude(20.0 * u.deg), radius=10 * u.deg, max_depth=9).save(
        str(path), format="fits"
    )
    area = read_footprint(path)
    assert area.label == "cone"
    assert area.contains([1.0, 355.0, -5.0, 20.0], [20.0, 20.0, 20.0, 20.0]).tolist() == [True, True, True, False]
    assert area.contains(np.full((2, 3), 1.0), np.full((2, 3), 20.0)).all()
    assert area.sky_fraction == pytest.approx((1 - np.cos(np.radians(10.0))) / 2, rel=0.02)  # cells of 0.1 degree


def test_fits_that_is_no_map(tmp_path):
    from astropy.table import Table

    Table({"a": [1.0]}).write(tmp_path / "t.fits")
    with pytest.raises(InputError, match="is FITS but no coverage map"):
        read_footprint(tmp_path / "t.fits")
    with pytest.raises(InputError, match="no such file"):
        read_footprint(tmp_path / "absent.fits")


def test_the_published_footprints(shared_data):
    folder = shared_data / "footprints"
    des = read_footprint(folder / "des_polygon.txt")
    # about 5,000 square degrees (DES collaboration's own round number)
    assert des.sky_fraction * 41252.96 == pytest.approx(5000, rel=0.03)
    # inside (Fornax; across RA 0), outside (north; LMC)
    assert des.contains([54.6, 0.0, 358.0, 150.0, 80.9], [-35.5, -45.0, -45.0, 2.2, -69.8]).tolist() == [
        True,
        True,
        True,
        False,
        False,
    ]
    sdss, legacy = (read_footprint(folder / f"{name}.moc.fits") for name in ("sdss9_r", "legacy_dr10"))
    assert sdss.sky_fraction * 41252.96 == pytest.approx(14555, rel=0.04)  # SDSS DR9 imaging: 14,555 (from memory)
    assert sdss.contains([194.95, 49.95, 54.6], [27.98, 41.51, -35.5]).tolist()[0]
    assert not sdss.contains(54.6, -35.5)
    assert legacy.contains(194.95, 27.98)
