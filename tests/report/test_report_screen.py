"""What is printed: numbers are those of the tables, names stay data, nothing unknown looks like a result."""

import io
from dataclasses import replace

import numpy as np
import pytest
from synthetic import ledgers as make

from haloledger.errors import InputError
from haloledger.report import text
from haloledger.report.names import shorten, wrapped
from haloledger.report.notebook import html
from haloledger.report.notes import burst_notes, shared_notes
from haloledger.report.screen import console, show
from haloledger.report.views import BUDGET, Spread, by_burst, view, views


def printed(ledgers, width=120, folder="out") -> str:
    to = io.StringIO()
    show(ledgers, console(to, width), folder)
    return to.getvalue()


def line(page: str, start: str) -> list[str]:
    """The words of the first line that starts so."""
    return next(x for x in page.splitlines() if x.strip().startswith(start)).split()


def test_page_shows_the_numbers_of_the_tables(ledgers):
    page = printed(ledgers)
    assert line(page, "survey:cluster 7")[-5:] == ["130", "98.0", "to", "165", "81%"]
    assert line(page, "sum of listed haloes  ")[-4:] == ["160", "120", "to", "200"]
    assert line(page, "strong-feedback")[-5:] == ["104", "190", "125", "to", "255"]
    assert line(page, "left over  ") == ["left", "over", "69.0", "to", "199", "134"]  # interval and median
    assert line(page, "observed DM") == ["observed", "DM", "612"]
    assert "survey:1550" not in page  # adds nothing
    assert "Files are in out" in page
    assert "galaxies.csv row 17 (g17): dec is 97.2. Dec in degrees between -90 and 90" in page
    assert page.rstrip().endswith(text.CAUTION.split()[-1])


def test_budget_terms_add_up_to_what_was_observed(ledgers):
    for each in views(ledgers):
        if np.isfinite(each.z):
            total = sum(each.terms[t].mean for t in BUDGET) + each.terms["dm_after_all"].mean
            assert total == pytest.approx(each.dm, abs=1e-9)  # only rounding is left


def test_terms_of_the_screen_are_those_of_the_budget():
    from haloledger.ledger.budget import EXTRA_TERMS, TERMS

    # what is left and the sums of other terms are not terms of their own
    derived = {"dm_cosmic_mean_z", "dm_cosmic_with_foreground", "dm_after_mw_foreground", "dm_after_all"}
    assert set(BUDGET) == set(TERMS + EXTRA_TERMS) - derived


def test_what_is_not_assessed_is_not_printed(ledgers):
    page = printed(ledgers)
    for word in ("reach", "controls", "verdict"):
        assert word not in page
    assert "nan" not in page.lower().replace("unnamed", "")
    second = page[page.index("FRB20990202B") :]
    assert "z not given, drawn from P(z|DM)" in second
    assert line(second, "left over (needs a redshift)")[-1] == "-"


def test_an_assessed_verdict_is_shown_with_its_reasons(ledgers):
    each = views(ledgers)[0]
    known = type(each)(**{**each.__dict__, "verdict": "check", "reasons": "one photometric redshift", "reach": 0.71})
    assert text.judged(known) == "reach 71%   verdict check (one photometric redshift)"


def test_a_halo_the_burst_sits_in_stands_outside_the_sum(ledgers):
    share = ledgers.entries["share"]
    share.mask[0] = True  # the cluster adds DM but has no share of the foreground
    page = printed(ledgers)
    assert line(page, "survey:cluster 7")[-4:] == ["130", "98.0", "to", "165"]
    assert page.index("sum of listed haloes") < page.index("at the source, apart:") < page.index("survey:cluster 7")


@pytest.mark.parametrize("width", [60, 72, 80, 100, 140])
def test_no_number_is_cut_at_any_width(ledgers, width):
    page = printed(ledgers, width)
    assert max(map(len, page.splitlines())) <= width
    assert line(page, "survey")[-5:] == ["130", "98.0", "to", "165", "81%"]
    left = line(page, "blended")
    assert "134" in (left[-1], left[-4])  # where there is room its interval follows


