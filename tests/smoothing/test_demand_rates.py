"""The Croston family against identities; no published table with all steps was found."""

from __future__ import annotations

import numpy as np
import pytest

from foredeck.errors import MethodError
from foredeck.smoothing.catalogue import fit, smooth

EVERY_FOURTH = np.tile([0.0, 0.0, 0.0, 12.0], 8)


def test_croston_of_size_z_every_p_periods_forecasts_z_over_p():
    # identity that follows from Croston (1972), whatever alpha
    for alpha in (0.05, 0.2, 1.0):
        np.testing.assert_allclose(smooth(EVERY_FOURTH, "croston", alpha=alpha).forecast(3), 3.0, rtol=1e-12)
    assert smooth(EVERY_FOURTH, "croston").forecast(1)[0] == pytest.approx(3.0, rel=1e-12)


def test_sba_of_size_z_every_p_periods_forecasts_1_minus_half_alpha_times_z_over_p():
    # Syntetos & Boylan (2005)
    for alpha in (0.05, 0.2, 1.0):
        expected = (1 - alpha / 2) * 3.0
        np.testing.assert_allclose(smooth(EVERY_FOURTH, "sba", alpha=alpha).forecast(3), expected, rtol=1e-12)


def test_croston_with_a_demand_in_every_period_is_simple_smoothing_from_the_first_value():
    y = np.random.default_rng(0).gamma(5, 1, 50)
    one = smooth(y, "croston", alpha=0.2)
    other = smooth(y, "ses", alpha=0.2, initial="first value")
    np.testing.assert_allclose(one.fitted[1:], other.fitted[1:], rtol=1e-12)
    assert one.forecast(1)[0] == pytest.approx(other.forecast(1)[0], rel=1e-12)


def test_tsb_with_a_demand_in_every_period_is_simple_smoothing_from_the_mean():
    # Teunter, Syntetos & Babai (2011): the chance of a demand stays 1
    y = np.random.default_rng(1).gamma(5, 1, 50)
    one = smooth(y, "tsb", alpha=0.2, beta=0.3)
    other = smooth(y, "ses", alpha=0.2, initial={"level": y.mean()})
    assert one.final["chance"] == 1.0
    np.testing.assert_allclose(one.fitted, other.fitted, rtol=1e-12)


def test_tsb_falls_by_1_minus_beta_in_every_period_without_demand_and_croston_does_not():
    ended = np.concatenate([EVERY_FOURTH, np.zeros(12)])
    before, after = (smooth(y, "tsb", alpha=0.1, beta=0.2) for y in (EVERY_FOURTH, ended))
    # both start from the mean rate of what they know, so compare with the chance carried on by hand
    chance = after.initial["chance"]
    for demand in ended > 0:
        chance += 0.2 * (demand - chance)
    assert after.forecast(1)[0] == pytest.approx(12 * chance, rel=1e-12)
    assert after.forecast(1)[0] < 0.1 * before.forecast(1)[0]
    assert smooth(ended, "croston", alpha=0.1).forecast(1)[0] == pytest.approx(3.0, rel=1e-12)


def test_mean_rate_of_many_random_demands_is_met_within_2_percent_by_sba_and_tsb_and_exceeded_by_croston():
    # own simulation, 200,000 periods, alpha .1: the bias factor is Syntetos & Boylan's 1 - alpha/2
    rng = np.random.default_rng(5)
    y = np.where(rng.random(200_000) < 0.25, rng.gamma(4, 2.5, 200_000), 0.0)
    means = {name: np.nanmean(smooth(y, name, alpha=0.1).fitted[1000:]) / 2.5 for name in ("croston", "sba")}
    means["tsb"] = np.mean(smooth(y, "tsb", alpha=0.1, beta=0.1).fitted[1000:]) / 2.5
    assert means["croston"] > 1.025
    assert means["sba"] == pytest.approx(1.0, abs=0.02)
    assert means["tsb"] == pytest.approx(1.0, abs=0.02)


@pytest.mark.parametrize("name", ["croston", "sba", "tsb"])
def test_a_series_that_never_had_a_demand_is_forecast_at_zero(name):
    assert fit(name, np.zeros(12), 12).forecast(3).tolist() == [0.0, 0.0, 0.0]


@pytest.mark.parametrize("name", ["croston", "sba", "tsb"])
def test_an_estimated_constant_has_the_smallest_squared_error_of_its_grid(name):
    y = np.where(np.random.default_rng(9).random(60) < 0.3, 5.0, 0.0) * np.linspace(1, 3, 60)
    estimated = fit(name, y, 12)
    for alpha in (0.01, 0.05, 0.1, 0.2, 0.3):
        assert estimated.sse <= fit(name, y, 12, {"alpha": alpha, "beta": 0.1}).sse * (1 + 1e-12)


def test_demand_rates_have_no_ranges_by_normal_theory_and_say_so_in_full():
    with pytest.raises(MethodError) as caught:
        smooth(EVERY_FOURTH, "croston").ranges(3)
    assert str(caught.value) == (
        "Croston has no ranges by normal theory.\n"
        "  where: ranges of croston\n"
        "  allowed: additive smoothing forms, mean, naive, seasonal naive and drift\n"
        "  next: Take the ranges of a study, which come from backtest errors."
    )
