"""The catalogue, its two doors, and what they refuse."""

from __future__ import annotations

import pickle
from dataclasses import replace

import numpy as np
import pandas as pd
import pytest

from foredeck.errors import MethodError
from foredeck.intake.history import SeriesHistory
from foredeck.periods import Frequency
from foredeck.smoothing.catalogue import METHODS, fit, smooth, usual_methods


@pytest.fixture(scope="module")
def values():
    rng = np.random.default_rng(12)
    return 60 + np.tile([-6.0, 9, -1, -2], 9) + rng.normal(size=36)


@pytest.fixture(scope="module")
def quarters(values):
    periods = pd.period_range("2017Q1", periods=36, freq="Q-DEC")
    return SeriesHistory(name="north/pots", frequency=Frequency.QUARTERLY, periods=periods, values=values)


def said(call):
    with pytest.raises(MethodError) as caught:
        call()
    return str(caught.value)


FORMS = ("ses", "seasonal_ses_additive", "seasonal_ses_multiplicative", "holt", "damped_holt", "holt_winters_additive",
         "damped_holt_winters_additive", "holt_winters_multiplicative", "damped_holt_winters_multiplicative")


def test_the_catalogue_holds_every_method_once_under_its_own_name_and_with_a_source():
    assert set(METHODS) == {
        "naive", "seasonal_naive", "mean", "moving_average", "drift", "drift_with_season",
        "differenced_ses", "seasonally_differenced_ses", *FORMS, *(f"{form}_relative" for form in FORMS),
        "theta", "optimised_theta", "dynamic_theta", "averaged_damped", "best_form", "weighted_forms",
        "temporal_hierarchy", "log_ses", "log_holt", "log_damped_holt", "log_theta", "log_optimised_theta",
        "log_dynamic_theta", "log_averaged_damped", "croston", "sba", "tsb",
    }
    for name, entry in METHODS.items():
        assert entry.name == name
        assert any(character.isdigit() for character in entry.source)
        assert entry.sentence.endswith(".")
    assert len({entry.title for entry in METHODS.values()}) == len(METHODS)


@pytest.mark.parametrize("season_length", [1, 4, 12, 52])
def test_the_usual_methods_are_in_the_catalogue_and_a_hierarchy_is_only_among_them_for_months(season_length):
    usual = usual_methods(season_length)
    assert set(usual) <= set(METHODS)
    assert ("temporal_hierarchy" in usual) == (season_length == 12) != ("weighted_forms" in usual)


@pytest.mark.parametrize("name", list(METHODS))
def test_a_fit_names_itself_as_the_catalogue_does_and_reports_the_catalogue_s_constants(values, name):
    fitted = fit(name, values, 4)
    assert (fitted.method, fitted.title) == (name, METHODS[name].title)
    # averages and mixtures report what of their constants there was to average
    assert set(fitted.constants) == set(METHODS[name].constants) or METHODS[name].season == "found"
    assert fitted.fitted.shape == fitted.residuals.shape == values.shape
    np.testing.assert_allclose(fitted.fitted + fitted.residuals, np.where(np.isnan(fitted.fitted), np.nan, values))
    assert fitted.sse == pytest.approx(np.nansum(fitted.residuals**2), rel=1e-9)
    assert fitted.forecast(3).shape == (3,)


@pytest.mark.parametrize("name", list(METHODS))
def test_a_fit_survives_the_way_back_from_a_worker(values, name):
    fitted = fit(name, values, 4)
    again = pickle.loads(pickle.dumps(fitted))
    np.testing.assert_array_equal(again.forecast(9), fitted.forecast(9))


@pytest.mark.parametrize("name", list(METHODS))
def test_the_same_values_give_the_same_fit_to_the_last_bit(values, name):
    np.testing.assert_array_equal(fit(name, values, 4).forecast(9), fit(name, values.copy(), 4).forecast(9))


@pytest.mark.parametrize(("name", "held"), [
    ("holt", {"alpha": 0.2}), ("holt", {"beta": 0.1}), ("damped_holt", {"phi": 0.9}),
    ("damped_holt", {"alpha": 0.3, "phi": 0.95}), ("holt_winters_additive", {"gamma": 0.1}),
    ("holt_winters_multiplicative", {"alpha": 0.2, "gamma": 0.1}), ("ses", {"alpha": 0.15}),
])
def test_any_subset_of_constants_may_be_held_and_the_others_are_estimated_under_that_hold(values, name, held):
    fitted = fit(name, values, 4, held)
    free = fit(name, values, 4)
    for key, value in held.items():
        assert fitted.constants[key] == value
    assert fitted.n_parameters == free.n_parameters - len(held)
    assert fitted.sse >= free.sse * (1 - 1e-9)
    others = {key: value for key, value in fitted.constants.items() if key not in held}
    moved = {key: min(max(value * 1.05 + 0.001, 0.0), 1.0 if key != "phi" else 0.98) for key, value in others.items()}
    assert fit(name, values, 4, {**moved, **held}).sse >= fitted.sse * (1 - 1e-9)


