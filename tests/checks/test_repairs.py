"""Repairs for fitting: what is replaced, with what, and what is left alone."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from checks.clean_series import KINDS, clean_series
from foredeck.checks.repairs import list_repairs, repaired
from foredeck.errors import ShapeError


def monthly(n: int = 84, seed: int = 1) -> np.ndarray:
    rng = np.random.default_rng(seed)
    t = np.arange(n)
    return (1000.0 + 5.0 * t) * (1.0 + 0.3 * np.sin(2 * np.pi * t / 12)) * np.exp(0.05 * rng.normal(size=n))


def drawn(seed: int, n: int) -> np.ndarray:
    """A series with whatever is wrong: odd values, gaps, jumps, slips of the unit."""
    rng = np.random.default_rng(seed)
    values = clean_series(KINDS[seed % len(KINDS)], n, 12, rng)
    for p in rng.integers(0, n, size=3):
        values[p] *= rng.choice([0.0, 0.1, 2.5, 10.0, np.nan])
    if seed % 3 == 0:
        values[n // 2:] *= 1.5
    return values


def test_an_outlier_is_replaced_by_what_level_and_season_suggest() -> None:
    y = monthly()
    true = y[40]
    y[40] *= 1.8
    (repair,) = list_repairs(y, 12)
    assert (repair.position, repair.code, repair.raw) == (40, "outlier", y[40])
    assert repair.used == pytest.approx(true, rel=0.15)
    assert repaired(y, 12)[40] == repair.used


@pytest.mark.parametrize("power", [10.0, 100.0, 1000.0, 0.1, 0.01, 0.001])
def test_a_change_of_unit_is_undone_exactly(power: float) -> None:
    y = monthly()
    true = y.copy()
    y[40] *= power
    (repair,) = list_repairs(y, 12)
    assert (repair.position, repair.code) == (40, "change_of_unit")
    assert repaired(y, 12) == pytest.approx(true, rel=1e-12)


def test_a_stretch_in_another_unit_is_undone_period_by_period() -> None:
    y = monthly()
    true = y.copy()
    y[40:47] /= 10.0
    assert [(r.position, r.code) for r in list_repairs(y, 12)] == [(p, "change_of_unit") for p in range(40, 47)]
    assert repaired(y, 12) == pytest.approx(true, rel=1e-12)


def test_a_unit_that_changes_for_good_is_left_as_it_is() -> None:
    y = monthly()
    y[40:] *= 10.0
    assert np.array_equal(repaired(y, 12), y)


@pytest.mark.parametrize("back", [1, 2, 3])
def test_an_outlier_in_the_last_three_periods_is_never_repaired(back: int) -> None:
    y = monthly()
    y[-back] *= 3.0
    assert np.array_equal(repaired(y, 12), y)
    later = np.append(y, monthly(100)[84:100])
    assert repaired(later, 12)[84 - back] < 0.6 * y[-back], "once newer periods are known it is"


def test_gaps_and_impossible_signs_are_filled_even_in_the_last_three_periods() -> None:
    y = monthly()
    true = y.copy()
    y[30], y[82], y[83] = np.nan, np.nan, -5.0
    assert [(r.position, r.code) for r in list_repairs(y, 12)] == [
        (30, "gap"), (82, "gap"), (83, "impossible_sign")]
    assert repaired(y, 12) == pytest.approx(true, rel=0.15)


def test_values_below_zero_stay_where_they_are_possible() -> None:
    y = monthly() - 1200.0
    assert np.array_equal(repaired(y, 12, nonnegative=False), y)


def test_level_shift_zero_run_and_repeated_values_are_not_repaired() -> None:
    shift, zeros, same = monthly(), monthly(), monthly()
    shift[40:] *= 1.5
    zeros[40:44] = 0.0
    same[40:47] = same[40]
    for values in (shift, zeros, same):
        assert np.array_equal(repaired(values, 12), values)


def test_under_two_seasons_a_gap_is_the_line_between_its_neighbours() -> None:
    assert repaired(np.array([10.0, np.nan, np.nan, 40.0, 50.0]), 12).tolist() == [10.0, 20.0, 30.0, 40.0, 50.0]
    year = monthly(20)
    year[7] = np.nan
    assert repaired(year, 12)[7] == pytest.approx((year[6] + year[8]) / 2, rel=1e-12)


def test_from_two_seasons_on_a_gap_knows_its_season() -> None:
    quarters = np.array([10.0, 20.0, 30.0, 40.0, 11.0, 21.0, 31.0, 41.0, 12.0, np.nan])
    assert repaired(quarters, 4)[9] == pytest.approx(22.0, abs=2.0)


def test_intermittent_demand_has_no_outliers_and_its_gaps_are_mostly_zero() -> None:
    y = np.zeros(60)
    y[::4] = 5.0
    y[24] = 400.0
    y[30] = np.nan
    assert [(r.position, r.code, r.used) for r in list_repairs(y, 12)] == [(30, "gap", 0.0)]


def test_a_series_without_any_value_is_all_zero() -> None:
    assert repaired(np.full(5, np.nan), 12).tolist() == [0.0] * 5
    assert repaired(np.array([]), 12).tolist() == []


def test_two_dimensions_are_refused() -> None:
    with pytest.raises(ShapeError) as refused:
        repaired(np.ones((3, 4)), 12)
    assert str(refused.value) == ("the values have 2 dimensions\n  allowed: one series, shape (n,)\n"
                                  "  next: hand in one series at a time")


@settings(max_examples=40, deadline=None, derandomize=True)
@given(st.integers(0, 10_000), st.integers(20, 96), st.integers(0, 40))
def test_repairs_use_the_past_alone(seed: int, n: int, later: int) -> None:
    """What is repaired at an origin is the same whatever came afterwards, and whatever was asked before."""
    whole = drawn(seed, n + later)
    other = whole.copy()
    other[n:] = other[n:] * 1000.0 + 7.0
    first = repaired(whole[:n], 12)
    repaired(whole, 12)
    repaired(other, 12)
    assert np.array_equal(repaired(other[:n], 12), first)


@settings(max_examples=60, deadline=None, derandomize=True)
@given(st.integers(0, 10_000), st.integers(5, 96))
def test_repaired_values_are_finite_not_negative_and_equal_the_raw_ones_elsewhere(seed: int, n: int) -> None:
    values = drawn(seed, n)
    before = values.copy()
    used = repaired(values, 12)
    assert np.array_equal(values, before, equal_nan=True), "the raw values are not touched"
    assert np.isfinite(used).all()
    assert (used >= 0).all()
    changed = {r.position for r in list_repairs(values, 12)}
    assert {int(p) for p in np.flatnonzero(used != values)} <= changed
    assert all(np.isnan(values[p]) for p in changed if p >= n - 3)


@settings(max_examples=40, deadline=None, derandomize=True)
@given(st.integers(0, 10_000), st.integers(24, 96), st.sampled_from([1e-4, 0.01, 4.0, 1e5]))
def test_repairs_do_not_depend_on_the_unit(seed: int, n: int, unit: float) -> None:
    values = drawn(seed, n)
    assert repaired(values * unit, 12) == pytest.approx(repaired(values, 12) * unit, rel=1e-6, abs=1e-9 * unit)
