"""Fifteen forms fitted in one call: each as the plain twin sees it, and inf where a form cannot be had."""

from __future__ import annotations

import numpy as np
import pytest

from foredeck.compiled.recursions import ADDITIVE, MULTIPLICATIVE, NO_SEASON
from foredeck.compiled.search import all_forms, mix
from foredeck.smoothing.weighted_forms import FORMS
from references import plain_smoothing as plain

CODES = np.array([(form.error, form.trend + form.damped, form.season) for form in FORMS])
FREE = np.full(4, np.nan)
KINDS = {NO_SEASON: "none", ADDITIVE: "additive", MULTIPLICATIVE: "multiplicative"}


def invented(n=30, m=4, seed=5):
    rng = np.random.default_rng(seed)
    return 60 + np.cumsum(rng.normal(0.4, 1, n)) + np.resize([-6.0, 9, -1, -2][:m], n) + rng.normal(size=n)


def together(values, m, held=FREE, horizon=6):
    size = len(FORMS)
    found = {
        "forecasts": np.zeros((size, horizon)), "fitted": np.zeros((size, values.size)), "aicc": np.zeros(size),
        "constants": np.zeros((size, 4)), "states": np.zeros((size, m + 2)), "sigma2": np.zeros(size),
    }
    all_forms(values, m, CODES, held, 2, 1e-6, *found.values())
    return found


def estimated(form, m, held=FREE):
    """Constants and starting states: alpha, beta, gamma, phi as far as free, level, trend, and m - 1 indices."""
    there = [True, form.trend, form.season != NO_SEASON, form.damped]
    return int(sum(np.isnan(held) & there)) + 1 + form.trend + (m - 1 if form.season else 0)


@pytest.mark.parametrize("index", range(15), ids=[form.name for form in FORMS])
def test_aicc_variance_and_forecasts_are_those_of_the_plain_twin_at_what_was_found(index):
    y, form = invented(), FORMS[index]
    found = together(y, 4)
    fitted, relative = found["fitted"][index], form.error == MULTIPLICATIVE
    n, k = y.size, estimated(form, 4) + 1  # and the variance
    deviance = plain.deviance(y, fitted, relative) - n * np.log(n)
    expected = deviance + 2 * k + 2 * k * (k + 1) / (n - k - 1)  # Hurvich & Tsai (1989)
    assert found["aicc"][index] == pytest.approx(expected, abs=1e-8)
    misses = (y - fitted) / (fitted if relative else 1.0)
    assert found["sigma2"][index] == pytest.approx(np.sum(misses**2) / (n - k + 1), rel=1e-9)
    state = found["states"][index]
    ahead = plain.ahead(n, 6, phi=found["constants"][index, 3], level=state[0], trend=state[1],
                        season=state[2:], kind=KINDS[form.season])
    np.testing.assert_allclose(found["forecasts"][index], ahead, rtol=1e-10)


def test_a_season_needs_five_values_more_than_its_periods_and_a_length_of_at_least_two():
    seasonal = np.array([form.season != NO_SEASON for form in FORMS])
    assert np.isinf(together(invented(8), 4)["aicc"][seasonal]).all()
    assert np.isinf(together(invented(30), 1)["aicc"][seasonal]).all()
    assert np.isfinite(together(invented(30), 4)["aicc"]).all()


def test_a_value_at_zero_leaves_the_six_wholly_additive_forms():
    y = invented()
    y[7] = 0.0
    names = [FORMS[i].name for i in np.flatnonzero(np.isfinite(together(y, 4)["aicc"]))]
    assert names == ["ANN", "AAN", "AAdN", "ANA", "AAA", "AAdA"]


def test_short_series_have_only_the_forms_whose_correction_is_finite():
    for n in range(1, 12):
        finite = np.isfinite(together(invented(n), 1)["aicc"])
        expected = [form.season == NO_SEASON and n - (estimated(form, 1) + 1) - 1 > 0 for form in FORMS]
        assert finite.tolist() == expected, n


def test_held_constants_are_held_in_every_form_that_has_them_and_are_not_counted():
    held = np.array([0.2, np.nan, 0.1, 0.9])
    found = together(invented(), 4, held)
    for form, constants in zip(FORMS, found["constants"], strict=True):
        assert constants[0] == 0.2
        assert constants[2] == (0.1 if form.season else 0.0)
        assert constants[3] == (0.9 if form.damped else 1.0)
    y, fitted, n, k = invented(), found["fitted"][0], 30, 2
    expected = plain.deviance(y, fitted, False) - n * np.log(n) + 2 * k + 2 * k * (k + 1) / (n - k - 1)
    assert found["aicc"][0] == pytest.approx(expected, abs=1e-8)


@pytest.mark.parametrize("unit", [1e-9, 1e12])
def test_another_unit_shifts_every_criterion_by_the_same_and_scales_every_forecast(unit):
    one, other = together(invented(), 4), together(invented() * unit, 4)
    np.testing.assert_allclose(other["aicc"] - one["aicc"], 60 * np.log(unit), rtol=1e-4)
    np.testing.assert_allclose(other["forecasts"], one["forecasts"] * unit, rtol=1e-2)


HOSTILE = {
    "constant": np.full(24, 7.3), "zero": np.zeros(24), "line": 5.0 + np.arange(24.0),
    "perfect season": np.tile([4.0, 9.0, 5.0, 2.0], 6), "negative": -invented(24), "two": np.array([5.0, 8.0]),
    "one": np.array([5.0]), "shift": np.r_[np.full(12, 1.0), np.full(12, 1e4)] + np.arange(24) % 4,
    "explosion": np.r_[np.tile([1.0, 2, 1.5, 0.5], 4), 30, 1, 45, 60], "tiny": invented(24) * 1e-9,
    "spike": np.r_[np.ones(23), 1e9], "from nothing": np.r_[np.full(10, 1e-6), np.linspace(1, 90, 14)],
}


@pytest.mark.parametrize("name", list(HOSTILE))
def test_on_any_series_what_is_given_is_finite(name):
    found = together(HOSTILE[name], 4)
    had = np.isfinite(found["aicc"])
    assert not np.isnan(found["aicc"]).any()
    for part in ("forecasts", "fitted", "constants", "states", "sigma2"):
        assert np.isfinite(found[part][had]).all(), part


def test_the_mix_is_the_weighted_mean_of_the_forecasts_each_with_its_floor():
    found = together(invented() - 60, 4)
    weights = np.zeros(15)
    weights[[1, 9]] = 0.25, 0.75
    found["aicc"][9] = 0.0  # had only on values above zero: row 9 stays at zero states and forecasts
    path = np.empty(6)
    mix(30, 4, CODES, weights, found["constants"], found["states"], 3.0, path)
    expected = 0.25 * np.maximum(found["forecasts"][1], 3.0) + 0.75 * np.maximum(found["forecasts"][9], 3.0)
    np.testing.assert_allclose(path, expected, rtol=1e-12)
