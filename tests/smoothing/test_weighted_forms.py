"""The best of fifteen forms, and all of them weighted."""

from __future__ import annotations

import pickle

import numpy as np
import pytest

from foredeck.compiled.recursions import MULTIPLICATIVE, NO_SEASON
from foredeck.smoothing.state_space import Form, fit_form
from foredeck.smoothing.weighted_forms import FORMS, fit_best_form, fit_forms, fit_weighted_forms
from references import plain_smoothing as plain


@pytest.fixture(scope="module")
def values():
    rng = np.random.default_rng(9)
    return 60 + np.cumsum(rng.normal(0.4, 1, 40)) + np.tile([-6.0, 9, -1, -2], 10) + rng.normal(size=40)


def criterion(y, form, fitted):
    """AICc written out: Hurvich & Tsai (1989); the variance counts as one more."""
    n, k = y.size, fitted.n_parameters + 1
    deviance = plain.deviance(y, fitted.fitted, form.error == MULTIPLICATIVE) - n * np.log(n)
    return deviance + 2 * k + 2 * k * (k + 1) / (n - k - 1)


def test_the_fifteen_forms_are_named_by_error_trend_and_season():
    assert [form.name for form in FORMS] == [
        "ANN", "AAN", "AAdN", "MNN", "MAN", "MAdN", "ANA", "AAA", "AAdA", "MNA", "MAA", "MAdA", "MNM", "MAM", "MAdM",
    ]


def test_weights_are_those_of_fifteen_single_fits_to_a_hundredth(values):
    # the fits at once stop earlier; a form whose criterion is off by .01 has a weight off by half a percent
    single = np.array([criterion(values, form, fit_form(form, values, 4)) for form in FORMS])
    expected = np.exp(-(single - single.min()) / 2)
    np.testing.assert_allclose(fit_forms(values, 4).weights, expected / expected.sum(), atol=0.01)


def test_the_weighted_forecast_is_the_mean_of_fifteen_single_ones_with_these_weights(values):
    fitted = fit_weighted_forms(values, 4)
    assert sum(fitted.final.values()) == pytest.approx(1.0)
    single = {form.name: fit_form(form, values, 4) for form in FORMS}
    expected = sum(weight * single[name].path(8) for name, weight in fitted.final.items())
    np.testing.assert_allclose(fitted.forecast(8), expected, rtol=2e-3)
    alphas = sum(weight * single[name].constants["alpha"] for name, weight in fitted.final.items())
    assert fitted.constants == {"alpha": pytest.approx(alphas, abs=0.01)}
    np.testing.assert_allclose(fitted.fitted + fitted.residuals, values)


def test_the_best_form_has_the_smallest_criterion_and_its_forecasts_and_spread(values):
    best = fit_best_form(values, 4)
    weights = fit_weighted_forms(values, 4).final
    assert best.final["form"] == max(weights, key=weights.get)
    form = next(form for form in FORMS if form.name == best.final["form"])
    single = fit_form(form, values, 4)
    np.testing.assert_allclose(best.forecast(8), single.forecast(8), rtol=2e-3)
    assert tuple(best.constants) == form.constants
    assert best.n_parameters == single.n_parameters
    assert best.sigma2 == pytest.approx(single.sigma2, rel=2e-3)
    again = fit_form(form, values, 4, best.constants)
    np.testing.assert_allclose(best.final["level"], again.final["level"], rtol=1e-3)


@pytest.mark.parametrize("fit", [fit_best_form, fit_weighted_forms])
def test_a_season_of_52_weeks_is_left_to_whoever_takes_it_out_before(fit):
    y = 50 + np.cumsum(np.random.default_rng(3).normal(size=120))
    weeks, none = fit(y, 52), fit(y, 1)
    np.testing.assert_array_equal(weeks.forecast(10), none.forecast(10))
    assert weeks.season_length == 52
    names = [weeks.final["form"]] if "form" in weeks.final else list(weeks.final)
    assert all(name.endswith("N") for name in names)


@pytest.mark.parametrize("fit", [fit_best_form, fit_weighted_forms])
def test_constants_are_held_in_all_forms_that_have_them(values, fit):
    fitted = fit(values, 4, {"alpha": 0.15})
    assert fitted.constants["alpha"] == pytest.approx(0.15, rel=1e-12)
    held, free = fit_forms(values, 4, {"alpha": 0.15}), fit_forms(values, 4)
    assert (held.constants[held.weights > 0, 0] == 0.15).all()
    np.testing.assert_array_equal(held.counts, free.counts - 1)


@pytest.mark.parametrize("fit", [fit_best_form, fit_weighted_forms])
@pytest.mark.parametrize("numbers", [[5.0], [5.0, 8.0], [0.0, 0.0, 0.0], [5.0, 8.0, 6.0, 9.0]])
def test_a_series_too_short_for_any_form_is_smoothed_simply(fit, numbers):
    y = np.array(numbers)
    simple = fit_form(Form("ses", "ses"), y, 1)
    assert fit(y, 1).forecast(3).tolist() == simple.forecast(3).tolist()


@pytest.mark.parametrize("fit", [fit_best_form, fit_weighted_forms])
@pytest.mark.parametrize("number", [0.0, 7.3, -4.0, 1e12])
def test_a_constant_series_goes_on(fit, number):
    np.testing.assert_allclose(fit(np.full(30, number), 4).forecast(6), number, rtol=1e-9)


@pytest.mark.parametrize("fit", [fit_best_form, fit_weighted_forms])
def test_the_fit_survives_the_way_back_from_a_worker(values, fit):
    fitted = fit(values, 4)
    again = pickle.loads(pickle.dumps(fitted))
    np.testing.assert_array_equal(again.forecast(9), fitted.forecast(9))


def test_read_only_values_are_fitted_like_any_others(values):
    locked = values.copy()
    locked.setflags(write=False)
    np.testing.assert_array_equal(fit_weighted_forms(locked, 4).forecast(4), fit_weighted_forms(values, 4).forecast(4))
    assert fit_forms(values[::2], 2).weights.sum() == pytest.approx(1.0)


def test_forms_without_season_alone_are_had_without_a_season(values):
    had = [form for form, weight in zip(FORMS, fit_forms(values, 1).weights, strict=True) if weight > 0]
    assert {form.season for form in had} == {NO_SEASON}
