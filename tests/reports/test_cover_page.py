"""The cover's sections, read back from their HTML."""

from __future__ import annotations

import dataclasses
import json
import re
from html.parser import HTMLParser

import numpy as np
import pytest

from foredeck.assets import notebook_path
from foredeck.errors import ReportError
from foredeck.ledger.store import open_ledger
from foredeck.reports import cover_pictures, cover_totals
from foredeck.reports.cover_cells import address, shown_name, two_digits
from foredeck.reports.cover_page import cover_of, json_object, open_cover
from foredeck.reports.cover_totals import bar_reach
from foredeck.reports.execute import parameters_of, run_notebook
from foredeck.reports.export import export_html
from foredeck.review.changes import changes
from foredeck.review.watch import watch_list
from sample_round import HOSTILE, NOT_FORECAST, SEASONAL, TREND, sample_view


class _Page(HTMLParser):
    """Tables as lists of rows of text, and the addresses of links."""

    def __init__(self, html: str) -> None:
        super().__init__()
        self.tables: list[list[list[str]]] = []
        self.links: list[str] = []
        self.tags: list[str] = []
        self.inside = 0
        self.feed(html)
        self.close()

    def handle_starttag(self, tag, attrs):
        given = dict(attrs)
        self.tags.append(tag)
        if tag == "a":
            self.links.append(given["href"])
        if tag == "table":
            self.tables.append([])
        elif tag == "tr":
            self.tables[-1].append([])
        elif tag in ("td", "th"):
            self.tables[-1][-1].append("")
            self.inside += 1
        elif tag == "br" and self.inside:
            self.tables[-1][-1][-1] += " "

    def handle_endtag(self, tag):
        self.inside -= tag in ("td", "th")

    def handle_data(self, data):
        if self.inside:
            self.tables[-1][-1][-1] += data


def html_of(section):
    return "".join(part if isinstance(part, str) else part.html() for part in section.parts)


def text_of(section):
    return " ".join(re.sub(r"<[^>]+>", " ", html_of(section)).split())


def cover(view=None, **given):
    view = sample_view() if view is None else view
    before = None if view.previous is None else view.previous.adjusted
    return cover_of(view, watch=watch_list(view.tables, before),
                    changes=changes(view.tables["adjusted"], before), **given)


def with_table(view, **tables):
    return dataclasses.replace(view, tables={**view.tables, **tables})


def test_the_table_of_totals_holds_the_rounds_figures():
    page = _Page(html_of(cover().totals()))
    head, whole, north = page.tables[0][0], page.tables[0][1], page.tables[0][2]
    assert head == ["Total", "Nov 2025", "Last round", "Forecast", "Nine in ten", "Against last year",
                    "−30% last\u202fyear +30%"]
    assert whole[0] == "All 5 seriesAll"
    assert north[:6] == ["north", "1,445", "1,530", "1,590", "1,460–1,730", "+10%"]
    assert page.tags.count("svg") == 6
    assert [row[0] for row in page.tables[0][2:]] == ["north", "river", "../x", "bird_care", "compost",
                                                      "hand_tools", "watering"]


def test_windows_of_several_periods_stand_below_with_what_is_actual():
    rows = _Page(html_of(cover().totals())).tables[1]
    totals = sample_view().tables["totals"].query("scope == 'all'").set_index("window")
    assert [row[0] for row in rows] == ["Together", "Nov 2026 to Jan 2027To Jan 2027",
                                        "Year Jan 2026 to Dec 2026Year to Dec 2026"]
    assert rows[2][1] == f"{totals.at['year', 'actual_to_date']:,.0f}"


def test_a_first_round_has_no_column_of_the_last_one():
    head = _Page(html_of(cover(sample_view(previous=False)).totals())).tables[0][0]
    assert "Last round" not in head


def test_bars_hold_every_forecast_and_grow_in_steps():
    totals = list(cover().facts.totals)
    assert max(total.against for total in totals if np.isfinite(total.against)) < bar_reach(totals) == 0.3
    assert bar_reach([]) == 0.05


def test_of_long_groups_the_largest_totals_are_shown_and_the_rest_counted(monkeypatch):
    monkeypatch.setattr(cover_totals, "MOST_MEMBERS", 2)
    section = cover().totals()
    assert [row[0] for row in _Page(html_of(section)).tables[0][2:]] == ["north", "river", "compost", "bird_care"]
    assert "Of 5 totals by family the 2 largest are shown" in text_of(section)


