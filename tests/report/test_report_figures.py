"""Pictures: circles to scale, the ellipse turned the right way, names as data, files where they should be."""

import numpy as np
import pytest
from astropy import units as u
from astropy.coordinates import SkyCoord
from matplotlib.patches import Circle
from matplotlib.text import Annotation, Text
from synthetic import ledgers as make

from haloledger.errors import InputError
from haloledger.report.figures import model_figure, save, sightline_figure
from haloledger.report.figures.sky import colour_norm, draw_sky, emptiest_corner, offsets, sky_haloes
from haloledger.report.figures.style import new_figure
from haloledger.report.views import view
from haloledger.report.write import write


def sky_axes(figure):
    return next(a for a in figure.axes if a.get_gid() == "sky")


def patches(axes, gid):
    return [p for p in axes.patches if p.get_gid() == gid]


def words(figure) -> str:
    figure.canvas.draw()
    return "\n".join(t.get_text() for t in figure.findobj(match=lambda a: hasattr(a, "get_text")))


@pytest.mark.parametrize(("ra0", "dec0"), [(150.0, 20.0), (0.01, -60.0), (200.0, 89.5)])
def test_offsets_keep_separation_and_direction(ra0, dec0):
    rng = np.random.default_rng(3)
    ra, dec = (ra0 + rng.uniform(-5, 5, 40)) % 360, np.clip(dec0 + rng.uniform(-5, 5, 40), -90, 90)
    east, north = offsets(ra0, dec0, ra, dec)
    centre, there = SkyCoord(ra0, dec0, unit="deg"), SkyCoord(ra, dec, unit="deg")
    # two ways to the same angle, both in double precision
    np.testing.assert_allclose(np.hypot(east, north), centre.separation(there).to_value(u.arcmin), rtol=1e-9)
    angle = centre.position_angle(there).to_value(u.rad)
    np.testing.assert_allclose(np.cos(np.arctan2(east, north) - angle), 1, atol=1e-12)


def test_boundaries_are_circles_to_scale(ledgers):
    axes = sky_axes(sightline_figure(ledgers, "FRB20990101A"))
    circles = patches(axes, "boundary")
    assert all(isinstance(c, Circle) for c in circles)
    entries = ledgers.entries[(ledgers.entries["burst"] == "FRB20990101A") & (ledgers.entries["model"] == "blended")]
    expected = sorted(float(e["boundary_arcmin"].unmasked.value) for e in entries if e["halo"] != "shared")
    assert sorted(c.get_radius() for c in circles) == pytest.approx(expected)
    assert axes.get_aspect() == 1  # arcmin in x are arcmin in y
    left, right = axes.get_xlim()
    assert left > right  # east is left
    largest = max(circles, key=lambda c: c.get_radius())
    assert np.hypot(*largest.center) == pytest.approx(6.2, abs=0.01)  # its separation in the table


def test_a_circle_holds_the_burst_where_the_halo_is_crossed(ledgers):
    each = view(ledgers, "FRB20990101A")
    for halo, entry in zip(sky_haloes(each, each.entries), each.entries, strict=True):
        assert (halo.sep < halo.radius) == (entry.dm.mean > 0)


def test_localisation_is_to_scale_and_turned_east_of_north():
    axes = sky_axes(sightline_figure(make(major=400.0, minor=150.0), "FRB20990101A"))
    (ellipse,) = patches(axes, "localisation")
    assert (ellipse.width, ellipse.height) == pytest.approx((2 * 400 / 60, 2 * 150 / 60))
    end = ellipse.get_patch_transform().transform([(1.0, 0.0)])[0]  # end of the major axis: x is east, y is north
    angle = np.degrees(np.arctan2(end[0], end[1])) % 180
    assert angle == pytest.approx(30.0)  # position angle of the fixture


def test_a_localisation_too_small_to_see_is_a_cross(ledgers):
    figure = sightline_figure(ledgers, "FRB20990101A")
    assert patches(sky_axes(figure), "localisation") == []
    assert "cross: the burst, its region is smaller" in words(figure)


def test_picture_says_what_the_tables_say(ledgers):
    said = words(sightline_figure(ledgers, "FRB20990101A"))
    for part in ("130  (98.0 to 165)", "160  (120 to 200)", "104  (78.0 to 130)", "observed 612", "134  (69.0 to 199)"):
        assert part in said
    second = words(sightline_figure(ledgers, "FRB20990202B", "strong-feedback"))
    assert "no redshift given" in second
    assert "sum, strong-feedback" in second
    assert "nan" not in second


