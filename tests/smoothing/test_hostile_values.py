"""Properties that hold for any values: forecasts are finite, capped, and move with scale and shift."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from foredeck.compiled.recursions import MULTIPLICATIVE
from foredeck.errors import MethodError
from foredeck.smoothing.catalogue import METHODS, fit
from foredeck.smoothing.state_space import Form, fit_form, spread

SEASON = 4
QUICK = settings(max_examples=25, deadline=None, derandomize=True)
ANY = st.floats(-1e6, 1e6, allow_nan=False).map(lambda value: round(value, 3))
COUNTS = st.sampled_from([0.0, 0.0, 1.0, 2.0, 40.0])
POSITIVE = st.floats(0.01, 1e4).map(lambda value: round(value, 3))


def usable(name, values):
    needs = METHODS[name].requirements
    return not (needs.positive and values.min() <= 0)


@QUICK
@given(st.lists(st.one_of(ANY, COUNTS), min_size=9, max_size=30))
def test_every_method_forecasts_finite_values_within_the_documented_reach_of_history(numbers):
    values = np.array(numbers)
    span = values.max() - values.min()
    room = span * max(1.0, 2 * 12 / (values.size - 1)) * (1 + 1e-9)
    for name in METHODS:
        if usable(name, values):
            fitted = fit(name, values, SEASON)
            forecast = fitted.forecast(12)
            assert np.isfinite(forecast).all(), name
            assert forecast.min() >= values.min() - room, name
            assert forecast.max() <= values.max() + room, name
            assert fitted.sse >= 0, name


@QUICK
@given(st.lists(st.one_of(POSITIVE, COUNTS), min_size=9, max_size=20), st.sampled_from([2.0**-30, 2.0**40]))
def test_a_unit_that_is_a_power_of_two_changes_nothing_but_the_unit_of_any_forecast(numbers, unit):
    values = np.array(numbers)
    for name in METHODS:
        if usable(name, values):
            forecast = fit(name, values, SEASON).forecast(6) * unit
            np.testing.assert_allclose(fit(name, values * unit, SEASON).forecast(6), forecast, rtol=1e-12)


@pytest.mark.parametrize("unit", [1e-9, 1e-3, 1e6, 1e12])
@pytest.mark.parametrize("name", list(METHODS))
def test_any_other_unit_changes_forecasts_of_an_ordinary_series_by_less_than_1e_5(name, unit):
    values = 50 + np.tile([-6.0, 9, -1, -2], 8) + np.random.default_rng(3).normal(size=32)
    forecast = fit(name, values, 4).forecast(6) * unit
    np.testing.assert_allclose(fit(name, values * unit, 4).forecast(6), forecast, rtol=1e-5)


@pytest.mark.parametrize("name", ["ses", "holt", "damped_holt", "holt_winters_additive", "differenced_ses"])
def test_an_additive_form_keeps_its_digits_on_a_small_movement_of_a_large_level(name):
    values = np.tile([-6.0, 9, -1, -2], 8) + np.random.default_rng(3).normal(size=32)
    low, high = fit(name, values, 4), fit(name, values + 2.0**30, 4)
    np.testing.assert_allclose(high.forecast(6) - 2.0**30, low.forecast(6), atol=1e-4)


@pytest.mark.parametrize("unit", [1e-300, 1e-150, 1e150, 1e280])
@pytest.mark.parametrize("name", ["ses", "holt", "holt_winters_additive", "holt_winters_multiplicative"])
def test_values_whose_squares_leave_the_number_range_still_give_forecasts_of_their_size(name, unit):
    values = (50 + np.tile([-6.0, 9, -1, -2], 8)) * unit
    with np.errstate(over="ignore", under="ignore"):
        forecast = fit(name, values, 4).forecast(4)
    assert (forecast > 30 * unit).all()
    assert (forecast < 70 * unit).all()


@pytest.mark.parametrize("name", list(METHODS))
def test_a_constant_series_is_forecast_at_its_constant(name):
    np.testing.assert_allclose(fit(name, np.full(16, 7.3), 4).forecast(5), 7.3, rtol=1e-12)


@pytest.mark.parametrize("name", ["holt", "drift", "differenced_ses", "holt_winters_additive"])
def test_a_straight_line_is_continued_as_it_is(name):
    line = 20 + 3.0 * np.arange(16)
    fitted = fit(name, line, 4)
    np.testing.assert_allclose(fitted.forecast(8), 20 + 3.0 * np.arange(16, 24), rtol=1e-6)


@pytest.mark.parametrize("name", ["holt_winters_additive", "holt_winters_multiplicative"])
def test_a_perfect_season_is_repeated_as_it_is(name):
    season = np.tile([44.0, 59, 49, 48], 5)
    np.testing.assert_allclose(fit(name, season, 4).forecast(8), season[:8], rtol=1e-5)


NO_SEASON = [name for name in METHODS if METHODS[name].season == "none"]


@pytest.mark.parametrize("name", NO_SEASON)
@pytest.mark.parametrize("values", [[5.0, 8.0], [0.0, 0.0], [-3.0, 4.0]])
def test_two_periods_give_finite_forecasts(name, values):
    if usable(name, np.array(values)):
        assert np.isfinite(fit(name, np.array(values), 1).forecast(3)).all()
    else:
        with pytest.raises(MethodError, match="needs values above zero"):
            fit(name, np.array(values), 1)


@pytest.mark.parametrize("name", [name for name in NO_SEASON if name != "differenced_ses"])
def test_one_period_is_forecast_to_go_on(name):
    assert fit(name, np.array([5.0]), 1).forecast(3).tolist() == [5.0] * 3


def test_a_multiplicative_season_after_a_level_shift_stays_within_the_cap():
    # The known explosion: quiet years, then a shift by a factor of thirty within a season.
    values = np.concatenate([np.tile([1.0, 2.0, 1.5, 0.5], 4), [30.0, 1.0, 45.0, 60.0]])
    fitted = fit_form(Form("m", "m", True, False, MULTIPLICATIVE), values, 4,
                      {"alpha": 0.9, "beta": 0.9, "gamma": 0.1})
    assert np.abs(fitted.path(12)).max() > fitted.reach(12)[1]
    assert fitted.forecast(12).max() == fitted.reach(12)[1]
    assert fitted.reach(12) == pytest.approx((0.5 - 59.5 * 24 / 19, 60.0 + 59.5 * 24 / 19))


@pytest.mark.parametrize("phi", [1.0, 0.9])
def test_variance_by_lead_is_the_sum_of_squared_responses_of_the_recursion_to_one_shock(phi):
    level, trend, season = 0.3, 0.3 * 0.4, [0.25, 0.0, 0.0, 0.0]  # the states after an error of 1
    responses = [1.0]
    for lead in range(1, 12):
        trend *= phi
        level += trend
        responses.append(level + season[lead % 4])
    expected = np.cumsum(np.square(responses))
    np.testing.assert_allclose(spread(12, alpha=0.3, beta=0.4, gamma=0.25, phi=phi, m=4), expected, rtol=1e-12)
