"""From an executed notebook to a page: nothing lost, nothing fetched, the same bytes again."""

from __future__ import annotations

import re
import subprocess
import sys

import nbformat
import pytest
from nbformat.v4 import new_code_cell, new_markdown_cell, new_notebook, new_output

from foredeck.assets import template_folder
from foredeck.charts.figure import PLOTLY
from foredeck.errors import ReportError
from foredeck.reports import series_page as page
from foredeck.reports.export import export_html, put_plotly_beside
from sample_round import HOSTILE, NAMES, SEASONAL, sample_study

CHARTS = ["outlook-data", "trust-data", "last-time-data", "season-data", "members-data", "weights-data"]


def cell(source, shown=None, tags=()):
    outputs = [] if shown is None else [new_output("display_data", data=d, metadata=m) for d, m in shown.outputs()]
    made = new_code_cell(source, outputs=outputs, metadata={"tags": list(tags)})
    made["id"] = re.sub(r"\W", "-", source)[:60]
    return made


def executed(study, *more):
    """The report notebook of a study as it is after running, without a kernel."""
    cells = [cell("parameters = 1", tags=["parameters"]), cell("secret = 2", tags=["injected-parameters"]),
             cell("page.head(study)", page.head(study, ("All series", "../cover.html")), ["hide_input"])]
    cells += [cell(f"page.{make.__name__}(study)", make(study), ["remove-input"]) for make in page.SECTIONS]
    return new_notebook(cells=[*cells, *more])


@pytest.fixture
def write(tmp_path):
    def write(nb, name="out.ipynb"):
        nbformat.write(nb, tmp_path / name)
        return tmp_path / name

    return write


@pytest.mark.parametrize("name", NAMES)
def test_every_report_is_whole(name, write, tmp_path):
    study = sample_study(name)
    facts = export_html(write(executed(study)), tmp_path / "page.html", plotly_js="beside")
    html = (tmp_path / "page.html").read_text(encoding="utf-8")
    assert re.match(r'<!DOCTYPE html>\s*<html lang="en">', html)
    assert facts.headings == 1
    assert (facts.outside, facts.empty) == ([], [])
    assert '<a class="skip" href="#main">' in html
    for tag in ("<header", "<main", "<footer", "<nav"):
        assert tag in html
    assert "parameters = 1" not in html
    assert "secret" not in html
    assert "(study)" not in html
    assert 'href="../cover.html"' in html


def test_charts_are_all_there_with_their_data_their_words_and_their_numbers(write, tmp_path):
    facts = export_html(write(executed(sample_study(SEASONAL))), tmp_path / "page.html", plotly_js="beside")
    html = (tmp_path / "page.html").read_text(encoding="utf-8")
    assert facts.charts == CHARTS
    for name in CHARTS:
        assert html.count(f'data-chart="{name}"') == html.count(f'id="{name}"') == 1
    assert len(re.findall(r'<div aria-label="[^"]{40,}" class="(?:chart|picture)"[^>]* role="img"', html)) == 7
    assert html.count("<summary>The numbers behind this chart</summary>") == len(CHARTS)
    assert '<script src="plotly.min.js"></script>' in html


def test_contents_name_every_section_and_lead_to_it(write, tmp_path):
    export_html(write(executed(sample_study(SEASONAL))), tmp_path / "page.html", plotly_js="beside")
    html = (tmp_path / "page.html").read_text(encoding="utf-8")
    links = re.findall(r'<a href="#([^"]+)">', html.split("<nav", 1)[1].split("</nav", 1)[0])
    assert links == re.findall(r'<section[^>]* id="([^"]+)"', html)
    assert links[0] == "outlook"


def test_the_same_notebook_gives_the_same_bytes(write, tmp_path):
    source = write(executed(sample_study(SEASONAL)))
    pages = []
    for name in ("a.html", "b.html"):
        export_html(source, tmp_path / name, plotly_js="beside")
        pages.append((tmp_path / name).read_bytes())
    assert pages[0] == pages[1]


def test_a_hostile_name_is_inert_in_title_body_and_printed_head(write, tmp_path):
    export_html(write(executed(sample_study(HOSTILE))), tmp_path / "page.html", plotly_js="beside")
    html = (tmp_path / "page.html").read_text(encoding="utf-8")
    assert "<script>alert" not in html
    assert "<title>&lt;script&gt;alert(1)&lt;/script&gt;/../x: forecast report" in html
    assert r"\3c script\3e alert\28 1\29 \3c \2f script\3e \2f ..\2f x: monthly cases" in html


def test_plotly_stands_inside_for_a_single_file_and_beside_for_a_pack(write, tmp_path):
    source = write(executed(sample_study(SEASONAL)))
    export_html(source, tmp_path / "one.html")
    assert (tmp_path / "one.html").stat().st_size > 4_000_000
    beside = put_plotly_beside(tmp_path)
    assert beside.name == "plotly.min.js"
    assert "</script" not in beside.read_text(encoding="utf-8")


def test_a_page_without_charts_carries_no_plotly(write, tmp_path):
    nb = new_notebook(cells=[new_markdown_cell("# Title\n\nwords")])
    export_html(write(nb), tmp_path / "page.html")
    assert (tmp_path / "page.html").stat().st_size < 60_000


