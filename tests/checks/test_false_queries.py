"""Clean data raise at most one query in 1,000 periods, and their newest values are never touched."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from checks.clean_series import KINDS, clean_series
from foredeck.checks.findings import find
from foredeck.checks.repairs import repaired
from foredeck.intake.history import SeriesHistory
from foredeck.periods import Frequency


def queries_and_touched(frequency: Frequency, lengths: list[int], n_series: int, seed: int) -> tuple[float, int]:
    """Queries per 1,000 periods, and how many series had one of their last three values changed."""
    rng = np.random.default_rng(seed)
    length = frequency.season_length
    kinds = [k for k in KINDS if length > 1 or "season" not in k]
    queries = periods = touched = 0
    for i in range(n_series):
        n = int(rng.choice(lengths))
        values = clean_series(kinds[i % len(kinds)], n, length, rng)
        index = pd.period_range(pd.Period("2016-01-04", frequency.pandas_code), periods=n)
        findings = find(SeriesHistory("s", frequency, index, values), index[-1])
        queries += len(findings)
        periods += n
        touched += not np.array_equal(repaired(values, length)[-3:], values[-3:])
    return 1000.0 * queries / periods, touched


def test_a_thousand_clean_monthly_series_raise_at_most_one_query_in_a_thousand_periods() -> None:
    """12 kinds, 36 to 120 months, about 78,000 periods; faults count as queries here."""
    rate, touched = queries_and_touched(Frequency.MONTHLY, [36, 48, 60, 72, 84, 96, 108, 120], 1000, 2026)
    assert rate <= 1.0
    assert touched == 0


@pytest.mark.parametrize(("frequency", "lengths", "n_series"), [
    (Frequency.YEARLY, [12, 15, 20, 30, 40], 300), (Frequency.QUARTERLY, [12, 16, 24, 40, 60, 80], 240),
    (Frequency.MONTHLY, [12, 15, 18, 23, 24, 27, 30, 33], 240), (Frequency.WEEKLY, [60, 104, 156, 260], 40)])
def test_clean_series_of_every_frequency_and_length_raise_as_few(
        frequency: Frequency, lengths: list[int], n_series: int) -> None:
    rate, touched = queries_and_touched(frequency, lengths, n_series, 7)
    assert rate <= 1.0
    assert touched == 0
