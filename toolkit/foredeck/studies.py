"""What a round knows, as frozen objects that notebooks and pages show.

A `Study` is everything about one series in one round; a `RoundView` is the same
for the portfolio. Both hold plain tables whose columns are named in `TABLES`.
Periods stand in tables as text (`2026-10`), levels as columns (`lower_90`).
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from html import escape
from typing import TYPE_CHECKING, Any

import numpy as np
import pandas as pd

from foredeck.errors import MethodError, SettingsError

if TYPE_CHECKING:
    from foredeck.intake.history import SeriesHistory

TABLES = ("series", "actuals", "findings", "eligibility", "error_table", "members", "forecasts",
          "adjusted", "adjustments", "reliability", "totals", "comparisons", "failures")
"""Names of the round's tables, in the order in which they are written."""


@dataclass(frozen=True)
class Previous:
    """What the round before said: its name and its adjusted forecasts."""

    round: str
    adjusted: pd.DataFrame


@dataclass(frozen=True)
class Study:
    """Everything about one series in one round.

    Every table is the round's table of the same name, cut to the series.
    """

    name: str
    round: str
    state: str
    closing: str
    frequency: str
    horizon: int
    levels: tuple[int, ...]
    info: Mapping[str, Any]
    actuals: pd.DataFrame
    findings: pd.DataFrame
    eligibility: pd.DataFrame
    error_table: pd.DataFrame
    members: pd.DataFrame
    forecasts: pd.DataFrame
    adjusted: pd.DataFrame
    adjustments: pd.DataFrame
    reliability: pd.DataFrame
    totals: pd.DataFrame
    comparisons: pd.DataFrame
    portfolio: Mapping[str, Any]
    made: Mapping[str, Any]
    previous: Previous | None = None

    @property
    def unit(self) -> str:
        """What the series counts."""
        return str(self.info["unit"])

    @classmethod
    def from_tables(cls, name: str, tables: Mapping[str, pd.DataFrame], *, round: str, state: str, closing: str,
                    portfolio: Mapping[str, Any], made: Mapping[str, Any],
                    previous: Previous | None = None) -> Study:
        """Cut a round's tables to one series.

        Parameters
        ----------
        tables : mapping of table name to DataFrame
            The round's tables, whole or already cut; all of `TABLES` but `failures`.

        Raises
        ------
        SettingsError
            if the round has no such series.
        """
        cut = {key: _of_series(key, table, name) for key, table in tables.items()}
        if cut["series"].empty:
            raise SettingsError(f"round {round} has no series {name!r}", do="see the names in its table `series`")
        info = {str(k): v for k, v in cut.pop("series").iloc[0].items()}
        cut.pop("failures", None)
        if previous is not None:
            previous = Previous(previous.round, _of_series("adjusted", previous.adjusted, name))
        return cls(name=name, round=round, state=state, closing=closing, frequency=str(portfolio["frequency"]),
                   horizon=int(portfolio["horizon"]), levels=tuple(portfolio["levels"]), info=info,
                   portfolio=portfolio, made=made, previous=previous, **cut)

    def _repr_html_(self) -> str:
        level = max(self.levels)
        rows = "".join(
            f"<tr><th scope='row' style='text-align:left'>{escape(str(r.period))}</th><td><b>{r.adjusted:,.0f}</b></td>"
            f"<td>{getattr(r, f'lower_{level}'):,.0f} to {getattr(r, f'upper_{level}'):,.0f}</td></tr>"
            for r in self.adjusted.head(6).itertuples())
        ahead = self.reliability[self.reliability["lead"] == 1].tail(12)
        inside = int(ahead["actual"].between(ahead[f"lower_{level}"], ahead[f"upper_{level}"]).sum())
        known = int(ahead[f"lower_{level}"].notna().sum())
        trust = (f"Of the last {known} forecasts one ahead, {inside} came in inside their {level} in 100 range."
                 if known else "No past forecast has been tested yet.")
        found = len(self.findings)
        return (
            f"<div><p><b>{escape(self.name)}</b>, {escape(self.unit)}; known up to {escape(self.closing)}.</p>"
            f"<table><thead><tr><th style='text-align:left'>Period</th><th>Forecast</th><th>{level} in 100</th></tr>"
            f"</thead>"
            f"<tbody>{rows}</tbody></table>"
            f"<p>{escape(str(self.info['method_words']))}<br>{escape(str(self.info['pattern_words']))}<br>"
            f"{trust} {found or 'No'} finding{'' if found == 1 else 's'} in the data.</p></div>")


