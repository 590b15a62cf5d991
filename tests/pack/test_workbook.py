"""The workbook, read back with openpyxl: real tables, inert text, the numbers of the round."""

from __future__ import annotations

import dataclasses
import warnings
from pathlib import Path

import numpy as np
import openpyxl
import pandas as pd
import pytest

from foredeck.pack import workbook as module
from foredeck.pack.sheets import reliability_table
from foredeck.pack.workbook import MOST_LETTERS, write_workbook
from sample_round import HOSTILE, NOT_FORECAST, SEASONAL, sample_view

SHEETS = ["Forecasts", "Totals", "Actuals", "Findings", "Adjustments", "Watch list", "Reliability",
          "Not forecast", "About"]
FORMULAS = ["=1+1", "+cmd|' /C calc'!A0", "-2+3", "@SUM(A1)", "=HYPERLINK(\"http://x.example\",\"x\")",
            "{=1+1}", "http://x.example/", "mailto:a@x.example", "internal:Sheet1!A1", "\t=1+1", "0042"]


def watch_of(names: list[str], reasons: list[str]) -> pd.DataFrame:
    return pd.DataFrame({"rank": range(1, len(names) + 1), "series": pd.Series(names, dtype=object),
                         "value_at_stake": 1900.0, "reasons": reasons, "ask": "Was stock short?"})


def read(path: Path) -> openpyxl.Workbook:
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", DeprecationWarning)  # openpyxl's own, not about the file
        return openpyxl.load_workbook(path)


def column(sheet: object, head: str) -> list[object]:
    heads = [cell.value for cell in sheet[1]]
    return [row[heads.index(head)] for row in sheet.iter_rows(min_row=2)]


@pytest.fixture(scope="module")
def view():
    return sample_view()


@pytest.fixture(scope="module")
def book(view, tmp_path_factory):
    path = tmp_path_factory.mktemp("pack") / "round.xlsx"
    watch = watch_of([SEASONAL, HOSTILE], ["October came to 359.", "=1+1"])
    return read(write_workbook(path, view, watch=watch, cautions=["Ranges do not add."]))


def test_every_sheet_is_one_excel_table_with_frozen_head(book):
    assert book.sheetnames == SHEETS
    for sheet in book:
        (table,) = sheet.tables.values()
        assert table.ref.startswith("A1:")
        assert [c.name for c in table.tableColumns] == [str(cell.value) for cell in sheet[1]]
        assert sheet.freeze_panes is not None
        assert sheet.freeze_panes.endswith("2")


def test_forecasts_hold_each_figure_of_the_round_unrounded(book, view):
    sheet = book["Forecasts"]
    assert [cell.value for cell in sheet[1]] == [
        "Series", "depot", "family", "Unit", "Period", "Lead", "Baseline", "Adjustment", "Adjusted",
        "Lower 50", "Upper 50", "Lower 90", "Upper 90"]
    expected = view.tables["adjusted"].sort_values(["series", "lead"], kind="stable")
    assert [cell.value for cell in column(sheet, "Series")] == expected["series"].tolist()
    for head, name in (("Baseline", "baseline"), ("Adjusted", "adjusted"), ("Upper 90", "upper_90")):
        values = [cell.value for cell in column(sheet, head)]
        np.testing.assert_allclose(values, expected[name], rtol=1e-15)
    assert {cell.number_format for cell in column(sheet, "Adjusted")} == {"#,##0"}
    # The group columns belong to the series, whatever order the tables came in.
    groups = view.tables["series"].set_index("series")["depot"]
    assert [c.value for c in column(sheet, "depot")] == [groups[name] for name in expected["series"]]


def test_missing_values_are_empty_cells(book, view):
    missing = view.tables["actuals"]["raw"].isna()
    assert missing.sum() == 1
    assert [cell.value is None for cell in column(book["Actuals"], "Actual as read")] == missing.tolist()


def test_series_without_forecast_stand_with_their_reason(book):
    rows = list(book["Not forecast"].iter_rows(min_row=2, values_only=True))
    assert rows == [(NOT_FORECAST, "not forecast", "2 periods are too few: at least 3 are needed")]


def test_about_names_round_state_and_cautions(book):
    facts = list(book["About"].iter_rows(min_row=2, values_only=True))
    assert ("Round", "2026-10") in facts
    assert ("State", "issued") in facts
    assert ("Caution", "Ranges do not add.") in facts


