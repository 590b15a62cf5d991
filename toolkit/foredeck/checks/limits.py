"""Limits beyond which a period is queried or a pattern is told, by season length and number of periods.

Simulated by tests/benchmarks/simulate_limits.py on clean series of the kinds in
tests/checks/clean_series.py, 500 series of each kind and length (a quarter of that for weeks),
1,000 for the strengths. Run it again whenever the model in `expectation` changes.
"""

from __future__ import annotations

import numpy as np

_Table = dict[int, tuple[tuple[int, float, float], ...]]

# season length -> rows of (periods, spike limit, step limit), in standard deviations. From
# two years on a season is fitted too, so much less can be told there than just before.
_QUERIES: _Table = {
    1: (
        (12, 3.84, 3.56),
        (16, 3.84, 3.56),
        (24, 3.60, 3.56),
        (36, 3.60, 3.56),
        (60, 3.60, 3.56),
        (120, 3.57, 3.56),
    ),
    4: (
        (12, 4.11, 3.42),
        (16, 4.09, 3.42),
        (24, 3.55, 3.42),
        (36, 3.55, 3.42),
        (60, 3.55, 3.42),
        (120, 3.55, 3.42),
    ),
    12: (
        (12, 3.01, 3.04),
        (18, 3.01, 3.04),
        (23, 3.01, 3.04),
        (24, 3.53, 3.55),
        (30, 3.53, 3.55),
        (36, 3.53, 3.55),
        (48, 3.53, 3.55),
        (60, 3.53, 3.55),
        (84, 3.53, 3.55),
        (120, 3.53, 3.55),
        (240, 3.53, 3.55),
    ),
    52: (
        (26, 3.39, 3.43),
        (52, 3.39, 3.43),
        (103, 3.39, 3.43),
        (104, 3.57, 3.65),
        (130, 3.57, 3.65),
        (156, 3.57, 3.65),
        (208, 3.57, 3.65),
        (260, 3.57, 3.65),
        (320, 3.56, 3.65),
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
    return _looked_up(_QUERIES, season_length, n_periods)


def strength_limits(season_length: int, n_periods: int) -> tuple[float, float]:
    """Return the trend and season strength that noise alone stays under in 19 of 20 series.

    Parameters as in `query_limits`.
    """
    return _looked_up(_STRENGTHS, season_length, n_periods)


def _looked_up(table: _Table, season_length: int, n_periods: int) -> tuple[float, float]:
    known = max(m for m in table if m <= season_length)
    periods, first, second = np.array(table[known]).T
    n = n_periods * known / season_length if known > 1 else n_periods
    return float(np.interp(n, periods, first)), float(np.interp(n, periods, second))
