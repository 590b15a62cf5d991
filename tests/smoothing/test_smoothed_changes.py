"""Simple smoothing of ordinary and seasonal differences."""

from __future__ import annotations

import numpy as np
import pytest

from foredeck.errors import MethodError
from foredeck.smoothing.catalogue import fit, smooth


@pytest.fixture(scope="module")
def values():
    rng = np.random.default_rng(8)
    return 30 + np.cumsum(rng.normal(0.5, 1, 40)) + np.tile([0.0, 4, -2, -2], 10)


def test_changes_are_those_of_simple_smoothing_added_back_step_by_step(values):
    changes = smooth(np.diff(values), "ses", alpha=0.3)
    fitted = smooth(values, "differenced_ses", alpha=0.3)
    np.testing.assert_allclose(fitted.fitted[1:], values[:-1] + changes.fitted, rtol=1e-12)
    line = values[-1] + changes.forecast(1)[0] * np.arange(1, 5)
    np.testing.assert_allclose(fitted.forecast(4), line, rtol=1e-12)
    assert np.isnan(fitted.fitted[0])


def test_changes_on_last_year_are_added_to_last_year_and_twice_in_the_second_year(values):
    change = smooth(values[4:] - values[:-4], "ses", alpha=0.3).forecast(1)[0]
    forecast = smooth(values, "seasonally_differenced_ses", 4, alpha=0.3).forecast(6)
    np.testing.assert_allclose(forecast[:4], values[-4:] + change, rtol=1e-12)
    np.testing.assert_allclose(forecast[4:], values[-4:-2] + 2 * change, rtol=1e-12)


def test_with_alpha_0_and_the_mean_change_it_is_the_drift_method(values):
    drift = smooth(values, "drift").forecast(8)
    held = smooth(values, "differenced_ses", alpha=0.0).forecast(8)
    np.testing.assert_allclose(held, drift, rtol=1e-10)


@pytest.mark.parametrize(("name", "lag"), [("differenced_ses", 1), ("seasonally_differenced_ses", 4)])
def test_variance_by_lead_is_the_sum_of_squared_responses_to_one_shock(values, name, lag):
    # Box & Jenkins (1970): psi weights, had by shocking the smoothing by hand
    fitted = fit(name, values, 4, {"alpha": 0.3})
    horizon = 11
    shock = np.zeros(lag + horizon)
    level, response = 0.0, []
    for lead in range(horizon):
        error = 1.0 if lead == 0 else 0.0
        shock[lag + lead] = shock[lead] + level + error
        response.append(shock[lag + lead])
        level += 0.3 * error
    np.testing.assert_allclose(fitted.spread(horizon), np.cumsum(np.square(response)), rtol=1e-12)


def test_changes_on_last_year_need_more_than_a_year_and_say_so_in_full():
    with pytest.raises(MethodError) as caught:
        fit("seasonally_differenced_ses", np.arange(4.0), 4)
    assert str(caught.value) == (
        "Smoothed changes on last year needs more than 4 periods; there are 4.\n"
        "  where: method seasonally_differenced_ses\n"
        "  allowed: at least 5 periods\n"
        "  next: Use a method that needs less history."
    )
