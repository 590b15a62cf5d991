"""Worked examples from handbooks and textbooks, each with its source and tolerance."""

from __future__ import annotations

import numpy as np
import pytest

from foredeck.backtests.measures import bias, mae, mape, mase_scale, mse, rmse
from foredeck.smoothing.catalogue import fit, smooth
from references.open_data import values

NIST_SINGLE = np.array([71.0, 70, 69, 68, 64, 65, 72, 78, 75, 75, 75, 70])
NIST_DOUBLE = np.array([6.4, 5.6, 7.8, 8.8, 11.0, 11.6, 16.7, 15.3, 21.6, 22.4])
NIST_SALES = np.array([362.0, 385, 432, 341, 382, 409, 498, 387, 473, 513, 582, 474, 544, 582, 681, 557,
                       628, 707, 773, 592, 627, 725, 854, 661])
COMPLAINTS = np.array([
    27.0, 34, 31, 24, 18, 19, 17, 12, 26, 14, 18, 33, 31, 31, 19, 17, 10, 25, 26, 18, 18, 10, 4, 20,
    28, 21, 18, 23, 19, 16, 10, 24, 11, 11, 13, 27, 18, 20, 21, 6, 9, 29, 12, 19, 14, 19, 16, 23,
])
EXERCISE = np.array([99.0, 88, 50, 58, 62, 60, 55, 62, 71, 65])


def test_nist_6_4_3_1_single_smoothing_at_alpha_1_to_the_printed_digits():
    # S2 = y1 is the forecast of period 2, and so on: the printed S column.
    fitted = smooth(NIST_SINGLE, "ses", alpha=0.1, initial="first value")
    printed = [71, 70.9, 70.71, 70.44, 69.80, 69.32, 69.58, 70.43, 70.88, 71.29, 71.67]
    np.testing.assert_allclose(fitted.fitted[1:], printed, atol=0.0051)
    assert fitted.sse == pytest.approx(208.82, abs=0.005)  # exact; printed from rounded figures 208.94
    assert fitted.sse / 11 == pytest.approx(19.0, abs=0.05)


def test_nist_6_4_3_2_bootstrapped_forecasts_from_origin_70_and_s_71_67_to_the_printed_digits():
    # S(t+1) = alpha * y_origin + (1 - alpha) * S(t): the same smoothing, fed the origin again and again
    again = np.concatenate([NIST_SINGLE, np.full(5, 70.0)])
    fitted = smooth(again, "ses", alpha=0.1, initial="first value")
    np.testing.assert_allclose(fitted.fitted[12:], [71.50, 71.35, 71.21, 71.09, 70.98], atol=0.0051)
    assert smooth(NIST_SINGLE, "ses", alpha=0.1, initial="first value").forecast(1)[0] == fitted.fitted[12]


def test_nist_6_4_3_4_double_smoothing_finds_alpha_3623_gamma_1_and_its_forecasts():
    slope = (NIST_DOUBLE[3] - NIST_DOUBLE[0]) / 3
    fitted = smooth(NIST_DOUBLE, "holt", initial={"level": NIST_DOUBLE[0], "trend": slope, "after": 1})
    assert fitted.constants["alpha"] == pytest.approx(0.3623, abs=1e-4)
    assert fitted.constants["beta"] == pytest.approx(1.0, abs=2e-4)  # our bound is .9999
    levels = NIST_DOUBLE[1:] - (1 - fitted.constants["alpha"]) * fitted.residuals[1:]
    np.testing.assert_allclose(levels, [6.6, 7.2, 8.1, 9.8, 11.5, 14.5, 16.7, 19.9, 22.8], atol=0.051)
    one_step = [7.2, 6.8, 7.8, 9.1, 11.4, 13.2, 17.4, 18.9, 23.05]
    np.testing.assert_allclose(fitted.fitted[1:], one_step, atol=0.051)
    np.testing.assert_allclose(fitted.forecast(5), [25.8, 28.7, 31.7, 34.6, 37.6], atol=0.051)
    assert fitted.sse / 9 == pytest.approx(3.6743, abs=2e-4)  # the exact minimum, recomputed; printed 3.7024