def test_many_bursts_get_a_line_each():
    page = printed(make(names=[f"FRB209901{i:02d}A" for i in range(13)]), width=120)
    assert page.count("FRB2099") == 13
    assert line(page, "FRB20990100A")[1:] == (
        ["0.4200", "612", "2.4", "160", "120", "to", "200", "104", "to", "160", "134", "survey:cluster", "7", "81%"]
    )
    assert "every halo and every note of every burst is in the tables there" in page


def test_names_of_largest_haloes_are_cut_only_as_far_as_needed():
    names = [f"FRB209901{i:02d}A" for i in range(13)]
    many = make(names=names, halo="a_survey_of_many_words:")
    assert "a_survey_of_many_words:cluster 7" in printed(many, 140)
    narrow = printed(many, 100)
    assert max(map(len, narrow.splitlines())) <= 100
    assert "a_survey_of_many_words:cluster 7" not in narrow
    assert "every halo and every note" in printed(many, folder=None)


def test_a_clean_sightline_says_so_without_a_table(ledgers):
    for name in ("dm_mean", "dm_p84"):
        ledgers.entries[name][:] = 0 * ledgers.entries[name].unit
    assert "model blended: no listed halo adds DM here (4 in the ledger)" in printed(ledgers)


def test_names_cannot_steer_the_screen():
    hostile = make(names=("[red]X[/red]", "a\x1b[31mb"), halo="[link=http://x]\u202e\x07:")
    page = printed(hostile)
    assert "[red]X[/red]" in page
    assert "[link=http://x]??:1183" in page
    assert "a?[31mb" in page
    assert "\x1b" not in page


def test_a_pipe_gets_no_colour_and_a_terminal_with_no_color_neither(ledgers, monkeypatch):
    class Terminal(io.StringIO):
        def isatty(self) -> bool:
            return True

    monkeypatch.setenv("TERM", "xterm-256color")
    monkeypatch.delenv("NO_COLOR", raising=False)
    coloured = Terminal()
    show(ledgers, console(coloured, 100))
    assert "\x1b[1m" in coloured.getvalue()  # so that the other half can fail
    assert "\x1b" not in printed(ledgers)
    monkeypatch.setenv("NO_COLOR", "1")
    plain = Terminal()
    show(ledgers, console(plain, 100))
    assert "\x1b[3" not in plain.getvalue().replace("\x1b[3m", "")  # bold and italic may stay, colours not


def test_notes_are_said_once_and_named_where_they_are_of_one_model(ledgers):
    page = printed(ledgers)
    assert "note: blended: outside the footprint of the survey" in page
    both = by_burst(views(ledgers))["FRB20990101A"]
    said = [type(v)(**{**v.__dict__, "note": "host by default; depth drawn"}) for v in both]
    assert burst_notes(said) == ["host by default; depth drawn"]


def test_notes_of_most_bursts_are_said_once_for_all():
    many = make(names=[f"b{i}" for i in range(5)])
    common = "host by default; law used beyond its redshifts for {} haloes"
    every = [
        replace(v, note=f"{common.format(v.burst[1])}; own of b2" if v.burst == "b2" else common.format(v.burst[1]))
        for v in views(many)
        if v.burst != "b4"
    ]
    every += [replace(v, note="") for v in views(many) if v.burst == "b4"]
    every = [replace(v, note=v.note + "; floor") if v.model == "blended" else v for v in every]
    bursts = by_burst(every)
    together, shared = shared_notes(bursts)
    assert together == [
        "host by default [all but b4]",
        "law used beyond its redshifts for 0 to 3 haloes [all but b4]",
        "blended: floor",
    ]
    assert burst_notes(bursts["b0"], shared) == []
    assert burst_notes(bursts["b2"], shared) == ["own of b2"]
    assert burst_notes(bursts["b4"], shared) == []


