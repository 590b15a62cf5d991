"""Measures of error by their definitions; published tables are in tests/smoothing."""

from __future__ import annotations

import numpy as np
import pytest

from foredeck.backtests.measures import bias, mae, mape, mase, mase_scale, mse, rmse, smape
from foredeck.errors import ShapeError

ACTUAL = np.array([[10.0, 20.0, np.nan], [0.0, 5.0, 8.0]])
FORECAST = np.array([[12.0, 16.0, 7.0], [0.0, 10.0, np.nan]])


def test_measures_drop_the_cells_where_actual_or_forecast_is_missing():
    assert bias(ACTUAL, FORECAST) == pytest.approx((-2 + 4 + 0 - 5) / 4)
    assert mae(ACTUAL, FORECAST) == pytest.approx(11 / 4)
    assert mse(ACTUAL, FORECAST) == pytest.approx((4 + 16 + 0 + 25) / 4)
    assert rmse(ACTUAL, FORECAST) == pytest.approx(np.sqrt(45 / 4))


def test_measures_by_lead_are_missing_where_every_cell_was_dropped():
    np.testing.assert_allclose(mae(ACTUAL, FORECAST, axis=0), [1.0, 4.5, np.nan])


def test_mape_drops_actuals_of_zero_and_smape_counts_two_zeros_as_no_error():
    assert mape(ACTUAL, FORECAST) == pytest.approx((20 + 20 + 100) / 3)
    assert smape(ACTUAL, FORECAST) == pytest.approx((200 * 2 / 22 + 200 * 4 / 36 + 0 + 200 * 5 / 15) / 4)
    assert smape(np.array([4.0]), np.array([0.0])) == pytest.approx(200.0)


def test_bias_is_above_zero_where_forecasts_were_too_low():
    assert bias(np.array([10.0]), np.array([7.0])) == 3.0


def test_mase_scale_is_the_mean_change_on_the_same_season_of_the_year_before():
    y = np.array([1.0, 2, 3, 4, 2, 2, np.nan, 8])
    assert mase_scale(y, 4) == pytest.approx((1 + 0 + 4) / 3)
    assert mase_scale(np.array([1.0, 3.0, 2.0]), 4) == pytest.approx(1.5)  # no full season: steps instead
    assert mase(np.array([3.0]), np.array([1.0]), 4.0) == pytest.approx(0.5)


def test_mase_scale_is_missing_for_a_series_without_change_or_of_one_period():
    assert np.isnan(mase_scale(np.full(9, 4.0), 4))
    assert np.isnan(mase_scale(np.array([4.0]), 4))


def test_unequal_shapes_are_refused_with_both_named():
    with pytest.raises(ShapeError) as caught:
        mae(np.zeros(3), np.zeros((3, 1)))
    assert str(caught.value) == (
        "Actuals have the shape (3,), forecasts (3, 1).\n"
        "  where: measures of error\n"
        "  allowed: two arrays of one shape\n"
        "  next: Hand in the forecast of each actual at its place."
    )