@pytest.mark.parametrize("text", ["=1+1", "http://x.example/"])
def test_names_and_notes_never_become_formulas_or_links(view, tmp_path, text):
    """OWASP, "CSV Injection": cells that begin with =, +, -, @, tab are run by spreadsheets."""
    tables = dict(view.tables)
    swap = {SEASONAL: text}
    for name in ("series", "adjusted", "actuals", "findings", "adjustments", "reliability"):
        tables[name] = tables[name].replace({"series": swap})
    tables["series"] = tables["series"].rename(columns={"depot": text}).assign(unit=text)
    tables["adjustments"] = tables["adjustments"].assign(reason=text, name=text)
    tables["failures"] = pd.DataFrame({"series": [text], "reason": [text]})
    hostile = dataclasses.replace(view, tables=tables, title=text)
    path = write_workbook(tmp_path / "x.xlsx", hostile, watch=watch_of(FORMULAS, [text] * len(FORMULAS)),
                          cautions=[text])
    found = 0
    book = read(path)
    assert [cell.value for cell in column(book["Watch list"], "Series")] == FORMULAS
    for sheet in book:
        for row in sheet.iter_rows():
            for cell in row:
                assert cell.hyperlink is None
                assert cell.data_type in "sn"
                if cell.value == text:
                    assert cell.data_type == "s"
                    found += 1
    assert found > 100


def test_names_longer_than_a_cell_are_cut_and_say_so(view, tmp_path):
    for text in ("x" * 40_000, "🌱" * 20_000):
        path = write_workbook(tmp_path / "x.xlsx", view, watch=watch_of([text], ["long"]))
        value = read(path)["Watch list"]["B2"].value
        assert value.endswith(" [cut]")
        assert len(value.encode("utf-16-le")) // 2 in (MOST_LETTERS, MOST_LETTERS - 1)
        assert text.startswith(value.removesuffix(" [cut]"))


def test_control_signs_and_half_letters_leave_a_readable_file(view, tmp_path):
    text = "a\x00b\x0bc\ufffed_x0041_\ud800"
    path = write_workbook(tmp_path / "x.xlsx", view, watch=watch_of([text], ["odd"]))
    assert read(path)["Watch list"]["B2"].value.startswith("a")


def test_group_columns_may_bear_the_names_of_other_columns(view, tmp_path):
    tables = dict(view.tables)
    for pair in (("Period", "adjusted"), ("period", "lead"), ("Series", "ROUND"), ("x" * 300, "line\nbreak")):
        names = dict(zip(("depot", "family"), pair, strict=True))
        tables["series"] = view.tables["series"].rename(columns=names)
        odd = dataclasses.replace(view, tables=tables)
        sheet = read(write_workbook(tmp_path / "x.xlsx", odd, watch=watch_of([], [])))["Forecasts"]
        heads = [cell.value for cell in sheet[1]]
        assert len({head.casefold() for head in heads}) == 13
        assert max(map(len, heads)) <= 255


def test_tables_longer_than_a_sheet_go_on_to_the_next(view, tmp_path, monkeypatch):
    monkeypatch.setattr(module, "MOST_ROWS", 50)
    book = read(write_workbook(tmp_path / "x.xlsx", view, watch=watch_of([], [])))
    parts = [book[name] for name in book.sheetnames if name.startswith("Forecasts")]
    assert [sheet.max_row - 1 for sheet in parts] == [50, 10]
    series = [cell.value for sheet in parts for cell in column(sheet, "Series")]
    assert series == sorted(view.tables["adjusted"]["series"])


def test_empty_tables_keep_their_heads(view, tmp_path):
    book = read(write_workbook(tmp_path / "x.xlsx", sample_view(adjusted=False), watch=watch_of([], [])))
    heads = [cell.value for cell in book["Watch list"][1]]
    assert heads == ["Rank", "Series", "Value at stake", "Reasons", "Ask"]
    assert all(cell.value is None for cell in book["Adjustments"][2])


def test_the_same_round_gives_the_same_bytes(view, tmp_path):
    watch = watch_of([SEASONAL], ["why"])
    first = write_workbook(tmp_path / "a.xlsx", view, watch=watch).read_bytes()
    assert write_workbook(tmp_path / "b.xlsx", view, watch=watch).read_bytes() == first
    facts = read(tmp_path / "a.xlsx").properties
    assert {facts.created.isoformat(), facts.modified.isoformat()} == {"2026-11-04T09:12:00"}


def test_reliability_is_counted_by_series_and_lead():
    """By hand: misses 10, 30, of which the last is outside 90; benchmark known once; one actual missing."""
    rows = pd.DataFrame({"series": "a", "lead": 1, "forecast": [100.0, 100.0, 100.0],
                         "actual": [110.0, 70.0, np.nan], "benchmark": [90.0, np.nan, 90.0],
                         "lower_90": 80.0, "upper_90": 120.0})
    table = reliability_table(rows, (90,))
    assert table.to_dict("records") == [{"series": "a", "lead": 1, "n": 2, "miss": 20.0,
                                         "benchmark_miss": 20.0, "lean": -10.0, "inside_90": 0.5}]
