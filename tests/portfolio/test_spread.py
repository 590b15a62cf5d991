"""Pass 1 over processes gives what it gives in one."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from foredeck.errors import MethodError
from foredeck.intake.history import SeriesHistory
from foredeck.periods import Frequency
from foredeck.portfolio.alone import Alone, ForecastOptions
from foredeck.portfolio.spread import FEW, examine_each

CLOSING = pd.Period("2024Q4", freq="Q-DEC")
OPTIONS = ForecastOptions(horizon=2, methods=("ses",))


def quarters(count: int) -> list[SeriesHistory]:
    periods = pd.period_range(end=CLOSING, periods=16, freq="Q-DEC")
    found = []
    for seed in range(count):
        values = 50 + np.random.default_rng(seed).normal(size=16)
        if seed == 3:
            values[:14] = np.nan  # too little to forecast
        found.append(SeriesHistory(f"series {seed}", Frequency.QUARTERLY, periods, values))
    return found


def test_two_processes_give_the_same_as_one_in_the_same_order() -> None:
    series = quarters(FEW + 5)
    alone, together = (list(examine_each(series, CLOSING, OPTIONS, workers=count)) for count in (1, 2))
    assert len(alone) == len(together) == len(series)
    for one, other, history in zip(alone, together, series, strict=True):
        if history.name == "series 3":
            assert isinstance(one, MethodError)
            assert isinstance(other, MethodError)
            assert str(one) == str(other)
        else:
            assert isinstance(one, Alone)
            assert isinstance(other, Alone)
            assert one.series.name == other.series.name == history.name
            np.testing.assert_array_equal(one.cube.forecasts, other.cube.forecasts)
            np.testing.assert_array_equal(one.members, other.members)


def test_a_killed_worker_costs_no_series(monkeypatch: pytest.MonkeyPatch) -> None:
    from portfolio import dying_workers

    series = quarters(FEW + 5)
    monkeypatch.setattr("foredeck.portfolio.spread.attempt", dying_workers.attempt)
    found = list(examine_each(series, CLOSING, OPTIONS, workers=2))
    assert [getattr(one, "series", history).name for one, history in zip(found, series, strict=True)] == [
        history.name for history in series]
