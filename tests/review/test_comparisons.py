"""Budgets from files, last year, the year to date, and what changed since last round."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from foredeck.errors import IntakeError
from foredeck.review.changes import changes
from foredeck.review.comparisons import last_year, read_comparison, year_to_date
from review.small_round import file, forecasts


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


def _actuals(*rows):
    return pd.DataFrame(rows, columns=["series", "period", "raw"])


def test_last_year_is_the_raw_actual_twelve_months_before():
    actuals = _actuals(("north/pots", "2025-11", 90.0), ("north/pots", "2025-12", np.nan),
                       ("north/pots", "2026-01", 80.0), ("north/pots", "2026-10", 1.0), ("x", "2025-11", 5.0))
    assert last_year(actuals, forecasts()).to_dict("records") == [
        {"name": "last year", "series": "north/pots", "period": "2026-11", "value": 90.0},
        {"name": "last year", "series": "north/pots", "period": "2027-01", "value": 80.0}]
    assert last_year(actuals, forecasts().iloc[:0]).empty


@pytest.mark.parametrize(("now", "before"),
                         [("2026-Q4", "2025-Q4"), ("2026-W05", "2025-W05"), ("2027", "2026"),
                                             ("2021-W01", "2020-W02")])
def test_a_year_before_is_one_season_before(now, before):
    # 2020 had 53 ISO weeks: 52 weeks before the first of 2021 lies the second of 2020.
    found = last_year(_actuals(("a", before, 7.0)), pd.DataFrame({"series": ["a"], "period": [now]}))
    assert list(found["value"]) == [7.0]


def test_the_year_to_date_counts_from_the_first_month_of_the_financial_year():
    rows = [("a", f"2026-{month:02}", float(month)) for month in range(1, 11)]
    rows += [("b", "2026-03", 100.0), ("b", "2026-04", 5.0), ("b", "2026-05", np.nan)]
    found = year_to_date(_actuals(*rows), "2026-10", first_month=4)
    assert found.to_dict("records") == [
        {"series": "a", "first": "2026-04", "last": "2026-10",
         "actual_to_date": float(4 + 5 + 6 + 7 + 8 + 9 + 10),
         "n_periods": 7, "n_missing": 0},
        {"series": "b", "first": "2026-04", "last": "2026-10", "actual_to_date": 5.0, "n_periods": 7,
         "n_missing": 6}]
    assert year_to_date(_actuals(*rows), "2026-10")["actual_to_date"].tolist() == [55.0, 105.0]


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
