"""Trend, season and remainder of a series, and how strong the first two are."""

from __future__ import annotations

from dataclasses import dataclass
from html import escape
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import ArrayLike
from statsmodels.nonparametric.smoothers_lowess import lowess
from statsmodels.tsa.seasonal import STL

from foredeck.checks.expectation import Array
from foredeck.checks.limits import strength_limits
from foredeck.checks.repairs import repaired
from foredeck.errors import ShapeError
from foredeck.intake.history import SeriesHistory
from foredeck.periods import frequency_of

if TYPE_CHECKING:
    import pandas as pd

STRONG = 0.64
"""Strength from which a pattern is called strong; also the customary bar for a seasonal difference."""

_SEASONAL_WINDOW = 13
_FEWEST = 5


@dataclass(frozen=True, eq=False)
class Decomposition:
    """A series taken apart: values = trend + season + remainder, in the series' unit.

    Attributes
    ----------
    values, trend, season, remainder : array, shape (n,)
        NaN in `values` and `remainder` where the value is missing.
    trend_strength, season_strength : float
        0 (none) to 1 (all); NaN where it cannot be told: with fewer than five periods, and
        for the season with fewer than two full seasons.
    has_trend, has_season : bool
        Whether the strength is beyond what noise alone reaches in 19 series of 20.
    words : str
        The same in a sentence.
    """

    values: Array
    trend: Array
    season: Array
    remainder: Array
    trend_strength: float
    season_strength: float
    has_trend: bool
    has_season: bool
    words: str

    def _repr_html_(self) -> str:
        rows = (("Trend", self.trend_strength, self.has_trend),
                ("Season", self.season_strength, self.has_season))
        body = "".join(f"<tr><th scope='row'>{name}</th><td>{strength_text(strong)}</td>"
                       f"<td>{_verdict(strong, has)}</td></tr>" for name, strong, has in rows)
        return (f"<div><p>{escape(self.words)}</p><table><thead><tr><th scope='col'>Pattern</th>"
                f"<th scope='col'>Strength, 0 to 1</th><th scope='col'>Told</th></tr></thead>"
                f"<tbody>{body}</tbody></table></div>")


def decompose(series_or_values: SeriesHistory | pd.Series[Any] | ArrayLike,
              season_length: int | None = None) -> Decomposition:
    """Take a series apart into trend, season and remainder.

    Trend and season come from STL on the repaired values (season window 13); a series
    without season, or with under two full ones, gets a trend only. The remainder is
    measured from the raw values, so an odd value shows there.

    Parameters
    ----------
    series_or_values : SeriesHistory, pandas Series over a PeriodIndex, or array, shape (n,)
        NaN is a missing period.
    season_length : int, optional
        Periods a year; needed for a bare array only.

    Returns
    -------
    Decomposition

    Raises
    ------
    ShapeError
        if the season length is missing, or the values are not one series.

    References
    ----------
    Cleveland, Cleveland, McRae & Terpenning (1990), Journal of Official Statistics 6, 3-73 (STL).
    Wang, Smith & Hyndman (2006), Data Mining and Knowledge Discovery 13, 335-364 (strengths).
    """
    values, length = values_of(series_or_values, season_length)
    negative = bool((values[np.isfinite(values)] < 0).any())
    return taken_apart(values, repaired(values, length, nonnegative=not negative), length)


def taken_apart(values: Array, used: Array, length: int) -> Decomposition:
    """Take apart values whose repairs are known already: `decompose` without its own.

    Parameters
    ----------
    values, used : array, shape (n,)
        Raw values, and the same repaired; NaN in the raw ones only.
    length : int
        Periods a year.
    """
    trend, season = trend_and_season(used, length)
    rest = used - trend - season
    trend_strength = strength(rest, trend) if used.size >= _FEWEST else np.nan
    season_strength = strength(rest, season) if length > 1 and used.size >= 2 * length else np.nan
    trend_limit, season_limit = strength_limits(length, used.size)
    has_trend, has_season = trend_strength > trend_limit, season_strength > season_limit
    words = _words(trend, length, trend_strength, season_strength, has_trend, has_season)
    return Decomposition(values, trend, season, values - trend - season, trend_strength, season_strength,
                         bool(has_trend), bool(has_season), words)


