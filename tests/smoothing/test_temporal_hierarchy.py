"""The temporal hierarchy against the formulas of Athanasopoulos et al. (2017), written out."""

from __future__ import annotations

import pickle

import numpy as np
import pytest

from foredeck.compiled.recursions import ADDITIVE, MULTIPLICATIVE
from foredeck.smoothing.temporal_hierarchy import BLOCKS, SOBER, fit_temporal_hierarchy, projection
from foredeck.smoothing.weighted_forms import fit_forms, fit_weighted_forms


@pytest.fixture(scope="module")
def months():
    rng = np.random.default_rng(6)
    season = np.array([-9.0, -6, 1, 4, 8, 12, 9, 3, -2, -5, -7, -8])
    return 90 + np.cumsum(rng.normal(0.2, 1.5, 71)) + np.resize(season, 71) + rng.normal(size=71) * 3


def summing():
    """One row for each month, quarter, half-year and the year: ones at its months."""
    rows = [[float(start <= month < start + block) for month in range(12)]
            for block in BLOCKS for start in range(0, 12, block)]
    return np.array(rows)


def test_projection_is_generalised_least_squares_with_structural_scaling():
    # section 2.3: variances in proportion to the months of a block
    S = summing()
    W = np.diag(1 / S.sum(axis=1))
    np.testing.assert_allclose(projection(), np.linalg.inv(S.T @ W @ S) @ S.T @ W, atol=1e-12)


def test_forecasts_that_add_up_already_are_left_as_they_are():
    year = np.arange(12.0) + 40
    np.testing.assert_allclose(projection() @ summing() @ year, year, rtol=1e-12)


def test_the_forecast_is_that_of_the_levels_counted_back_from_the_end_and_reconciled(months):
    path = fit_temporal_hierarchy(months, 12).path(18)
    sums = []
    for block in BLOCKS:
        count = months.size // block
        means = np.array([months[months.size - (count - i) * block :][:block].mean() for i in range(count)])
        assert means[-1] == pytest.approx(months[-block:].mean())
        ahead = fit_forms(means, 12 // block, forms=SOBER).path(24 // block)
        sums.append(ahead.reshape(2, -1) * block)
    expected = np.concatenate([projection() @ np.concatenate([level[year] for level in sums]) for year in (0, 1)])
    np.testing.assert_allclose(path, expected[:18], rtol=1e-10)


def test_a_shorter_horizon_is_the_beginning_of_a_longer_one(months):
    fitted = fit_temporal_hierarchy(months, 12)
    np.testing.assert_allclose(fitted.path(5), fitted.path(30)[:5], rtol=1e-12)


def test_one_step_forecasts_are_those_of_the_weighted_forms_of_the_months(months):
    fitted, plain = fit_temporal_hierarchy(months, 12), fit_forms(months, 12, forms=SOBER)
    np.testing.assert_array_equal(fitted.fitted, plain.weights @ plain.fitted)
    assert fitted.constants == {"alpha": plain.weights @ plain.constants[:, 0]}
    assert set(fitted.final) <= {form.name for form in SOBER}
    assert np.abs(fitted.path(12) / plain.path(12) - 1).max() > 1e-4


def test_with_a_season_the_levels_have_no_undamped_trend_and_one_error_for_each_kind_of_season():
    seasonal = [form for form in SOBER if form.season]
    assert len(SOBER) == 9
    assert all(form.damped or not form.trend for form in seasonal)
    assert {(form.season, form.error) for form in seasonal} == {(ADDITIVE, ADDITIVE), (MULTIPLICATIVE, MULTIPLICATIVE)}


@pytest.mark.parametrize(("n", "m"), [(47, 12), (71, 4), (71, 1), (120, 52)])
def test_under_four_years_and_for_other_seasons_it_is_the_weighted_forms(months, n, m):
    y = np.resize(months, n)
    fitted = fit_temporal_hierarchy(y, m)
    np.testing.assert_array_equal(fitted.path(9), fit_weighted_forms(y, m).path(9))
    assert fitted.method == "temporal_hierarchy"


def test_four_years_carry_the_annual_level_on_from_its_last_year(months):
    assert np.isfinite(fit_temporal_hierarchy(months[:48], 12).path(12)).all()


def test_no_forecast_of_values_at_or_above_zero_is_under_zero():
    y = np.maximum(np.linspace(40, 0, 72) + np.tile([6.0, -6], 36), 0.0)
    assert fit_temporal_hierarchy(y, 12).path(36).min() >= 0.0
    assert fit_temporal_hierarchy(y - 30, 12).path(36).min() < -30


def test_constants_are_held_at_all_levels(months):
    free, held = fit_temporal_hierarchy(months, 12), fit_temporal_hierarchy(months, 12, {"alpha": 0.05})
    assert held.constants == {"alpha": pytest.approx(0.05)}
    for level in held.path.keywords["levels"]:
        had = level.fits.weights > 0
        assert (level.fits.constants[had, 0] == 0.05).all()
    assert np.abs(free.path(12) - held.path(12)).max() > 1e-3


def test_the_fit_survives_the_way_back_from_a_worker(months):
    fitted = fit_temporal_hierarchy(months, 12)
    np.testing.assert_array_equal(pickle.loads(pickle.dumps(fitted)).forecast(15), fitted.forecast(15))
