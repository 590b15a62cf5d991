"""`fd.study`: the three passes for one series, with or without a round's portfolio fit."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Any

import numpy as np
import pandas as pd

from foredeck.errors import MethodError
from foredeck.intake.history import SeriesHistory
from foredeck.periods import FinancialYear, frequency_of, period_name
from foredeck.portfolio.alone import ForecastOptions, examine
from foredeck.portfolio.applied import apply_fit
from foredeck.portfolio.coverage import achieved_coverage
from foredeck.portfolio.fit import PortfolioFit, fit_portfolio, standardised_errors
from foredeck.portfolio.procedure import live_through
from foredeck.portfolio.totals import totals_table
from foredeck.studies import Study, empty_table, unadjusted, versions

USUAL_HORIZON = {12: 12, 4: 8, 52: 13, 1: 3}
"""Periods ahead when none are asked for, by season length (common practice)."""


def study(series: SeriesHistory | pd.Series[Any], horizon: int | None = None, *,
          levels: Iterable[int] = (50, 90), style: str = "blend", methods: Iterable[str] = (),
          constants: Mapping[str, float] | None = None, nonnegative: bool = True,
          portfolio_fit: Mapping[str, Any] | None = None, closing: pd.Period | None = None) -> Study:
    """Everything about one series: findings, pattern, backtest, forecast, ranges.

    Parameters
    ----------
    series : SeriesHistory, pandas.Series with a PeriodIndex
        Missing values are repaired for fitting only.
    horizon : int, optional
        Periods ahead; 12 months, 8 quarters, 13 weeks or 3 years when not given.
    levels : iterable of int
        Per cent of the ranges.
    style : {"blend", "single"}
    methods : iterable of str
        Names from the catalogue; the usual ones when empty. With a portfolio fit, those of the fit.
    constants : mapping, optional
        Fixed smoothing constants, for example {"alpha": 0.2}; estimated where not given.
    nonnegative : bool
        True for counts: neither forecasts' ranges nor raw values fall below zero.
    portfolio_fit : mapping, optional
        A round's portfolio fit (`RoundRecord.portfolio`): the study then equals the
        round's. Without it, ranges rest on this series alone.
    closing : pandas.Period, optional
        Last closed period; the series' last when not given.

    Raises
    ------
    MethodError
        if the series cannot be forecast, or has no periods; the reason is named.
    """
    history = _as_history(series)
    fit = None if portfolio_fit is None else PortfolioFit.from_dict(portfolio_fit)
    if fit is None:
        options = ForecastOptions(horizon or USUAL_HORIZON[history.season_length], tuple(levels), style,
                                  tuple(methods), constants, nonnegative)
    else:
        options = ForecastOptions(fit.horizon, fit.levels, fit.style, fit.asked, constants, fit.nonnegative)
    closing = history.periods[-1] if closing is None else closing
    alone = examine(history, closing, options)
    if fit is None:
        fit, (procedure,), standardised = fit_portfolio([alone], options)
    else:
        procedure = live_through(alone, fit.style, fit.learned)
        standardised = standardised_errors([alone], [procedure], len(fit.multipliers) - 1, fit.nonnegative)
    tables = apply_fit(alone, procedure, fit)
    tables["adjusted"] = unadjusted(tables["forecasts"])
    tables["totals"] = totals_table([alone], [procedure], fit, standardised, tables["adjusted"], (), {"next 3": 3},
                                    FinancialYear(1))
    tables["adjustments"] = empty_table("adjustments")
    tables["comparisons"] = empty_table("comparisons")
    stored = {**fit.to_dict(), "frequency": history.frequency.value}
    if portfolio_fit is None:
        stored["coverage"] = achieved_coverage(tables["reliability"], fit.levels)
    return Study.from_tables(history.name, tables, round="", state="study", closing=period_name(closing),
                             portfolio=stored, made={"made_at": "", "versions": versions()})


def _as_history(series: SeriesHistory | pd.Series[Any]) -> SeriesHistory:
    if isinstance(series, SeriesHistory):
        return series
    if not isinstance(series, pd.Series) or not isinstance(series.index, pd.PeriodIndex) or series.empty:
        raise MethodError(f"a study needs to know the periods; this is a {type(series).__name__} without them",
                          allowed="a series history, or a pandas Series over a PeriodIndex",
                          do="take one of what fd.read returned, or index the Series by pandas.period_range")
    index = pd.period_range(series.index.min(), series.index.max(), freq=series.index.freq)
    values = series.reindex(index).to_numpy(dtype=np.float64)
    return SeriesHistory(name=str(series.name or "series"), frequency=frequency_of(index), periods=index, values=values)
