"""The stated order of adjustments, by hand-computed cases; ranges; what is refused, by row."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from foredeck.errors import AdjustmentError
from foredeck.review.adjustments import ADJUSTMENT_COLUMNS, apply_adjustments
from review.small_round import BASELINES, PERIODS, adjustment, forecasts, series_table


def _applied(*rows, nonnegative=True, base=None):
    return apply_adjustments(forecasts() if base is None else base, series_table(), pd.DataFrame(rows),
                             nonnegative=nonnegative)


def _figures(adjusted):
    return {name: tuple(group["adjusted"].round(9)) for name, group in adjusted.groupby("series", sort=False)}


def test_without_adjustments_the_adjusted_figures_and_ranges_are_the_baseline():
    listed, adjusted = apply_adjustments(forecasts(), series_table(),
                                         pd.DataFrame(columns=["scope", "first"]))
    assert listed.empty
    assert tuple(listed.columns) == ADJUSTMENT_COLUMNS
    expected = forecasts()
    pd.testing.assert_frame_equal(adjusted[list(expected.columns)], expected)
    assert (adjusted["adjustment"] == 0).all()
    assert (adjusted["adjusted"] == adjusted["baseline"]).all()


@pytest.mark.parametrize(("kind", "size", "figures"), [
    ("amount", 40, (140, 240, 300)), ("amount", -40, (60, 160, 300)), ("percent", 18, (118, 236, 300)),
    ("percent", -100, (0, 0, 300)), ("value", 380, (380, 380, 300))])
def test_each_kind_changes_each_period_of_its_row(kind, size, figures):
    _, adjusted = _applied(adjustment("north/pots", kind, size, last="2026-12"))
    assert _figures(adjusted) == {**BASELINES, "north/pots": figures}


def test_a_row_without_a_last_period_touches_only_the_first():
    _, adjusted = _applied(adjustment("north/pots", "amount", 5, first="2026-12"))
    assert _figures(adjusted)["north/pots"] == (100, 205, 300)


def test_value_then_percent_then_amount_whatever_the_order_of_the_rows():
    # 100 -> value 500 -> +10 % = 550 -> +25 = 575
    listed, adjusted = _applied(adjustment("north/pots", "amount", 25),
                                adjustment("north/pots", "percent", 10),
                                adjustment("north/pots", "value", 500))
    assert _figures(adjusted)["north/pots"] == (575, 200, 300)
    assert list(listed["kind"]) == ["value", "percent", "amount"]
    assert list(listed["adjustment"].round(9)) == [400, 50, 25]
    assert list(listed["adjusted"].round(9)) == [500, 550, 575]
    assert list(listed["baseline"]) == [100, 100, 100]


def test_rows_for_a_series_come_before_rows_for_its_group():
    # north/pots: 100 -> +60 = 160; then depot north +10 %: 176 and 300 -> 330
    _, adjusted = _applied(adjustment("depot=north", "percent", 10), adjustment("north/pots", "amount", 60))
    assert _figures(adjusted)["north/pots"][0] == 176
    assert _figures(adjusted)["north/seeds"][0] == 330


def test_a_groups_amount_is_spread_in_proportion_to_the_baselines():
    # 2026-11: baselines 100 and 300, so 80 = 20 + 60, also after the series' own +60; 2026-12: 200 and 200
    _, adjusted = _applied(adjustment("depot=north", "amount", 80, last="2026-12"),
                           adjustment("north/pots", "amount", 60))
    assert _figures(adjusted) == {"north/pots": (180, 240, 300), "north/seeds": (360, 240, 100),
                                  "river/pots": (50, 60, 70)}


def test_a_groups_value_is_its_total_and_the_difference_is_spread():
    # 2026-11: 160 + 300 = 460; to reach 500: +40 = 10 + 30
    _, adjusted = _applied(adjustment("depot=north", "value", 500), adjustment("north/pots", "amount", 60))
    assert _figures(adjusted)["north/pots"][0] == 170
    assert _figures(adjusted)["north/seeds"][0] == 330


def test_groups_may_overlap_and_each_adds_its_part():
    # depot north +10 %: 110, 330; family pots +15 over 100 and 50: +10, +5; all +90 over 100, 300, 50
    _, adjusted = _applied(adjustment("all", "amount", 90), adjustment("family=pots", "amount", 15),
                           adjustment("depot=north", "percent", 10))
    first = {name: figures[0] for name, figures in _figures(adjusted).items()}
    assert first == {"north/pots": 110 + 10 + 20, "north/seeds": 330 + 60, "river/pots": 50 + 5 + 10}


def test_a_group_reaches_only_the_series_that_are_forecast():
    listed, _ = _applied(adjustment("family=pots", "amount", 15))
    assert list(listed["series"]) == ["north/pots", "river/pots"]
    assert list(listed["scope"]) == ["family=pots"] * 2


def test_ranges_move_with_the_figure_and_stop_at_zero_for_counts():
    _, adjusted = _applied(adjustment("north/pots", "amount", -70), adjustment("north/seeds", "amount", 40))
    row = adjusted.iloc[0]
    assert (row["adjustment"], row["adjusted"]) == (-70, 30)
    assert (row["lower_50"], row["upper_50"], row["lower_90"], row["upper_90"]) == (10, 50, 0, 90)
    row = adjusted.iloc[3]
    assert (row["lower_50"], row["upper_50"], row["lower_90"], row["upper_90"]) == (320, 360, 280, 400)


def test_series_that_may_be_negative_are_not_stopped_at_zero():
    _, adjusted = _applied(adjustment("north/pots", "amount", -120), nonnegative=False)
    row = adjusted.iloc[0]
    assert (row["adjusted"], row["lower_90"], row["upper_90"]) == (-20, -80, 40)


def test_each_row_is_listed_by_series_and_period_with_who_why_and_when():
    listed, _ = _applied(adjustment("depot=north", "amount", 80, last="2026-12",
                                    where="adjustments.csv line 4"))
    assert list(zip(listed["series"], listed["period"], listed["lead"], strict=True)) == [
        ("north/pots", "2026-11", 1), ("north/pots", "2026-12", 2),
        ("north/seeds", "2026-11", 1), ("north/seeds", "2026-12", 2)]
    assert list(listed["adjustment"]) == [20, 40, 60, 40]
    for column, value in {"reason": "promotion", "name": "Asha Verrall", "made_on": "2026-11-03",
                          "kind": "amount",
                          "size": 80.0, "where": "adjustments.csv line 4"}.items():
        assert set(listed[column]) == {value}


def test_a_standing_adjustment_touches_the_forecast_periods_up_to_its_end():
    for first, ends, figures in (("2025-01", "2026-12", (110, 220, 300)),
                                 ("2026-12", "2029-12", (100, 220, 330)),
                                 ("2025-01", "2026-10", (100, 200, 300)),
                                 ("2028-01", "2028-03", (100, 200, 300))):
        _, adjusted = _applied(adjustment("north/pots", "percent", 10, first=first, ends=ends))
        assert _figures(adjusted)["north/pots"] == figures


def test_a_series_own_name_goes_before_the_group_that_it_reads_like():
    table = series_table()
    base = forecasts({"depot=north": (10.0, 10.0, 10.0), **BASELINES})
    table = pd.concat([table, pd.DataFrame({"series": ["depot=north"], "depot": ["x"], "family": ["y"]})])
    _, adjusted = apply_adjustments(base, table, pd.DataFrame([adjustment("depot=north", "amount", 1)]))
    assert _figures(adjusted) == {**BASELINES, "depot=north": (11, 10, 10)}


ROWS = st.lists(st.builds(
    adjustment, st.sampled_from([*BASELINES, "depot=north", "family=pots", "all"]),
    st.sampled_from(["percent", "amount", "value"]), st.integers(0, 900), first=st.sampled_from(PERIODS),
    reason=st.uuids().map(str)), min_size=2, max_size=7)


@settings(max_examples=20, deadline=None)
@given(rows=ROWS, turn=st.randoms(use_true_random=False))
def test_the_order_of_the_rows_never_matters_and_the_listed_parts_add_up(rows, turn):
    other = list(rows)
    turn.shuffle(other)
    try:
        listed, adjusted = _applied(*rows)
    except AdjustmentError:
        with pytest.raises(AdjustmentError):
            _applied(*other)
        return
    np.testing.assert_allclose(_applied(*other)[1]["adjusted"], adjusted["adjusted"], rtol=1e-12)
    parts = listed.groupby(["series", "period"])["adjustment"].sum()
    for row in adjusted.itertuples():
        assert row.adjusted == pytest.approx(row.baseline + parts.get((row.series, row.period), 0.0),
                                             rel=1e-12)


ALLOWED_SCOPE = "the name of a series, a group such as depot=north, or all"


@pytest.mark.parametrize(("row", "what", "allowed", "then"), [
    (adjustment("north/potz", "amount", 1), "there is no series 'north/potz'", ALLOWED_SCOPE,
     "did you mean 'north/pots'?"),
    (adjustment("'; DROP", "amount", 1), "there is no series \"'; DROP\"", ALLOWED_SCOPE,
     "correct the scope"),
    (adjustment("depo=north", "amount", 1), "there is no group column 'depo'", "depot, family",
     "did you mean 'depot'?"),
    (adjustment("depot=nroth", "amount", 1), "no series has depot 'nroth'", "north, river, west",
     "did you mean 'north'?"),
    (adjustment("west/pots", "amount", 1), "the series 'west/pots' is not forecast in this round",
     "series that are forecast", "remove the row for this round"),
    (adjustment("depot=west", "amount", 1), "no series of 'depot=west' is forecast in this round",
     "series that are forecast", "remove the row for this round"),
    (adjustment("north/pots", "amount", 1, first="2026-10"),
     "2026-10 is past: it is not forecast in this round",
     "periods from 2026-11 to 2027-01",
     "remove or shorten the row; for a standing adjustment give ends instead of last"),
    (adjustment("north/pots", "amount", 1, last="2027-02"),
     "2027-02 is a period that is not forecast in this round",
     "periods from 2026-11 to 2027-01",
     "remove or shorten the row; for a standing adjustment give ends instead of last"),
    (adjustment("north/pots", "amount", 1, first="2026-Q4", ends="2027-Q4"),
     "2026-Q4 is a period that is not forecast in this round", "periods from 2026-11 to 2027-01",
     "remove or shorten the row; for a standing adjustment give ends instead of last"),
    (adjustment("north/pots", "amount", -101), "'north/pots' would come to −1 in 2026-11",
     "figures that are not below zero", "take away less, or set the figure by kind value"),
    (adjustment("depot=north", "amount", -480), "'north/pots' would come to −20 in 2026-11",
     "figures that are not below zero", "take away less, or set the figure by kind value"),
])
def test_what_cannot_be_is_refused_by_row(row, what, allowed, then):
    with pytest.raises(AdjustmentError) as caught:
        _applied(adjustment("north/pots", "amount", 0, reason="another"), row)
    assert str(caught.value) == f"{what}\n  where: row 2\n  allowed: {allowed}\n  next: {then}"


def test_the_row_that_takes_the_most_away_is_blamed_for_a_figure_below_zero():
    with pytest.raises(AdjustmentError) as caught:
        _applied(adjustment("north/pots", "amount", -30, reason="a"),
                 adjustment("north/pots", "amount", -90, reason="b"),
                 adjustment("north/pots", "amount", 5, reason="c"))
    assert caught.value.where == "row 2"


def test_a_group_whose_baselines_are_zero_cannot_carry_an_amount():
    base = forecasts({"north/pots": (0.0, 1.0, 1.0), "north/seeds": (0.0, 1.0, 1.0)})
    with pytest.raises(AdjustmentError) as caught:
        _applied(adjustment("depot=north", "amount", 5), base=base)
    assert str(caught.value) == (
        "the baselines of 'depot=north' in 2026-11 cannot carry a share each: they add up to 0\n"
        "  where: row 1\n"
        "  allowed: a group whose baselines are not negative, nor all zero\n"
        "  next: adjust the series one by one")


def test_an_adjustment_given_twice_is_refused_and_both_rows_are_named():
    with pytest.raises(AdjustmentError) as caught:
        _applied(adjustment("north/pots", "amount", 40, last="2026-12"),
                 adjustment("north/pots", "amount", 60, first="2026-12", reason="Promotion"))
    assert str(caught.value) == (
        "the row repeats an adjustment: see row 1\n"
        "  where: row 2\n"
        "  allowed: each adjustment once in a period\n"
        "  next: remove one of the two, or give another reason if both are meant")


def test_the_same_reason_in_other_periods_or_another_reason_is_no_duplicate():
    _, adjusted = _applied(adjustment("north/pots", "amount", 40),
                           adjustment("north/pots", "amount", 60, first="2026-12"),
                           adjustment("north/pots", "amount", 1, reason="a new shop"))
    assert _figures(adjusted)["north/pots"] == (141, 260, 300)


@pytest.mark.parametrize("scopes", [("north/pots", "north/pots"), ("depot=north", "family=pots")])
def test_two_values_for_one_figure_are_refused(scopes):
    with pytest.raises(AdjustmentError) as caught:
        _applied(*(adjustment(scope, "value", 400 + at, reason=str(at)) for at, scope in enumerate(scopes)))
    assert str(caught.value) == (
        "the row sets a figure that is set already: see row 1\n"
        "  where: row 2\n"
        "  allowed: one value for a figure\n"
        "  next: remove one of the two")