def test_totals_over_different_units_are_refused_in_words():
    view = sample_view()
    series = view.tables["series"].copy()
    series.loc[series["series"] == TREND, "unit"] = "beds"
    section = cover(with_table(view, series=series)).totals()
    assert text_of(section) == "The series count different things (beds and cases), so nothing is added up."


def test_the_watch_list_keeps_its_ranks_and_leads_to_reports():
    page = cover()
    read = _Page(html_of(page.watch_list()))
    assert [row[0] for row in read.tables[0][1:]] == [f"{k}{name}" for k, name in
                                                      zip(page.watch["rank"], page.watch["series"], strict=True)]
    assert read.links == [page.view.links[name] for name in page.watch["series"]]
    assert read.tables[0][1][2] == page.watch["reasons"][0]


def test_an_empty_watch_list_says_so():
    page = cover()
    quiet = dataclasses.replace(page, watch=page.watch.iloc[:0])
    assert text_of(quiet.watch_list()) == "No series stands out in this round."


def test_changes_show_both_figures_and_their_difference():
    rows = _Page(html_of(cover().moves())).tables[0]
    assert rows[0] == ["Series", "Last round", "Now", "Change", "Because"]
    assert rows[1] == [SEASONAL, "930", "990", "+60", "October came above what was said; adjustment +40"]
    for _, before, now, change, _ in rows[1:]:
        shown = float(now.replace(",", "")) - float(before.replace(",", ""))
        assert float(change.replace("−", "-")) == pytest.approx(shown)


def test_a_first_round_has_nothing_to_compare_with():
    section = cover(sample_view(previous=False)).moves()
    assert text_of(section) == "This is the first round: there is nothing earlier to compare with."


def test_series_outside_their_range_are_listed_with_their_side():
    view = sample_view()
    actuals = view.tables["actuals"].copy()
    last = actuals["period"] == "2026-10"
    actuals.loc[last & (actuals["series"] == SEASONAL), "raw"] = 5000.0
    actuals.loc[last & (actuals["series"] == TREND), "raw"] = 1.0
    rows = _Page(html_of(cover(with_table(view, actuals=actuals)).turned_out())).tables[0]
    assert {(row[0], row[1], row[5]) for row in rows[1:]} == {(SEASONAL, "5,000", "above"), (TREND, "1", "below")}


def test_every_series_has_a_picture_that_leads_to_its_report():
    page = cover()
    read = _Page(html_of(page.all_series()))
    assert read.tags.count("svg") == 6
    assert sorted(read.links) == sorted(page.view.links.values())
    assert [row[0] for row in read.tables[0]] == ["family", "bird_care", "compost", "seeds", "hand_tools",
                                                  "watering", "../x"]
    assert read.tables[0][0][1:] == ["north", "river"]
    assert read.tables[0][1][1] == f"{TREND}: 603 +11%watch 1"


def test_a_picture_without_report_has_no_link():
    view = dataclasses.replace(sample_view(), links={})
    assert _Page(html_of(cover(view).all_series())).links == []


@pytest.mark.parametrize("change", ["one group", "same place", "many across"])
def test_groups_that_make_no_table_give_a_flat_list(change, monkeypatch):
    view = sample_view()
    series, totals = view.tables["series"], view.tables["totals"]
    if change == "one group":
        series, totals = series.drop(columns="family"), totals[totals["scope"] != "family"]
    elif change == "same place":
        series = series.assign(depot="north", family="seeds")
    else:
        monkeypatch.setattr(cover_pictures, "MOST_COLUMNS", 1)
    html = html_of(cover(with_table(view, series=series, totals=totals)).all_series())
    assert html.count("<li>") == 6
    assert "<table" not in html


def test_of_very_many_series_the_watched_and_the_largest_have_pictures(monkeypatch):
    monkeypatch.setattr(cover_pictures, "MOST_PICTURES", 5)
    monkeypatch.setattr(cover_pictures, "PICTURES_OF_MANY", 3)
    page = cover()
    section = page.all_series()
    # By value of the next period: compost 990 x 6.50 and bird_care 603 x 12 lead, whatever the watch list adds.
    assert set(page.watch["series"]) == {TREND, "river/watering"}
    assert sorted(_Page(html_of(section)).links) == sorted(page.view.links[name] for name in
                                                           (TREND, SEASONAL, "river/watering"))
    assert "3 of 6 series have a picture: those of the watch list and the largest." in text_of(section)


