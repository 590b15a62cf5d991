import numpy as np
import pandas as pd
import pytest

import foredeck as fd
from foredeck.periods import period_names

LONG = {"series": "series", "period": "month", "value": "cases", "frequency": "monthly"}


@pytest.fixture
def read(tmp_path):
    def made(*rows, **options):
        (tmp_path / "a.csv").write_text("\n".join(["series,month,cases", *rows]) + "\n")
        return fd.read(tmp_path / "a.csv", **LONG, **options)
    return made


def test_a_series_is_complete_from_its_first_value_to_its_last(read):
    history = read("b,2024-05,3", "a,2024-02,-", "a,2024-03,1", "a,2024-06,2", "a,2024-07,", "b,2024-04,4")
    np.testing.assert_array_equal(history["a"].values, [1, np.nan, np.nan, 2])
    assert list(history.actuals["series"]) == ["a"] * 4 + ["b"] * 2
    assert period_names(history.actuals["period"]) == [
        "2024-03", "2024-04", "2024-05", "2024-06", "2024-04", "2024-05"]


def test_gaps_are_zero_where_that_is_said_but_not_what_somebody_calls_unknown(read):
    rows = ("a,2024-01,1", "a,2024-03,", "a,2024-04,-", "a,2024-05,n/a", "a,2024-06,?", "a,2024-07,2",
            "a,2024-08,")
    np.testing.assert_array_equal(read(*rows, gaps="zero")["a"].values, [1, 0, 0, 0, np.nan, np.nan, 2])
    np.testing.assert_array_equal(read(*rows)["a"].values, [1] + [np.nan] * 5 + [2])


def test_a_last_cell_that_is_no_number_still_counts_as_the_last_period(read):
    history = read("a,2024-01,1", "a,2024-02,?")
    np.testing.assert_array_equal(history["a"].values, [1, np.nan])
    assert list(history.faults["period"]) == ["2024-02"]


def test_rows_that_agree_count_once_and_are_named(read):
    history = read("a,2024-01,5", "a,2024-02,7", "a,2024-01,5.0")
    np.testing.assert_array_equal(history["a"].values, [5, 7])
    assert history.faults.to_dict("records") == [{
        "series": "a", "period": "2024-01", "code": "duplicate", "raw": "5 and 5.0",
        "where": "a.csv line 2, column cases and line 4, column cases",
        "evidence": "2 rows hold 5 and 5.0; they agree and count once.",
        "remedy": "Take out the wrong rows, or set sum_rows if they add up."}]


def test_of_rows_that_differ_the_last_counts_and_all_are_named(read):
    history = read("a,2024-01,5", "a,2024-01,6", "a,2024-01,", "a,2024-01,4")
    np.testing.assert_array_equal(history["a"].values, [4])
    assert list(history.faults["evidence"]) == ["3 rows hold 5 and 6 and 4; the last one is used."]


def test_a_blank_row_beside_a_value_is_no_duplicate(read):
    history = read("a,2024-01,5", "a,2024-01,")
    np.testing.assert_array_equal(history["a"].values, [5])
    assert len(history.faults) == 0


def test_a_last_row_that_is_no_number_leaves_the_period_missing_with_both_faults(read):
    history = read("a,2024-01,5", "a,2024-02,6", "a,2024-02,see note")
    np.testing.assert_array_equal(history["a"].values, [5, np.nan])
    assert list(history.faults["code"]) == ["not_a_number", "duplicate"]


def test_rows_are_summed_when_asked_and_are_then_no_duplicates(read):
    history = read("a,2024-01,5", "b,2024-01,1", "a,2024-01,-2", "a,2024-01,", "a,2024-02,", "a,2024-03,0.5",
                   sum_rows=True)
    np.testing.assert_array_equal(history["a"].values, [3, np.nan, 0.5])
    assert len(history.faults) == 0


@pytest.mark.parametrize("cell", ["?", "n/a"])
def test_a_sum_with_a_part_that_is_not_known_is_missing(read, cell):
    history = read("a,2024-01,1", "a,2024-02,5", f"a,2024-02,{cell}", "a,2024-03,1", sum_rows=True)
    np.testing.assert_array_equal(history["a"].values, [1, np.nan, 1])


def test_a_series_without_any_value_is_left_out_and_named(read):
    history = read("a,2024-01,1", "b,2024-01,", "c,2024-01,n/a")
    assert history.names == ["a"]
    assert "ignored: 2 series without any value: b, c" in history.understood.lines()


def test_a_series_that_holds_only_what_is_no_number_stays_to_be_seen(read):
    history = read("a,2024-01,1", "b,2024-01,?")
    np.testing.assert_array_equal(history["b"].values, [np.nan])


def test_faults_are_sorted_by_series_and_period_and_all_of_text(read):
    faults = read("b,2024-01,?", "a,2024-02,1", "a,2024-02,1", "a,2024-01,!").faults
    assert list(zip(faults["series"], faults["period"], faults["code"], strict=True)) == [
        ("a", "2024-01", "not_a_number"), ("a", "2024-02", "duplicate"), ("b", "2024-01", "not_a_number")]
    assert set(faults.dtypes.astype(str)) == {"str"}
    assert read("a,2024-01,1").faults.columns.equals(faults.columns)


def test_the_order_of_the_file_does_not_matter(read):
    rows = [f"{name},{month},{k}" for k, (name, month) in enumerate(
        (n, m) for n in "cab" for m in ("2024-01", "2024-02", "2024-05"))]
    straight, shuffled = read(*rows), read(*(rows[k] for k in np.random.default_rng(3).permutation(len(rows))))
    pd.testing.assert_frame_equal(straight.actuals, shuffled.actuals)
    pd.testing.assert_frame_equal(straight.series, shuffled.series)


def test_weeks_are_filled_across_the_53rd_week_of_2020(tmp_path):
    (tmp_path / "a.csv").write_text("series,month,cases\na,2020-W52,1\na,2021-W02,2\n")
    one = fd.read(tmp_path / "a.csv", **{**LONG, "frequency": None})["a"]
    assert period_names(one.periods) == ["2020-W52", "2020-W53", "2021-W01", "2021-W02"]
    np.testing.assert_array_equal(one.values, [1, np.nan, np.nan, 2])