def test_a_note_of_a_model_in_one_burst_stays_with_that_burst(ledgers):
    bursts = by_burst(views(ledgers))
    together, shared = shared_notes(bursts)  # two bursts: nothing is worth a line of its own
    assert (together, shared) == ([], set())
    assert burst_notes(bursts["FRB20990101A"], shared) == ["blended: outside the footprint of the survey"]


def test_left_over_is_its_median_everywhere(ledgers):
    each = view(ledgers, "FRB20990101A")
    left = each.terms["dm_after_all"]
    assert text.dm(left.mean) != text.dm(left.p50)  # so that the rest can fail
    page = printed(ledgers)[: printed(ledgers).index("FRB20990202B")]
    assert "left over, median" in page
    said = [x for x in page.splitlines() if "left over" in x or x.strip().startswith("blended")]
    assert sum(text.dm(left.p50) in x.split() for x in said) == 2
    assert not any(text.dm(left.mean) in x.split() for x in said)
    assert f"<td>{text.dm(left.p50)}</td>" in html(ledgers)
    assert f"<td>{text.dm(left.mean)}</td>" not in html(ledgers)


def test_discs_and_haloes_at_the_source_are_terms_only_where_they_are_not_zero(ledgers):
    page = printed(ledgers)
    assert "discs of galaxies crossed" not in page
    assert "haloes at the source" not in page
    for name, value in {"mean": 7.0, "p16": 0.0, "p50": 5.0, "p84": 11.0}.items():
        for table in (ledgers.sightlines, ledgers.entries):
            column = table[f"dm_disc_crossing_{name}"]
            column[1] = value * column.unit
    for table in (ledgers.sightlines, ledgers.entries):
        table["model"][1] = "blended"
    ledgers.sightlines = ledgers.sightlines[1:]
    page = printed(ledgers)
    assert line(page, "discs of galaxies crossed")[-5:] == ["7.0", "0.0", "to", "11.0", "5.0"]
    assert "disc mean" in page
    assert line(page, "survey:1183")[-2:] == ["7.0", "15%"]


def test_a_halo_in_the_sum_that_holds_the_burst_is_named(ledgers):
    ledgers.entries["note"] = ["the burst sits in this halo: in the foreground sum, as asked"] + [""] * (
        len(ledgers.entries) - 1
    )
    assert "in the sum as asked, though the burst sits in it: survey:cluster 7" in " ".join(printed(ledgers).split())


def test_a_fixed_run_says_what_it_inverts_and_shows_no_intervals(ledgers):
    ledgers.run["options"] = {"fixed": True, "draws": 1, "hold": {"mw_disc": "0.5"}}
    page = " ".join(printed(ledgers).split())
    assert "moster2013 inverted without scatter or prior, which is too heavy at the massive end (by 0.5 dex" in page
    assert "held: mw_disc = 0.5 (scale)" in page
    for word in ("16 to 84", "mean", "median", "on average"):
        assert word not in page
    ledgers.run["options"]["hold"] = {"relation": "kravtsov2018"}
    page = " ".join(printed(ledgers).split())
    assert "kravtsov2018 inverted without scatter" in page
    assert "0.5 dex" not in page


def test_few_draws_and_held_nuisances_are_said_first(ledgers):
    ledgers.run["options"] = {"draws": 99, "hold": {"mw_halo": "yamasaki", "kept": "0.1"}}
    page = printed(ledgers)
    assert page.startswith("99 draws: intervals are rough.")
    assert "held: mw_halo = yamasaki (law), kept = 0.1 (dex)" in page
    ledgers.run["options"] = {"draws": 100, "hold": {}}
    assert "intervals are rough" not in printed(ledgers)


def test_words_for_nuisances_are_those_of_the_package():
    from haloledger.haloes.nuisances import FIXED_RELATION
    from haloledger.ledger.nuisances import NUISANCES

    assert set(text.HELD_UNIT) == set(NUISANCES)
    assert text.FIXED_RELATION == FIXED_RELATION