def test_series_without_forecast_and_failed_reports_give_their_reasons():
    page = cover(failed={SEASONAL: "the kernel died"})
    assert _Page(html_of(page.not_forecast())).tables[0][1] == [
        NOT_FORECAST, "not forecast", "2 periods are too few: at least 3 are needed"]
    assert _Page(html_of(page.failed_reports())).tables[0][1] == [SEASONAL, "the kernel died"]
    assert cover().failed_reports() is None


def test_contents_are_links_inside_the_pack():
    page = cover(contents={"forecasts.xlsx": "Workbook", "javascript:alert(1)": "<b>"})
    read = _Page(html_of(page.in_this_pack()))
    assert read.links == ["forecasts.xlsx", "javascript%3Aalert%281%29"]
    assert "b" not in read.tags


@pytest.mark.parametrize(("href", "written"), [
    ("reports/north--compost.html", "reports/north--compost.html"), ("//x.example/a", "x.example/a"),
    ("https://x.example/a", "https%3A//x.example/a"), ('a"onclick="b', "a%22onclick%3D%22b"),
    ("a b?c#d", "a%20b%3Fc#d")])
def test_addresses_stay_inside_the_pack(href, written):
    assert address(href) == written


def test_hostile_names_are_text_everywhere_on_the_page():
    view = sample_view()
    swap = {"series": {SEASONAL: '"><img src=x onerror=alert(1)>\n' + "y" * 500}}
    tables = {name: table.replace(swap) if "series" in table else table for name, table in view.tables.items()}
    tables["series"] = tables["series"].rename(columns={"depot": "<script>"})
    tables["totals"] = tables["totals"].replace({"scope": {"depot": "<script>"}})
    old = dataclasses.replace(view.previous, adjusted=view.previous.adjusted.replace(swap))
    page = cover(dataclasses.replace(view, tables=tables, previous=old, title="<script>alert(1)</script>"),
                 failed={HOSTILE: "<script>alert(2)</script>"})
    html = page.head().html() + "".join(map(html_of, page.sections()))
    tags = set(_Page(html).tags)
    assert not tags & {"script", "img", "iframe", "style"}
    assert "&lt;script&gt;alert(1)" in html
    assert "&lt;script&gt;alert(2)" in html
    assert html.count("&lt;img src=x onerror=alert(1)&gt;") >= 3
    assert "y" * 100 not in html


def test_long_names_are_cut_in_their_middle():
    assert shown_name("a" * 90) == "a" * 90
    cut = shown_name("start" + "x" * 500 + "end")
    assert (len(cut), cut[:5], cut[-3:]) == (90, "start", "end")
    assert shown_name("two\nlines\x00here") == "two lines here"


def test_a_late_revised_agreed_round_says_so():
    view = sample_view()
    made = {**view.made, "revision": 2, "reason": "the river file was missing.", "agreed_by": "R. Lindqvist",
            "agreed_at": "2026-12-02T10:00:00", "late": True}
    head = cover(dataclasses.replace(view, made=made, state="agreed")).head()
    assert head.kick[2] == "Agreed by R. Lindqvist, 2026-12-02"
    assert "Revision 2: the river file was missing." in head.html()
    assert "Agreed after its first month had closed, so that month is not scored." in head.html()


def test_values_at_stake_keep_two_digits():
    assert [two_digits(v) for v in (1944.0, 0.0377, 0.0, 12.0)] == [1900.0, pytest.approx(0.038), 0.0, 12.0]


@pytest.mark.parametrize("frequency", ["yearly", "quarterly", "weekly"])
def test_every_frequency_makes_every_section(frequency):
    page = cover(sample_view(frequency=frequency, horizon=3))
    assert [section.id for section in page.sections()] == [
        "totals", "watch", "moves", "turned-out", "all", "not-forecast", "pack", "made"]


def test_a_round_in_which_nothing_could_be_forecast_still_has_a_cover():
    view = sample_view(previous=False)
    series = view.tables["series"].assign(status="not forecast", reason="too short")
    empty = {name: view.tables[name].iloc[:0] for name in ("forecasts", "adjusted", "reliability", "totals",
                                                           "adjustments", "members", "error_table", "findings")}
    page = cover(with_table(view, series=series, **empty))
    assert text_of(page.totals()) == "No series could be forecast, so there are no totals."
    assert text_of(page.all_series()).count("not forecast") == 6


def test_objects_come_as_text_or_from_a_file(tmp_path):
    assert json_object('{"a": "b"}', "links") == {"a": "b"}
    assert json_object("", "links") == {}
    (tmp_path / "links.json").write_text('{"ä": "b"}', encoding="utf-8")
    assert json_object(str(tmp_path / "links.json"), "links") == {"ä": "b"}


