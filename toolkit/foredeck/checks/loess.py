"""STL for many series of one length: its smoothers as matrices, made once for a length and season.

Without robustness weights every smoother in STL is linear in the values, and none of them
depends on the values: a series is then decomposed by ten products of a matrix and a vector.
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

SEASONAL_WINDOW = 13
"""Years (of one month, quarter or week) over which a season is smoothed."""

_TURNS = 5


def stl(values: Array, season_length: int) -> tuple[Array, Array]:
    """Trend and season by STL with straight lines, five inner turns, and no robustness weights.

    Parameters
    ----------
    values : array, shape (n,), n >= 2 * season_length; the series' unit
        Without NaN.
    season_length : int
        Periods a year, 2 or more.

    Returns
    -------
    trend, season : array, shape (n,); same unit

    References
    ----------
    Cleveland, Cleveland, McRae & Terpenning (1990), Journal of Official Statistics 6, 3-73,
    section 2.2; the windows are those of section 3.
    """
    to_season, to_trend = _smoothers(values.size, season_length)
    trend = np.zeros(values.size)
    for _ in range(_TURNS):
        season = to_season @ (values - trend)
        trend = to_trend @ (values - season)
    return trend, season


@lru_cache(maxsize=64)
def _smoothers(n: int, season_length: int) -> tuple[Array, Array]:
    """Matrices that take values without trend to the season, and values without season to the trend."""
    cycles = _cycles(n, season_length)
    averaged = cycles
    for length in (season_length, season_length, 3):
        averaged = _moving_average(averaged, length)
    low_pass = _loess(n, _next_odd(season_length + 1), np.arange(n)) @ averaged
    to_season = cycles[season_length:-season_length] - low_pass
    trend_window = _next_odd(int(np.ceil(1.5 * season_length / (1.0 - 1.5 / SEASONAL_WINDOW))))
    return to_season, _loess(n, trend_window, np.arange(n))


def _cycles(n: int, season_length: int) -> Array:
    """Smooth each month, quarter or week over the years, and extend it by one year at either end."""
    smoother = np.zeros((n + 2 * season_length, n))
    for first in range(season_length):
        years = len(range(first, n, season_length))
        smoother[first::season_length, first::season_length] = _loess(years, SEASONAL_WINDOW, np.arange(-1, years + 1))
    return smoother


def _moving_average(rows: Array, length: int) -> Array:
    """Average of so many neighbouring rows, for each place where they all exist."""
    total = np.cumsum(np.pad(rows, ((1, 0), (0, 0))), axis=0)
    return np.asarray((total[length:] - total[:-length]) / length)


def _loess(n: int, window: int, at: NDArray[np.intp]) -> Array:
    """Weights of n values in the straight lines fitted about each position, shape (at.size, n).

    Cleveland et al. (1990), section 2.1: tricube weights of the nearest `window` values; where
    there are fewer values, they reach further by half of what is short.
    """
    places = np.arange(n)
    first = np.clip(at - window // 2, 0, max(n - window, 0))[:, None]
    last = np.minimum(first + window, n) - 1
    place = at[:, None]
    reach = np.maximum(place - first, last - place) + float(max(window - n, 0) // 2)
    away = np.abs(places - place)
    weights = np.where(away <= 0.001 * reach, 1.0, (1.0 - np.minimum(away / reach, 1.0) ** 3) ** 3)
    weights[(places < first) | (places > last) | (away > 0.999 * reach)] = 0.0
    weights /= weights.sum(axis=1, keepdims=True)
    centre = weights @ places
    from_centre = places - centre[:, None]
    spread = (weights * from_centre ** 2).sum(axis=1)
    # Weights on one place only hold no slope.
    slope = np.where(np.sqrt(spread) > 0.001 * (n - 1), (at - centre) / np.where(spread > 0.0, spread, 1.0), 0.0)
    return np.asarray(weights * (slope[:, None] * from_centre + 1.0))


def _next_odd(window: int) -> int:
    return window if window % 2 else window + 1
