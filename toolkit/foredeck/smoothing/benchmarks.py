"""Methods that any other has to beat: mean, naive, seasonal naive, drift, moving average.

References
----------
Hyndman & Athanasopoulos, Forecasting: Principles and Practice (2nd ed. 2018), sections
3.1 (methods) and 3.5 (variance of the forecast error).
"""

from __future__ import annotations

from functools import partial
from typing import Any

import numpy as np
from numpy.typing import NDArray

from foredeck.errors import MethodError
from foredeck.smoothing.fitted import Fitted, from_forecasts
from foredeck.smoothing.seasonal_indices import fit_adjusted

Array = NDArray[np.float64]


def fit_mean(values: Array, season_length: int) -> Fitted:
    """Forecast the mean of all known periods; the one-step forecasts are that same mean."""
    mean = float(values.mean())
    n = values.size
    return from_forecasts(
        values, np.full(n, mean), method="mean", title="Mean of all periods", season_length=season_length,
        path=partial(_flat, value=mean), spread=partial(_flat, value=1.0 + 1.0 / n),
        final={"level": mean}, n_parameters=1,
    )


def fit_naive(values: Array, season_length: int) -> Fitted:
    """Forecast the last value."""
    one_step = np.concatenate([[np.nan], values[:-1]])
    return from_forecasts(
        values, one_step, method="naive", title="Last value (naive)", season_length=season_length,
        path=partial(_flat, value=float(values[-1])), spread=_steps, final={"level": float(values[-1])},
    )


def fit_seasonal_naive(values: Array, season_length: int) -> Fitted:
    """Forecast the value of the same season a year before."""
    m = season_length
    if values.size < m:
        raise MethodError(
            f"The seasonal naive method needs one full season; there are {values.size} periods of {m}.",
            where="method seasonal_naive", allowed=f"at least {m} periods at a season length of {m}",
            do="Use the naive method until there is more history.",
        )
    one_step = np.concatenate([np.full(m, np.nan), values[:-m]])
    return from_forecasts(
        values, one_step, method="seasonal_naive", title="Same season last year (seasonal naive)",
        season_length=m, path=partial(_repeat, season=values[-m:].copy()), spread=partial(_years, m=m),
        final={"season": values[-m:].copy()},
    )


def fit_drift(values: Array, season_length: int) -> Fitted:
    """Extend the line from the first value to the last.

    The one-step forecasts add the slope of the whole history to the value before, as the
    published residuals of the method do.
    """
    n = values.size
    slope = float((values[-1] - values[0]) / (n - 1)) if n > 1 else 0.0
    one_step = np.concatenate([[np.nan], values[:-1] + slope])
    return from_forecasts(
        values, one_step, method="drift", title="Last value with drift", season_length=season_length,
        path=partial(_line, level=float(values[-1]), slope=slope), spread=partial(_drifting, n=n),
        final={"level": float(values[-1]), "trend": slope}, n_parameters=1,
    )


def fit_drift_with_season(values: Array, season_length: int) -> Fitted:
    """Extend the line from the first value to the last of the seasonally adjusted values, season put back."""

    def drift(adjusted: Array, _season_length: int, _constants: object = None) -> Fitted:
        return fit_drift(adjusted, 1)

    return fit_adjusted(drift, values, season_length, method="drift_with_season", title="Drift with season")


def default_window(season_length: int) -> int:
    """Periods a moving average takes when none are stated: a full season, which averages it out; else 3."""
    return season_length if season_length > 1 else 3


def fit_moving_average(values: Array, season_length: int, window: float | None = None) -> Fitted:
    """Forecast the mean of the last `window` periods (of all, where there are fewer).

    A moving average of w periods stands beside simple smoothing with alpha = 2/(w+1)
    (`equal_age_alpha`).
    """
    asked = default_window(season_length) if window is None else window
    if float(asked) != int(asked) or asked < 1:
        raise MethodError(
            f"The window is {asked!r}.", where="method moving_average",
            allowed="a whole number of periods, at least 1", do="Give the number of periods to average.",
        )
    w = min(int(asked), values.size)
    sums = np.convolve(values, np.ones(w), mode="valid") / w
    one_step = np.concatenate([np.full(w, np.nan), sums[:-1]])
    level = float(values[-w:].mean())
    return from_forecasts(
        values, one_step, method="moving_average", title="Moving average", season_length=season_length,
        path=partial(_flat, value=level), constants={"window": float(w)}, final={"level": level},
    )


def equal_age_alpha(window: int) -> float:
    """Constant of simple smoothing whose weights have the mean age of a moving average: 2/(w+1).

    The data in a moving average of w periods are (w - 1)/2 periods old on average; the
    weights alpha (1 - alpha)^k of simple smoothing have the mean age (1 - alpha)/alpha.

    References
    ----------
    Brown (1963), Smoothing, Forecasting and Prediction; common practice.
    """
    return 2.0 / (window + 1.0)


def _flat(horizon: int, *, value: float) -> Array:
    return np.full(horizon, value)


def _repeat(horizon: int, *, season: Array) -> Array:
    return np.resize(season, horizon)


def _line(horizon: int, *, level: float, slope: float) -> Any:
    return level + slope * np.arange(1, horizon + 1)


def _steps(horizon: int) -> Any:
    return np.arange(1.0, horizon + 1)


def _years(horizon: int, *, m: int) -> Any:
    return np.arange(horizon) // m + 1.0


def _drifting(horizon: int, *, n: int) -> Any:
    lead = np.arange(1.0, horizon + 1)
    return lead * (1.0 + lead / n)
