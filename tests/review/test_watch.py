"""The watch list's rules and sentences, and how the last period turned out."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from foredeck.review.last_time import last_time
from foredeck.review.sentences import listed, number, numbers_apart, period_words, sentence
from foredeck.review.watch import LONGEST, watch_list
from review.small_round import BASELINES, forecasts, series_table

PAST = [f"2026-{month:02}" for month in range(3, 11)]


def _reliability(name, errors, benchmark_errors=None, actual=100.0, half=50.0):
    """One-ahead cells up to 2026-10: forecast = actual + error."""
    n = len(errors)
    benchmark_errors = [np.nan] * n if benchmark_errors is None else benchmark_errors
    return pd.DataFrame({
        "series": name, "origin": PAST[-n:], "period": PAST[-n:], "lead": 1,
        "forecast": [actual + error for error in errors], "actual": actual,
        "lower_90": [actual + error - half for error in errors],
        "upper_90": [actual + error + half for error in errors],
        "benchmark": [actual + error for error in benchmark_errors]})


def _actuals(values):
    return pd.DataFrame([(name, "2026-10", value) for name, value in values.items()],
                        columns=["series", "period", "raw"])


def _quiet():
    """A round in which nothing calls for a person: typical one-ahead misses 8, 6 and 4."""
    base = forecasts()
    return {
        "series": series_table(), "actuals": _actuals(dict.fromkeys(BASELINES, 100.0)),
        "findings": pd.DataFrame(columns=["series", "period", "code", "kind"]).astype("str"),
        "forecasts": base,
        "adjusted": base.assign(adjustment=0.0, adjusted=base["baseline"]),
        "reliability": pd.concat([_reliability(name, [miss, -miss] * 4) for name, miss in
                                  zip(BASELINES, (8.0, 6.0, 4.0), strict=True)], ignore_index=True)}


def _previous(figures, half=20.0, wide=60.0):
    rows = [(name, period, 1 if period == "2026-10" else 2, figure, 0.0, figure, figure - half, figure + half,
             figure - wide, figure + wide) for (name, period), figure in figures.items()]
    return pd.DataFrame(rows, columns=["series", "period", "lead", "baseline", "adjustment", "adjusted",
                                       "lower_50",
                                       "upper_50", "lower_90", "upper_90"])


def _only(found):
    assert len(found) == 1
    return found.iloc[0]


def test_a_quiet_round_has_an_empty_watch_list():
    found = watch_list(_quiet(),
                       _previous({("north/pots", "2026-11"): 100.0, ("north/pots", "2026-10"): 100.0}))
    assert found.empty
    assert list(found.columns) == ["rank", "series", "value_at_stake", "reasons", "ask"]


@pytest.mark.parametrize(("actual", "sentence", "ask"), [
    (359.0, "October came to 359, below the range given (362 to 653).",
     "Was stock short, or a customer lost?"),
    (1400.0, "October came to 1,400, above the range given (362 to 653).",
     "A single large order, or a lasting change?")])
def test_an_actual_outside_the_range_that_last_round_gave_is_listed(actual, sentence, ask):
    tables = _quiet()
    tables["actuals"] = _actuals({"north/seeds": actual})
    row = _only(watch_list(tables, _previous({("north/seeds", "2026-10"): 507.5}, wide=145.5)))
    assert (row["rank"], row["series"], row["reasons"], row["ask"]) == (1, "north/seeds", sentence, ask)


def test_in_a_first_round_the_range_is_the_one_the_backtest_would_have_given():
    tables = _quiet()
    tables["actuals"] = _actuals({"north/pots": 20.0})
    row = _only(watch_list(tables))  # the backtest said 92 for 2026-10, give or take 50
    assert row["reasons"] == "October came to 20, below the range that would have been given (42 to 142)."


def test_faults_and_open_queries_of_the_last_three_periods_are_listed_and_older_ones_are_not():
    tables = _quiet()
    tables["findings"] = pd.DataFrame(
        [("north/pots", "2026-10", "outlier", "query"), ("north/pots", "2026-08", "outlier", "query"),
         ("north/pots", "2026-09", "gap", "fault"), ("river/pots", "2026-07", "outlier", "query")],
        columns=["series", "period", "code", "kind"])
    row = _only(watch_list(tables))
    assert (row["series"], row["reasons"]) == (
        "north/pots", "An outlier is queried in August and October. September has no value.")
    assert row["ask"] == "Was it a single order, or will it come again?"


@pytest.mark.parametrize(("code", "text", "ask"), [
    ("level_shift", "A level shift is queried in October.", "Has something changed for good?"),
    ("change_of_unit", "A change of unit is queried in October.", "Was it entered in another unit?"),
    ("zero_run", "A run of zeros is queried in October.", "Was nothing asked for, or nothing there to give?"),
    ("repeated_constant", "A repeated constant is queried in October.", "Was it counted, or copied?"),
    ("incomplete_last_period", "October looks incomplete.", "Is it booked in full?"),
    ("stale", "No value has come from October on.", "Is the series late, or has it ended?"),
    ("new_code", "A finding (new_code) is noted in October.", "Is the value right?")])
def test_each_finding_has_its_words_and_its_question(code, text, ask):
    tables = _quiet()
    tables["findings"] = pd.DataFrame({"series": ["north/pots"], "period": ["2026-10"], "code": [code],
                                       "kind": ["query"]})
    row = _only(watch_list(tables))
    assert (row["reasons"], row["ask"]) == (text, ask)


@pytest.mark.parametrize(("before", "text"), [
    (1121.0, "The forecast for November fell from 1,121 to 100 since last round."),
    (79.4, "The forecast for November rose from 79.4 to 100 since last round."),
    (120.0, ""), (80.0, "")])
def test_a_figure_that_left_the_inner_range_of_last_round_is_listed(before, text):
    found = watch_list(_quiet(), _previous({("north/pots", "2026-11"): before}))
    assert " ".join(found["reasons"]) == text
    assert list(found["ask"]) == (["Is the new level believable?"] if text else [])


@pytest.mark.parametrize(("benchmark", "n", "listed"), [(4.0, 8, True), (7.8, 8, False), (4.0, 5, False)])
def test_losing_to_same_as_last_year_is_listed_when_it_is_material_and_rests_on_enough(benchmark, n, listed):
    tables = _quiet()
    tables["reliability"] = _reliability("north/pots", [8.0] * n, [benchmark] * n)
    found = watch_list(tables)
    assert list(found["series"]) == (["north/pots"] if listed else [])
    if listed:
        assert found.iloc[0]["reasons"] == ("“Same as last year” has been the better guide (typical miss 4, "
                                            "against 8).")
        assert found.iloc[0]["ask"] == "Is the history still a guide?"


@pytest.mark.parametrize(("figures", "text"), [
    ((170.0, 200.0, 300.0),
     "The adjusted 170 for November lies above the range of the baseline (40 to 160)."),
    ((100.0, 100.0, 100.0),
     "The adjusted 100 for December lies below the range of the baseline (140 to 260); "
                            "so does one more figure."),
    ((170.0, 100.0, 100.0), "The adjusted 170 for November lies above the range of the baseline (40 to 160); "
                            "so do 2 more figures.")])
def test_an_adjusted_figure_outside_the_range_of_its_baseline_is_listed(figures, text):
    tables = _quiet()
    adjusted = tables["adjusted"]
    adjusted.loc[adjusted["series"] == "north/pots", "adjusted"] = figures
    adjusted["adjustment"] = adjusted["adjusted"] - adjusted["baseline"]
    row = _only(watch_list(tables))
    assert (row["reasons"], row["ask"]) == (text, "How sure is the reason for it?")


def test_the_list_is_ranked_by_typical_miss_times_unit_value_and_several_reasons_stand_together():
    # misses 8, 6, 4 times unit values 2, 1 and unknown (1)
    tables = _quiet()
    tables["actuals"] = _actuals({"north/pots": 0.0, "north/seeds": 0.0, "river/pots": 0.0})
    tables["findings"] = pd.DataFrame({"series": ["north/seeds"], "period": ["2026-10"],
                                       "code": ["level_shift"],
                                       "kind": ["query"]})
    found = watch_list(tables)
    assert list(found["rank"]) == [1, 2, 3]
    assert list(found["series"]) == ["north/pots", "north/seeds", "river/pots"]
    assert list(found["value_at_stake"]) == [16.0, 6.0, 4.0]
    assert found["reasons"][1] == (
        "October came to 0, below the range that would have been given (44 to 144). "
        "A level shift is queried in October.")
    assert found["ask"][1] == "Was stock short, or a customer lost?"


def test_a_series_that_was_never_backtested_has_half_its_inner_range_at_stake():
    tables = _quiet()
    tables["reliability"] = tables["reliability"][tables["reliability"]["series"] != "north/pots"]
    row = _only(watch_list(tables, _previous({("north/pots", "2026-11"): 500.0})))
    assert row["value_at_stake"] == 20.0 * 2.0


def test_the_list_is_capped():
    names = {f"s{at:02}": (100.0, 100.0, 100.0) for at in range(LONGEST + 5)}
    base = forecasts(names)
    tables = _quiet()
    tables.update(
        series=pd.DataFrame({"series": list(names), "unit_value": range(1, len(names) + 1)}), forecasts=base,
        adjusted=base.assign(adjustment=0.0, adjusted=base["baseline"]),
        actuals=_actuals(dict.fromkeys(names, 0.0)),
        reliability=pd.concat([_reliability(name, [8.0] * 8) for name in names], ignore_index=True))
    found = watch_list(tables)
    assert len(found) == LONGEST == 10
    assert found["series"][0] == "s14"


def test_a_round_without_forecasts_has_an_empty_watch_list():
    tables = {**_quiet(), "forecasts": forecasts().iloc[:0]}
    assert watch_list(tables).empty


def test_last_time_takes_what_the_round_said_before_what_the_backtest_says():
    actuals = _actuals({"north/pots": 130.0, "north/seeds": 100.0, "river/pots": np.nan, "unsaid": 1.0})
    reliability = pd.concat([_reliability("north/seeds", [60.0]), _reliability("north/pots", [0.0])])
    found = last_time("2026-10", actuals, reliability,
                      _previous({("north/pots", "2026-10"): 60.0, ("river/pots", "2026-10"): 9.0}))
    told = found[["series", "said", "lower", "upper", "actual", "miss", "where_it_fell", "said_by"]]
    expected = pd.DataFrame(
        [("north/pots", 60.0, 0.0, 120.0, 130.0, 70.0, "above", "last round"),
         ("north/seeds", 160.0, 110.0, 210.0, 100.0, -60.0, "below", "backtest"),
         ("river/pots", 9.0, -51.0, 69.0, np.nan, np.nan, "no actual", "last round")], columns=told.columns)
    pd.testing.assert_frame_equal(told, expected)


def test_an_actual_on_the_edge_of_the_range_is_inside():
    found = last_time("2026-10", _actuals({"a": 120.0}), _reliability("a", [0.0]).iloc[:0],
                      _previous({("a", "2026-10"): 60.0}))
    assert list(found["where_it_fell"]) == ["inside"]


@pytest.mark.parametrize(("value", "text"), [
    (1890.0, "1,890"), (-31.0, "−31"), (0.4217, "0.422"), (42.54, "42.5"), (123.6, "124"), (-0.2, "−0.2"),
    (0.0, "0"), (0.00001, "0"), (-0.00001, "0"), (1234567.8, "1,234,568"), (99.999, "100"), (9.996, "10")])
def test_numbers_are_whole_from_a_hundred_and_carry_thousands_and_a_true_minus(value, text):
    assert number(value) == text


def test_numbers_of_one_sentence_can_be_told_apart():
    assert numbers_apart(361.7, 362.3, 653.0) == ["361.7", "362.3", "653.0"]
    assert numbers_apart(362.1, 362.3, 653.0) == ["362.1", "362.3", "653.0"]
    assert numbers_apart(359.0, 362.0, 653.0) == ["359", "362", "653"]


def test_periods_and_lists_in_words():
    words = [period_words(text) for text in ("2026-10", "2026-Q3", "2026-W05", "2026")]
    assert words == ["October", "the third quarter", "week 5", "2026"]
    assert sentence(words[1]) == "The third quarter"
    assert [listed(["a"]), listed(["a", "b"]), listed(["a", "b", "c"])] == ["a", "a and b", "a, b and c"]
