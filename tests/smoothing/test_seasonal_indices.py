"""Shrunken seasonal indices, and methods fitted to seasonally adjusted values."""

from __future__ import annotations

from functools import partial

import numpy as np
import pytest

from foredeck.smoothing.benchmarks import fit_drift, fit_naive
from foredeck.smoothing.seasonal_indices import fit_adjusted, seasonal_indices, with_season, without_season
from references import plain_averages as plain

FACTORS = np.array([0.7, 0.8, 0.95, 1.0, 1.05, 1.1, 1.3, 1.25, 1.05, 1.0, 0.9, 0.9])


@pytest.fixture(scope="module")
def trended():
    return (100 + 2.0 * np.arange(61)) * np.resize(FACTORS, 61)


def test_a_clean_season_on_a_level_keeps_its_classical_indices_to_1e_12():
    indices, multiplicative = seasonal_indices(50 * np.resize(FACTORS, 60), 12)
    assert multiplicative
    np.testing.assert_allclose(indices, FACTORS, rtol=1e-12)


def test_a_clean_season_on_a_trend_loses_less_than_a_thousandth_of_its_classical_indices(trended):
    indices, _ = seasonal_indices(trended, 12)
    classical, _ = plain.classical_indices(trended, 12, True)
    np.testing.assert_allclose(indices - 1, classical - 1, rtol=1e-3)
    assert (np.abs(indices - 1) <= np.abs(classical - 1)).all()


def test_of_pure_noise_less_than_a_third_of_the_classical_season_is_left():
    # The share left is 1 - B with B near (m - 3) / (m - 1) = .82: on average a quarter, where B is not over 1.
    rng = np.random.default_rng(0)
    left, classical = 0.0, 0.0
    for values in rng.normal(100, 10, (200, 60)):
        left += np.sum((seasonal_indices(values, 12)[0] - 1) ** 2)
        classical += np.sum((plain.classical_indices(values, 12, True)[0] - 1) ** 2)
    assert left < classical / 3


@pytest.mark.parametrize("m", [4, 12, 52])
def test_shrunken_indices_are_nearer_to_a_weak_season_than_classical_ones(m):
    rng = np.random.default_rng(1)
    season = 5 * np.sin(2 * np.pi * np.arange(m) / m)
    shrunken, classical = 0.0, 0.0
    for noise in rng.normal(0, 10, (100, 4 * m)):
        values = np.resize(season, 4 * m) + noise
        shrunken += np.sum((seasonal_indices(values - 1e3, m)[0] - season) ** 2)
        classical += np.sum((plain.classical_indices(values, m, False)[0] - season) ** 2)
    assert shrunken < 0.8 * classical


def test_a_single_strong_week_of_three_years_keeps_nine_tenths_of_its_height_and_its_neighbours_stay_flat():
    season = np.zeros(52)
    season[50] = 60.0
    indices, _ = seasonal_indices(np.resize(season, 157) + np.random.default_rng(2).normal(0, 2, 157), 52)
    assert indices[50] - np.delete(indices, 50).mean() > 54
    assert np.abs(np.delete(indices, 50) - np.delete(indices, 50).mean()).max() < 5


def test_factors_for_values_above_zero_and_amounts_otherwise(trended):
    assert seasonal_indices(trended, 12)[1]
    indices, multiplicative = seasonal_indices(trended - trended.min(), 12)
    assert not multiplicative
    assert indices.sum() == pytest.approx(0.0, abs=1e-10)


@pytest.mark.parametrize(("values", "m"), [(np.arange(1.0, 25), 12), (np.array([-1.0, 3]), 4), (np.array([4.0]), 1)])
def test_up_to_two_full_seasons_there_are_no_indices(values, m):
    indices, multiplicative = seasonal_indices(values, m)
    assert indices.tolist() == [1.0 if multiplicative else 0.0] * m


def test_no_factor_magnifies_a_value_more_than_fifty_fold():
    values = np.resize([1e-9, 1.0, 1.0, 1.0], 40)
    assert seasonal_indices(values, 4)[0].min() >= 0.02


@pytest.mark.parametrize("unit", [1e-300, 1e-150, 1e150, 1e280])
@pytest.mark.parametrize("shift", [0.0, -120.0])
def test_indices_of_values_whose_squares_leave_the_number_range_are_the_same_in_their_unit(trended, unit, shift):
    indices, multiplicative = seasonal_indices((trended + shift) * unit, 12)
    expected, _ = seasonal_indices(trended + shift, 12)
    np.testing.assert_allclose(indices / (1.0 if multiplicative else unit), expected, rtol=1e-9)


def test_a_season_taken_out_and_put_back_goes_on_after_the_last_period(trended):
    indices, multiplicative = seasonal_indices(trended, 12)
    adjusted = without_season(trended, indices, multiplicative)
    np.testing.assert_allclose(with_season(adjusted, indices, multiplicative), trended, rtol=1e-13)
    np.testing.assert_allclose(with_season(np.ones(3), indices, multiplicative, 61), indices[1:4], rtol=1e-15)


@pytest.mark.parametrize("shift", [0.0, -300.0])
def test_a_method_without_season_is_that_method_on_adjusted_values_with_the_season_put_back(trended, shift):
    values = trended + shift
    fitted = fit_adjusted(lambda y, m, _: fit_drift(y, m), values, 12, method="seasonal_drift", title="Seasonal drift")
    indices, multiplicative = seasonal_indices(values, 12)
    combine = np.multiply if multiplicative else np.add
    plain_fit = fit_drift(without_season(values, indices, multiplicative), 1)
    np.testing.assert_allclose(fitted.path(5), combine(plain_fit.path(5), indices[1:6]), rtol=1e-12)
    np.testing.assert_allclose(fitted.fitted, combine(plain_fit.fitted, np.resize(indices, 61)), rtol=1e-12)
    np.testing.assert_allclose(fitted.residuals, values - fitted.fitted, rtol=1e-12)
    np.testing.assert_array_equal(fitted.final["season"], indices)
    assert fitted.n_parameters == plain_fit.n_parameters + 11
    assert (fitted.method, fitted.title, fitted.season_length) == ("seasonal_drift", "Seasonal drift", 12)


def test_whole_numbers_and_rows_that_must_not_be_written_to_have_the_same_indices(trended):
    whole = np.rint(trended)
    frozen = np.repeat(whole, 2)[::2]
    frozen.setflags(write=False)
    for values in (whole.astype(np.int64), frozen):
        np.testing.assert_array_equal(seasonal_indices(values, 12)[0], seasonal_indices(whole, 12)[0])


def test_without_season_a_wrapped_method_is_the_method_itself(trended):
    fitted = fit_adjusted(lambda y, m, _: fit_naive(y, m), trended, 1, method="n", title="N")
    np.testing.assert_array_equal(fitted.fitted, fit_naive(trended, 1).fitted)
    assert "season" not in fitted.final


def test_constants_and_options_are_handed_on(trended):
    seen = []

    def fit_one(values, season_length, constants, *, colour):
        seen.append((season_length, constants, colour))
        return fit_naive(values, season_length)

    fit_adjusted(partial(fit_one), trended, 12, {"alpha": 0.2}, method="n", title="N", colour="blue")
    assert seen == [(1, {"alpha": 0.2}, "blue")]