def test_left_over_is_a_bar_of_the_median_with_its_whole_interval_in_view(ledgers):
    figure = sightline_figure(ledgers, "FRB20990101A")
    (axes,) = [a for a in figure.axes if patches(a, "left over")]
    (bar,) = patches(axes, "left over")
    left = view(ledgers, "FRB20990101A").terms["dm_after_all"]
    assert (bar.get_x(), bar.get_width()) == pytest.approx((0, left.p50))
    for name, value in {"p16": -531.0, "p50": -212.0, "p84": 900.0}.items():
        ledgers.sightlines[f"dm_after_all_{name}"][0] = value * ledgers.sightlines["dm"].unit
    wide = sightline_figure(ledgers, "FRB20990101A")
    (axes,) = [a for a in wide.axes if patches(a, "left over")]
    low, high = axes.get_xlim()
    assert low < -531
    assert high > 900


def texts(axes):
    axes.figure.canvas.draw()
    return [t for t in axes.findobj(Text) if t.get_text() and t.get_visible()]


@pytest.mark.parametrize("more_models", [2, 9])
def test_labels_of_bars_stay_apart_and_inside(more_models):
    names = tuple(f"model-with-a-long-name-{i}" for i in range(more_models))
    figure = sightline_figure(make(models=names, halo="a_long_survey_name:cluster-of-"), "FRB20990101A")
    (axes,) = [a for a in figure.axes if a.get_title("left") == "What each halo adds"]
    page, inside = figure.bbox, axes.get_window_extent()
    boxes = [t.get_window_extent() for t in texts(axes) if isinstance(t, Annotation)]
    assert len(boxes) > 2 * more_models
    assert all(b.x1 <= min(page.x1, inside.x1 + 3) for b in boxes)  # three pixels: the edge of a letter
    overlaps = [(a, b) for i, a in enumerate(boxes) for b in boxes[:i] if a.overlaps(b) and min(a.x1, b.x1) > 0]
    assert not [(a, b) for a, b in overlaps if min(a.y1, b.y1) - max(a.y0, b.y0) > 2]
    assert (figure.get_size_inches()[1] > 8.5) == (more_models == 9)  # it grows


def test_every_halo_in_view_has_its_number():
    from haloledger.report.figures.sky import SkyHalo, out_of_view

    haloes = [
        SkyHalo(0.2, 0.1, 1.0, 5.0, 1),
        SkyHalo(20.0, -15.0, 18.0, 2.0, 2),  # only its edge is in view
        SkyHalo(40.0, 0.0, 60.0, 2.0, 3),  # fills the view
        SkyHalo(40.0, 40.0, 3.0, 1.0, 4),  # far outside
    ]
    axes = new_figure(6, 6).add_axes((0, 0, 1, 1))
    draw_sky(axes, haloes, (np.nan,) * 3, 8.0, colour_norm(haloes))
    places = {t.get_text(): t.get_position() for t in axes.texts}
    assert set(places) == {"1", "2", "3"}
    assert all(max(map(abs, place)) < 8.0 for place in places.values())
    assert np.hypot(places["2"][0] - 20, places["2"][1] + 15) < 18  # on its halo
    assert out_of_view(haloes, 8.0) == [4]


def test_two_views_number_each_halo_once():
    from haloledger.report.figures.sky import SkyHalo, second_view

    haloes = [SkyHalo(0.0, 30.0, 50.0, 5.0, 1), SkyHalo(0.5, 0.4, 1.0, 5.0, 2), SkyHalo(-3.0, 0.0, 4.5, 5.0, 3)]
    axes = new_figure(6, 6).add_axes((0, 0, 1, 1))
    norm = colour_norm(haloes)
    draw_sky(axes, haloes, (np.nan,) * 3, 80.0, norm, zoom=5.0)
    second_view(axes, haloes, (np.nan,) * 3, 80.0, 5.0, norm)
    (inset,) = axes.child_axes
    assert {t.get_text() for t in axes.texts} == {"1", "3"}
    assert {t.get_text() for t in inset.texts if t.get_text().isdigit()} == {"2"}


def test_minus_signs_are_those_of_the_tables(ledgers):
    assert "\N{MINUS SIGN}" not in words(sightline_figure(ledgers, "FRB20990101A"))


def test_held_nuisances_and_a_mean_beyond_its_interval_are_on_the_picture(ledgers):
    ledgers.run["options"] = {"draws": 20, "hold": {"mw_disc": "0.5"}}
    said = words(sightline_figure(ledgers, "FRB20990101A"))
    assert "held: mw_disc = 0.5 (scale)" in said
    assert "intervals are rough" in said
    assert "a mean outside" not in said
    ledgers.entries["dm_p84"][0] = 100 * ledgers.entries["dm_p84"].unit
    assert "a mean outside" in words(sightline_figure(ledgers, "FRB20990101A"))


