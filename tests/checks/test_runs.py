"""Runs of zeros and of one value, and the runs that are no finding."""

from __future__ import annotations

import numpy as np

from foredeck.checks.runs import Run, constant_runs, zero_runs


def selling(n: int = 60, seed: int = 0) -> np.ndarray:
    return np.round(np.random.default_rng(seed).normal(300.0, 25.0, n))


def test_three_zeros_in_a_row_are_a_run_when_there_is_demand_otherwise() -> None:
    y = selling()
    y[20:23] = 0.0
    assert zero_runs(y, 12) == [Run(20, 22, 0.0)]


def test_zeros_at_the_end_and_at_the_beginning_are_runs_too() -> None:
    y = selling()
    y[:4], y[-3:] = 0.0, 0.0
    assert [(r.first, r.last) for r in zero_runs(y, 12)] == [(0, 3), (57, 59)]


def test_one_zero_alone_is_no_run() -> None:
    y = selling()
    y[20] = 0.0
    assert zero_runs(y, 12) == []


def test_zeros_that_come_every_year_are_no_finding() -> None:
    y = selling()
    y[(np.arange(60) % 12 == 0) | (np.arange(60) % 12 == 1)] = 0.0
    assert zero_runs(y, 12) == []


def test_zeros_of_an_intermittent_series_are_no_finding() -> None:
    y = np.zeros(60)
    y[::3] = 4.0
    assert zero_runs(y, 12) == []


def test_zero_is_nothing_special_where_values_go_below_it() -> None:
    y = selling() - 300.0
    y[20:24] = 0.0
    assert zero_runs(y, 12) == []


def test_small_counts_have_zeros_by_chance() -> None:
    y = np.random.default_rng(1).poisson(1.8, 84).astype(float)
    y[40:43] = 0.0
    assert zero_runs(y, 12) == []


def test_one_value_six_times_over_is_a_run() -> None:
    y = selling()
    y[30:36] = y[30]
    assert constant_runs(y) == [Run(30, 35, y[30])]


def test_ties_of_small_counts_are_no_run() -> None:
    y = np.random.default_rng(2).poisson(2.0, 84).astype(float)
    y[40:44] = 2.0
    assert constant_runs(y) == []


def test_a_series_of_steps_is_no_run() -> None:
    """A price or a head count stays for months; its ties are the rule."""
    y = np.repeat(np.array([10.0, 12.0, 11.0, 15.0, 14.0, 16.0]), 8)
    assert constant_runs(y) == []


def test_a_missing_period_breaks_a_run() -> None:
    y = selling()
    y[30:36] = y[30]
    y[33] = np.nan
    assert constant_runs(y) == []
