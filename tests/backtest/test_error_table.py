"""The cube of past forecasts: nothing later than the origin gets in, errors are against raw actuals."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from foredeck.backtests.error_table import Cube, backtest, build_cube, summary
from foredeck.backtests.measures import mase_scale
from foredeck.errors import MethodError, ShapeError
from foredeck.intake.history import SeriesHistory
from foredeck.periods import Frequency
from foredeck.smoothing.catalogue import METHODS, fit
from references.open_data import values as open_values

SOME = ("naive", "seasonal_naive", "ses", "holt_winters_additive")


@pytest.fixture(scope="module")
def values():
    rng = np.random.default_rng(30)
    return 60 + np.tile([-6.0, 9, -1, -2], 9) + rng.normal(size=36)


def as_it_is(known):
    return known


def always(method, known):
    return True


def test_each_cell_is_the_forecast_of_a_cold_fit_to_what_was_known(values):
    known = np.array([20, 30, 35])
    cube = build_cube(values, 4, 6, SOME, known, as_it_is, always)
    assert cube.forecasts.shape == (4, 3, 6)
    for row, name in enumerate(SOME):
        for origin, count in enumerate(known):
            np.testing.assert_array_equal(cube.forecasts[row, origin], fit(name, values[:count], 4).forecast(6))


def test_actuals_stand_beside_their_forecasts_and_are_missing_beyond_the_history(values):
    cube = build_cube(values, 4, 6, SOME, np.array([20, 34]), as_it_is, always)
    np.testing.assert_array_equal(cube.actual[0], values[20:26])
    np.testing.assert_array_equal(cube.actual[1], [*values[34:], *[np.nan] * 4])
    np.testing.assert_array_equal(cube.errors[2], cube.actual - cube.forecasts[2])


def test_what_came_after_an_origin_cannot_change_its_forecasts(values):
    other = values.copy()
    other[25:] = -1e6
    known = np.arange(20, 26)
    one = build_cube(values, 4, 6, SOME, known, as_it_is, always)
    two = build_cube(other, 4, 6, SOME, known, as_it_is, always)
    np.testing.assert_array_equal(one.forecasts, two.forecasts)


def test_the_repair_is_handed_what_was_known_and_can_spoil_nothing_else(values):
    handed = []

    def prepare(known):
        handed.append(known.size)
        known[:] = 50.0
        return known

    cube = build_cube(values, 4, 3, ("naive",), np.array([20, 30]), prepare, always)
    assert handed == [20, 30]
    assert cube.forecasts.ravel().tolist() == [50.0] * 6
    np.testing.assert_array_equal(cube.actual[0], values[20:23])


def test_errors_are_measured_against_raw_actuals_and_missing_ones_are_not_counted(values):
    raw = values.copy()
    raw[22] = np.nan
    raw[31] = 500.0
    cube = build_cube(raw, 4, 2, ("naive",), np.array([21, 30]), lambda known: np.nan_to_num(known, nan=60.0), always)
    np.testing.assert_array_equal(cube.actual, [[raw[21], np.nan], [raw[30], 500.0]])
    assert summary(cube)["n"].tolist() == [2, 1]


def test_a_method_that_is_not_eligible_at_an_origin_has_no_forecast_there(values):
    cube = build_cube(values, 4, 2, SOME, np.array([10, 20]), as_it_is, lambda name, known: known.size > 15)
    assert np.isnan(cube.forecasts[:, 0]).all()
    assert np.isfinite(cube.forecasts[:, 1]).all()


def test_held_constants_reach_every_method_that_has_them(values):
    cube = build_cube(values, 4, 2, ("ses", "naive"), np.array([30]), as_it_is, always, {"alpha": 0.2})
    np.testing.assert_array_equal(cube.forecasts[0, 0], fit("ses", values[:30], 4, {"alpha": 0.2}).forecast(2))


def test_the_table_of_a_small_cube_is_the_one_worked_by_hand():
    cube = Cube(methods=("ses", "naive"), known=np.array([4, 5]), actual=np.array([[10.0, 12.0], [12.0, np.nan]]),
                forecasts=np.array([[[9.0, 9.0], [15.0, 15.0]], [[np.nan] * 2, [10.0, 10.0]]]), scale=2.0)
    expected = pd.DataFrame({
        "method": ["ses", "ses", "naive", "naive"], "lead": [1, 2, 1, 2], "n": [2, 1, 1, 0],
        "mae": [2.0, 3.0, 2.0, np.nan], "bias": [-1.0, 3.0, 2.0, np.nan],
        "rmse": [np.sqrt(5), 3.0, 2.0, np.nan], "mase": [1.0, 1.5, 1.0, np.nan],
    })
    pd.testing.assert_frame_equal(summary(cube), expected, check_dtype=False)


def test_the_table_of_the_rolling_wwwusage_backtest_agrees_with_fpp3_section_8_2_within_3_percent():
    # printed: damped MAE 3.00 RMSE 3.69, Holt 3.17 3.87, SES 4.81 6.05
    y = open_values("datasets", "WWWusage", 1, 101)
    cube = build_cube(y, 1, 1, ("ses", "holt", "damped_holt"), np.arange(10, 100), as_it_is, always)
    table = summary(cube).set_index("method")
    np.testing.assert_allclose(table.loc["damped_holt", ["mae", "rmse"]].tolist(), [3.00, 3.69], rtol=0.03)
    np.testing.assert_allclose(table.loc["holt", ["mae", "rmse"]].tolist(), [3.17, 3.87], rtol=0.03)
    np.testing.assert_allclose(table.loc["ses", ["mae", "rmse"]].tolist(), [4.81, 6.05], rtol=0.03)
    assert cube.scale == pytest.approx(4.525, abs=5e-4)  # the naive MAE of the whole series, as printed


def test_origins_outside_the_history_are_refused_with_the_whole_message(values):
    with pytest.raises(ShapeError) as caught:
        build_cube(values, 4, 2, SOME, np.array([30, 36]), as_it_is, always)
    assert str(caught.value) == (
        "The origins know 30, 36 periods of 36.\n"
        "  where: backtest\n"
        "  allowed: 1 to 35 periods\n"
        "  next: Take the origins from known_counts."
    )


def quarters(values):
    periods = pd.period_range("2017Q1", periods=values.size, freq="Q-DEC")
    return SeriesHistory(name="north/pots", frequency=Frequency.QUARTERLY, periods=periods, values=values)


def test_backtest_judges_all_methods_and_tells_why_some_are_not_eligible(values):
    result = backtest(quarters(values))
    assert set(result.cube.methods) == set(METHODS)
    assert result.cube.actual.shape == (27, 4)
    assert "intermittent" in result.reasons["croston"]
    assert result.reasons["holt_winters_additive"] == ""
    assert np.isnan(result.relative["croston"])
    assert result.relative["seasonal_naive"] == pytest.approx(1.0)
    assert result.relative["holt_winters_additive"] < 1.0 < result.relative["naive"]
    assert len(result.table) == len(METHODS) * 4


def test_backtest_keeps_the_benchmarks_beside_the_methods_asked_for_and_takes_other_leads(values):
    result = backtest(quarters(values), horizon=2, methods=["ses"], origins=5)
    assert result.cube.methods == ("ses", "naive", "seasonal_naive")
    assert result.cube.known.tolist() == [31, 32, 33, 34, 35]
    assert result.cube.actual.shape == (5, 2)


def test_backtest_repairs_gaps_leaves_out_missing_ones_at_the_beginning_and_scores_raw_actuals(values):
    holed = values.copy()
    holed[[0, 1, 12, 33]] = np.nan
    result = backtest(quarters(holed), methods=["ses"], origins=4)
    assert result.cube.known.tolist() == [30, 31, 32, 33]
    assert np.isfinite(result.cube.forecasts).all()
    assert np.isnan(result.cube.actual[0, 1])
    assert result.cube.scale == mase_scale(holed[2:], 4)


def test_backtest_of_an_array_takes_its_values_under_zero_for_real(values):
    cold = values - 60
    result = backtest(cold, methods=["naive"], season_length=4, origins=3)
    np.testing.assert_array_equal(result.cube.forecasts[0, :, 0], cold[[32, 33, 34]])


def test_backtest_refuses_a_horizon_that_is_no_whole_number_with_the_whole_message(values):
    with pytest.raises(MethodError) as caught:
        backtest(values, horizon=1.5)
    assert str(caught.value) == (
        "The horizon is 1.5.\n"
        "  where: backtest\n"
        "  allowed: a whole number of periods, at least 1\n"
        "  next: Give the number of periods to forecast."
    )


def test_the_card_of_a_backtest_lists_methods_from_the_best_to_those_without_a_forecast(values):
    card = backtest(quarters(values))._repr_html_()
    assert card.index("Holt-Winters, additive season") < card.index("Last value (naive)") < card.index("Croston")
    assert "Backtest from 27 origins, 4 leads" in card
    assert "nan" not in card
