"""Pass 3: the portfolio fit applied to each series again.

Cheap: nothing is fitted here. The result is the part of a round's tables (see
`foredeck.studies.TABLES`) that belongs to the series.
"""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from foredeck.backtests.error_table import summary
from foredeck.periods import period_name
from foredeck.portfolio.alone import Alone
from foredeck.portfolio.count_ranges import origin_limits
from foredeck.portfolio.explained import named_in_a_sentence, percent
from foredeck.portfolio.fit import PortfolioFit
from foredeck.portfolio.procedure import Procedure
from foredeck.portfolio.ranges import scales
from foredeck.smoothing.catalogue import METHODS

Array = NDArray[np.float64]
Places = NDArray[np.int64]


def apply_fit(alone: Alone, procedure: Procedure, fit: PortfolioFit) -> dict[str, pd.DataFrame]:
    """Tables of one series: `series`, `actuals`, `findings`, `eligibility`, `error_table`,
    `members`, `forecasts` and `reliability`.
    """
    scale = scales(alone, procedure, fit.nonnegative)
    counted = origin_limits(alone, procedure, fit.levels, fit.nonnegative)
    leads = np.arange(fit.horizon)
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
                                   "lead": leads + 1, "baseline": procedure.forecasts[-1],
                                   **_limits(procedure.forecasts[-1], scale[-1], fit, np.zeros_like(leads), leads,
                                             np.moveaxis(counted[-1], -1, 0))}),
        "reliability": _reliability(alone, procedure, fit, scale, counted, names),
    }


def window_scale(alone: Alone, procedure: Procedure, fit: PortfolioFit) -> Array:
    """Scales of the errors to come, shape (horizon,); what totals are made of."""
    return np.asarray(scales(alone, procedure, fit.nonnegative)[-1])


def _limits(forecast: Array, scale: Array, fit: PortfolioFit, offset: Places, lead: Places,
            counted: Array) -> dict[str, Array]:
    """Limits of forecasts made so many periods before the closing period, at 0-based leads; all of one shape.

    `counted`, of that shape with (levels, 2) behind it, are limits from counts; they stand wherever they are known.
    """
    columns = {}
    for at, level in enumerate(fit.levels):
        for side, (name, sign) in enumerate((("lower", -1.0), ("upper", 1.0))):
            limit = forecast + sign * fit.multipliers[offset, at, side, lead] * scale
            limit = np.maximum(limit, 0.0) if fit.nonnegative else limit
            columns[f"{name}_{level}"] = np.where(np.isnan(counted[:, at, side]), limit, counted[:, at, side])
    return columns


def _error_table(alone: Alone) -> pd.DataFrame:
    table = summary(alone.cube)
    table.insert(0, "series", alone.series.name)
    table["mase"] = table["mae"] / alone.mase_scale
    return table[["series", "method", "lead", "n", "mae", "bias", "mase"]]


def _members(alone: Alone, procedure: Procedure, ahead: list[str]) -> pd.DataFrame:
    there = np.flatnonzero(np.isfinite(alone.members).all(axis=1))
    horizon = len(ahead)
    constants = [json.dumps({k: round(float(v), 6) for k, v in held.items()}) for held in alone.constants]
    return pd.DataFrame({
        "series": alone.series.name,
        "method": np.repeat(np.array(alone.cube.methods, dtype=object)[there], horizon),
        "lead": np.tile(np.arange(1, horizon + 1), len(there)), "period": ahead * len(there),
        "forecast": alone.members[there].ravel(), "weight": np.repeat(procedure.weights[-1, there], horizon),
        "constants": np.repeat(np.array(constants, dtype=object)[there], horizon)})


def _reliability(alone: Alone, procedure: Procedure, fit: PortfolioFit, scale: Array, counted: Array,
                 names: list[str]) -> pd.DataFrame:
    """The procedure's past forecasts with the ranges it would have given, beside the actual and the seasonal naive."""
    seasonal, naive = (alone.cube.forecasts[alone.cube.methods.index(name)] for name in ("seasonal_naive", "naive"))
    benchmark = np.where(np.isfinite(seasonal), seasonal, naive)
    forecasts, actual = procedure.forecasts[:-1], alone.cube.actual
    origin, lead = np.nonzero(np.isfinite(actual) & np.isfinite(forecasts))
    known = alone.cube.known[origin]
    named = np.array(names, dtype=object)
    limits = _limits(forecasts[origin, lead], scale[origin, lead], fit, alone.offsets[origin], lead,
                     counted[origin, :, :, lead])
    return pd.DataFrame({
        "series": alone.series.name, "origin": named[known - 1], "period": named[known + lead],
        "lead": lead.astype(np.int64) + 1, "forecast": forecasts[origin, lead], "actual": actual[origin, lead],
        **limits, "benchmark": benchmark[origin, lead]})


def _series_row(alone: Alone, procedure: Procedure, names: list[str]) -> pd.DataFrame:
    series, seen = alone.series, alone.pattern
    weights = dict(zip(alone.cube.methods, procedure.weights[-1].tolist(), strict=True))
    used = {name: weight for name, weight in weights.items() if weight > 0}
    return pd.DataFrame([{
        "series": series.name, **dict(series.groups), "unit": series.unit, "unit_value": series.unit_value,
        "status": "forecast", "reason": "", "first_period": names[0],
        "last_period": names[int(np.flatnonzero(np.isfinite(alone.raw))[-1])],
        "n_periods": int(np.isfinite(alone.raw).sum()), "trend_strength": seen.trend_strength,
        "season_strength": seen.season_strength,
        "has_trend": seen.trend, "has_season": seen.season, "adi": seen.adi, "cv2": seen.cv2,
        "demand_class": seen.demand_class, "pattern_words": seen.words,
        "differencing_words": alone.differencing_words, "method": next(iter(used)) if len(used) == 1 else "blend",
        "method_words": method_words(used), "mase_scale": alone.mase_scale}])


def method_words(used: Mapping[str, float]) -> str:
    """The method in plain words: one sentence for one method; for a blend who leads it, and who comes next."""
    ranked = sorted(used, key=lambda name: -used[name])
    first = METHODS[ranked[0]]
    if len(used) == 1:
        return first.sentence
    if max(used.values()) - min(used.values()) < 1e-9:
        kind = " for intermittent demand" if first.family == "demand rate" else ""
        names = [named_in_a_sentence(name) for name in used]
        rates = " Each sets how large a demand usually is against how often one comes." if kind else ""
        return f"The forecast is the plain mean of {len(used)} methods{kind}: {_listed(names)}.{rates}"
    next_ones = [f"{named_in_a_sentence(name)} ({percent(used[name])})" for name in ranked[1:3]]
    return (f"The forecast is a blend of {len(used)} methods, led by {named_in_a_sentence(ranked[0])} with "
            f"{percent(used[ranked[0]])}. {first.sentence} Next {'comes' if len(next_ones) == 1 else 'come'} "
            f"{_listed(next_ones)}.")


def _listed(names: Sequence[str]) -> str:
    return " and ".join([", ".join(names[:-1]), names[-1]] if len(names) > 1 else names)
