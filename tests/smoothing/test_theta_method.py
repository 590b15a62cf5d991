"""The theta method and its dynamic forms: closed forms, statsmodels, bounds of averages, hostile values."""

from __future__ import annotations

import pickle

import numpy as np
import pytest
from statsmodels.tsa.forecasting.theta import ThetaModel

from foredeck.smoothing.catalogue import smooth
from foredeck.smoothing.theta_method import fit_dynamic_theta, fit_optimised_theta, fit_theta
from references.open_data import values as open_values

METHODS = (fit_theta, fit_optimised_theta, fit_dynamic_theta)
ALPHAS = (0.02, 0.05, 0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9, 0.99)


@pytest.fixture(scope="module")
def walk():
    rng = np.random.default_rng(9)
    return 300 + np.cumsum(rng.normal(1.5, 2.0, 45)) + rng.normal(0, 3, 45)


@pytest.mark.parametrize("alpha", [0.1, 0.5, 0.9])
def test_theta_is_simple_smoothing_with_a_drift_of_half_the_slope_hyndman_billah_2003(walk, alpha):
    # International Journal of Forecasting 19, 287-290: l_n + b/2 (h - 1 + 1/alpha - (1-alpha)^n / alpha), to 1e-10
    n, lead = walk.size, np.arange(1, 9)
    slope = np.polyfit(np.arange(n), walk, 1)[0]
    level = smooth(walk, "ses", alpha=alpha, initial="first value").final["level"]
    expected = level + slope / 2 * (lead - 1 + 1 / alpha - (1 - alpha) ** n / alpha)
    np.testing.assert_allclose(fit_theta(walk, 1, {"alpha": alpha}).path(8), expected, rtol=1e-10)


@pytest.mark.parametrize("name", ["WWWusage", "Nile", "austres"])
def test_theta_equals_statsmodels_at_its_alpha_to_1e_8(name):
    # statsmodels.tsa.forecasting.theta: smoothing from the first value, theta = 2, no season
    values = open_values("datasets", name)
    theirs = ThetaModel(values, period=1, deseasonalize=False).fit()
    ours = fit_theta(values, 1, {"alpha": float(theirs.params["alpha"])})
    np.testing.assert_allclose(ours.path(10), theirs.forecast(10, theta=2).to_numpy(), rtol=1e-8)


def test_the_alpha_of_theta_has_the_least_mean_absolute_error_of_all_hundredths(walk):
    misses = [np.nanmean(np.abs(fit_theta(walk, 1, {"alpha": k / 100}).residuals)) for k in range(1, 100)]
    assert fit_theta(walk, 1).constants["alpha"] == pytest.approx((np.argmin(misses) + 1) / 100, rel=1e-15)


def test_optimised_theta_has_no_larger_squared_error_than_any_alpha_of_the_average(walk):
    best = fit_optimised_theta(walk, 1)
    errors = {alpha: fit_optimised_theta(walk, 1, {"alpha": alpha}).sse for alpha in ALPHAS}
    assert best.sse <= min(errors.values())
    assert best.sse < 0.9999 * errors[min(ALPHAS, key=lambda alpha: abs(alpha - best.constants["alpha"]))]
    assert 0 <= best.constants["theta_weight"] <= 0.98


def test_the_averaged_forecast_lies_within_the_forecasts_of_its_alphas_and_near_the_likely_ones(walk):
    each = [fit_dynamic_theta(walk, 1, {"alpha": alpha}) for alpha in ALPHAS]
    paths = np.array([fitted.path(12) for fitted in each])
    average = fit_dynamic_theta(walk, 1)
    assert (average.path(12) <= paths.max(axis=0)).all()
    assert (average.path(12) >= paths.min(axis=0)).all()
    weights = np.array([fitted.sse for fitted in each]) ** (-(walk.size - 2) / 2)
    np.testing.assert_allclose(average.path(12), weights @ paths / weights.sum(), rtol=1e-9)
    assert average.constants["alpha"] == pytest.approx(weights @ ALPHAS / weights.sum(), rel=1e-9)