def test_nist_6_4_3_4_single_smoothing_of_the_same_data_finds_alpha_977():
    fitted = smooth(NIST_DOUBLE, "ses", initial="first value")
    assert fitted.constants["alpha"] == pytest.approx(0.9773, abs=2e-4)
    assert fitted.sse / 9 == pytest.approx(8.8768, abs=2e-4)


def test_nist_6_4_3_6_sales_single_smoothing_at_alpha_4694_has_mse_6906():
    fitted = smooth(NIST_SALES, "ses", alpha=0.4694, initial="first value")
    assert fitted.sse / 23 == pytest.approx(6906, abs=1.0)


def test_nist_6_4_3_6_initial_trend_of_the_sales_is_9_75():
    fitted = smooth(NIST_SALES, "holt_winters_multiplicative", 4, alpha=0.5, beta=0.1, gamma=0.1,
                    initial="first value")
    assert fitted.initial["trend"] == pytest.approx(9.75, abs=1e-12)
    assert fitted.initial["level"] == pytest.approx(380.0, abs=1e-12)


def test_cowpertwait_and_metcalfe_motor_complaints_alpha_143_sse_2502_level_17_70():
    fitted = smooth(COMPLAINTS, "ses", initial="first value")
    assert fitted.constants["alpha"] == pytest.approx(0.14298, abs=1e-4)
    assert fitted.sse == pytest.approx(2502.03, abs=0.005)
    assert fitted.final["level"] == pytest.approx(17.7035, abs=5e-4)
    held = smooth(COMPLAINTS, "ses", alpha=0.2, initial="first value")
    assert held.sse == pytest.approx(2526.39, abs=0.005)


def test_nile_from_its_first_value_alpha_2466_level_805_04_sse_2038872():
    # datasets/Nile; R's documented example of simple smoothing, from memory and recomputed
    nile = values("datasets", "Nile")
    fitted = smooth(nile, "ses", initial="first value")
    assert fitted.constants["alpha"] == pytest.approx(0.2465796, abs=5e-5)
    assert fitted.final["level"] == pytest.approx(805.0389, abs=0.005)
    assert fitted.sse == pytest.approx(2038872, abs=1)


def test_fpp2_section_7_1_oil_alpha_8339_forecast_542_68_and_its_80_and_95_percent_ranges():
    oil = values("fpp2", "oil", 1996)
    assert oil.size == 18
    fitted = smooth(oil, "ses")
    assert fitted.constants["alpha"] == pytest.approx(0.8339, abs=1e-4)
    assert fitted.initial["level"] == pytest.approx(446.5759, abs=0.001)
    assert np.sqrt(fitted.sse / 18) == pytest.approx(28.12, abs=0.005)
    np.testing.assert_allclose(fitted.forecast(5), 542.6806, atol=5e-4)
    published_80 = [[504.4541, 580.9070], [492.9073, 592.4539], [483.5747, 601.7864], [475.5269, 609.8343],
                    [468.3452, 617.0159]]
    published_95 = [[484.2183, 601.1429], [466.5589, 618.8023], [452.2860, 633.0752], [439.9778, 645.3834],
                    [428.9945, 656.3667]]
    np.testing.assert_allclose(fitted.ranges(5, 80).T, published_80, atol=0.005)
    np.testing.assert_allclose(fitted.ranges(5, 95).T, published_95, atol=0.007)
    assert mae(oil, fitted.fitted) == pytest.approx(22.26, abs=0.005)
    assert bias(oil, fitted.fitted) == pytest.approx(6.40, abs=0.005)
    assert mape(oil, fitted.fitted) == pytest.approx(4.61, abs=0.005)
    assert mae(oil, fitted.fitted) / mase_scale(oil, 1) == pytest.approx(0.93, abs=0.005)


def test_fpp2_section_7_2_ausair_holt_forecasts_to_0_03_and_sse_at_most_128_52():
    # the likelihood is flat: the constants themselves are no test
    air = values("fpp2", "ausair", 1990)
    assert air.size == 27
    fitted = smooth(air, "holt")
    np.testing.assert_allclose(fitted.forecast(5), [74.60, 76.70, 78.80, 80.91, 83.01], atol=0.03)
    assert fitted.sse <= 128.52


