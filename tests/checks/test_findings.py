"""Findings of a series: codes, periods, and sentences for people."""

from __future__ import annotations

import re

import numpy as np
import pandas as pd
import pytest

from foredeck.checks.findings import FAULT_CODES, FINDING_COLUMNS, QUERY_CODES, find
from foredeck.checks.sentences import about, exact, spoken
from foredeck.intake.history import FAULT_COLUMNS, SeriesHistory
from foredeck.periods import Frequency

CLOSING = pd.Period("2026-10", "M")


def history(values: np.ndarray, last: pd.Period = CLOSING, faults: pd.DataFrame | None = None) -> SeriesHistory:
    index = pd.period_range(end=last, periods=len(values))
    extra = {} if faults is None else {"faults": faults}
    return SeriesHistory("north/seeds", Frequency.MONTHLY, index, values, unit="cases", **extra)


def sales(n: int = 84) -> np.ndarray:
    """November 2019 to October 2026 when n = 84."""
    rng = np.random.default_rng(11)
    t = np.arange(n)
    return np.round(1500.0 * (1.0 + 0.3 * np.sin(2 * np.pi * t / 12)) * np.exp(0.05 * rng.normal(size=n)))


def at(text: str) -> int:
    return pd.Period(text, "M").ordinal - pd.Period("2019-11", "M").ordinal


def only(series: SeriesHistory) -> pd.Series:
    found = find(series, CLOSING)
    assert len(found) == 1, found[["period", "code", "evidence"]].to_string()
    return found.iloc[0]


def test_clean_sales_have_no_finding_and_the_empty_table_has_its_columns() -> None:
    found = find(history(sales()), CLOSING)
    assert found.empty
    assert found.columns.tolist() == [*FINDING_COLUMNS, "raw_text"]


def test_a_change_of_unit_says_what_the_others_suggest() -> None:
    y = sales()
    p = at("2025-02")
    y[p] = 185.0
    row = only(history(y))
    assert (row["period"], row["code"], row["kind"], row["raw"], row["used"], row["raw_text"]) == (
        "2025-02", "change_of_unit", "query", 185.0, 1850.0, "185")
    assert re.fullmatch(r"February 2025 is 185; its neighbours and the same month of other years suggest "
                        r"about 1,[89]\d0: ten times as much\.", row["evidence"])
    assert row["remedy"] == ("For fitting, 1,850 stands in its place; the value itself is kept and shown. "
                             "Correct the unit in the source.")


def test_a_unit_that_changed_for_good_asks_which_stretch_is_right() -> None:
    y = sales()
    y[at("2024-03"):] *= 1000.0
    row = only(history(y))
    assert (row["period"], row["code"]) == ("2024-03", "change_of_unit")
    assert row["evidence"] == (
        "From March 2024 on the values are about a thousand times as large as before.")
    assert row["used"] == row["raw"]


def test_an_outlier_says_what_is_used_instead() -> None:
    y = sales()
    p = at("2023-09")
    y[p] = 3000.0
    row = only(history(y))
    assert (row["period"], row["code"], row["raw"]) == ("2023-09", "outlier", 3000.0)
    assert row["used"] == pytest.approx(sales()[p], rel=0.15)
    assert re.fullmatch(r"September 2023 is 3,000; its neighbours and the same month of other years suggest about "
                        r"1,\d\d0 \([\d,]+ to [\d,]+ would be ordinary\)\.", row["evidence"])
    assert row["remedy"].startswith("For fitting, 1,")


def test_an_outlier_among_the_last_three_months_is_left_and_says_why() -> None:
    y = sales()
    y[-2] = 4000.0
    row = only(history(y))
    assert (row["period"], row["code"], row["used"]) == ("2026-09", "outlier", 4000.0)
    assert row["remedy"] == ("Left as it is: in the last 3 months an odd value and a new level look alike. "
                             "Confirm the value, or note what happened.")


def test_a_level_shift_is_one_query_at_its_first_month() -> None:
    y = sales()
    y[at("2023-02"):] *= 1.5
    row = only(history(y))
    assert (row["period"], row["code"], row["used"]) == ("2023-02", "level_shift", row["raw"])
    assert re.match(r"From February 2023 on the level is about (4[5-9]|5[0-5])% higher than before: about ",
                    row["evidence"])


def test_a_run_of_zeros_and_a_repeated_value_are_one_query_each() -> None:
    y = sales()
    y[at("2022-04"):at("2022-04") + 3] = 0.0
    y[at("2024-07"):at("2024-07") + 6] = y[at("2024-07")]
    found = find(history(y), CLOSING)
    assert found[["period", "code", "kind"]].values.tolist() == [
        ["2022-04", "zero_run", "query"], ["2024-07", "repeated_constant", "query"]]
    assert found["evidence"][0].startswith("April 2022 to June 2022: 3 months at zero in a series that otherwise has")
    assert found["evidence"][1].startswith("July 2024 to December 2024: ")
    assert (found["used"] == found["raw"]).all()