def values_of(series_or_values: SeriesHistory | pd.Series[Any] | ArrayLike,
              season_length: int | None) -> tuple[Array, int]:
    """Return values and season length of whatever form a series was handed in.

    Raises
    ------
    ShapeError
        if the season length is missing or not a positive number, or the values are not one series.
    """
    if isinstance(series_or_values, SeriesHistory):
        return series_or_values.values, season_length or series_or_values.season_length
    values = np.asarray(series_or_values, dtype=np.float64)
    index: Any = getattr(series_or_values, "index", None)
    if season_length is None and hasattr(index, "freqstr"):
        season_length = frequency_of(index).season_length
    if season_length is None or season_length < 1:
        raise ShapeError("a bare array does not say how many periods make a year" if season_length is None
                         else f"the season length is {season_length}",
                         allowed="season_length 1 (yearly), 4, 12 or 52; or a series over periods",
                         do="hand in season_length=12 for monthly values", season_length=season_length)
    if values.ndim != 1:
        raise ShapeError(f"the values have {values.ndim} dimensions", allowed="one series, shape (n,)",
                         do="hand in one series at a time", shape=values.shape)
    return values, season_length


def trend_and_season(values: Array, season_length: int) -> tuple[Array, Array]:
    """Return trend and season of values without gaps; season all zero where it cannot be told."""
    n = values.size
    if season_length > 1 and n >= 2 * season_length:
        found = STL(values, period=season_length, seasonal=_SEASONAL_WINDOW).fit()
        return np.asarray(found.trend), np.asarray(found.seasonal)
    if n < _FEWEST:
        return np.full(n, values.mean() if n else 0.0), np.zeros(n)
    share = min(1.0, max(0.5, 7.0 / n))
    trend = lowess(values, np.arange(n, dtype=float), frac=share, it=0, return_sorted=False)
    return np.asarray(trend), np.zeros(n)


def strength(rest: Array, part: Array) -> float:
    """Strength of a trend or season: 1 - Var(remainder) / Var(part + remainder), not below 0.

    Parameters
    ----------
    rest, part : array, shape (n,)
        Remainder, and the trend or season; without NaN.

    References
    ----------
    Wang, Smith & Hyndman (2006); Hyndman & Athanasopoulos, 3rd ed., section 4.3.
    """
    both = part + rest
    whole = float(both.var())
    # Differences in the last binary digits of a constant series are no pattern.
    if whole <= 1e-20 * float(np.abs(both).max(initial=1.0)) ** 2:
        return 0.0
    return max(0.0, 1.0 - float(rest.var()) / whole)


def strength_text(strength: float) -> str:
    """Write a strength with two digits; a dash where it cannot be told."""
    return "–" if np.isnan(strength) else f"{strength:.2f}"


def _verdict(strength: float, has: bool) -> str:
    if np.isnan(strength):
        return "cannot be told"
    return ("strong" if strength > STRONG else "present") if has else "no more than noise would show"


def _words(trend: Array, season_length: int, trend_strength: float, season_strength: float,
           has_trend: bool, has_season: bool) -> str:
    if np.isnan(trend_strength):
        return "Too short to tell any pattern."
    year = max(1, min(season_length, trend.size // 3))
    before, after = float(trend[:year].mean()), float(trend[-year:].mean())
    if not has_trend:
        level = f"A steady level (trend strength {trend_strength:.2f})"
    elif abs(after - before) < 0.5 * np.ptp(trend):
        level = f"A level that moves both ways (trend strength {trend_strength:.2f})"
    else:
        way = "rises" if after > before else "falls"
        level = f"A level that {way} (trend strength {trend_strength:.2f})"
    if season_length == 1:
        return f"{level}; yearly values have no season."
    if np.isnan(season_strength):
        return f"{level}; with under two full years no season can be told."
    if not has_season and trend.size < 3 * season_length:
        return f"{level}; with under three full years no season can be told from noise."
    if not has_season:
        return f"{level}; no season beyond what noise would show (season strength {season_strength:.2f})."
    kind = "a strong" if season_strength > STRONG else "a moderate"
    return f"{level}; {kind} season (season strength {season_strength:.2f})."
