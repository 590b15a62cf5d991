"""Equal weights, and errors relative to the benchmark."""

from __future__ import annotations

import numpy as np
import pytest

from foredeck.backtests.choice import equal_weights, relative_errors
from foredeck.errors import ShapeError

METHODS = ("naive", "seasonal_naive", "ses", "holt", "damped_holt")
POOL = np.array([False, False, True, True, True])


def errors_of(*sizes, origins=6, leads=2):
    """Errors of constant size by method."""
    return np.array(sizes)[:, None, None] * np.ones((len(sizes), origins, leads))


def test_every_method_of_the_pool_has_the_same_weight_and_the_others_none():
    assert equal_weights(POOL).tolist() == [0, 0, 1 / 3, 1 / 3, 1 / 3]
    assert equal_weights(np.zeros(5, dtype=bool)).tolist() == [0] * 5


def test_every_lead_counts_the_same_however_large_its_errors():
    errors = errors_of(1, 1, 1, 1, 1)
    errors[:2, :, 1] = 100.0
    errors[2, :, 0], errors[2, :, 1] = 0.5, 90.0  # half at lead 1, nine tenths at lead 2
    np.testing.assert_allclose(relative_errors(METHODS, errors)[2], 0.7)


def test_a_method_that_came_late_is_compared_in_its_own_cells_only():
    errors = errors_of(10, 10, 5, 10, 10)
    errors[:, :4] *= 10  # hard times, in which only some had a forecast
    errors[2, :4] = np.nan
    np.testing.assert_allclose(relative_errors(METHODS, errors), [1, 1, 0.5, 1, 1])


def test_the_naive_stands_in_where_the_seasonal_naive_has_no_forecast():
    errors = errors_of(4, 2, 2, 2, 2)
    errors[1, :3] = np.nan
    relative = relative_errors(METHODS, errors)
    assert relative[2] == pytest.approx(2 / 3)  # half the cells against 4, half against 2


def test_a_perfect_benchmark_leaves_1_for_the_perfect_and_infinity_for_the_rest():
    relative = relative_errors(METHODS, errors_of(0, 0, 0, 1, 1))
    assert relative.tolist() == [1, 1, 1, np.inf, np.inf]


def test_demand_rates_are_compared_by_squares_since_absolute_errors_reward_a_forecast_of_zero():
    # demand of 10 in every fifth period: zero has the smaller absolute error, the rate the smaller square
    actual = np.tile([0.0, 0, 0, 0, 10], 4)[:, None]
    zero, rate = actual - 0.0, actual - 2.0
    assert np.abs(zero).mean() < np.abs(rate).mean()
    relative = relative_errors(("naive", "croston", "tsb"), np.array([actual - 5.0, zero, rate]))
    assert relative[2] < relative[1]


def test_errors_that_do_not_fit_or_lack_the_benchmark_are_refused_with_the_whole_message():
    with pytest.raises(ShapeError) as caught:
        relative_errors(("ses", "holt"), errors_of(1, 1))
    assert str(caught.value) == (
        "There are errors of shape (2, 6, 2) for the methods ses, holt.\n"
        "  where: choice\n"
        "  allowed: errors of shape (methods, origins, leads), 'naive' among the methods\n"
        "  next: Hand in the methods of the cube, benchmarks included, and their errors."
    )