def test_box_jenkins_airline_multiplicative_holt_winters_at_fixed_constants_to_six_digits():
    # Start: a line through the centred moving average of the first two years gives level (its
    # intercept) and slope, the ratios to that average the factors; first forecast at t = 13.
    y = values("datasets", "AirPassengers")
    assert (y.size, y.sum()) == (144, 40363)
    weights = np.r_[0.5, np.ones(11), 0.5] / 12
    centred = np.convolve(y[:24], weights, mode="valid")
    time = np.column_stack([np.ones(12), np.arange(1, 13)])
    (level, slope), *_ = np.linalg.lstsq(time, centred, rcond=None)
    ratios = np.roll(y[6:18] / centred, 6)
    start = {"level": level, "trend": slope, "season": ratios / ratios.mean(), "after": 12}
    assert (level, slope) == (pytest.approx(124.3169, abs=5e-5), pytest.approx(1.14569, abs=5e-6))
    fitted = smooth(y, "holt_winters_multiplicative", 12, alpha=0.2755925, beta=0.03269295, gamma=0.8707292,
                    initial=start, season_update="new level")
    assert fitted.final["level"] == pytest.approx(469.3232, abs=5e-4)
    assert fitted.final["trend"] == pytest.approx(3.02154, abs=5e-5)
    factors = [0.9465, 0.8829, 0.9717, 1.0305, 1.0477, 1.1805, 1.3591, 1.3332, 1.1083, 0.9869, 0.8361, 0.9210]
    np.testing.assert_allclose(fitted.final["season"], factors, atol=5.1e-5)
    assert fitted.sse == pytest.approx(16570.78, abs=0.05)
    assert np.isnan(fitted.fitted[:12]).all()


def test_ses_exercise_bias_12_43_mad_14_14_mape_24_66_mse_365_80():
    # wongsteve.com, Exponential Smoothing: alpha .3, forecast of period 2 = 99
    fitted = smooth(EXERCISE, "ses", alpha=0.3, initial="first value")
    printed = [99.0, 95.7, 82.0, 74.8, 71.0, 67.7, 63.9, 63.3, 65.6]
    np.testing.assert_allclose(fitted.fitted[1:], printed, atol=0.051)
    actual, forecast = EXERCISE[1:], fitted.fitted[1:]
    assert bias(actual, forecast) == pytest.approx(-12.43, abs=0.005)
    assert mae(actual, forecast) == pytest.approx(14.14, abs=0.005)
    assert mape(actual, forecast) == pytest.approx(24.66, abs=0.005)
    assert mse(actual, forecast) == pytest.approx(365.80, abs=0.02)
    assert rmse(actual, forecast) == pytest.approx(19.1, abs=0.05)
    assert fitted.forecast(1)[0] == pytest.approx(65.43, abs=0.005)


@pytest.mark.parametrize(("name", "mae_printed", "rmse_printed", "mape_printed", "mase_printed"), [
    ("damped_holt", 3.00, 3.69, 2.26, 0.663),
    ("holt", 3.17, 3.87, 2.38, 0.701),
    ("ses", 4.81, 6.05, 3.55, 1.06),
])
def test_fpp3_section_8_2_wwwusage_rolling_one_step_errors_within_3_percent(
    name, mae_printed, rmse_printed, mape_printed, mase_printed
):
    # datasets/WWWusage, 90 origins from 10 known minutes on; the bands leave only the order damped, Holt, SES
    y = values("datasets", "WWWusage", 1, 101)
    assert y.size == 100
    forecast = np.array([fit(name, y[:known], 1).forecast(1)[0] for known in range(10, 100)])
    assert rmse(y[10:], forecast) == pytest.approx(rmse_printed, rel=0.03)
    assert mae(y[10:], forecast) == pytest.approx(mae_printed, rel=0.03)
    assert mape(y[10:], forecast) == pytest.approx(mape_printed, rel=0.03)
    assert mae(y[10:], forecast) / mase_scale(y, 1) == pytest.approx(mase_printed, rel=0.03)


def test_fpp3_section_8_2_wwwusage_damped_fit_is_no_worse_than_the_published_sigma2_12_2244():
    assert smooth(values("datasets", "WWWusage", 1, 101), "damped_holt").sigma2 <= 12.2244
