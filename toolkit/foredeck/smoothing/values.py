"""The values and the season length of whatever stands for a series."""

from __future__ import annotations

from typing import Any, Union

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from foredeck.checks.repairs import repaired
from foredeck.errors import MethodError
from foredeck.intake.history import SeriesHistory
from foredeck.periods import Frequency

Array = NDArray[np.float64]
AnySeries = Union[SeriesHistory, "pd.Series[float]", Array]


def raw_values(series: AnySeries, season_length: int | None) -> tuple[Array, int]:
    """Return the raw values, NaN where missing, and the season length.

    Parameters
    ----------
    series : SeriesHistory, Series over a PeriodIndex, or array, shape (n,)
    season_length : int, optional
        By default that of the series' frequency; 1 for an array.

    Raises
    ------
    MethodError
        for a season length that is not a whole number of at least 1, values that are not
        numbers, and a Series without a regular PeriodIndex.
    """
    values: Any
    if isinstance(series, SeriesHistory):
        values, own = series.values, series.season_length
    elif isinstance(series, pd.Series):
        values, own = series.to_numpy(dtype=np.float64, na_value=np.nan), _season_of(series)
    else:
        values, own = _numbers(series), 1
    m = own if season_length is None else season_length
    if isinstance(m, bool) or not isinstance(m, int | np.integer) or m < 1:
        raise MethodError(
            f"The season length is {m!r}.", where="season_length", allowed="a whole number of at least 1",
            do="Give 12 for months, 4 for quarters, 52 for weeks, 1 for none.",
        )
    return np.array(values, dtype=np.float64), int(m)


def bare_values(series: AnySeries, season_length: int | None, nonnegative: bool) -> tuple[Array, int]:
    """Return values to fit, and the season length; a `SeriesHistory` is repaired from its first value on."""
    values, m = raw_values(series, season_length)
    known = from_first_value(values)
    if isinstance(series, SeriesHistory) and known.size:
        values = repaired(known, m, nonnegative=nonnegative)
    return values, m


def from_first_value(values: Array) -> Array:
    """Return the values without missing ones at the beginning."""
    known = np.flatnonzero(np.isfinite(values))
    return values[known[0] :] if known.size else values[:0]


def _numbers(values: Array) -> Array:
    try:
        return np.asarray(values, dtype=np.float64)
    except (TypeError, ValueError) as error:
        raise MethodError(
            f"The series is a {type(values).__name__} that does not hold numbers ({error}).", where="series",
            allowed="a series history, a pandas Series over a PeriodIndex, or an array of numbers",
            do="Take one series of what foredeck.read returned, or an array of its values.",
        ) from error


def _season_of(series: pd.Series[float]) -> int:
    index = series.index
    if not isinstance(index, pd.PeriodIndex):
        raise MethodError(
            f"The Series has an index of type {type(index).__name__}.", where="series",
            allowed="a PeriodIndex with every period from the first to the last",
            do="Use series.to_period(), or hand in the values as an array with a season_length.",
        )
    if len(index) > 1 and not (np.diff(index.asi8) == 1).all():
        raise MethodError(
            "The Series leaves out periods, or holds them out of order.", where="series",
            allowed="a PeriodIndex with every period from the first to the last",
            do="Reindex it by pandas.period_range; missing values are then seen as such.",
        )
    for frequency in Frequency:
        if index.freqstr.split("-")[0] == frequency.pandas_code.split("-")[0]:
            return frequency.season_length
    raise MethodError(
        f"The Series has the frequency {index.freqstr!r}.", where="series",
        allowed="years, quarters, months or weeks", do="Sum or average it to one of these first.",
    )