def test_a_clean_sightline_has_a_picture(ledgers):
    ledgers.entries = ledgers.entries[ledgers.entries["halo"] == "shared"]
    assert "no listed halo adds DM here" in words(sightline_figure(ledgers, "FRB20990101A"))


def test_footprint_of_the_ledgers_is_shaded(ledgers):
    class East:
        def contains(self, ra, dec):
            return np.asarray(ra) > 150.0

    bare = len(sky_axes(sightline_figure(ledgers, "FRB20990101A")).collections)
    ledgers.footprints = [East()]
    assert len(sky_axes(sightline_figure(ledgers, "FRB20990101A")).collections) > bare


def test_second_view_goes_where_it_hides_least():
    from haloledger.report.figures.sky import SkyHalo

    for x, y in ((6, 6), (-6, 6), (6, -6), (-6, -6)):
        halo = SkyHalo(x, y, 3.0, 10.0, 1)
        right, up = emptiest_corner([halo], 10.0, 0.37)
        hidden_x, hidden_y = 10 * (1 - 2 * (right + 0.185)), 10 * (2 * (up + 0.185) - 1)
        assert np.hypot(hidden_x - x, hidden_y - y) > 10


def test_names_in_pictures_are_not_mathematics():
    hostile = make(names=("$\\frac{", "b\x1b[31m"), halo="$x^{")
    said = words(sightline_figure(hostile, "$\\frac{"))
    assert "$\\frac{" in said
    assert "$x^{cluster 7" in said
    assert "b?[31m" in words(sightline_figure(hostile, "b\x1b[31m"))


def test_a_picture_per_burst_with_clean_names(tmp_path):
    write(make(names=("../x", "a/b", "A b")), tmp_path / "out", figures=True)
    assert sorted(p.name for p in (tmp_path / "out" / "figures").iterdir()) == ["A_b-2.png", "a_b.png", "x.png"]
    assert [p.name for p in tmp_path.iterdir()] == ["out"]


def test_pictures_are_wide_enough_and_the_same_each_time(ledgers, tmp_path):
    from matplotlib.image import imread

    paths = [save(sightline_figure(ledgers, "FRB20990101A"), tmp_path / f"{i}.png") for i in (1, 2)]
    assert imread(paths[0]).shape[1] >= 1200
    assert paths[0].read_bytes() == paths[1].read_bytes()


def test_old_pictures_go_with_the_run_that_made_them(ledgers, tmp_path):
    write(ledgers, tmp_path / "out", figures=True)
    write(ledgers, tmp_path / "out")
    assert not (tmp_path / "out" / "figures").exists()


def test_other_suffixes_are_refused(ledgers, tmp_path):
    with pytest.raises(InputError, match=r"a\.pdf: pictures are written as \.png or \.svg\. Write .*a\.png"):
        save(sightline_figure(ledgers, "FRB20990101A"), tmp_path / "a.pdf")
    with pytest.raises(InputError, match="cannot be written"):
        save(sightline_figure(ledgers, "FRB20990101A"), tmp_path / "nowhere" / "a.png")


def test_model_picture_shows_the_models_own_density(planck, tmp_path):
    from haloledger.cosmos.concentration import concentration
    from haloledger.gas.curves import curves
    from haloledger.gas.models import load_model

    model = load_model("textbook-modified-nfw")
    figure = model_figure(curves(model, planck, (12.0, 14.0), 0.2))
    density, dm = figure.axes
    x, y = next(line for line in density.lines if line.get_label() == "14").get_data()
    c200c = concentration(model.concentration, np.array([14.0]), 0.2, planck)
    np.testing.assert_allclose(y, model.density_cm3(x, 14.0, 0.2, c200c, planck), rtol=1e-12)
    b, column = dm.lines[1].get_data()
    r200c = float(planck.r200c_kpc(np.array([14.0]), 0.2)[0])
    assert b[-1] == pytest.approx(r200c * model.boundary_r200c, rel=1e-6)
    # twice the integral of the density from the middle of the line outward, by the trapezium rule
    depth = np.linspace(0, np.sqrt(r200c**2 - b[150] ** 2), 20001)
    n_e = model.density_cm3(np.minimum(np.hypot(b[150], depth) / r200c, 1.0), 14.0, 0.2, c200c, planck)
    assert column[150] == pytest.approx(2 * np.trapezoid(n_e, depth) * 1000, rel=1e-3)  # the table's own accuracy
    assert save(figure, tmp_path / "m.svg").read_text().startswith("<?xml")
