"""What the portfolio fit says of itself."""

from __future__ import annotations

from types import SimpleNamespace
from typing import Any

import numpy as np
import pytest

from foredeck.portfolio.alone import ForecastOptions
from foredeck.portfolio.applied import method_words
from foredeck.portfolio.explained import fit_facts, fit_words, half_weight, named_in_a_sentence, winners_edge
from foredeck.portfolio.procedure import live_through
from foredeck.portfolio.weights import learn_from
from foredeck.smoothing.catalogue import METHODS
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
             "used": {"damped_holt": 9}, "half": 4, "edge_then": 0.14, "edge_after": 0.03,
             "edge_back": 12, "own_share": 0.3, "intermittent": 2}
    assert fit_words("blend", 9, facts, MONTHS) == (
        "Over the portfolio the forecast is a blend of 2 methods, led by damped trend with 75%: in the backtests it "
        "missed 3% less than the methods do on average. Weights begin nearly equal; these backtests count 30% in them, "
        "and on each series the methods that missed less on it count more. The latest 4 months count for half of the "
        "level that a forecast starts from, all earlier ones for the other half. Why not the winner alone? On each "
        "series, the method that had missed least until 12 months ago was 14% ahead of the methods' average then, and "
        "3% ahead since: that is what a winner's lead is worth. Ranges come from the misses of past forecasts, pooled "
        "over 7 series. Ranges of intermittent series come from how often demand came, and how large it was.")
    alone = fit_words("blend", 1, {**facts, "intermittent": 0}, MONTHS)
    assert alone.endswith("Ranges come from the misses of past forecasts, pooled over one series.")
    assert alone.startswith("The forecast is a blend of 2 methods, led by damped trend with 75%:")
    assert "in them, and methods that missed less count more." in alone
    assert "On this series, the method that had missed least" in alone


@pytest.mark.parametrize(("after", "said"), [
    (-0.04, "then, and 4% behind since:"),
    (0.004, "then, and level with it since:"),
    (0.2, "then, and 20% ahead since:"),
])
def test_a_winner_that_fell_behind_or_level_is_said_to_have_done_so(after: float, said: str) -> None:
    facts = {"weights": {"ses": 1.0}, "standing": {"ses": 0.0}, "used": {"ses": 1}, "half": None, "edge_then": 0.2,
             "edge_after": after, "edge_back": 8, "own_share": 0.3, "intermittent": 0}
    words = fit_words("blend", 9, facts, ("quarter", "quarters"))
    assert said in words
    assert "Why not simply the winner? On each series" in fit_words("single", 9, facts, ("quarter", "quarters"))
    assert "until 8 quarters ago" in words


def test_a_method_keeps_its_capital_within_a_sentence_only_where_it_begins_with_a_person() -> None:
    assert [named_in_a_sentence(name) for name in ("holt", "croston", "tsb", "log_dynamic_theta", "ses")] == [
        "Holt's linear trend", "Croston", "Teunter-Syntetos-Babai", "dynamic theta on logarithms",
        "simple exponential smoothing"]


def test_the_half_of_the_weight_leaves_out_intermittent_demand_whose_constants_count_demands() -> None:
    alones, _, procedures = portfolio(1)
    alones[0].constants = tuple({"alpha": 0.2} for _ in range(5))
    assert half_weight(alones, procedures) is not None
    alones[0].pattern = SimpleNamespace(intermittent=True)
    assert half_weight(alones, procedures) is None


def test_the_method_of_a_series_is_told_by_who_leads_and_who_comes_next() -> None:
    assert method_words({"theta": 1.0}) == METHODS["theta"].sentence
    words = method_words({"ses": 0.1, "dynamic_theta": 0.6, "averaged_damped": 0.3})
    assert words == ("The forecast is a blend of 3 methods, led by dynamic theta with 60%. "
                     f"{METHODS['dynamic_theta'].sentence} Next come averaged damped trend (30%) and simple "
                     "exponential smoothing (10%).")
    assert method_words({"ses": 0.3, "theta": 0.7}).endswith("Next comes simple exponential smoothing (30%).")


def test_a_plain_mean_is_called_one_and_says_what_it_is_for() -> None:
    assert method_words({"ses": 0.5, "theta": 0.5}) == (
        "The forecast is the plain mean of 2 methods: simple exponential smoothing and theta.")
    assert method_words({"croston": 1 / 3, "sba": 1 / 3, "tsb": 1 / 3}) == (
        "The forecast is the plain mean of 3 methods for intermittent demand: Croston, Syntetos-Boylan approximation "
        "and Teunter-Syntetos-Babai. Each sets how large a demand usually is against how often one comes.")


def test_words_of_the_single_style_count_the_series_of_each_method() -> None:
    facts = {"weights": {}, "standing": {}, "used": {"ses": 2, "damped_holt": 5, "holt": 1, "croston": 1}, "half": 1,
             "edge_then": None, "edge_after": None, "own_share": 0.1, "intermittent": 1}
    words = fit_words("single", 9, facts, MONTHS)
    assert "damped trend on 5, simple exponential smoothing on 2, Holt's linear trend on 1, and others of 9" in words
    assert "The latest month counts for half or more of the level" in words
    assert "winner" not in words
