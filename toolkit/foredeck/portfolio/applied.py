"""Pass 3: the portfolio fit applied to each series again.

Cheap: nothing is fitted here. The result is the part of a round's tables (see
`foredeck.studies.TABLES`) that belongs to the series.
"""

from __future__ import annotations

import json

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from foredeck.backtests.error_table import summary
from foredeck.periods import period_name
from foredeck.portfolio.alone import Alone
from foredeck.portfolio.fit import PortfolioFit
from foredeck.portfolio.procedure import Procedure
from foredeck.portfolio.ranges import scales
from foredeck.smoothing.catalogue import METHODS

Array = NDArray[np.float64]


def apply_fit(alone: Alone, procedure: Procedure, fit: PortfolioFit) -> dict[str, pd.DataFrame]:
    """Tables of one series: `series`, `actuals`, `findings`, `eligibility`, `error_table`,
    `members`, `forecasts` and `reliability`.
    """
    scale = scales(alone, procedure, fit.ratio, fit.nonnegative)
    names = [period_name(p) for p in alone.periods]
    ahead = [period_name(alone.periods[-1] + lead) for lead in range(1, fit.horizon + 1)]
    return {
        "series": _series_row(alone, procedure, names),
        "actuals": pd.DataFrame({"series": alone.series.name, "period": names, "raw": alone.raw, "used": alone.used,
                                 "repaired": ~np.isclose(alone.raw, alone.used, equal_nan=False)}),
        "findings": alone.findings,
        "eligibility": pd.DataFrame({"series": alone.series.name, "method": list(alone.reasons),
                                     "eligible": [not r for r in alone.reasons.values()],
                                     "reason": list(alone.reasons.values())}),
        "error_table": _error_table(alone),
        "members": _members(alone, procedure, ahead),
        "forecasts": pd.DataFrame({"series": alone.series.name, "period": ahead,
                                   "lead": np.arange(1, fit.horizon + 1), "baseline": procedure.forecasts[-1],
                                   **_limits(procedure.forecasts[-1], scale[-1], fit, 0)}),
        "reliability": _reliability(alone, procedure, fit, scale, names),
    }


def window_scale(alone: Alone, procedure: Procedure, fit: PortfolioFit) -> Array:
    """Scales of the errors to come, shape (horizon,); what totals are made of."""
    return np.asarray(scales(alone, procedure, fit.ratio, fit.nonnegative)[-1])


def _limits(forecast: Array, scale: Array, fit: PortfolioFit, offset: int) -> dict[str, Array]:
    columns = {}
    for at, level in enumerate(fit.levels):
        lower, upper = fit.multipliers[offset, at]
        columns[f"lower_{level}"] = forecast - lower * scale
        columns[f"upper_{level}"] = forecast + upper * scale
    if fit.nonnegative:
        columns = {name: np.maximum(values, 0.0) for name, values in columns.items()}
    return columns


def _error_table(alone: Alone) -> pd.DataFrame:
    table = summary(alone.cube)
    table.insert(0, "series", alone.series.name)
    table["mase"] = table["mae"] / alone.mase_scale
    return table[["series", "method", "lead", "n", "mae", "bias", "mase"]]


def _members(alone: Alone, procedure: Procedure, ahead: list[str]) -> pd.DataFrame:
    rows = []
    for at, method in enumerate(alone.cube.methods):
        if np.isfinite(alone.members[at]).all():
            rows.append(pd.DataFrame({
                "series": alone.series.name, "method": method, "lead": np.arange(1, len(ahead) + 1), "period": ahead,
                "forecast": alone.members[at], "weight": procedure.weights[-1, at],
                "constants": json.dumps({k: round(float(v), 6) for k, v in alone.constants[at].items()})}))
    return pd.concat(rows, ignore_index=True)


def _reliability(alone: Alone, procedure: Procedure, fit: PortfolioFit, scale: Array,
                 names: list[str]) -> pd.DataFrame:
    """The procedure's past forecasts with the ranges it would have given, beside the actual and the seasonal naive."""
    horizon, rows = fit.horizon, []
    seasonal, naive = (alone.cube.forecasts[alone.cube.methods.index(name)] for name in ("seasonal_naive", "naive"))
    benchmark = np.where(np.isfinite(seasonal), seasonal, naive)
    for o, (known, offset) in enumerate(zip(alone.cube.known, alone.offsets, strict=True)):
        leads = np.flatnonzero(np.isfinite(alone.cube.actual[o]) & np.isfinite(procedure.forecasts[o]))
        if not len(leads):
            continue
        limits = _limits(procedure.forecasts[o], scale[o], fit, int(offset))
        rows.append(pd.DataFrame({
            "origin": names[known - 1], "period": [names[known + lead] for lead in leads], "lead": leads + 1,
            "forecast": procedure.forecasts[o, leads], "actual": alone.cube.actual[o, leads],
            **{name: values[leads] for name, values in limits.items()}, "benchmark": benchmark[o, leads]}))
    if not rows:
        limits = _limits(scale[-1], scale[-1], fit, 0)
        columns = ["origin", "period", "lead", "forecast", "actual", *limits, "benchmark"]
        table = pd.DataFrame({c: pd.Series(dtype=str if c in ("origin", "period") else float) for c in columns})
    else:
        table = pd.concat(rows, ignore_index=True)
    table.insert(0, "series", alone.series.name)
    table["lead"] = table["lead"].astype("int64")
    return table[table["lead"] <= horizon]


def _series_row(alone: Alone, procedure: Procedure, names: list[str]) -> pd.DataFrame:
    series, seen = alone.series, alone.pattern
    used = [m for m, w in zip(alone.cube.methods, procedure.weights[-1], strict=True) if w > 0]
    return pd.DataFrame([{
        "series": series.name, **dict(series.groups), "unit": series.unit, "unit_value": series.unit_value,
        "status": "forecast", "reason": "", "first_period": names[0],
        "last_period": names[int(np.flatnonzero(np.isfinite(alone.raw))[-1])],
        "n_periods": int(np.isfinite(alone.raw).sum()), "trend_strength": seen.trend_strength,
        "season_strength": seen.season_strength, "adi": seen.adi, "cv2": seen.cv2,
        "demand_class": seen.demand_class, "pattern_words": seen.words,
        "differencing_words": alone.differencing_words, "method": used[0] if len(used) == 1 else "blend",
        "method_words": method_words(used), "mase_scale": alone.mase_scale}])


def method_words(used: list[str]) -> str:
    """The method in plain words: one sentence for one method, a list for a blend."""
    if len(used) == 1:
        return METHODS[used[0]].sentence
    titles = [METHODS[name].title for name in used]
    return f"The forecast is the plain mean of {len(titles)} methods: {'; '.join(titles)}."