def _of_series(key: str, table: pd.DataFrame, name: str) -> pd.DataFrame:
    mine = table["series"] == name if key != "totals" else (table["scope"] == "series") & (table["member"] == name)
    return table[mine].reset_index(drop=True)


@dataclass(frozen=True)
class RoundView:
    """Everything about all series in one round, for the cover and the workbook."""

    round: str
    state: str
    closing: str
    title: str
    frequency: str
    horizon: int
    levels: tuple[int, ...]
    tables: Mapping[str, pd.DataFrame]
    portfolio: Mapping[str, Any]
    made: Mapping[str, Any]
    previous: Previous | None = None
    links: Mapping[str, str] = field(default_factory=dict)


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
        Names from the catalogue; all when empty.
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
    from foredeck.periods import FinancialYear, period_name
    from foredeck.portfolio.alone import ForecastOptions, examine
    from foredeck.portfolio.applied import apply_fit
    from foredeck.portfolio.fit import PortfolioFit, fit_portfolio, standardised_errors
    from foredeck.portfolio.procedure import live_through
    from foredeck.portfolio.totals import totals_table

    history = _as_history(series)
    fit = None if portfolio_fit is None else PortfolioFit.from_dict(portfolio_fit)
    if fit is None:
        options = ForecastOptions(horizon or USUAL_HORIZON[history.season_length], tuple(levels), style,
                                  tuple(methods), constants, nonnegative)
    else:
        options = ForecastOptions(fit.horizon, fit.levels, fit.style, tuple(methods), constants, fit.nonnegative)
    closing = history.periods[-1] if closing is None else closing
    alone = examine(history, closing, options)
    procedure = live_through(alone, options.style)
    if fit is None:
        fit, standardised = fit_portfolio([alone], [procedure], options)
    else:
        standardised = standardised_errors([alone], [procedure], fit.ratio, fit.nonnegative)
    tables = apply_fit(alone, procedure, fit)
    tables["adjusted"] = unadjusted(tables["forecasts"])
    tables["totals"] = totals_table([alone], [procedure], fit, standardised, tables["adjusted"], (), {"next 3": 3},
                                    FinancialYear(1))
    tables["adjustments"] = empty_table("adjustments")
    tables["comparisons"] = empty_table("comparisons")
    stored = {**fit.to_dict(), "frequency": history.frequency.value}
    return Study.from_tables(history.name, tables, round="", state="study", closing=period_name(closing),
                             portfolio=stored, made={"made_at": "", "versions": versions()})


def _as_history(series: SeriesHistory | pd.Series[Any]) -> SeriesHistory:
    from foredeck.intake.history import SeriesHistory
    from foredeck.periods import frequency_of

    if isinstance(series, SeriesHistory):
        return series
    if not isinstance(series, pd.Series) or not isinstance(series.index, pd.PeriodIndex) or series.empty:
        raise MethodError(f"a study needs to know the periods; this is a {type(series).__name__} without them",
                          allowed="a series history, or a pandas Series over a PeriodIndex",
                          do="take one of what fd.read returned, or index the Series by pandas.period_range")
    index = pd.period_range(series.index.min(), series.index.max(), freq=series.index.freq)
    values = series.reindex(index).to_numpy(dtype=np.float64)
    return SeriesHistory(name=str(series.name or "series"), frequency=frequency_of(index), periods=index, values=values)


def unadjusted(forecasts: pd.DataFrame) -> pd.DataFrame:
    """The `adjusted` table when nobody has adjusted anything."""
    limits = [c for c in forecasts.columns if c.startswith(("lower_", "upper_"))]
    table = forecasts[["series", "period", "lead", "baseline"]].assign(adjustment=0.0)
    return table.assign(adjusted=forecasts["baseline"], **{c: forecasts[c] for c in limits})


_EMPTY: dict[str, dict[str, Any]] = {
    "adjustments": {"series": str, "period": str, "lead": "int64", "baseline": float, "adjustment": float,
                    "adjusted": float, "kind": str, "reason": str, "name": str, "made_on": str, "scope": str},
    "comparisons": {"name": str, "series": str, "period": str, "value": float},
    "failures": {"series": str, "reason": str},
}


def empty_table(name: str) -> pd.DataFrame:
    """A round's table with its columns and no rows."""
    return pd.DataFrame({column: pd.Series(dtype=kind) for column, kind in _EMPTY[name].items()})


def versions() -> dict[str, str]:
    """Versions of what the figures depend on."""
    from importlib.metadata import version

    return {name: version(name) for name in ("foredeck", "numpy", "pandas", "scipy", "statsmodels", "numba")}
