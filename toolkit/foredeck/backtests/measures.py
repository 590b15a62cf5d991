"""Measures of forecast error. Errors are actual minus forecast everywhere.

Each takes arrays of one shape and drops the cells where either is NaN; where none is
left the result is NaN. `axis` keeps the other axes, so that a measure can be had by lead.

References
----------
Hyndman & Koehler (2006), International Journal of Forecasting 22, 679-688.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from foredeck.errors import ShapeError

Array = NDArray[np.float64]


def errors(actual: Array, forecast: Array) -> Array:
    """Actual minus forecast, NaN where either is.

    Raises
    ------
    ShapeError
        if the shapes differ; both are named.
    """
    a, f = np.asarray(actual, dtype=np.float64), np.asarray(forecast, dtype=np.float64)
    if a.shape != f.shape:
        raise ShapeError(
            f"Actuals have the shape {a.shape}, forecasts {f.shape}.", where="measures of error",
            allowed="two arrays of one shape", do="Hand in the forecast of each actual at its place.",
        )
    difference: Array = a - f
    return difference


def mean_of(values: Array, axis: int | None = None) -> Array:
    """Mean over the cells that are not NaN; NaN, without a warning, where there are none."""
    known = ~np.isnan(values)
    count = known.sum(axis=axis)
    total = np.where(known, values, 0.0).sum(axis=axis)
    return np.where(count > 0, total / np.maximum(count, 1), np.nan)


def bias(actual: Array, forecast: Array, axis: int | None = None) -> Array:
    """Mean error, in the series' unit; above zero where forecasts were too low."""
    return mean_of(errors(actual, forecast), axis)


def mae(actual: Array, forecast: Array, axis: int | None = None) -> Array:
    """Mean absolute error (the mean absolute deviation, MAD, of planners), in the series' unit."""
    return mean_of(np.abs(errors(actual, forecast)), axis)


def mse(actual: Array, forecast: Array, axis: int | None = None) -> Array:
    """Mean squared error, in the square of the series' unit."""
    return mean_of(errors(actual, forecast) ** 2, axis)


def rmse(actual: Array, forecast: Array, axis: int | None = None) -> Array:
    """Root of the mean squared error, in the series' unit."""
    return np.sqrt(mse(actual, forecast, axis))


def mape(actual: Array, forecast: Array, axis: int | None = None) -> Array:
    """Mean absolute error in percent of the actual; cells with an actual of 0 are dropped."""
    a = np.asarray(actual, dtype=np.float64)
    share = np.full(a.shape, np.nan)
    np.divide(100.0 * np.abs(errors(actual, forecast)), np.abs(a), out=share, where=a != 0)
    return mean_of(share, axis)


def smape(actual: Array, forecast: Array, axis: int | None = None) -> Array:
    """Mean of 200 |error| / (|actual| + |forecast|), in percent, 0 to 200; cells with both 0 count as 0.

    References
    ----------
    Makridakis & Hibon (2000), International Journal of Forecasting 16, 451-476, p. 461.
    """
    error = np.abs(errors(actual, forecast))
    size = np.abs(np.asarray(actual, dtype=np.float64)) + np.abs(np.asarray(forecast, dtype=np.float64))
    share = np.where(np.isnan(size), np.nan, 0.0)
    np.divide(200.0 * error, size, out=share, where=size > 0)
    return mean_of(share, axis)


def mase_scale(values: Array, season_length: int) -> float:
    """Scale of MASE: mean absolute difference from the same season a year before.

    Where the history has no more than one season, differences from the period before.

    Parameters
    ----------
    values : array, shape (n,); the series' unit
        Differences with a NaN are dropped.
    season_length : int

    Returns
    -------
    float; same unit; NaN where there is no difference, or where all are zero

    References
    ----------
    Hyndman & Koehler (2006); Hyndman & Athanasopoulos (2018), section 3.4.
    """
    y = np.asarray(values, dtype=np.float64)
    lag = season_length if y.size > season_length else 1
    scale = float(mean_of(np.abs(y[lag:] - y[:-lag]))) if y.size > lag else float("nan")
    return scale if scale > 0 else float("nan")


def mase(actual: Array, forecast: Array, scale: float, axis: int | None = None) -> Array:
    """Mean absolute error in units of `mase_scale`; under 1 beats the seasonal naive in sample."""
    result: Array = mae(actual, forecast, axis) / scale
    return result
