"""The three passes over a portfolio, and the tables of a round that come of them."""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pandas as pd

from foredeck.checks.findings import find
from foredeck.errors import ForedeckError, IntakeError, SettingsError
from foredeck.intake.history import History
from foredeck.periods import FinancialYear, period_name
from foredeck.portfolio.alone import Alone, ForecastOptions, not_forecastable
from foredeck.portfolio.applied import apply_fit
from foredeck.portfolio.coverage import achieved_coverage
from foredeck.portfolio.fit import fit_portfolio
from foredeck.portfolio.spread import examine_each
from foredeck.portfolio.totals import totals_table
from foredeck.review.adjustment_file import read_adjustments
from foredeck.review.adjustments import apply_adjustments
from foredeck.review.comparisons import read_comparison
from foredeck.settings.model import Settings
from foredeck.studies import TABLES, empty_table, unadjusted, versions

Progress = Callable[[str, int, int], None]
"""Called with the stage, how many are done, and how many there are."""


@dataclass(frozen=True)
class Computed:
    """A round's tables and portfolio fit, ready for the ledger."""

    tables: Mapping[str, pd.DataFrame]
    portfolio: Mapping[str, Any]


def compute_round(history: History, closing: pd.Period, settings: Settings, progress: Progress) -> Computed:
    """Run the three passes, apply adjustments and add up totals.

    A series that cannot be forecast, or in which something fails, does not stop the
    others: it is listed with its reason.

    Parameters
    ----------
    history : History
        Actuals as known now; periods after `closing` are not looked at.
    closing : pandas.Period
    settings : Settings
    progress : Progress

    Raises
    ------
    IntakeError
        if not one series can be forecast.
    AdjustmentError
        if a row of the adjustments cannot be applied.
    """
    _refuse_taken_names(history.group_columns)
    options = forecast_options(settings)
    options.allowed(history.frequency.season_length)  # a wrong method name is the settings' fault, not a series'
    known = history.up_to(closing)
    alones, parts, failures = _pass_one(known, closing, options, progress)
    if not alones:
        raise IntakeError("not one series can be forecast", where=str(settings.source.file),
                          do="; ".join(f"{f['series']}: {f['reason']}" for f in failures[:3]))
    fit, procedures, standardised = fit_portfolio(alones, options)
    progress("portfolio fit", 1, 1)
    parts += [apply_fit(alone, procedure, fit) for alone, procedure in zip(alones, procedures, strict=True)]
    tables = {name: _joined(parts, name, known.names) for name in
              ("series", "actuals", "findings", "eligibility", "error_table", "members", "forecasts", "reliability")}
    tables["failures"] = pd.DataFrame(failures) if failures else empty_table("failures")
    tables["adjustments"], tables["adjusted"] = _adjusted(tables, closing, settings)
    tables["comparisons"] = _comparisons(settings)
    tables["totals"] = totals_table(alones, procedures, fit, standardised, tables["adjusted"],
                                    list(settings.columns.groups), dict(settings.windows),
                                    FinancialYear(settings.year.first_month))
    coverage = achieved_coverage(tables["reliability"], options.levels)
    portfolio = {**fit.to_dict(), "frequency": history.frequency.value, "coverage": coverage}
    return Computed({name: tables[name] for name in TABLES}, portfolio)


def forecast_options(settings: Settings) -> ForecastOptions:
    """The part of the settings that the passes need."""
    forecast = settings.forecast
    constants = {str(name): value for name, value in forecast.constants.items()}
    return ForecastOptions(horizon=forecast.horizon, levels=tuple(forecast.levels), style=forecast.style,
                           methods=tuple(forecast.methods), constants=constants or None,
                           nonnegative=forecast.nonnegative)


def data_fingerprint(history: History, closing: pd.Period, settings: Settings) -> str:
    """SHA-256 of everything the figures rest on beside the settings: actuals, adjustments, comparisons."""
    known = history.up_to(closing)
    digest = hashlib.sha256()
    for table in (known.actuals, known.series.reset_index(), known.faults):
        digest.update(table.astype(str).to_csv(index=False).encode())
    for path in (settings.adjustments.file, settings.comparisons.budget, settings.comparisons.earlier):
        if path is not None:
            digest.update(Path(path).read_bytes() if Path(path).exists() else b"absent")
    return digest.hexdigest()


