"""Mean, naive, seasonal naive, drift and moving average against published tables."""

from __future__ import annotations

import numpy as np
import pytest

from foredeck.backtests.measures import bias, mae, mape, mase, mase_scale, rmse
from foredeck.errors import MethodError
from foredeck.smoothing.benchmarks import equal_age_alpha
from foredeck.smoothing.catalogue import fit, smooth
from references.open_data import values


@pytest.fixture(scope="module")
def beer():
    y = values("fpp2", "ausbeer", 1992)
    assert y.size == 74
    return y[:64], y[64:]


@pytest.mark.parametrize(("name", "printed"), [
    ("mean", (-13.775, 38.45, 34.83, 8.28, 2.44)),
    ("naive", (-51.4, 62.69, 57.40, 14.18, 4.01)),
    ("seasonal_naive", (5.2, 14.31, 13.40, 3.17, 0.94)),
])
def test_fpp2_section_3_4_beer_accuracy_table_to_the_printed_digits(beer, name, printed):
    known, actual = beer
    forecast = fit(name, known, 4).forecast(10)
    scale = mase_scale(known, 4)
    got = (bias(actual, forecast), rmse(actual, forecast), mae(actual, forecast), mape(actual, forecast),
           mase(actual, forecast, scale))
    np.testing.assert_allclose(got, printed, atol=0.0051)


@pytest.mark.parametrize(("name", "printed"), [
    ("mean", (114.21, 113.27, 20.32, 30.28)),
    ("naive", (28.43, 24.59, 4.36, 6.57)),
    ("drift", (14.08, 11.67, 2.07, 3.12)),
])
def test_fpp2_section_3_4_google_accuracy_table_to_the_printed_digits(name, printed):
    known, actual = values("fpp2", "goog200", 1, 201), values("fpp2", "goog", 201, 241)
    assert (known.size, actual.size) == (200, 40)
    forecast = fit(name, known, 1).forecast(40)
    got = (rmse(actual, forecast), mae(actual, forecast), mape(actual, forecast),
           mase(actual, forecast, mase_scale(known, 1)))
    np.testing.assert_allclose(got, printed, atol=0.0051)


def test_fpp2_section_3_4_drift_on_google_has_cross_validated_rmse_6_233_and_residual_rmse_6_169():
    y = values("fpp2", "goog200", 1, 201)
    # from two known days on: with one there is no drift yet
    forecast = np.array([fit("drift", y[:known], 1).forecast(1)[0] for known in range(2, 200)])
    assert rmse(y[2:], forecast) == pytest.approx(6.233, abs=5e-4)
    assert rmse(y, fit("drift", y, 1).fitted) == pytest.approx(6.169, abs=5e-4)


def test_fpp2_section_3_5_naive_95_percent_interval_of_google_is_519_3_to_543_6():
    y = values("fpp2", "goog200", 1, 201)
    fitted = fit("naive", y, 1)
    np.testing.assert_allclose(fitted.forecast(1), 531.48, atol=0.005)
    np.testing.assert_allclose(fitted.ranges(1)[:, 0], [519.3, 543.6], atol=0.06)


@pytest.mark.parametrize(("name", "spread"), [
    ("naive", [1, 2, 3, 4, 5]),
    ("seasonal_naive", [1, 1, 1, 1, 2]),
    ("mean", [1 + 1 / 20] * 5),
    ("drift", [h * (1 + h / 20) for h in range(1, 6)]),
])
def test_variance_by_lead_is_that_of_fpp2_table_3_1(name, spread):
    y = np.random.default_rng(0).normal(size=20)
    np.testing.assert_allclose(fit(name, y, 4).spread(5), spread, rtol=1e-12)


def test_moving_average_forecasts_the_mean_of_its_window_and_defaults_to_a_season():
    y = np.arange(1.0, 11.0)
    assert smooth(y, "moving_average", window=3).forecast(2).tolist() == [9.0, 9.0]
    one_step = smooth(y, "moving_average", window=3).fitted
    np.testing.assert_allclose(one_step, [np.nan] * 3 + list(range(2, 9)))
    assert smooth(y, "moving_average", 4).constants["window"] == 4
    assert smooth(y, "moving_average").constants["window"] == 3
    assert smooth(y[:2], "moving_average", 4).forecast(1)[0] == 1.5


def test_alpha_2_over_w_plus_1_gives_smoothing_the_mean_age_of_a_moving_average_common_practice():
    for window in (3, 6, 12):
        alpha = equal_age_alpha(window)
        ages = np.arange(4000)
        age_of_smoothing = np.sum(ages * alpha * (1 - alpha) ** ages)
        assert age_of_smoothing == pytest.approx(np.mean(np.arange(window)), rel=1e-9)
        assert age_of_smoothing == pytest.approx((window - 1) / 2, rel=1e-9)


def test_on_a_straight_line_both_lag_by_the_mean_age_of_their_data():
    line = np.arange(400.0)
    average = smooth(line, "moving_average", window=12).forecast(1)[0]
    smoothed = smooth(line, "ses", alpha=equal_age_alpha(12), initial="first value").forecast(1)[0]
    assert 399 - average == pytest.approx(5.5)
    assert 399 - smoothed == pytest.approx(5.5, rel=1e-9)


def test_seasonal_naive_refuses_less_than_a_season_with_its_whole_message():
    with pytest.raises(MethodError) as caught:
        fit("seasonal_naive", np.arange(3.0), 4)
    assert str(caught.value) == (
        "The seasonal naive method needs one full season; there are 3 periods of 4.\n"
        "  where: method seasonal_naive\n"
        "  allowed: at least 4 periods at a season length of 4\n"
        "  next: Use the naive method until there is more history."
    )


def test_moving_average_refuses_half_a_period_with_its_whole_message():
    nine = np.arange(9.0)
    with pytest.raises(MethodError) as caught:
        smooth(nine, "moving_average", window=2.5)
    assert str(caught.value) == (
        "The window is 2.5.\n  where: method moving_average\n  allowed: a whole number of periods, at least 1\n"
        "  next: Give the number of periods to average."
    )
