"""How often a series should be differenced before a method without trend or season is used."""

from __future__ import annotations

from dataclasses import dataclass
from html import escape
from typing import TYPE_CHECKING, Any

import numpy as np
import pandas as pd
from numpy.typing import ArrayLike
from statsmodels.stats.diagnostic import acorr_ljungbox
from statsmodels.tsa.adfvalues import mackinnoncrit

from foredeck.checks.decomposition import STRONG, decompose, values_of
from foredeck.checks.expectation import Array
from foredeck.checks.intermittence import is_intermittent

if TYPE_CHECKING:
    from foredeck.intake.history import SeriesHistory

KPSS_LIMIT = 0.463
"""5 % limit of the KPSS statistic around a level (Kwiatkowski et al. 1992, table 1)."""

_MOST_ORDINARY = 2
_FEWEST_SEASONS = 3
_FEWEST_PERIODS = 12


@dataclass(frozen=True, eq=False)
class Differencing:
    """Advice on differencing.

    Attributes
    ----------
    ordinary : int or None
        Differences from one period to the next, 0 to 2; None where it cannot be told.
    seasonal : int or None
        Differences to the same period a year before, 0 or 1; None where it cannot be told.
    figures : tuple of tuples
        The rows of `tests`.
    words : str
        The advice in a sentence.
    """

    ordinary: int | None
    seasonal: int | None
    figures: tuple[tuple[Any, ...], ...]
    words: str

    @property
    def tests(self) -> pd.DataFrame:
        """One row a test; columns test, of (what was tested), statistic, limit, lags, says."""
        return pd.DataFrame(list(self.figures), columns=["test", "of", "statistic", "limit", "lags", "says"])

    def _repr_html_(self) -> str:
        rows = "".join(f"<tr><th scope='row'>{escape(str(r.test))}</th><td>{escape(str(r.of))}</td>"
                       f"<td>{r.statistic:.3f}</td><td>{r.limit:.3f}</td><td>{escape(str(r.says))}</td></tr>"
                       for r in self.tests.itertuples())
        head = "".join(f"<th scope='col'>{h}</th>" for h in ("Test", "Of", "Statistic", "Limit", "Says"))
        table = f"<table><thead><tr>{head}</tr></thead><tbody>{rows}</tbody></table>" if rows else ""
        return f"<div><p>{escape(self.words)}</p>{table}</div>"


def difference(series_or_values: SeriesHistory | pd.Series[Any] | ArrayLike,
               season_length: int | None = None) -> Differencing:
    """Advise on how often to difference a series.

    A season stronger than .64 (and than noise would show at this length) asks for one
    seasonal difference. The KPSS test at 5 % on the seasonally adjusted values asks for
    ordinary differences until it no longer objects, two at most. The augmented
    Dickey-Fuller and Ljung-Box tests inform and decide nothing. With under three full
    seasons, or under 12 periods, the answer is that one cannot tell.

    Parameters
    ----------
    series_or_values : SeriesHistory, pandas Series over a PeriodIndex, or array, shape (n,)
        NaN is a missing period; it is repaired first.
    season_length : int, optional
        Periods a year; needed for a bare array only.

    Returns
    -------
    Differencing

    Raises
    ------
    ShapeError
        if the season length is missing, or the values are not one series.

    References
    ----------
    Kwiatkowski, Phillips, Schmidt & Shin (1992), Journal of Econometrics 54, 159-178.
    Hyndman & Athanasopoulos, Forecasting: Principles and Practice, 3rd ed., section 9.1.
    """
    values, length = values_of(series_or_values, season_length)
    parts = decompose(values, length)
    adjusted = parts.trend + parts.remainder
    adjusted = np.where(np.isfinite(adjusted), adjusted, parts.trend)
    n = adjusted.size
    if is_intermittent(parts.values):
        return Differencing(0, 0, (),
                            "Demand is intermittent: differences say nothing here and none is taken.")
    if n < max(_FEWEST_SEASONS * length, _FEWEST_PERIODS):
        short = f"under three full years ({n} periods)" if length > 1 else f"only {n} periods"
        return Differencing(None, None, (), f"Cannot tell: with {short} the tests decide nothing.")
    tests = []
    seasonal = 0
    if length > 1:
        seasonal = int(parts.has_season and parts.season_strength > STRONG)
        tests.append(("Season strength", "all values", parts.season_strength, STRONG, 0,
                      "take one seasonal difference" if seasonal else "no seasonal difference"))
    ordinary, x = 0, adjusted
    while True:
        statistic, lags = kpss(x)
        moves = statistic > KPSS_LIMIT
        tests.append(("KPSS", _times(ordinary), statistic, KPSS_LIMIT, lags,
                      "the level does not hold" if moves else "the level holds"))
        if not moves or ordinary == _MOST_ORDINARY:
            break
        ordinary, x = ordinary + 1, np.diff(x)
    tests += _informing(adjusted, x, ordinary, length)
    return Differencing(ordinary, seasonal, tuple(tests), _advice(ordinary, seasonal, length))


