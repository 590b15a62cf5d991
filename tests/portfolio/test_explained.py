"""What the portfolio fit says of itself."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from foredeck.portfolio.alone import ForecastOptions
from foredeck.portfolio.explained import fit_facts, fit_words, half_weight, winners_edge
from foredeck.portfolio.procedure import live_through
from foredeck.portfolio.weights import learn_from
from portfolio.invented import alone_of

OPTIONS = ForecastOptions(horizon=2, methods=("ses", "holt", "damped_holt"))
MONTHS = ("month", "months")


def portfolio(count: int, seed: int = 0) -> tuple[list[Any], Any, list[Any]]:
    alones = [alone_of(seed + n, horizon=2) for n in range(count)]
    learned = learn_from(alones, OPTIONS)
    return alones, learned, [live_through(alone, "blend", learned) for alone in alones]


def test_the_half_of_the_weight_is_where_the_weights_of_simple_smoothing_add_up_to_a_half() -> None:
    alones, _, procedures = portfolio(1)
    for alpha in (0.05, 0.2, 0.5, 0.9):
        alones[0].constants = tuple({"alpha": alpha} for _ in range(5))
        found = half_weight(alones, procedures)
        held = np.cumsum(alpha * (1 - alpha) ** np.arange(200))
        assert found == int(np.argmax(held >= 0.5 - 1e-9)) + 1
    alones[0].constants = ({}, {}, {}, {}, {})
    assert half_weight(alones, procedures) is None


def test_the_winner_s_edge_shrinks_when_it_was_luck_and_stays_when_it_was_not() -> None:
    alones, learned, _ = portfolio(60)
    for alone in alones:
        rng = np.random.default_rng(abs(int(1000 * alone.raw[0])))
        alone.cube.forecasts[2:] = 100 + rng.normal(size=(3, 20, 2))  # three methods of the same worth
    then, after = winners_edge(alones, learned)
    assert then is not None
    assert after is not None
    assert then > 0.1
    assert abs(after) < 0.08
    for alone in alones:
        rng = np.random.default_rng(abs(int(1000 * alone.raw[0])))
        alone.cube.forecasts[2] = 100 + 0.1 * rng.normal(size=(20, 2))  # now one is truly better
        alone.cube.forecasts[3:] = 100 + 3 * rng.normal(size=(2, 20, 2))
    then, after = winners_edge(alones, learned)
    assert then is not None
    assert after is not None
    assert after > 0.5 * then


def test_facts_name_the_weights_now_and_who_leads_where() -> None:
    alones, learned, procedures = portfolio(3)
    facts = fit_facts(alones, procedures, learned)
    assert list(facts["weights"]) == ["ses", "holt", "damped_holt"]
    assert sum(facts["weights"].values()) == pytest.approx(1.0)
    assert sum(facts["used"].values()) == 3
    assert facts["own_share"] == pytest.approx(3 / 53)


def test_words_of_a_blend_say_who_leads_why_how_far_back_and_what_a_winner_s_lead_is_worth() -> None:
    facts = {"weights": {"ses": 0.25, "damped_holt": 0.75}, "standing": {"ses": 0.02, "damped_holt": -0.03},
             "used": {"damped_holt": 9}, "half": 4, "edge_then": 0.14, "edge_after": 0.03, "own_share": 0.3}
    assert fit_words("blend", 9, facts, MONTHS) == (
        "The forecast is a blend of 2 methods, led by Damped trend (75 %), which missed 3 % less than the methods on "
        "average in the backtests of this portfolio. These backtests count 30 % in the weights, the usual weights the "
        "rest; on each series, methods that missed less on it count more. Half of the weight lies on the latest 4 "
        "months. The method that had done best on a series a year earlier missed 14 % less than the methods on average "
        "up to then, and 3 % less since: that is what a winner's lead is worth. Ranges come from the misses of past "
        "forecasts, pooled over 9 series.")


def test_words_of_the_single_style_count_the_series_of_each_method() -> None:
    facts = {"weights": {}, "standing": {}, "used": {"ses": 2, "damped_holt": 5, "holt": 1, "croston": 1}, "half": 1,
             "edge_then": None, "edge_after": None, "own_share": 0.1}
    words = fit_words("single", 9, facts, MONTHS)
    assert "Damped trend on 5, Simple exponential smoothing on 2, Holt's linear trend on 1, and others of 9" in words
    assert "the latest month." in words
    assert "worth" not in words
