"""Names and notes are untrusted text: inert in pages, file names and the workbook of a real round."""

from __future__ import annotations

import json
import subprocess
import sys
from html.parser import HTMLParser
from pathlib import Path

import openpyxl
import pandas as pd
import pytest
from small_round import write_folder

from browser import opened
from foredeck.ledger.store import open_ledger

SCRIPT = "<script>document.title='broken'</script>"
UPWARDS = "../../../etc/x"
FORMULA = "=1+1"
NOTE = "=1+1 and <img src=x onerror=\"document.title='broken'\">"


class Elements(HTMLParser):
    """Collects what a page really holds: elements with their attributes, and its text."""

    def __init__(self) -> None:
        super().__init__()
        self.elements: list[tuple[str, dict[str, str | None]]] = []
        self.text: list[str] = []

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.elements.append((tag, dict(attrs)))

    def handle_data(self, data: str) -> None:
        self.text.append(data)


def read(page: Path) -> Elements:
    found = Elements()
    found.feed(page.read_text(encoding="utf-8"))
    return found


@pytest.fixture(scope="module")
def pack(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("hostile")
    settings = write_folder(folder)
    lines = (folder / "actuals.csv").read_text().splitlines()
    # two families renamed: the series are now called `<script>...</script>/x` and the like
    renamed = [line.replace("north,twine,", f"north,{SCRIPT},").replace("river,twine,", f"river,{UPWARDS},")
               .replace("river,peat,", f"river,{FORMULA},") for line in lines]
    (folder / "actuals.csv").write_text("\n".join(renamed) + "\n")
    (folder / "adjustments.csv").write_text(
        "scope,first,last,kind,size,reason,name,made_on\n"
        f'"north/{SCRIPT}",2027-07,2027-08,amount,5,"{NOTE.replace(chr(34), chr(34) * 2)}","=cmd()",2027-07-03\n')
    # a JSON string is a TOML string too
    reports = json.dumps([f"north/{SCRIPT}", f"river/{UPWARDS}"])
    text = settings.read_text().replace("workers = 1", f"workers = 1\nreports = {reports}")
    settings.write_text(text + '\n[adjustments]\nfile = "adjustments.csv"\n')
    done = subprocess.run([sys.executable, "-c", "from foredeck.cli.app import main; main()", "round"],
                          capture_output=True, text=True, check=False, cwd=folder)
    assert done.returncode == 0, done.stderr
    return folder / "pack" / "2027-06"


def test_every_file_lies_inside_the_pack_under_a_plain_name(pack: Path) -> None:
    names = [p.relative_to(pack.parent.parent).as_posix() for p in pack.parent.parent.rglob("*") if "pack" in p.parts]
    assert len([n for n in names if n.startswith("pack/2027-06/reports/") and n.endswith(".html")]) == 2
    assert all(set(n) <= set("abcdefghijklmnopqrstuvwxyz0123456789/._-") for n in names)
    assert all(n == "pack" or n.startswith("pack/2027-06") for n in names)


def test_names_and_notes_stand_in_pages_as_text(pack: Path) -> None:
    for page in [pack / "cover.html", *(pack / "reports").glob("*.html")]:
        found = read(page)
        scripts = [attrs for tag, attrs in found.elements if tag == "script"]
        assert all(attrs.get("src") in (None, "plotly.min.js") for attrs in scripts)
        assert not [attrs for _, attrs in found.elements if any(name.startswith("on") for name in attrs)]
        assert not [attrs for tag, attrs in found.elements if tag == "img"]
    report = next(p for p in (pack / "reports").glob("*.html") if "etc" not in p.name)
    words = "".join(read(report).text)
    assert f"north/{SCRIPT}" in words
    assert NOTE in words


def test_a_real_browser_runs_nothing_of_them(pack: Path) -> None:
    for page in [pack / "cover.html", *(pack / "reports").glob("*.html")]:
        with opened(page) as (tab, complaints):
            assert tab.title() != "broken"
            assert complaints == []


@pytest.mark.parametrize("width", [1280, 390])
def test_every_chart_is_drawn_and_no_page_scrolls_sideways(pack: Path, width: int) -> None:
    for page in [pack / "cover.html", *(pack / "reports").glob("*.html")]:
        with opened(page, width=width) as (tab, complaints):
            wanted = tab.locator("[data-chart]").count()
            drawn = "n => document.querySelectorAll('[data-chart] .main-svg .cartesianlayer').length >= n"
            tab.wait_for_function(drawn, arg=wanted)
            assert wanted >= 4 or page.name == "cover.html"
            assert tab.evaluate("document.documentElement.scrollWidth") <= width
            assert complaints == []


def test_without_script_every_sentence_and_table_is_there(pack: Path) -> None:
    page = next(p for p in (pack / "reports").glob("*.html") if "etc" not in p.name)
    with opened(page, script=False) as (tab, _):
        assert tab.locator("h1").inner_text().startswith("Expect about ")
        assert tab.locator("main table").count() >= 6
        assert tab.locator("[data-chart]").first.is_hidden()


def test_the_workbook_holds_them_as_text(pack: Path) -> None:
    book = openpyxl.load_workbook(pack / "forecasts.xlsx")
    cells = [cell for sheet in book for row in sheet.iter_rows() for cell in row if isinstance(cell.value, str)]
    assert {cell.data_type for cell in cells} == {"s"}
    assert all(cell.hyperlink is None for cell in cells)
    values = {cell.value for cell in cells}
    assert {f"river/{FORMULA}", f"north/{SCRIPT}", NOTE, "=cmd()"} <= values


def test_the_ledger_keeps_them_exactly(pack: Path) -> None:
    ledger = open_ledger(pack.parent.parent / "ledger")
    assert ledger.check() == []
    names = pd.unique(ledger.round("2027-06").table("forecasts")["series"])
    assert {f"north/{SCRIPT}", f"river/{UPWARDS}", f"river/{FORMULA}"} <= set(names)