def test_fit_ignores_constants_of_other_methods_so_that_one_mapping_serves_all(values):
    assert fit("ses", values, 4, {"alpha": 0.2, "beta": 0.1, "phi": 0.9}).constants == {"alpha": 0.2}
    assert fit("naive", values, 4, {"alpha": 0.2}).constants == {}


def test_smooth_takes_the_season_from_a_history_or_a_period_index_and_none_from_an_array(values, quarters):
    expected = fit("holt_winters_additive", values, 4).forecast(4)
    np.testing.assert_array_equal(smooth(quarters.to_series(), "holt_winters_additive").forecast(4), expected)
    np.testing.assert_array_equal(smooth(values, "holt_winters_additive", 4).forecast(4), expected)
    assert smooth(quarters, "holt_winters_additive").season_length == 4
    assert smooth(values, "ses").season_length == 1


def test_smooth_repairs_a_history_with_a_gap_and_leaves_out_missing_ones_at_its_beginning(quarters, values):
    holed = values.copy()
    holed[[0, 1, 9]] = np.nan
    fitted = smooth(replace(quarters, values=holed), "ses")
    assert fitted.fitted.size == 34
    assert np.isfinite(fitted.forecast(4)).all()


def test_smooth_refuses_a_missing_value_in_an_array_with_its_whole_message():
    assert said(lambda: smooth(np.array([1.0, 2.0, np.nan, 4.0]), "ses")) == (
        "Value 3 of 4 is nan.\n"
        "  where: method ses\n"
        "  allowed: finite values, none missing\n"
        "  next: Repair the series first, or hand in a series history, which is repaired on the way."
    )


def test_an_unknown_method_is_refused_with_the_nearest_name(values):
    assert said(lambda: smooth(values, "damped_hold")) == (
        "There is no method 'damped_hold'.\n"
        "  where: method\n"
        f"  allowed: {', '.join(METHODS)}\n"
        "  next: Did you mean 'damped_holt'?"
    )
    assert "next: Name one of these." in said(lambda: smooth(values, "xyz"))


def test_a_constant_the_method_does_not_have_is_refused_with_its_whole_message(values):
    assert said(lambda: smooth(values, "ses", beta=0.1)) == (
        "Simple exponential smoothing has no constant 'beta'.\n"
        "  where: method ses\n"
        "  allowed: alpha, initial\n"
        "  next: Leave it out."
    )


def test_a_constant_out_of_range_is_refused_with_its_whole_message(values):
    assert said(lambda: smooth(values, "ses", alpha=1.2)) == (
        "The constant alpha is 1.2.\n"
        "  where: alpha\n"
        "  allowed: a number from 0 to 1\n"
        "  next: Give such a number, or leave it out to have it estimated."
    )
    assert "The constant alpha is True." in said(lambda: fit("ses", values, 4, {"alpha": True}))
    assert "The constant alpha is nan." in said(lambda: smooth(values, "ses", alpha=float("nan")))
    assert "allowed: a number of at least 1" in said(lambda: smooth(values, "moving_average", window=0))


def test_an_option_the_method_does_not_take_is_refused_with_its_whole_message(values):
    assert said(lambda: smooth(values, "naive", initial="classical")) == (
        "Last value (naive) takes no 'initial'.\n"
        "  where: method naive\n"
        "  allowed: nothing to set\n"
        "  next: Leave it out."
    )


def test_unknown_starting_states_are_refused_with_their_whole_message(values):
    assert said(lambda: smooth(values, "holt", initial="backcast")) == (
        "The starting states are 'backcast'.\n"
        "  where: initial\n"
        "  allowed: 'estimated', 'first value', 'classical', or a mapping of level, trend, season and after\n"
        "  next: Name one of them."
    )
    assert said(lambda: smooth(values, "holt", initial={"level": 1.0, "season": [1.0]})) == (
        "The starting states do not fit the method (unknown: season; missing: trend).\n"
        "  where: initial\n"
        "  allowed: level, trend, and after\n"
        "  next: Give exactly these states."
    )
    start = {"level": 60.0, "trend": 0.0, "season": [1.0, 1.0, 0.0, 1.0]}
    assert said(lambda: smooth(values, "holt_winters_multiplicative", 4, initial=start)) == (
        "The starting states are level 60.0, trend 0.0 and 4 seasonal indices.\n"
        "  where: initial\n"
        "  allowed: finite numbers; 4 seasonal indices, above zero when they are factors\n"
        "  next: Give one index for each period of the season, the first for the first value."
    )
    assert said(lambda: smooth(values, "ses", initial={"level": 60.0, "after": 36})) == (
        "`after` is 36.\n"
        "  where: initial\n"
        "  allowed: a whole number from 0 to 35\n"
        "  next: Say how many periods lie behind the starting states."
    )