def test_what_is_no_object_of_texts_is_refused():
    with pytest.raises(ReportError) as caught:
        json_object('{"a": 1}', "links")
    assert str(caught.value) == (
        "the parameter 'links' cannot be read: it is not an object of texts\n  where: {\"a\": 1}\n"
        '  allowed: a JSON object such as {"north/compost": "reports/north--compost.html"}, or the path of a '
        "file that holds one\n  next: give one of these")
    for text in ("[1]", "{", "no_such_file.json"):
        with pytest.raises(ReportError, match="the parameter 'failed' cannot be read"):
            json_object(text, "failed")


def test_the_notebook_takes_the_parameters_of_a_round():
    assert set(parameters_of(notebook_path("pack_cover"))) == {"ledger", "round", "links", "failed", "contents"}


@pytest.fixture(scope="module")
def packed(tmp_path_factory):
    """The sample round in a ledger, and its cover as the notebook and the template make it."""
    folder = tmp_path_factory.mktemp("pack")
    view = sample_view()
    ledger = open_ledger(folder / "ledger", create=True)
    ledger.record(view.round, view.tables, dict(view.portfolio), {**view.made, "title": view.title}, "")
    ledger.issue(view.round)
    run_notebook(notebook_path("pack_cover"), folder / "cover.ipynb", {
        "ledger": str(folder / "ledger"), "round": view.round, "links": json.dumps(dict(view.links)),
        "failed": json.dumps({HOSTILE: "the kernel died"}), "contents": '{"forecasts.xlsx": "Workbook"}'})
    facts = export_html(folder / "cover.ipynb", folder / "cover.html", "foredeck-cover", "beside")
    return folder, facts


def test_the_notebook_makes_a_whole_cover_from_a_ledger(packed):
    folder, facts = packed
    html = (folder / "cover.html").read_text(encoding="utf-8")
    assert (facts.charts, facts.empty, facts.headings) == ([], [], 1)
    assert facts.anchors == ["main", "totals", "watch", "moves", "turned-out", "all", "not-forecast", "failed", "pack",
                             "made"]
    assert "<h1>November should bring about 2,080 cases: like for like 8% more than last year.</h1>" in html
    assert ".totals td.bar" in html
    assert "Last three totals of the example" not in html


def test_the_cover_asks_nothing_of_the_network_and_runs_no_script(packed):
    folder, facts = packed
    html = (folder / "cover.html").read_text(encoding="utf-8")
    assert facts.outside == []
    assert "<script" not in html
    links = [link for link in _Page(html).links if not link.startswith("#")]
    assert set(links) == {*(f"reports/series-{k}.html" for k in range(6)), "forecasts.xlsx"}


def test_the_same_notebook_gives_the_same_page(packed):
    folder, _ = packed
    export_html(folder / "cover.ipynb", folder / "again.html", "foredeck-cover", "beside")
    assert (folder / "again.html").read_bytes() == (folder / "cover.html").read_bytes()


def test_an_empty_ledger_is_refused(tmp_path):
    open_ledger(tmp_path / "ledger", create=True)
    with pytest.raises(ReportError) as caught:
        open_cover(str(tmp_path / "ledger"))
    assert str(caught.value) == (f"the ledger holds no round\n  where: {tmp_path / 'ledger'}\n"
                                 "  allowed: a ledger with a round\n  next: run foredeck round first")


def test_a_round_that_moved_nothing_says_so():
    view = sample_view()
    page = dataclasses.replace(cover(view), changes=changes(view.tables["adjusted"], view.tables["adjusted"]))
    assert text_of(page.moves()) == "No forecast for November has moved since round 2026-09."


def test_groups_whose_sums_were_off_in_one_direction_are_named_and_others_are_not():
    view = sample_view()
    totals = view.tables["totals"].copy()
    totals["past_bias"] = 0.01 * totals["baseline"]
    assert "in one direction" not in text_of(cover(with_table(view, totals=totals)).totals())
    off = (totals["scope"] == "depot") & (totals["member"] == "north")
    totals.loc[off, "past_bias"] = -0.06 * totals.loc[off, "baseline"]
    assert text_of(cover(with_table(view, totals=totals)).totals()).endswith(
        "Past forecasts of such sums (Nov 2026 to Jan 2027 in this round) were off in one direction on average: "
        "north 6% too high.")
