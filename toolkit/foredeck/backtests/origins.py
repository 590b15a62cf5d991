"""The past origins that a backtest forecasts from."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from foredeck.errors import MethodError


def known_counts(n: int, season_length: int, horizon: int, count: int | None = None) -> NDArray[np.int64]:
    """Numbers of periods known at each origin, ascending; the last is n - 1.

    Origins are consecutive. At each of them at least two seasons and one period are known
    or, in a history shorter than four seasons, half of it; at least one period always.

    Parameters
    ----------
    n : int
        Periods of history, at least 2.
    season_length : int
    horizon : int
        Leads to be judged.
    count : int, optional
        Number of origins wanted. By default the horizon and two years of months (24), so
        that a lead as far as the horizon is judged about two dozen times. There are fewer
        where the history is short.

    Returns
    -------
    array of int, shape (at most count,)

    Raises
    ------
    MethodError
        for fewer than two periods, or a count or horizon under 1.

    References
    ----------
    Tashman (2000), International Journal of Forecasting 16, 437-450 (rolling origins,
    refitted each time).
    """
    wanted = horizon + 24 if count is None else count
    if n < 2:
        raise MethodError(
            f"The history has {n} periods.", where="backtest", allowed="at least 2 periods",
            do="Wait for more history: a forecast needs one period to learn from and one to be judged by.",
        )
    if wanted < 1 or horizon < 1:
        raise MethodError(
            f"The backtest is to have {wanted} origins and {horizon} leads.", where="backtest",
            allowed="at least 1 of each", do="Give a larger number, or none for the default.",
        )
    least = max(1, min(2 * season_length + 1, n // 2))
    return np.arange(max(least, n - wanted), n, dtype=np.int64)