def test_gap_and_impossible_sign_are_faults_with_what_is_used() -> None:
    y = sales()
    y[at("2021-06")], y[at("2026-10")] = np.nan, -42.0
    found = find(history(y), CLOSING)
    assert found[["period", "code", "kind"]].values.tolist() == [
        ["2021-06", "gap", "fault"], ["2026-10", "impossible_sign", "fault"]]
    assert found["evidence"].tolist() == [
        "June 2021 has no value.", "October 2026 is -42; the series cannot go below zero."]
    assert found["used"].to_numpy() == pytest.approx(sales()[[at("2021-06"), at("2026-10")]], rel=0.15)
    assert find(history(sales() - 5000.0), CLOSING, nonnegative=False).empty


def test_an_incomplete_closing_month_is_told_from_an_outlier_before_it() -> None:
    y = sales()
    y[-1] = round(0.35 * y[-1])
    row = only(history(y))
    assert (row["period"], row["code"], row["kind"], row["used"]) == (
        "2026-10", "incomplete_last_period", "fault", y[-1])
    assert re.match(r"October 2026 stands at [\d,]+, 3\d% of the [\d,]+ that its neighbours and the same month of "
                    r"other years suggest: the month may not be complete yet\.", row["evidence"])
    assert only(history(np.append(y, sales(85)[-1]), CLOSING + 1).up_to(CLOSING))["code"] == row["code"]
    earlier = sales()
    earlier[-2] = round(0.35 * earlier[-2])
    assert only(history(earlier))["code"] == "outlier"


def test_a_high_closing_month_is_not_incomplete() -> None:
    y = sales()
    y[-1] *= 2.0
    assert only(history(y))["code"] == "outlier"


def test_a_series_that_stops_early_is_stale_once_and_its_end_is_no_gap() -> None:
    for values, last in ((sales()[:82], CLOSING - 2), (np.append(sales()[:82], [np.nan, np.nan]), CLOSING)):
        row = only(history(values, last))
        assert (row["period"], row["code"], row["kind"]) == ("2026-09", "stale", "fault")
        assert row["evidence"] == "The last value is of August 2026; the round closes October 2026."


def test_reading_faults_are_handed_through_with_the_value_used_and_not_reported_again_as_gaps() -> None:
    y = sales()
    y[at("2022-02")] = np.nan
    faults = pd.DataFrame([
        ["north/seeds", "2022-02", "not_a_number", "see note", "line 12", "No number: 'see note'.", "Enter it."],
        ["north/seeds", "2024-03", "duplicate", "433 and 458", "line 40", "Sent twice.", "Keep one."],
    ], columns=list(FAULT_COLUMNS))
    found = find(history(y, faults=faults), CLOSING)
    assert found[["period", "code", "kind", "raw_text", "evidence", "remedy"]].values.tolist() == [
        ["2022-02", "not_a_number", "fault", "see note", "No number: 'see note' (line 12).", "Enter it."],
        ["2024-03", "duplicate", "fault", "433 and 458", "Sent twice (line 40).", "Keep one."]]
    assert found["used"][0] == pytest.approx(sales()[at("2022-02")], rel=0.15)
    assert found["used"][1] == y[at("2024-03")]
    assert found["raw"].isna().all()


def test_an_unreadable_closing_month_is_not_stale_as_well() -> None:
    y = sales()
    y[-1] = np.nan
    faults = pd.DataFrame([["north/seeds", "2026-10", "not_a_number", "x", "line 2", "No number.", "Enter it."]],
                          columns=list(FAULT_COLUMNS))
    assert only(history(y, faults=faults))["code"] == "not_a_number"


def test_nothing_after_the_closing_period_is_looked_at() -> None:
    y = sales(86)
    y[84:] = 1e6
    assert find(history(y, CLOSING + 2), CLOSING).empty


def test_faults_come_first_and_then_the_order_of_time() -> None:
    y = sales()
    y[at("2020-05")] *= 10.0
    y[at("2024-05")] = np.nan
    y[at("2022-05")] = -1.0
    assert find(history(y), CLOSING)["period"].tolist() == ["2022-05", "2024-05", "2020-05"]


def test_a_series_without_any_value_has_no_finding_of_ours() -> None:
    assert find(history(np.full(4, np.nan)), CLOSING).empty


def test_every_code_is_a_fault_or_a_query_and_never_both() -> None:
    assert set(FAULT_CODES).isdisjoint(QUERY_CODES)
    assert len(FAULT_CODES) + len(QUERY_CODES) == 11


@pytest.mark.parametrize(("value", "text"), [
    (1483.2, "1,480"), (36.24, "36.2"), (0.004149, "0.00415"), (0.0, "0"), (999.7, "1,000"), (2.0, "2"),
    (-1483.2, "-1,480"), (np.nan, "unknown")])
def test_an_expected_value_is_written_with_three_digits(value: float, text: str) -> None:
    assert about(value) == text


@pytest.mark.parametrize(("value", "text"), [(14820.0, "14,820"), (0.125, "0.125"), (1e6, "1,000,000"), (-42.0, "-42")])
def test_a_value_as_it_stands_is_written_in_full(value: float, text: str) -> None:
    assert exact(value) == text


@pytest.mark.parametrize(("period", "code", "text"), [
    ("2025-02", "M", "February 2025"), ("2026Q3", "Q-DEC", "quarter 3 of 2026"),
    ("2026-01-26", "W-SUN", "week 5 of 2026"), ("2026", "Y-DEC", "2026")])
def test_a_period_is_named_as_one_says_it(period: str, code: str, text: str) -> None:
    assert spoken(pd.Period(period, code)) == text
