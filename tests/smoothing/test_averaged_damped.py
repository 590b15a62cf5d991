"""The averaged damped trend: its grid, its bounds, and hostile values."""

from __future__ import annotations

from itertools import product

import numpy as np
import pytest

from foredeck.smoothing.averaged_damped import fit_averaged_damped
from references import plain_averages as plain

ALPHAS = (0.05, 0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9, 0.99)
BETAS, PHIS = (0.0, 0.05, 0.1, 0.2, 0.4), (0.8, 0.9, 0.95, 0.98)


@pytest.fixture(scope="module")
def walk():
    rng = np.random.default_rng(10)
    return 300 + np.cumsum(1.5 + np.cumsum(rng.normal(0, 0.2, 45))) + rng.normal(0, 3, 45)


def test_the_forecast_is_the_likelihood_weighted_mean_of_220_published_forecasts_to_1e_9(walk):
    fit, path, weights = plain.averaged_damped(walk, ALPHAS, BETAS, PHIS, 9)
    fitted = fit_averaged_damped(walk, 1)
    assert weights.size == 220
    np.testing.assert_allclose(fitted.path(9), path, rtol=1e-9)
    np.testing.assert_allclose(fitted.fitted[1:], fit, rtol=1e-9)
    assert np.isnan(fitted.fitted[0])


def test_the_averaged_forecast_lies_within_the_forecasts_of_its_constants(walk):
    paths = np.array([fit_averaged_damped(walk, 1, dict(zip(("alpha", "beta", "phi"), point, strict=True))).path(9)
                      for point in product(ALPHAS, BETAS, PHIS)])
    average = fit_averaged_damped(walk, 1).path(9)
    assert (average <= paths.max(axis=0)).all()
    assert (average >= paths.min(axis=0)).all()


def test_held_constants_are_used_as_they_are_and_the_others_averaged(walk):
    fitted = fit_averaged_damped(walk, 1, {"phi": 0.85, "alpha": 0.15, "gamma": 0.3})
    assert fitted.constants["phi"] == pytest.approx(0.85, rel=1e-14)
    assert fitted.constants["alpha"] == pytest.approx(0.15, rel=1e-14)
    _, path, weights = plain.averaged_damped(walk, [0.15], BETAS, [0.85], 5)
    np.testing.assert_allclose(fitted.path(5), path, rtol=1e-9)
    assert fitted.constants["beta"] == pytest.approx(weights @ BETAS, rel=1e-8)
    assert set(fitted.constants) == {"alpha", "beta", "phi"}


def test_level_and_trend_are_those_of_the_forecast(walk):
    fitted = fit_averaged_damped(walk, 1, {"phi": 0.9})
    level, trend = fitted.final["level"], fitted.final["trend"]
    np.testing.assert_allclose(fitted.path(2), [level + 0.9 * trend, level + (0.9 + 0.81) * trend], rtol=1e-12)


@pytest.mark.parametrize("values", [[5.0], [5.0, 8.0], [0.0, 0.0], [-3.0, 4.0], [2.0, 2.0, 7.0], [0.0, 0.0, 4.0, 0.0]])
@pytest.mark.parametrize("held", [None, dict.fromkeys(("alpha", "beta", "phi"), 0.0),
                                  dict.fromkeys(("alpha", "beta", "phi"), 1.0)])
def test_a_few_periods_give_finite_forecasts_within_reach_of_them(values, held):
    path = fit_averaged_damped(np.array(values), 1, held).path(3)
    room = 4 * (max(values) - min(values))
    assert (path >= min(values) - room).all()
    assert (path <= max(values) + room).all()


def test_a_constant_goes_on_and_a_line_goes_on_rising():
    np.testing.assert_allclose(fit_averaged_damped(np.full(16, 7.3), 4).path(5), 7.3, rtol=1e-12)
    line = fit_averaged_damped(20 + 3.0 * np.arange(16), 1).path(4)
    assert (np.diff(line) > 1.4).all()
    assert line[0] > 66


@pytest.mark.parametrize("unit", [1e-300, 1e-150, 1e150, 1e280])
def test_values_whose_squares_leave_the_number_range_give_the_same_forecasts_in_their_unit(unit, walk):
    for shift in (0.0, -330.0):
        expected = fit_averaged_damped(walk + shift, 12).forecast(4)
        forecast = fit_averaged_damped((walk + shift) * unit, 12).forecast(4)
        np.testing.assert_allclose(forecast / unit, expected, rtol=1e-6)
