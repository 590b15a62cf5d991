"""Ranges of totals, against the variance of a sum (closed form)."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from foredeck.portfolio.joint_totals import past_bias, total_range, window_errors

SERIES, ORIGINS = 30, 400


def total_sd(standardised: np.ndarray, scale: np.ndarray, leads: int = 1) -> float:
    errors = window_errors(standardised, scale, np.arange(leads), (80,), np.ones((1, 2, standardised.shape[2])))
    half = total_range(errors, np.arange(len(scale))).mean()
    return float(half / stats.norm.ppf(0.9))


def shared(common: float, seed: int) -> np.ndarray:
    rng = np.random.default_rng(seed)
    own, together = rng.normal(size=(SERIES, ORIGINS, 1)), rng.normal(size=(1, ORIGINS, 1))
    return np.sqrt(1 - common) * own + np.sqrt(common) * together


def test_independent_series_add_in_variance() -> None:
    scale = np.full((SERIES, 1), 2.0)
    assert total_sd(shared(0.0, 1), scale) == pytest.approx(2.0 * np.sqrt(SERIES), rel=0.08)


def test_series_that_move_as_one_add_in_spread() -> None:
    scale = np.full((SERIES, 1), 2.0)
    assert total_sd(shared(1.0, 2), scale) == pytest.approx(2.0 * SERIES, rel=0.05)


def test_a_common_shock_gives_the_variance_of_equally_correlated_terms() -> None:
    # Var(sum) = n (1 - r) + n^2 r for unit variances
    expected = np.sqrt(SERIES * 0.7 + SERIES**2 * 0.3)
    assert total_sd(shared(0.3, 3), np.ones((SERIES, 1))) == pytest.approx(expected, rel=0.08)


def test_leads_that_repeat_the_same_error_add_in_spread() -> None:
    once = np.random.default_rng(4).normal(size=(SERIES, ORIGINS, 1))
    assert total_sd(np.repeat(once, 4, axis=2), np.ones((SERIES, 4)), leads=4) == pytest.approx(
        4 * np.sqrt(SERIES), rel=0.08)


def test_a_series_without_past_errors_enters_by_the_common_correlation() -> None:
    errors = shared(0.3, 5)
    errors[-1] = np.nan
    expected = np.sqrt(SERIES * 0.7 + SERIES**2 * 0.3)
    assert total_sd(errors, np.ones((SERIES, 1))) == pytest.approx(expected, rel=0.08)


def test_without_any_known_window_the_leads_are_taken_as_moving_together() -> None:
    nothing = np.full((2, 5, 3), np.nan)
    errors = window_errors(nothing, np.ones((2, 3)), np.arange(3), (80,), np.full((1, 2, 3), 1.5))
    assert errors.spread == pytest.approx([3.0, 3.0])
    assert total_range(errors, np.array([0])) == pytest.approx(np.full((1, 2), 4.5))


def test_the_past_bias_of_a_total_is_the_sum_of_its_members_mean_errors_at_today_s_scale() -> None:
    errors = np.array([[0.0, 1.0, 3.0], [0.0, -1.0, np.nan], [np.nan, np.nan, np.nan]])[:, :, None]
    errors[:, 0] = np.nan  # offset 0 is now
    found = window_errors(errors, np.array([[10.0], [100.0], [5.0]]), np.arange(1), (80,), np.ones((1, 2, 1)))
    # with fewer than three origins nothing is pooled, and nothing is known of the bias
    assert np.isnan(past_bias(found, np.arange(3)))
    many = np.tile(errors, (1, 4, 1))
    found = window_errors(many, np.array([[10.0], [100.0], [5.0]]), np.arange(1), (80,), np.ones((1, 2, 1)))
    assert past_bias(found, np.array([0])) == pytest.approx(20.0)  # mean of 1 and 3, times 10
    assert past_bias(found, np.arange(3)) == pytest.approx(20.0 - 100.0)
    assert np.isnan(past_bias(found, np.array([2])))


def test_past_forecasts_without_any_error_leave_the_plain_multipliers() -> None:
    perfect = np.zeros((2, 9, 3))
    errors = window_errors(perfect, np.ones((2, 3)), np.arange(3), (80,), np.full((1, 2, 3), 0.5))
    assert total_range(errors, np.array([0])) == pytest.approx(np.full((1, 2), 1.5))
