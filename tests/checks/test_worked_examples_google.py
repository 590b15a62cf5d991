"""Residuals of the naive forecast of Google's price, Forecasting: Principles and Practice, 2nd ed., section 3.3."""

from __future__ import annotations

import pytest

from foredeck.checks.differencing import difference
from references.open_data import values


def test_ljung_box_of_the_differences_of_200_days_has_probability_3551_at_10_lags() -> None:
    """fpp2/goog200, printed p value .3551 (statistic 11.031); tolerance half a digit."""
    advice = difference(values("fpp2", "goog200", 1, 201), 1)
    told = advice.tests.set_index("test").loc["Ljung-Box (probability)"]
    assert (told["of"], told["lags"]) == ("their differences", 10)
    assert told["statistic"] == pytest.approx(0.3551, abs=5e-5)
