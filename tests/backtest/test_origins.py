"""Where a backtest stands when it forecasts again."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from foredeck.backtests.origins import known_counts
from foredeck.errors import MethodError


def test_seven_years_of_months_have_36_origins_up_to_the_last_period_but_one():
    known = known_counts(84, 12, 12)
    assert known.tolist() == list(range(48, 84))


def test_the_first_origin_knows_two_seasons_and_one_period_however_many_origins_are_wanted():
    assert known_counts(84, 12, 12, 500)[0] == 25


def test_a_short_history_is_split_in_the_middle():
    assert known_counts(9, 12, 12).tolist() == [4, 5, 6, 7, 8]
    assert known_counts(2, 1, 6).tolist() == [1]


@given(st.integers(2, 200), st.sampled_from([1, 4, 12, 52]), st.integers(1, 20), st.integers(1, 60))
def test_origins_are_consecutive_and_leave_something_to_learn_from_and_to_be_judged_by(n, m, horizon, count):
    known = known_counts(n, m, horizon, count).tolist()
    assert known == list(range(known[0], n))
    assert known[0] >= 1
    assert len(known) <= count


def test_one_period_is_refused_with_the_whole_message():
    with pytest.raises(MethodError) as caught:
        known_counts(1, 12, 12)
    assert str(caught.value) == (
        "The history has 1 periods.\n"
        "  where: backtest\n"
        "  allowed: at least 2 periods\n"
        "  next: Wait for more history: a forecast needs one period to learn from and one to be judged by."
    )


def test_no_origin_or_no_lead_is_refused_with_the_whole_message():
    with pytest.raises(MethodError) as caught:
        known_counts(84, 12, 12, 0)
    assert str(caught.value) == (
        "The backtest is to have 0 origins and 12 leads.\n"
        "  where: backtest\n"
        "  allowed: at least 1 of each\n"
        "  next: Give a larger number, or none for the default."
    )
