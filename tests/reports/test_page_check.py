"""What a page is refused for."""

from __future__ import annotations

import pytest

from foredeck.errors import ReportError
from foredeck.reports.page_check import check_page, is_outside, read_page

GOOD = ('<body><h1>T</h1><a href="#a">A</a><section id="a"><header><h2>A</h2></header><p>text</p>'
        '<div data-chart="c-data"></div></section></body>')


def refused(html, charts=("c-data",), **options):
    with pytest.raises(ReportError) as caught:
        check_page(html, charts, "page.html", **options)
    return str(caught.value)


def test_a_good_page_passes_and_is_described():
    facts = check_page(GOOD, ["c-data"])
    assert (facts.charts, facts.headings, facts.empty, facts.outside) == (["c-data"], 1, [], [])


def test_a_chart_that_is_missing_is_told_with_its_name():
    assert refused(GOOD.replace(' data-chart="c-data"', "")) == (
        "the notebook displayed 1 charts, the page holds 0\n"
        "  where: page.html\n"
        "  allowed: exactly the charts displayed: c-data\n"
        "  next: show charts with foredeck.charts, each with an id of its own, in cells that are not removed")


def test_a_chart_too_many_is_told():
    assert refused(GOOD, charts=()).startswith("the notebook displayed 0 charts, the page holds 1")


@pytest.mark.parametrize("part", [
    '<script src="https://example.org/x.js"></script>', '<link rel="stylesheet" href="//example.org/x.css">',
    '<img alt="" src=" HTTP://example.org/x.png">', '<img alt="" srcset="a.png, https://example.org/b.png 2x">',
    "<style>@import 'https://example.org/x.css';</style>", '<p style="background:url(https://example.org/x)">x</p>',
    '<style>p{background:url("//example.org/x")}</style>', '<iframe src="file:///etc/passwd"></iframe>',
])
def test_a_page_that_would_fetch_from_outside_is_refused(part):
    assert refused(GOOD.replace("<p>", part + "<p>")).startswith("the page would fetch ")


@pytest.mark.parametrize(("address", "outside"), [
    ("plotly.min.js", False), ("../cover.html", False), ("data:image/png;base64,AA", False), ("#a", False),
    ("https://a.b", True), ("//a.b", True), ("/etc/x", True), ("file:///x", True), ("javascript:alert(1)", True),
])
def test_addresses_in_the_pages_folder_and_data_are_inside(address, outside):
    assert is_outside(address) is outside


def test_links_that_a_reader_follows_are_no_requests():
    check_page(GOOD.replace("<p>", '<p><a href="https://example.org">x</a>'), ["c-data"])


def test_an_empty_section_is_refused_and_its_heading_is_no_content():
    html = GOOD.replace("<p>text</p>", "<p> </p>")
    assert refused(html) == ("the section 'a' holds nothing\n"
                             "  where: page.html\n"
                             "  allowed: sections with text, a chart or a table\n"
                             "  next: give the section content, or leave it out")


def test_scripts_and_styles_are_no_content_but_a_picture_is():
    script = GOOD.replace("<p>text</p>", "<script>var a;</script><style>p{}</style>")
    assert read_page(script).empty == ["a"]
    assert read_page(GOOD.replace("<p>text</p>", '<img alt="x" src="x.png">')).empty == []


def test_ids_are_unique_anchors_lead_somewhere_and_there_is_one_main_heading():
    assert refused(GOOD.replace("<p>", '<p id="a">')).startswith("the id 'a' stands twice in the page")
    assert refused(GOOD.replace("#a", "#b")).startswith("the link #b leads nowhere")
    assert refused(GOOD.replace("<p>", "<h1>U</h1><p>")).startswith("the page has 2 main headings (h1)")
    check_page(GOOD.replace("<h1>T</h1>", ""), ["c-data"], whole=False)
