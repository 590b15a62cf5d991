"""The table of totals: over groups, over windows of periods, and the financial year's landing."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from foredeck.periods import FinancialYear, period_name
from foredeck.portfolio.alone import Alone
from foredeck.portfolio.applied import window_scale
from foredeck.portfolio.count_ranges import Demand, demand_of, intermittent_at, sum_limits
from foredeck.portfolio.fit import PortfolioFit
from foredeck.portfolio.joint_totals import WindowErrors, past_bias, total_range, window_errors
from foredeck.portfolio.procedure import Procedure

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Window:
    """Leads to be added (0-based, consecutive), with the part of the year already known."""

    name: str
    leads: NDArray[np.int64]
    known_periods: int = 0


def windows(closing: pd.Period, horizon: int, named: Mapping[str, int], year: FinancialYear) -> list[Window]:
    """Each period to come, the named windows, and the financial year of the next period.

    A window that reaches past the horizon is left out: a part of it would be named as the whole.
    """
    found = [Window(period_name(closing + lead + 1), np.array([lead])) for lead in range(horizon)]
    found += [Window(name, np.arange(span)) for name, span in named.items() if 1 < span <= horizon]
    first, last = year.containing(closing + 1)
    span = last.ordinal - closing.ordinal
    if span <= horizon:
        found.append(Window("year", np.arange(span), closing.ordinal - first.ordinal + 1))
    return found


def totals_table(alones: Sequence[Alone], procedures: Sequence[Procedure], fit: PortfolioFit, standardised: Array,
                 adjusted: pd.DataFrame, groups: Sequence[str], named: Mapping[str, int],
                 year: FinancialYear) -> pd.DataFrame:
    """Totals of baseline and adjusted forecast with joint ranges.

    Parameters
    ----------
    alones, procedures : one a series, in the order of `standardised`'s rows
    standardised : array, shape (series, largest offset + 1, horizon)
    adjusted : DataFrame
        Columns series, lead, baseline, adjusted.
    groups : group columns to add up by, beside each series and all of them

    Returns
    -------
    DataFrame
        scope, member, window, first, last, baseline, adjustment, adjusted, lower_..,
        upper_.. (of adjusted), last_year, actual_to_date, past_bias. The year's figures include
        the actuals to date; `last_year` is missing where a period of it is; `past_bias` is the
        mean past error of such a total (`joint_totals.past_bias`).
    """
    names = [a.series.name for a in alones]
    base, final = (_matrix(adjusted, column, names, fit.horizon) for column in ("baseline", "adjusted"))
    scale = np.stack([window_scale(a, p, fit) for a, p in zip(alones, procedures, strict=True)])
    closing = alones[0].periods[-1]
    counted = [demand_of(a.raw) if intermittent_at(a.raw, [len(a.raw)], fit.nonnegative)[0] else None for a in alones]
    rows = []
    for window in windows(closing, fit.horizon, named, year):
        errors = window_errors(standardised, scale, window.leads, fit.levels, fit.multipliers[0])
        to_date, last_year = _around(alones, window)
        for scope, member, rows_of in _scopes(alones, groups):
            if scope == "series" and len(window.leads) == 1 and window.known_periods == 0:
                continue  # the forecasts table has it
            one = counted[rows_of[0]] if len(rows_of) == 1 else None
            rows.append(_row(scope, member, rows_of, window, closing, base, final, to_date, last_year, errors, one,
                             fit))
    return pd.DataFrame(rows)


def _row(scope: str, member: str, rows: NDArray[np.int64], window: Window, closing: pd.Period, base: Array,
         final: Array, to_date: Array, last_year: Array, errors: WindowErrors, counted: Demand | None,
         fit: PortfolioFit) -> dict[str, object]:
    done = float(to_date[rows].sum())
    baseline = done + float(base[np.ix_(rows, window.leads)].sum())
    adjusted = done + float(final[np.ix_(rows, window.leads)].sum())
    if counted is None:
        edges = adjusted + total_range(errors, rows) * np.array([-1.0, 1.0])
    else:
        expected = float(base[np.ix_(rows, window.leads)].sum())
        edges = done + (adjusted - baseline) + sum_limits(counted, expected, len(window.leads), fit.levels)
    limits: dict[str, float] = {}
    for level, (lower, upper) in zip(fit.levels, edges.tolist(), strict=True):
        limits[f"lower_{level}"] = max(lower, done) if fit.nonnegative else lower
        limits[f"upper_{level}"] = upper
    first = closing + 1 + int(window.leads[0]) - window.known_periods
    return {"scope": scope, "member": member, "window": window.name, "first": period_name(first),
            "last": period_name(closing + 1 + int(window.leads[-1])), "baseline": baseline,
            "adjustment": adjusted - baseline, "adjusted": adjusted, **limits,
            "last_year": float(last_year[rows].sum()), "actual_to_date": done, "past_bias": past_bias(errors, rows)}


def _scopes(alones: Sequence[Alone], groups: Sequence[str]) -> list[tuple[str, str, NDArray[np.int64]]]:
    found = [("all", "all", np.arange(len(alones)))]
    for group in groups:
        labels = np.array([a.series.groups.get(group, "") for a in alones])
        # the order of the data is the order people know
        found += [(group, label, np.flatnonzero(labels == label)) for label in dict.fromkeys(labels.tolist())]
    return found + [("series", a.series.name, np.array([i])) for i, a in enumerate(alones)]


def _matrix(adjusted: pd.DataFrame, column: str, names: list[str], horizon: int) -> Array:
    wide = adjusted.pivot(index="series", columns="lead", values=column)
    return np.asarray(wide.reindex(index=names, columns=list(range(1, horizon + 1))).to_numpy(dtype=np.float64))


def _around(alones: Sequence[Alone], window: Window) -> tuple[Array, Array]:
    """Actuals to date in the window, and the same window a year before, per series.

    A missing actual to date is replaced by its repair; last year stays missing, since it is compared with.
    """
    to_date, last_year = np.zeros(len(alones)), np.full(len(alones), np.nan)
    for i, alone in enumerate(alones):
        n, m = len(alone.raw), alone.series.season_length
        best = np.where(np.isfinite(alone.raw), alone.raw, alone.used)
        if window.known_periods:
            to_date[i] = best[max(0, n - window.known_periods):].sum()
        start = n + int(window.leads[0]) - window.known_periods - m
        stop = n + int(window.leads[-1]) + 1 - m
        if start >= 0 and stop <= n:
            last_year[i] = alone.raw[start:stop].sum()
    return to_date, last_year