def test_a_held_alpha_makes_the_average_the_same_as_the_optimised_method(walk):
    average, optimised = (fit(walk, 1, {"alpha": 0.3}) for fit in (fit_dynamic_theta, fit_optimised_theta))
    np.testing.assert_array_equal(average.path(6), optimised.path(6))
    assert average.constants == optimised.constants
    assert average.constants["alpha"] == 0.3


@pytest.mark.parametrize("fit", METHODS)
def test_a_perfect_season_on_a_level_is_repeated_and_was_forecast_from_the_second_or_third_period_on(fit):
    values = np.tile([10.0, 12.0, 11.0, 9.0], 6)
    fitted = fit(values, 4)
    first = 1 if fit is fit_theta else 2
    assert np.isnan(fitted.fitted[:first]).all()
    np.testing.assert_allclose(fitted.fitted[first:], values[first:], rtol=1e-9)
    np.testing.assert_allclose(fitted.forecast(6), np.resize(values[:4], 6), rtol=1e-9)


def test_what_rounding_leaves_of_a_perfect_season_chooses_no_alpha():
    values = np.resize([7.3, 11.9, 10.1, 8.7], 27)
    assert fit_theta(values, 4).constants["alpha"] == 0.01
    assert fit_optimised_theta(values, 4).constants["alpha"] == 0.02
    assert fit_dynamic_theta(values, 4).constants["alpha"] == pytest.approx(np.mean(ALPHAS), rel=1e-12)


@pytest.mark.parametrize("fit", METHODS)
def test_a_shift_and_a_change_of_unit_only_shift_and_scale_the_forecast(fit, walk):
    expected = fit(walk - 320, 1).path(8)
    np.testing.assert_allclose(fit((walk - 320) * 8.0 + 1024.0, 1).path(8), expected * 8.0 + 1024.0, rtol=1e-9)


@pytest.mark.parametrize("fit", METHODS)
@pytest.mark.parametrize("values", [[5.0], [5.0, 8.0], [0.0, 0.0], [-3.0, 4.0], [2.0, 2.0, 7.0], [0.0, 0.0, 4.0, 0.0]])
@pytest.mark.parametrize("alpha", [None, 0.0, 0.5, 1.0])
def test_a_few_periods_give_finite_forecasts_within_reach_of_them(fit, values, alpha):
    fitted = fit(np.array(values), 1, None if alpha is None else {"alpha": alpha})
    path = fitted.path(3)
    room = 3 * (max(values) - min(values))
    assert (path >= min(values) - room).all()
    assert (path <= max(values) + room).all()


@pytest.mark.parametrize("fit", METHODS)
def test_a_constant_goes_on_and_a_line_goes_on_rising(fit):
    np.testing.assert_allclose(fit(np.full(16, 7.3), 4).path(5), 7.3, rtol=1e-12)
    line = fit(20 + 3.0 * np.arange(16), 1).path(4)
    assert (np.diff(line) > 1.4).all()
    assert line[0] > 64


@pytest.mark.parametrize("fit", METHODS)
@pytest.mark.parametrize("unit", [1e-300, 1e-150, 1e150, 1e280])
def test_values_whose_squares_leave_the_number_range_give_the_same_forecasts_in_their_unit(fit, unit, walk):
    for shift in (0.0, -330.0):
        expected = fit(walk + shift, 12).forecast(4)
        np.testing.assert_allclose(fit((walk + shift) * unit, 12).forecast(4) / unit, expected, rtol=1e-6)


@pytest.mark.parametrize("fit", METHODS)
def test_a_fit_survives_pickling_and_is_the_same_each_time(fit, walk):
    fitted = fit(walk, 4)
    np.testing.assert_array_equal(pickle.loads(pickle.dumps(fitted)).forecast(6), fitted.forecast(6))
    np.testing.assert_array_equal(fit(walk.copy(), 4).forecast(6), fitted.forecast(6))