def test_a_mean_outside_its_interval_is_explained_once(ledgers):
    assert text.MEAN_OUTSIDE not in printed(ledgers)
    for name in ("dm_p16", "dm_p50", "dm_p84"):
        ledgers.entries[name][1] = 0 * ledgers.entries[name].unit  # the mean stays 24
    assert " ".join(printed(ledgers).split()).count(text.MEAN_OUTSIDE) == 1
    assert text.MEAN_OUTSIDE not in html(ledgers)  # it shows no entries
    ledgers.sightlines["dm_foreground_p84"][0] = 150 * ledgers.sightlines["dm_foreground_p84"].unit
    assert html(ledgers).count(text.MEAN_OUTSIDE) == 1


def test_long_names_run_over_lines_and_are_cut_in_the_id():
    assert wrapped("textbook-modified-nfw-wide", 12) == ["textbook-", "modified-", "nfw-wide"]
    assert wrapped("short", 12) == ["short"]
    assert wrapped("a" * 20, 8) == ["aaaaaaaa", "aaaaaaaa", "aaaa"]
    cut = wrapped("survey:" + "0123456789" * 20 + "end", 12)
    assert len(cut) == 3
    assert all(len(part) <= 12 for part in cut)
    assert cut[0].startswith("survey:")
    assert cut[-1].endswith("end")
    assert shorten("redmapper-sdss:RMJ123456.7+123456.7", 26) == "redmapper-sdss:RMJ12…456.7"
    assert shorten("redmapper-sdss:RMJ123456.7", 26) == "redmapper-sdss:RMJ123456.7"


def test_names_are_whole_where_there_is_room():
    long = make(halo="a_rather_long_survey_name:")
    assert "a_rather_long_survey_name:1183" in printed(long, 140)
    narrow = printed(long, 80)
    assert "…" not in narrow
    assert "1183" in narrow


@pytest.mark.parametrize(
    ("value", "shown"),
    [(np.nan, "-"), (-0.04, "0.0"), (12.34, "12.3"), (99.96, "100"), (-214.2, "-214"), (1234.5, "1234")],
)
def test_dm_as_text(value, shown):
    assert text.dm(value) == shown


def test_a_held_value_has_no_interval():
    assert not Spread(24.700000000000003, 24.7, 24.7, 24.7).spreads
    assert Spread(0.3, 0.0, 0.0, 0.0).spreads  # most draws miss: the interval says so
    assert not Spread(mean=3.0).spreads


def test_other_numbers_as_text():
    assert text.percent(0.004) == "<1%"
    assert text.percent(0.0) == "0%"
    assert text.redshift(0.31, "phot") == "0.3100 phot"
    assert text.redshift(np.nan, "phot") == "-"
    assert text.mass(Spread(p16=12.0, p50=12.2, p84=12.6)) == "12.2 ±0.3"
    assert text.mass(Spread(p16=12.19, p50=12.2, p84=12.21)) == "12.2 ±<0.1"
    assert text.mass(Spread(p16=12.23, p50=12.23, p84=12.23)) == "12.23"
    assert (text.counted(1, "halo", "haloes"), text.counted(2, "halo", "haloes")) == ("1 halo", "2 haloes")
    assert text.angle(0.3) == "0.3 arcsec"
    assert text.angle(7200) == "2 deg"


def test_view_of_an_unknown_name_names_the_nearest(ledgers):
    with pytest.raises(InputError, match=r"No burst 'FRB20990101B' in these ledgers\. Did you mean 'FRB20990101A'\?"):
        view(ledgers, "FRB20990101B")
    with pytest.raises(InputError, match=r"No model 'blendd' for FRB20990101A\. Did you mean 'blended'\?"):
        view(ledgers, "FRB20990101A", "blendd")


def test_notebook_is_escaped_and_short(ledgers):
    page = html(make(names=("<script>alert(1)</script>", "b&b"), halo='"><img src=x>'))
    assert "<script>" not in page
    assert "<img" not in page
    assert "&lt;script&gt;alert(1)&lt;/script&gt;" in page
    assert page.count("<tr>") == 5  # head, and two bursts with two models
    assert "1 row refused" in page
    assert "more rows" in html(make(names=[f"b{i}" for i in range(20)]))