def test_an_unknown_season_update_is_refused_with_its_whole_message(values):
    assert said(lambda: smooth(values, "holt_winters_additive", 4, season_update="old")) == (
        "season_update is 'old'.\n"
        "  where: method holt_winters_additive\n"
        "  allowed: 'expected level' or 'new level'\n"
        "  next: Name one of them."
    )


def test_a_seasonal_form_refuses_no_season_too_little_history_and_values_at_zero(values):
    assert said(lambda: smooth(values, "holt_winters_additive")) == (
        "Holt-Winters, additive season needs a season; the season length is 1.\n"
        "  where: method holt_winters_additive\n"
        "  allowed: a season length of at least 2 periods\n"
        "  next: Give season_length (12 for months, 4 for quarters), or use a method without season."
    )
    assert said(lambda: smooth(values[:7], "holt_winters_additive", 4)) == (
        "Holt-Winters, additive season needs two full seasons; there are 7 periods of 8.\n"
        "  where: method holt_winters_additive\n"
        "  allowed: at least 8 periods at a season length of 4\n"
        "  next: Use a method without season until there is more history."
    )
    zero = np.where(np.arange(36) == 10, 0.0, values)
    assert said(lambda: smooth(zero, "holt_winters_multiplicative", 4)) == (
        "Holt-Winters, multiplicative season needs values above zero; value 11 is 0.\n"
        "  where: method holt_winters_multiplicative\n"
        "  allowed: values above zero\n"
        "  next: Use the form with additive season."
    )


def test_values_of_another_shape_or_none_are_refused_with_their_whole_message():
    assert said(lambda: smooth(np.ones((3, 2)), "ses")) == (
        "The values have the shape (3, 2).\n"
        "  where: method ses\n"
        "  allowed: one row of at least one value\n"
        "  next: Hand in the values of one series."
    )
    assert "The values have the shape (0,)." in said(lambda: smooth(np.array([]), "ses"))


def test_things_that_are_no_series_are_refused(quarters):
    series = quarters.to_series()
    assert said(lambda: smooth(series.to_timestamp(), "ses")) == (
        "The Series has an index of type DatetimeIndex.\n"
        "  where: series\n"
        "  allowed: a PeriodIndex with every period from the first to the last\n"
        "  next: Use series.to_period(), or hand in the values as an array with a season_length."
    )
    assert "leaves out periods" in said(lambda: smooth(series.drop(series.index[4]), "ses"))
    daily = pd.Series([1.0, 2.0], index=pd.period_range("2026-01-01", periods=2, freq="D"))
    assert said(lambda: smooth(daily, "ses")) == (
        "The Series has the frequency 'D'.\n"
        "  where: series\n"
        "  allowed: years, quarters, months or weeks\n"
        "  next: Sum or average it to one of these first."
    )
    assert "does not hold numbers" in said(lambda: smooth(["a", "b"], "ses"))
    assert said(lambda: smooth(series, "ses", 0)) == (
        "The season length is 0.\n"
        "  where: season_length\n"
        "  allowed: a whole number of at least 1\n"
        "  next: Give 12 for months, 4 for quarters, 52 for weeks, 1 for none."
    )


def test_ranges_and_forecasts_refuse_impossible_requests_with_their_whole_messages(values):
    fitted = smooth(values, "ses")
    assert said(lambda: fitted.forecast(0)) == (
        "The horizon is 0.\n"
        "  where: forecast by ses\n"
        "  allowed: a whole number of periods, at least 1\n"
        "  next: Give the number of periods to forecast."
    )
    assert said(lambda: fitted.ranges(3, 100)) == (
        "The level is 100.\n"
        "  where: ranges of ses\n"
        "  allowed: a percentage above 0 and under 100\n"
        "  next: Give, for example, 80 or 95."
    )
    assert said(lambda: smooth(values[:2], "ses").ranges(1)) == (
        "Simple exponential smoothing leaves nothing to judge its errors by: 2 periods, 2 estimated constants and "
        "starting states.\n"
        "  where: ranges of ses\n"
        "  allowed: more periods than estimated constants and starting states\n"
        "  next: Use a simpler method, fix constants, or wait for more history."
    )


def test_the_card_shows_constants_and_forecasts_with_text_escaped(values):
    card = replace(smooth(values, "ses", alpha=0.2), title="<script>")._repr_html_()
    assert "<script>" not in card
    assert "&lt;script&gt;" in card
    assert '<th scope="row">alpha</th><td>0.2</td>' in card
