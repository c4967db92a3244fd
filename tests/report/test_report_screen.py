"""What is printed: numbers are those of the tables, names stay data, nothing unknown looks like a result."""

import io

import numpy as np
import pytest
from synthetic import ledgers as make

from haloledger.errors import InputError
from haloledger.report import text
from haloledger.report.notebook import html
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
    assert line(page, "strong-feedback")[-6:] == ["104", "78.0", "to", "130", "104", "190"]
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
    from haloledger.ledger.budget import TERMS

    # what is left and the sums of other terms are not terms of their own
    derived = {"dm_cosmic_mean_z", "dm_cosmic_with_foreground", "dm_after_mw_foreground", "dm_after_all"}
    assert set(BUDGET) == set(TERMS) - derived


def test_what_is_not_assessed_is_a_dash(ledgers):
    page = printed(ledgers)
    assert "reach -   controls -   verdict -   (not assessed)" in page
    assert "nan" not in page.lower().replace("unnamed", "")
    second = page[page.index("FRB20990202B") :]
    assert "z not given, drawn from P(z|DM)" in second
    assert line(second, "left over (needs a redshift)")[-1] == "-"


def test_an_assessed_verdict_is_shown_with_its_reasons(ledgers):
    each = views(ledgers)[0]
    known = type(each)(**{**each.__dict__, "verdict": "check", "reasons": "one photometric redshift", "reach": 0.71})
    assert text.judged(known) == "reach 71%   controls -   verdict check (one photometric redshift)"


def test_a_halo_the_burst_sits_in_stands_outside_the_sum(ledgers):
    share = ledgers.entries["share"]
    share.mask[0] = True  # the cluster adds DM but has no share of the foreground
    page = printed(ledgers)
    assert line(page, "survey:cluster 7")[-6:] == ["130", "98.0", "to", "165", "at", "source"]
    assert page.index("sum of listed haloes") < page.index("survey:cluster 7")


@pytest.mark.parametrize("width", [72, 80, 100, 140])
def test_no_number_is_cut_at_any_width(ledgers, width):
    page = printed(ledgers, width)
    assert max(map(len, page.splitlines())) <= width
    assert line(page, "survey")[-5:] == ["130", "98.0", "to", "165", "81%"]
    assert line(page, "blended")[-1] == "134"


def test_many_bursts_get_a_line_each():
    page = printed(make(names=[f"FRB209901{i:02d}A" for i in range(13)]), width=120)
    assert page.count("FRB2099") == 13
    assert line(page, "FRB20990100A")[1:] == (
        ["0.4200", "612", "2.4", "160", "120", "to", "200", "104", "to", "160", "134", "survey:cluster", "7", "81%"]
    )
    assert "every halo of every burst is in the table entries there" in page


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
    assert text.notes(said) == ["host by default; depth drawn"]


@pytest.mark.parametrize(
    ("value", "shown"),
    [(np.nan, "-"), (-0.04, "0.0"), (12.34, "12.3"), (99.96, "100"), (-214.2, "-214"), (1234.5, "1234")],
)
def test_dm_as_text(value, shown):
    assert text.dm(value) == shown


def test_other_numbers_as_text():
    assert text.percent(0.004) == "<1%"
    assert text.percent(0.0) == "0%"
    assert text.redshift(0.31, "phot") == "0.3100 phot"
    assert text.redshift(np.nan, "phot") == "-"
    assert text.mass(Spread(p16=12.0, p50=12.2, p84=12.6)) == "12.2 ±0.3"
    assert text.mass(Spread(p16=12.2, p50=12.2, p84=12.2)) == "12.2"
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
