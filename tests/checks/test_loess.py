"""Seasonal-trend decomposition by matrices, against the one of statsmodels, and a plain line fitted in a window."""

from __future__ import annotations

import numpy as np
import pytest
from statsmodels.tsa.seasonal import STL

from foredeck.checks.loess import _loess, stl


@pytest.mark.parametrize("season_length", [2, 4, 7, 12, 52])
@pytest.mark.parametrize("seasons", [2.0, 2.5, 3.0, 6.1])
def test_trend_and_season_are_those_of_statsmodels_to_1e_12_of_the_largest_value(
        season_length: int, seasons: float) -> None:
    """Cleveland et al. (1990), season window 13, other windows by default, without robustness weights."""
    n = int(seasons * season_length)
    rng = np.random.default_rng([n, season_length])
    y = 500.0 + rng.normal(size=n).cumsum() + 40.0 * rng.normal(size=season_length)[np.arange(n) % season_length]
    expected = STL(y, period=season_length, seasonal=13).fit()
    trend, season = stl(y, season_length)
    tolerance = 1e-12 * np.abs(y).max()
    np.testing.assert_allclose(trend, expected.trend, rtol=0, atol=tolerance)
    np.testing.assert_allclose(season, expected.seasonal, rtol=0, atol=tolerance)


@pytest.mark.parametrize("at", [-1, 0, 7, 19, 20])
def test_a_smoothed_value_is_read_off_a_line_fitted_with_tricube_weights(at: int) -> None:
    """Cleveland (1979), Journal of the American Statistical Association 74, 829-836; tolerance 1e-10."""
    y = np.random.default_rng(3).normal(100.0, 10.0, 20)
    x = np.arange(20.0)
    nearest = np.argsort(np.abs(x - at), kind="stable")[:9]
    weights = (1.0 - (np.abs(x[nearest] - at) / np.abs(x[nearest] - at).max()) ** 3) ** 3
    level = np.polyfit(x[nearest] - at, y[nearest], 1, w=np.sqrt(weights))[1]
    assert (_loess(20, 9, np.array([at])) @ y)[0] == pytest.approx(level, rel=1e-10)


def test_a_line_is_kept_as_it_is_and_has_no_season() -> None:
    y = 10.0 + 2.5 * np.arange(60)
    trend, season = stl(y, 12)
    assert trend == pytest.approx(y, rel=1e-12)
    assert season == pytest.approx(np.zeros(60), abs=1e-10)
