"""Value axes and labels pushed apart."""

from __future__ import annotations

from itertools import pairwise

import pytest
from hypothesis import given
from hypothesis import strategies as st

from foredeck.charts.scale import decimals_for, number, pushed_apart, two_figures, value_axis

NAN = float("nan")
VALUES = st.floats(min_value=-1e9, max_value=1e9, allow_nan=False).filter(lambda v: v == 0 or abs(v) > 1e-6)


@given(st.lists(VALUES, min_size=1, max_size=12), st.booleans())
def test_an_axis_holds_every_value_with_at_most_six_ticks_inside_it(values, zero):
    axis = value_axis(values, zero=zero)
    assert axis.low <= min(values)
    assert axis.high >= max(values)
    assert 1 <= len(axis.ticks) == len(set(axis.texts)) <= 6
    slack = 1e-9 * (axis.high - axis.low)
    assert all(axis.low - slack <= t <= axis.high + slack for t in axis.ticks)
    assert not zero or axis.low <= 0 <= axis.high


@pytest.mark.parametrize(("top", "texts"), [
    (2500, ("0", "500", "1,000", "1,500", "2,000", "2,500")), (0.02, ("0.000", "0.005", "0.010", "0.015", "0.020")),
    (5_000_000, ("0", "1,000,000", "2,000,000", "3,000,000", "4,000,000", "5,000,000")),
])
def test_ticks_are_round_at_any_scale(top, texts):
    assert value_axis([0, top]).texts == texts


def test_an_axis_of_levels_begins_at_zero_and_one_of_differences_need_not():
    assert value_axis([90, 110]).low == 0
    assert value_axis([90, 110], zero=False).low > 80
    assert value_axis([-40, -10]).high == 0


def test_without_values_there_is_still_an_axis():
    assert value_axis([NAN]).texts[0] == "0.0"


def test_labels_are_at_least_a_gap_apart_in_their_order_and_inside_the_axis():
    axis = value_axis([0, 100])
    placed = pushed_apart([50, 50.5, 51, 3, 99], axis, 300, gap=17)
    pixels = [y * 300 / (axis.high - axis.low) for y in placed]
    assert sorted(range(5), key=lambda k: pixels[k]) == [3, 0, 1, 2, 4]
    ordered = sorted(pixels)
    assert min(b - a for a, b in pairwise(ordered)) >= 17 - 1e-9
    assert ordered[0] >= 8.5 - 1e-9


def test_labels_that_are_far_apart_stay_where_they_are():
    assert pushed_apart([10, 50, 90], value_axis([0, 100]), 300) == pytest.approx([10, 50, 90])


def test_numbers_in_charts_read_like_those_in_sentences():
    assert [number(-1890), number(NAN), number(0.25, 2)] == ["−1,890", "–", "0.25"]
    assert [two_figures(v) for v in (146.4, 2.84, 0.0035, 0)] == ["150", "2.8", "0.0035", "0"]
    assert decimals_for([0.0895, NAN]) == 4
    assert decimals_for([12, 99]) == 0
