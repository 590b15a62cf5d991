"""Methods on the logarithms of seasonally adjusted values."""

from __future__ import annotations

import pickle

import numpy as np
import pytest

from foredeck.errors import MethodError
from foredeck.smoothing import on_logs
from foredeck.smoothing.benchmarks import fit_drift
from foredeck.smoothing.catalogue import smooth
from foredeck.smoothing.seasonal_indices import seasonal_indices
from foredeck.smoothing.theta_method import learn_theta

METHODS = (
    on_logs.fit_log_theta, on_logs.fit_log_optimised_theta, on_logs.fit_log_dynamic_theta,
    on_logs.fit_log_averaged_damped, on_logs.fit_log_ses, on_logs.fit_log_holt, on_logs.fit_log_damped_holt,
)


@pytest.fixture(scope="module")
def growing():
    rng = np.random.default_rng(12)
    season = np.resize([0.8, 1.0, 1.3, 0.9], 40)
    return np.exp(4 + 0.03 * np.arange(40) + np.cumsum(rng.normal(0, 0.02, 40))) * season


def test_growth_by_a_constant_rate_goes_on_at_that_rate_to_1e_6():
    growth = 5 * 1.04 ** np.arange(20)
    fitted = on_logs.fit_on_logs(lambda y, m, _: fit_drift(y, m), growth, 1, method="log_drift", title="Growth")
    np.testing.assert_allclose(fitted.path(6), 5 * 1.04 ** np.arange(20, 26), rtol=1e-12)
    np.testing.assert_allclose(on_logs.fit_log_holt(growth, 1).path(6), 5 * 1.04 ** np.arange(20, 26), rtol=1e-6)


def test_forecasts_are_exponentials_of_forecasts_of_logarithms_times_the_seasonal_factors(growing):
    indices, _ = seasonal_indices(growing, 4)
    adjusted = growing / np.resize(indices, 40)
    learned = learn_theta(np.log(adjusted), 1)
    fitted = on_logs.fit_log_theta(growing, 4)
    np.testing.assert_allclose(fitted.path(6), np.exp(learned.path(6)) * np.resize(indices, 6), rtol=1e-10)
    np.testing.assert_allclose(fitted.fitted[1:], (np.exp(learned.fitted) * np.resize(indices, 40))[1:], rtol=1e-10)
    assert fitted.constants == learned.constants
    assert set(fitted.final) == {"log_level", "log_trend", "season"}


def test_smoothing_of_logarithms_has_the_constants_of_the_method_on_adjusted_logarithms(growing):
    adjusted = np.log(growing / np.resize(seasonal_indices(growing, 4)[0], 40))
    plain = smooth(adjusted, "ses", alpha=0.3)
    fitted = on_logs.fit_log_ses(growing, 4, {"alpha": 0.3})
    assert fitted.constants == {"alpha": 0.3}
    assert fitted.method == "log_ses"
    np.testing.assert_allclose(np.log(fitted.path(4) / seasonal_indices(growing, 4)[0]), plain.path(4), rtol=1e-7)


@pytest.mark.parametrize("fit", METHODS)
def test_another_unit_changes_nothing_but_the_unit(fit, growing):
    forecast = fit(growing, 4).forecast(6)
    np.testing.assert_array_equal(fit(growing * 2.0**40, 4).forecast(6), forecast * 2.0**40)
    for unit in (1e-300, 1e-3, 1e280):
        np.testing.assert_allclose(fit(growing * unit, 4).forecast(6) / unit, forecast, rtol=1e-5)


@pytest.mark.parametrize("fit", METHODS)
def test_an_explosion_of_the_logarithms_stays_a_number_and_the_forecast_within_its_cap(fit):
    values = np.geomspace(1e-290, 1e290, 12)
    path = fit(values, 1).path(400)
    assert np.isfinite(path).all()
    assert (path > 0).all()
    assert np.isfinite(fit(values, 1).forecast(400)).all()


@pytest.mark.parametrize("fit", METHODS)
@pytest.mark.parametrize("values", [[5.0, 8.0], [3.0, 3.0], [2.0, 2.0, 7.0]])
def test_a_few_periods_give_positive_forecasts(fit, values):
    path = fit(np.array(values), 1).path(3)
    assert np.isfinite(path).all()
    assert (path > 0).all()


@pytest.mark.parametrize("fit", METHODS)
def test_a_constant_goes_on(fit):
    np.testing.assert_allclose(fit(np.full(16, 7.3), 4).forecast(5), 7.3, rtol=1e-12)


def test_a_fit_survives_pickling(growing):
    fitted = on_logs.fit_log_dynamic_theta(growing, 4)
    np.testing.assert_array_equal(pickle.loads(pickle.dumps(fitted)).forecast(6), fitted.forecast(6))


def test_values_at_or_under_zero_are_refused_in_full_words():
    with pytest.raises(MethodError) as caught:
        on_logs.fit_log_theta(np.array([3.0, 0.0, 2.0]), 1)
    assert str(caught.value) == (
        "Theta on logarithms needs values above zero; value 2 is 0.\n"
        "  where: method log_theta\n"
        "  allowed: values above zero\n"
        "  next: Use the method without logarithms."
    )
