"""Methods compared by their backtest errors, never by training errors."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from foredeck.backtests.measures import mean_of
from foredeck.errors import ShapeError
from foredeck.smoothing.catalogue import METHODS

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]


def equal_weights(pool: Flags) -> Array:
    """Weights of a blend in which every method of the pool counts the same.

    The plain mean is hard to beat: Clemen (1989), International Journal of Forecasting 5,
    559-583; Makridakis & Hibon (2000).

    Parameters
    ----------
    pool : array of bool, shape (methods,)
        Methods that may speak: eligible, and no benchmarks.

    Returns
    -------
    array, shape (methods,)
        Summing to 1; all 0 where the pool is empty.
    """
    members = np.asarray(pool, dtype=bool)
    return members / max(int(members.sum()), 1)


def relative_errors(methods: Sequence[str], errors: Array) -> Array:
    """Backtest error of each method relative to the benchmark, averaged over leads.

    At each lead, a method's mean absolute error is divided by that of the benchmark in the
    same cells, so that a method which came late into a short history is compared fairly.
    The benchmark is the seasonal naive where it has a forecast, else the naive. For the
    demand-rate family root mean squared errors are compared: on a series that is zero more
    often than not, absolute errors reward a forecast of zero.

    Parameters
    ----------
    methods : sequence of str, length M
        Holding "naive"; "seasonal_naive" where there is a season.
    errors : array, shape (M, origins, leads); the series' unit
        Actual minus forecast, NaN where not known.

    Returns
    -------
    array, shape (M,)
        Under 1 where the method beat the benchmark; NaN where nothing can be compared.

    Raises
    ------
    ShapeError
        if the errors are not those of the methods, or the benchmark is missing.
    """
    if errors.ndim != 3 or errors.shape[0] != len(methods) or "naive" not in methods:
        raise ShapeError(
            f"There are errors of shape {errors.shape} for the methods {', '.join(methods) or 'none'}.",
            where="choice", allowed="errors of shape (methods, origins, leads), 'naive' among the methods",
            do="Hand in the methods of the cube, benchmarks included, and their errors.",
        )
    benchmark = errors[methods.index("naive")]
    if "seasonal_naive" in methods:
        seasonal = errors[methods.index("seasonal_naive")]
        benchmark = np.where(np.isnan(seasonal), benchmark, seasonal)
    result = np.full(len(methods), np.nan)
    for row, method in enumerate(methods):
        power = 2.0 if METHODS[method].family == "demand rate" else 1.0
        both = ~np.isnan(errors[row]) & ~np.isnan(benchmark)
        own = mean_of(np.where(both, np.abs(errors[row]) ** power, np.nan), axis=0) ** (1 / power)
        theirs = mean_of(np.where(both, np.abs(benchmark) ** power, np.nan), axis=0) ** (1 / power)
        result[row] = float(mean_of(_ratio(own, theirs)))
    return result


def _ratio(own: Array, theirs: Array) -> Array:
    """Own error by the benchmark's; where the benchmark made none, 1 for none and infinity for any."""
    ratio = np.where(np.isnan(own), np.nan, np.where(own > 0, np.inf, 1.0))
    np.divide(own, theirs, out=ratio, where=theirs > 0)
    return ratio
