"""The named starting states, on series whose states are known."""

from __future__ import annotations

import numpy as np
import pytest

from foredeck.smoothing.catalogue import smooth

LEVEL, TREND = 100.0, 0.5
ADDED, FACTORS = np.array([-6.0, 9.0, -1.0, -2.0]), np.array([0.9, 1.2, 0.95, 0.95])
TIME = np.arange(1, 21)
HELD = {"alpha": 0.3, "beta": 0.1, "gamma": 0.1}


@pytest.mark.parametrize("m", [4, 5])
def test_classical_start_finds_level_trend_and_season_of_a_perfect_additive_series(m):
    # Hyndman, Koehler, Ord & Snyder (2008), section 2.6.1: exact, since the moving average keeps a line
    season = np.r_[ADDED, 0.0][:m]
    fitted = smooth(LEVEL + TREND * TIME + np.resize(season, 20), "holt_winters_additive", m, initial="classical",
                    **HELD)
    assert fitted.initial["level"] == pytest.approx(LEVEL, rel=1e-12)
    assert fitted.initial["trend"] == pytest.approx(TREND, rel=1e-10)
    np.testing.assert_allclose(fitted.initial["season"], season, atol=1e-10)
    np.testing.assert_allclose(fitted.residuals, 0.0, atol=1e-9)


def test_classical_start_finds_the_factors_of_a_level_series():
    fitted = smooth(LEVEL * np.resize(FACTORS, 20), "holt_winters_multiplicative", 4, initial="classical", **HELD)
    assert fitted.initial["level"] == pytest.approx(LEVEL, rel=1e-12)
    assert fitted.initial["trend"] == pytest.approx(0.0, abs=1e-10)
    np.testing.assert_allclose(fitted.initial["season"], FACTORS, rtol=1e-12)


def test_first_value_start_takes_level_trend_and_season_from_the_first_two_seasons():
    y = np.array([10.0, 20.0, 30.0, 40.0, 14.0, 24.0, 34.0, 44.0, 18.0])
    fitted = smooth(y, "holt_winters_additive", 4, initial="first value", **HELD)
    assert (fitted.initial["level"], fitted.initial["trend"]) == (pytest.approx(25.0), pytest.approx(1.0))
    np.testing.assert_allclose(fitted.initial["season"], [-15.0, -5.0, 5.0, 15.0])
    assert fitted.fitted[0] == pytest.approx(25.0 + 1.0 - 15.0)
    plain = smooth(y, "holt", initial="first value", alpha=0.3, beta=0.1)
    assert (plain.initial["level"], plain.initial["trend"]) == (pytest.approx(10.0), pytest.approx(10.0))


def test_estimated_start_fits_at_least_as_well_as_every_named_one():
    rng = np.random.default_rng(14)
    y = LEVEL + TREND * TIME + np.resize(ADDED, 20) + rng.normal(size=20) * 2
    for name in ("ses", "holt", "damped_holt", "holt_winters_additive", "holt_winters_multiplicative"):
        best = smooth(y, name, 4).sse
        assert best <= smooth(y, name, 4, initial="first value").sse * (1 + 1e-9), name
        assert best <= smooth(y, name, 4, initial="classical").sse * (1 + 1e-9), name


def test_stated_states_after_k_periods_leave_the_first_k_without_a_forecast_and_out_of_the_sum():
    y = np.array([3.0, 5.0, 4.0, 6.0])
    fitted = smooth(y, "ses", alpha=0.5, initial={"level": 4.0, "after": 2})
    np.testing.assert_allclose(fitted.fitted, [np.nan, np.nan, 4.0, 4.0])
    assert fitted.sse == pytest.approx(4.0)
    assert fitted.sigma2 == pytest.approx(2.0)
    assert fitted.final["level"] == pytest.approx(5.0)
