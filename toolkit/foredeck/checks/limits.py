"""Limits beyond which a period is queried or a pattern is told, by season length and number of periods.

Simulated by tests/benchmarks/simulate_limits.py on clean series of the kinds in
tests/checks/clean_series.py, 600 series of each kind and length (a quarter of that for weeks),
1,000 for the strengths. Run it again whenever the model in `expectation` changes.
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np

_Table = dict[int, tuple[tuple[int, float, float], ...]]

# season length -> rows of (periods, spike limit, step limit), in standard deviations. From
# two years on a season is fitted too, so much less can be told there than just before.
_QUERIES: _Table = {
    1: (
        (12, 4.70, 4.09),
        (16, 4.51, 3.84),
        (24, 4.37, 3.84),
        (36, 4.37, 3.84),
        (60, 4.37, 3.84),
        (120, 4.09, 3.84),
    ),
    4: (
        (12, 5.19, 3.98),
        (16, 5.17, 3.78),
        (24, 4.42, 3.74),
        (36, 4.38, 3.74),
        (60, 4.16, 3.74),
        (120, 4.13, 3.74),
    ),
    12: (
        (12, 3.33, 3.24),
        (18, 3.33, 3.24),
        (23, 3.33, 3.24),
        (24, 4.06, 3.98),
        (30, 4.06, 3.98),
        (36, 4.06, 3.98),
        (48, 4.06, 3.98),
        (60, 4.06, 3.98),
        (84, 4.06, 3.98),
        (120, 4.00, 3.98),
        (240, 4.00, 3.98),
    ),
    52: (
        (26, 3.74, 3.74),
        (52, 3.74, 3.74),
        (103, 3.74, 3.74),
        (104, 3.96, 4.16),
        (130, 3.96, 4.16),
        (156, 3.96, 4.16),
        (208, 3.96, 4.16),
        (260, 3.94, 4.16),
        (320, 3.94, 4.16),
    ),
}

# season length -> rows of (periods, trend strength, season strength) that noise alone stays
# under in 19 of 20 series.
_STRENGTHS: _Table = {
    1: (
        (5, 0.89, 0.00),
        (8, 0.70, 0.00),
        (12, 0.64, 0.00),
        (16, 0.49, 0.00),
        (24, 0.36, 0.00),
        (36, 0.25, 0.00),
        (60, 0.14, 0.00),
        (120, 0.08, 0.00),
    ),
    4: (
        (5, 0.90, 0.00),
        (7, 0.74, 0.00),
        (8, 1.00, 1.00),
        (12, 0.93, 0.97),
        (16, 0.84, 0.88),
        (24, 0.70, 0.68),
        (36, 0.62, 0.51),
        (60, 0.54, 0.40),
        (120, 0.49, 0.31),
    ),
    12: (
        (5, 0.89, 0.00),
        (12, 0.62, 0.00),
        (23, 0.41, 0.00),
        (24, 1.00, 1.00),
        (30, 0.75, 0.95),
        (36, 0.58, 0.86),
        (48, 0.39, 0.69),
        (60, 0.32, 0.60),
        (84, 0.26, 0.45),
        (120, 0.21, 0.36),
        (240, 0.18, 0.26),
    ),
    52: (
        (5, 0.89, 0.00),
        (26, 0.33, 0.00),
        (103, 0.09, 0.00),
        (104, 1.00, 1.00),
        (130, 0.32, 0.88),
        (156, 0.16, 0.76),
        (208, 0.11, 0.59),
        (260, 0.08, 0.49),
        (520, 0.05, 0.30),
    ),
}


def query_limits(season_length: int, n_periods: int) -> tuple[float, float]:
    """Return the standardised sizes beyond which a spike and a step are queried.

    Parameters
    ----------
    season_length : int
        Periods a year; one that is not in the table borrows the limits of the next shorter
        one at the same number of years.
    n_periods : int
        Number of periods with a value.

    Returns
    -------
    spike, step : float
        Standard deviations.
    """
    return _looked_up(True, season_length, n_periods)


def strength_limits(season_length: int, n_periods: int) -> tuple[float, float]:
    """Return the trend and season strength that noise alone stays under in 19 of 20 series.

    Parameters as in `query_limits`.
    """
    return _looked_up(False, season_length, n_periods)


@lru_cache(maxsize=4096)
def _looked_up(queries: bool, season_length: int, n_periods: int) -> tuple[float, float]:
    table = _QUERIES if queries else _STRENGTHS
    known = max(m for m in table if m <= season_length)
    periods, first, second = np.array(table[known]).T
    n = n_periods * known / season_length if known > 1 else n_periods
    return float(np.interp(n, periods, first)), float(np.interp(n, periods, second))
