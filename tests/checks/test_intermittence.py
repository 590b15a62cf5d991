"""Average demand interval, squared variation, quadrant."""

from __future__ import annotations

import numpy as np
import pytest

from foredeck.checks.intermittence import average_demand_interval, demand_class, is_intermittent, squared_variation


def test_the_interval_is_periods_by_periods_with_demand_and_not_the_mean_gap() -> None:
    """Demand in periods 3 and 4 of 8: 8 / 2 = 4, although the gap between the two demands is 1."""
    y = np.array([0, 0, 5, 7, 0, 0, 0, 0.0])
    assert average_demand_interval(y) == 4.0


def test_a_missing_period_counts_neither_as_zero_nor_as_demand() -> None:
    assert average_demand_interval(np.array([0, np.nan, 5, np.nan, 5, 0.0])) == 2.0


def test_no_demand_at_all_is_an_infinite_interval_and_nothing_known_is_none() -> None:
    assert average_demand_interval(np.zeros(4)) == float("inf")
    assert average_demand_interval(np.full(4, np.nan)) == 1.0
    assert is_intermittent(np.zeros(4))


def test_variation_is_of_the_sizes_alone() -> None:
    """Sizes 2, 4, 6: mean 4, variance 4, so (2/4)^2 = .25."""
    assert squared_variation(np.array([2, 0, 4, 0, 0, 6.0])) == pytest.approx(0.25)
    assert squared_variation(np.array([0, 0, 9.0])) == 0.0


@pytest.mark.parametrize(("adi", "cv2", "quadrant"), [
    (1.31, 0.48, "smooth"), (1.31, 0.49, "erratic"), (1.32, 0.48, "intermittent"), (1.32, 0.49, "lumpy")])
def test_quadrants_meet_at_the_published_cut_offs(adi: float, cv2: float, quadrant: str) -> None:
    """Syntetos, Boylan & Croston (2005): 1.32 and .49."""
    assert demand_class(adi, cv2) == quadrant