def made_with(history: History) -> dict[str, Any]:
    """What the page tells about how it was made, beside fingerprints."""
    return {"versions": versions(), "source": history.understood.lines()}


SERIES_COLUMNS = ("series", "unit", "unit_value", "status", "reason", "first_period", "last_period", "n_periods",
                  "trend_strength", "season_strength", "has_trend", "has_season",
                  "adi", "cv2", "demand_class", "pattern_words",
                  "differencing_words", "method", "method_words", "mase_scale")
"""Columns of the table `series` beside the groups."""


def _refuse_taken_names(groups: list[str]) -> None:
    for name in groups:
        if name in SERIES_COLUMNS:
            raise SettingsError(f"a group cannot be called {name!r}", where="[columns] groups",
                                allowed=f"any name but {', '.join(SERIES_COLUMNS)}", do="rename the column")


def _pass_one(known: History, closing: pd.Period, options: ForecastOptions,
              progress: Progress) -> tuple[list[Alone], list[dict[str, pd.DataFrame]], list[dict[str, str]]]:
    alones, parts, failures = [], [], []
    each = [known[name] for name in known.names]
    for done, (series, found) in enumerate(zip(each, examine_each(each, closing, options), strict=True)):
        if isinstance(found, Alone):
            alones.append(found)
        else:
            reason = not_forecastable(series, closing)
            status = "not forecast" if reason or isinstance(found, ForedeckError) else "failed"
            if not reason:
                reason = found.data.get("reason", found.what) if isinstance(found, ForedeckError) \
                    else f"{type(found).__name__}: {found}"
            failures.append({"series": series.name, "reason": reason, "status": status})
            parts.append(_unforecast(known, series.name, closing, status, reason))
        progress("series", done + 1, len(known))
    return alones, parts, failures


def _unforecast(known: History, name: str, closing: pd.Period, status: str, reason: str) -> dict[str, pd.DataFrame]:
    """What can still be shown of a series that has no forecast."""
    series = known[name]
    names = [period_name(p) for p in series.periods]
    row = {"series": name, **dict(series.groups), "unit": series.unit, "unit_value": series.unit_value,
           "status": status, "reason": reason, "first_period": names[0], "last_period": names[-1],
           "n_periods": int(pd.notna(series.values).sum())}
    findings = find(series, closing) if status == "not forecast" else find(series, closing).iloc[:0]
    return {"series": pd.DataFrame([row]), "findings": findings,
            "actuals": pd.DataFrame({"series": name, "period": names, "raw": series.values, "used": series.values,
                                     "repaired": False})}


def _joined(parts: list[dict[str, pd.DataFrame]], name: str, order: list[str]) -> pd.DataFrame:
    tables = [part[name] for part in parts if name in part]
    filled = [table for table in tables if len(table)] or tables[:1]
    whole = pd.concat(filled, ignore_index=True)
    rank = {series: at for at, series in enumerate(order)}
    return whole.sort_values("series", key=lambda s: s.map(rank), kind="stable", ignore_index=True)


def _adjusted(tables: Mapping[str, pd.DataFrame], closing: pd.Period,
              settings: Settings) -> tuple[pd.DataFrame, pd.DataFrame]:
    if settings.adjustments.file is None:
        return empty_table("adjustments"), unadjusted(tables["forecasts"])
    rows = read_adjustments(settings.adjustments.file)
    # what was decided after the next period had closed belongs to a later round
    next_closed = str((closing + 1).end_time.date())
    rows = rows[rows["made_on"].fillna("").astype(str) <= next_closed].reset_index(drop=True)
    adjustments, adjusted = apply_adjustments(tables["forecasts"], tables["series"], rows,
                                              nonnegative=settings.forecast.nonnegative)
    return adjustments, adjusted


def _comparisons(settings: Settings) -> pd.DataFrame:
    if settings.comparisons.budget is None:
        return empty_table("comparisons")
    columns = settings.columns
    # a wide source has no column of periods or values: there the file's own heads must be the plain ones
    return read_comparison(settings.comparisons.budget, "budget", series=columns.series,
                           period=columns.period or "period", value=columns.value or "value")
