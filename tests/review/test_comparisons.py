"""Budgets from files, and what changed since last round."""

from __future__ import annotations

import pandas as pd
import pytest

from foredeck.errors import IntakeError
from foredeck.review.changes import changes
from foredeck.review.comparisons import read_comparison
from review.small_round import file


def test_a_budget_by_series_is_read(tmp_path):
    path = file(tmp_path / "budget.csv",
                "series,period,value,note\nb,2026-11,10,x\na,2026-12,12.5,\na,2026-11,11,")
    expected = pd.DataFrame({"name": "budget", "series": ["a", "a", "b"],
                             "period": ["2026-11", "2026-12", "2026-11"],
                             "value": [11.0, 12.5, 10.0]})
    pd.testing.assert_frame_equal(read_comparison(path, "budget"), expected)


def test_a_budget_by_the_columns_that_name_a_series_is_read(tmp_path):
    path = file(tmp_path / "budget.csv", "depot,family,month,cases\nnorth,pots,2026-11,10")
    read = read_comparison(path, "budget", series=["depot", "family"], period="month", value="cases")
    assert read.to_dict("records") == [{"name": "budget", "series": "north/pots", "period": "2026-11",
                                        "value": 10.0}]


@pytest.mark.parametrize(("text", "what", "line", "allowed", "then"), [
    ("series,period\na,2026-11", "budget.csv has no column 'value'", 1, "series, period",
     "correct the column's name"),
    ("series,period,value\na,2026-11,1\na,2026-12,", "'' is no number", 3,
     "a plain number such as 1250 or 17.5",
     "correct the value, or remove the row"),
    ("series,period,value\na,2026-11,1,000", "the row has more fields than the heading", 2,
     "one field a column",
     "write 1250, not 1,250; put quotation marks around text with commas"),
    ("series,period,value\na,Nov,1", "'Nov' is no period", 2, "2026, 2026-Q3, 2026-10, 2026-W05",
     "write the period in one of these forms"),
    ("series,period,value\na,2026-11,1\na,2026-Q4,1",
     "the period '2026-Q4' is quarterly, those before are monthly",
     3, "one frequency in a file", "correct the period"),
    ("series,period,value\na,2026-11,1\nb,2026-11,1\na,2026-11,2",
     "'a' has a second figure for 2026-11; the first is in budget.csv line 2", 4,
     "one figure a series and period",
     "remove one of the two"),
])
def test_a_row_that_cannot_be_a_budget_is_named(tmp_path, text, what, line, allowed, then):
    with pytest.raises(IntakeError) as caught:
        read_comparison(file(tmp_path / "budget.csv", text), "budget")
    assert str(caught.value) == (
        f"{what}\n  where: budget.csv line {line}\n  allowed: {allowed}\n  next: {then}")


def test_a_missing_file_is_said(tmp_path):
    with pytest.raises(IntakeError) as caught:
        read_comparison(tmp_path / "none.csv", "budget")
    assert str(caught.value) == (
        f"there is no file none.csv\n  where: {tmp_path / 'none.csv'}\n  allowed: a CSV file\n"
        "  next: correct the path, or leave the setting out")


def _adjusted(*rows):
    frame = pd.DataFrame(rows, columns=["series", "period", "baseline", "adjustment"])
    return frame.assign(adjusted=frame["baseline"] + frame["adjustment"])


def test_changes_are_those_of_periods_that_both_rounds_forecast():
    now = _adjusted(("a", "2026-11", 110.0, 40.0), ("a", "2026-12", 100.0, 0.0), ("new", "2026-11", 1.0, 0.0))
    before = _adjusted(("a", "2026-10", 90.0, 0.0), ("a", "2026-11", 100.0, 10.0),
                       ("gone", "2026-11", 5.0, 0.0))
    assert changes(now, before).to_dict("records") == [
        {"series": "a", "period": "2026-11", "before": 110.0, "now": 150.0, "change": 40.0,
         "from_baseline": 10.0,
         "from_adjustment": 30.0}]


def test_without_an_earlier_round_nothing_changed():
    none = changes(_adjusted(("a", "2026-11", 110.0, 40.0)), None)
    assert none.empty
    assert list(none.columns) == ["series", "period", "before", "now", "change", "from_baseline",
                                  "from_adjustment"]