def kpss(values: Array) -> tuple[float, int]:
    """KPSS statistic of a level, and its number of lags.

    Parameters
    ----------
    values : array, shape (n,)
        Without NaN.

    Returns
    -------
    statistic : float
        0 for a constant.
    lags : int
        Bartlett weights up to this lag: 4 (n / 100)^(1/4), rounded down.

    References
    ----------
    Kwiatkowski, Phillips, Schmidt & Shin (1992), equations 10, 12 and 13.
    """
    n = values.size
    lags = int(4.0 * (n / 100.0) ** 0.25)
    e = values - values.mean()
    long_run = float(e @ e)
    for lag in range(1, lags + 1):
        long_run += 2.0 * (1.0 - lag / (lags + 1.0)) * float(e[lag:] @ e[:-lag])
    # A constant leaves nothing but rounding errors behind.
    if long_run <= 1e-20 * n * max(1.0, float(np.abs(values).max())) ** 2:
        return 0.0, lags
    return float((np.cumsum(e) ** 2).sum() / (n * long_run)), lags


def dickey_fuller(values: Array) -> tuple[float, int]:
    """Augmented Dickey-Fuller statistic around a level, and its number of lags.

    Parameters
    ----------
    values : array, shape (n,)
        Without NaN and not constant.

    Returns
    -------
    statistic : float
        The t value of last period's level in a regression of the change.
    lags : int
        Earlier changes in the regression: the cube root of n - 1, rounded down.

    References
    ----------
    Said & Dickey (1984), Biometrika 71, 599-607; limits of MacKinnon (2010).
    """
    lags = int((values.size - 1) ** (1.0 / 3.0))
    change = np.diff(values)
    y = change[lags:]
    x = np.column_stack([values[lags:-1], np.ones(y.size)]
                        + [change[lags - i:change.size - i] for i in range(1, lags + 1)])
    coefficients = np.linalg.lstsq(x, y, rcond=None)[0]
    rest = y - x @ coefficients
    spread = float(rest @ rest) / (y.size - x.shape[1]) * np.linalg.pinv(x.T @ x)[0, 0]
    return (float(coefficients[0] / np.sqrt(spread)) if spread > 0 else 0.0), lags


def _informing(adjusted: Array, differenced: Array, ordinary: int, length: int) -> list[tuple[Any, ...]]:
    """Augmented Dickey-Fuller on the adjusted values, Ljung-Box on the differenced ones."""
    tests: list[tuple[Any, ...]] = []
    if np.ptp(adjusted) > 1e-9 * np.abs(adjusted).max():
        statistic, lags = dickey_fuller(adjusted)
        limit = float(mackinnoncrit(N=1, regression="c", nobs=adjusted.size - lags - 1)[1])
        tests.append(("Augmented Dickey-Fuller", _times(0), statistic, limit, lags,
                      "the level holds" if statistic < limit else "the level may wander"))
    if np.ptp(differenced) > 1e-9 * np.abs(adjusted).max():
        lags = min(2 * length if length > 1 else 10, differenced.size // 5)
        p = float(acorr_ljungbox(differenced, lags=[lags])["lb_pvalue"].iloc[0])
        tests.append(("Ljung-Box (probability)", _times(ordinary), p, 0.05, lags,
                      "neighbours go together" if p < 0.05 else "no link between neighbours shows"))
    return tests


def _times(ordinary: int) -> str:
    return ("seasonally adjusted values", "their differences", "differences of their differences")[ordinary]


def _advice(ordinary: int, seasonal: int, length: int) -> str:
    if ordinary == 0 and seasonal == 0:
        season = " and the season is not strong" if length > 1 else ""
        return f"No difference is needed: the level holds{season}."
    level = ("", "one difference from period to period, because the level does not hold",
             "two differences from period to period, because even the changes do not hold a level")[ordinary]
    parts = ["one difference to the same period a year before, because the season is strong"] * seasonal
    return f"Take {', and '.join(parts + [level] * (ordinary > 0))}."
