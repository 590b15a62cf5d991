"""Limits beyond which a period is queried, by season length and number of periods."""

from __future__ import annotations

import numpy as np

# season length -> rows of (periods, spike limit, step limit)
_TABLE: dict[int, tuple[tuple[int, float, float], ...]] = {
    1: ((12, 5.0, 5.0), (120, 4.2, 4.5)),
}


def query_limits(season_length: int, n_periods: int) -> tuple[float, float]:
    """Limits."""
    known = max((m for m in _TABLE if m <= season_length), default=1)
    periods, spike, step = np.array(_TABLE[known]).T
    return float(np.interp(n_periods, periods, spike)), float(np.interp(n_periods, periods, step))


def strength_limits(season_length: int, n_periods: int) -> tuple[float, float]:
    """Strengths."""
    return 0.4, 0.5