def test_the_notebook_on_disk_keeps_its_cells(write, tmp_path):
    source = write(executed(sample_study(SEASONAL)))
    before = source.read_bytes()
    export_html(source, tmp_path / "page.html", plotly_js="beside")
    assert source.read_bytes() == before


def test_markdown_headings_make_the_sections_of_a_plain_notebook_and_its_code_shows(write, tmp_path):
    frame = new_output("execute_result", data={"text/html": "<table><tr><td>7</td></tr></table>"}, execution_count=1)
    nb = new_notebook(cells=[
        new_markdown_cell("# Exploring\n\nwords"), new_markdown_cell("## Read <b>\n\nWhat it is.", id="read"),
        new_code_cell("6 + 1 < 9", outputs=[frame]), new_markdown_cell("## Next\n\nmore", id="next"),
        new_code_cell("not_shown", metadata={"tags": ["remove_cell"]})])
    export_html(write(nb), tmp_path / "page.html")
    html = (tmp_path / "page.html").read_text(encoding="utf-8")
    assert "<title>Exploring</title>" in html
    assert re.findall(r'<section[^>]* id="([^"]+)"', html) == ["section-read", "section-next"]
    assert "Read &lt;b&gt;</h2>" in html
    assert "<code>6 + 1 &lt; 9</code>" in html
    assert "not_shown" not in html
    assert 'tabindex="0"' in html


@pytest.mark.parametrize(("change", "message"), [
    (lambda nb: nb.cells[4].metadata.tags.append("remove_cell"), "the notebook displayed 6 charts, the page holds 5"),
    (lambda nb: nb.cells[4].metadata.tags.append("remove-output"), "the notebook displayed 6 charts, the page holds 5"),
])
def test_a_chart_lost_by_a_tag_stops_the_export(change, message, write, tmp_path):
    nb = executed(sample_study(SEASONAL))
    assert nb.cells[4].source == "page.outlook(study)"
    change(nb)
    with pytest.raises(ReportError, match=message):
        export_html(write(nb), tmp_path / "page.html", plotly_js="beside")
    assert not (tmp_path / "page.html").exists()


def test_a_plotly_figure_that_a_page_cannot_show_is_refused(write, tmp_path):
    foreign = new_output("display_data", data={PLOTLY: {"data": [], "layout": {}}})
    nb = new_notebook(cells=[new_markdown_cell("# T"), new_code_cell("figure", outputs=[foreign])])
    with pytest.raises(ReportError) as caught:
        export_html(write(nb), tmp_path / "page.html")
    assert str(caught.value) == ("a plotly figure is displayed that a page cannot show\n"
                                 "  where: out\n"
                                 "  allowed: charts made by foredeck.charts\n"
                                 "  next: wrap its data and layout in foredeck.charts.Figure")


def test_outside_addresses_and_empty_sections_stop_the_export(write, tmp_path):
    image = new_output("display_data", data={"text/html": '<img alt="" src="https://example.org/x.png">'})
    nb = new_notebook(cells=[new_markdown_cell("# T"), new_code_cell("x", outputs=[image])])
    with pytest.raises(ReportError, match=r'the page would fetch <img src="https://example\.org/x\.png">'):
        export_html(write(nb), tmp_path / "page.html")
    with pytest.raises(ReportError, match="the section 'section-e' holds nothing"):
        export_html(write(new_notebook(cells=[new_markdown_cell("# T"), new_markdown_cell("## Empty", id="e")])),
                    tmp_path / "page.html")


def test_a_failed_notebook_is_never_exported_and_an_old_page_stays(write, tmp_path):
    (tmp_path / "page.html").write_text("old", encoding="utf-8")
    error = new_output("error", ename="ValueError", evalue="no", traceback=["x"])
    nb = new_notebook(cells=[new_markdown_cell("# T"), new_code_cell("x", outputs=[error])])
    with pytest.raises(ReportError) as caught:
        export_html(write(nb), tmp_path / "page.html")
    assert str(caught.value) == ("cell 2 of the notebook failed: ValueError: no\n"
                                 "  where: out\n"
                                 "  allowed: notebooks whose every cell ran\n"
                                 "  next: mend the cause and run the notebook again")
    assert (tmp_path / "page.html").read_text(encoding="utf-8") == "old"


def test_stock_nbconvert_makes_the_same_page(write, tmp_path):
    source = write(executed(sample_study(SEASONAL)))
    command = [sys.executable, "-m", "jupyter", "nbconvert", "--to", "html", "--template", "foredeck-report",
               f"--TemplateExporter.extra_template_basedirs={template_folder()}", "--FinishPage.plotly_js=beside",
               "--output", "stock.html", str(source)]
    done = subprocess.run(command, capture_output=True, text=True, check=False, timeout=120)
    assert done.returncode == 0, done.stderr
    export_html(source, tmp_path / "ours.html", plotly_js="beside")
    assert (tmp_path / "stock.html").read_bytes() == (tmp_path / "ours.html").read_bytes()
