"""Pass 1: each series alone.

Findings, repairs, pattern and eligibility of one series, its errors from past
origins, and what each method says now. Nothing here knows another series, so
the pass can be spread over workers and a fault stops one series only.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from foredeck.backtests.error_table import Cube, build_cube
from foredeck.backtests.measures import mase_scale
from foredeck.checks.differencing import difference
from foredeck.checks.eligibility import Pattern, ineligible_reason, pattern
from foredeck.checks.findings import find
from foredeck.checks.repairs import repaired
from foredeck.errors import MethodError, SettingsError
from foredeck.intake.history import SeriesHistory
from foredeck.smoothing.catalogue import METHODS, fit

Array = NDArray[np.float64]

MIN_PERIODS = 4
"""Below this many periods with a value a series is listed, not forecast."""

YEAR_OF_ORIGINS = {12: 12, 4: 8, 52: 26, 1: 6}
"""How many origins one reading of reliability rests on, by season length (common practice:
one season of monthly origins, two years of quarterly ones)."""


@dataclass(frozen=True)
class ForecastOptions:
    """How to forecast: the part of the settings that the three passes need."""

    horizon: int = 12
    levels: tuple[int, ...] = (50, 90)
    style: str = "blend"
    methods: tuple[str, ...] = ()
    constants: Mapping[str, float] | None = None
    nonnegative: bool = True

    def allowed(self) -> tuple[str, ...]:
        """Names of the methods to compute, in the catalogue's order: those asked for, and the benchmarks.

        Raises
        ------
        SettingsError
            if a name is not in the catalogue.
        """
        for name in self.methods:
            if name not in METHODS:
                raise SettingsError(f"method {name!r} is not in the catalogue", where="[forecast] methods",
                                    allowed=", ".join(METHODS), do="take the name from the list")
        return tuple(name for name, method in METHODS.items()
                     if not self.methods or name in self.methods or method.family == "benchmark")

    def asked_for(self, method: str) -> bool:
        """Whether a method may speak in the forecast; benchmarks always stand beside it."""
        return not self.methods or method in self.methods


@dataclass(frozen=True)
class Alone:
    """What pass 1 knows of one series.

    `offsets[o]` counts the periods between an origin of `cube` and the closing period,
    so that origins of different series can be laid side by side. `reasons` says why a method
    is not eligible, or is kept out of the forecast; empty when it speaks. `pool[m, o]` says whether
    method m may enter the blend or the choice at that origin; its last column is now.
    """

    series: SeriesHistory
    raw: Array
    used: Array
    periods: pd.PeriodIndex
    findings: pd.DataFrame
    pattern: Pattern
    differencing_words: str
    reasons: Mapping[str, str]
    cube: Cube
    offsets: NDArray[np.int64]
    pool: NDArray[np.bool_]
    members: Array
    constants: tuple[Mapping[str, float], ...]
    naive_scale: NDArray[np.float64]
    mase_scale: float


def origin_count(season_length: int, horizon: int) -> int:
    """How many past origins the backtest goes through when the history is long enough.

    Two readings of reliability (one to calibrate ranges, one to judge them) and the
    horizon between them, since an error at lead h is known only h periods later.
    """
    return 2 * YEAR_OF_ORIGINS[season_length] + horizon


def not_forecastable(series: SeriesHistory, closing: pd.Period) -> str:
    """Why the series cannot be forecast at all; empty when it can."""
    present = int(np.isfinite(series.values).sum())
    noun = series.frequency.noun if present == 1 else series.frequency.plural
    if present < MIN_PERIODS:
        return f"has {present} {noun} with a value; {MIN_PERIODS} are needed"
    last = series.periods[np.isfinite(series.values)][-1]
    silent = closing.ordinal - last.ordinal
    if silent > max(2, series.season_length // 2):
        return f"no actual for {silent} {series.frequency.plural}: closed, or renamed?"
    return ""


def _to_closing(series: SeriesHistory, closing: pd.Period) -> tuple[Array, pd.PeriodIndex]:
    """Values from the first actual to the closing period; periods not yet reported are missing."""
    first = int(np.argmax(np.isfinite(series.values)))
    values = np.asarray(series.values[first:], dtype=np.float64)
    missing = closing.ordinal - series.periods[-1].ordinal
    values = np.concatenate([values, np.full(max(missing, 0), np.nan)])
    return values, pd.period_range(series.periods[first], periods=len(values), freq=closing.freq)


def examine(series: SeriesHistory, closing: pd.Period, options: ForecastOptions) -> Alone:
    """Everything about one series that can be known without the others.

    Parameters
    ----------
    series : SeriesHistory
        Known up to `closing` or earlier; NaN = missing, repaired for fitting only.
    closing : pandas.Period
        The round's last closed period.
    options : ForecastOptions

    Raises
    ------
    MethodError
        if the series cannot be forecast at all (see `not_forecastable`), or no allowed
        method is eligible.
    """
    reason = not_forecastable(series, closing)
    if reason:
        raise MethodError(f"{series.name} cannot be forecast: {reason}", where=series.name, reason=reason)
    m, horizon = series.season_length, options.horizon
    raw, periods = _to_closing(series, closing)
    methods = options.allowed()

    # every origin needs its repaired values three times: each is made once, from what was known then
    known_then = cache(lambda n: repaired(raw[:n], m, nonnegative=options.nonnegative))
    seen = cache(lambda n: pattern(known_then(n), m, used=known_then(n)))

    def prepare(known: Array) -> Array:
        values: Array = known_then(len(known))
        return values

    used = prepare(raw)

    def eligible(method: str, known: Array) -> bool:
        # the error table must know only what a forecaster knew at that origin
        return not ineligible_reason(METHODS[method].requirements, known, m, seen(len(known)))

    known = _known_counts(len(raw), m, horizon)
    cube = build_cube(raw, m, horizon, methods, known, prepare, eligible, options.constants)
    now = seen(len(raw))
    reasons = {name: ineligible_reason(METHODS[name].requirements, used, m, now) for name in methods}
    fits = [None if reasons[name] else fit(name, used, m, options.constants) for name in methods]
    members = np.array([np.full(horizon, np.nan) if f is None else f.forecast(horizon) for f in fits])
    asked = np.array([options.asked_for(name) for name in methods])
    everywhere = np.isfinite(np.concatenate([cube.forecasts, members[:, None]], axis=1)).all(axis=2) & asked[:, None]
    pool = everywhere & np.array([[not _kept_out(name, seen(int(k)), int(k) < 2 * m)
                                     for k in (*known, len(raw))] for name in methods])
    # where the pattern leaves none of the methods asked for, any of them that runs is better than silence
    pool = np.where(pool.any(axis=0)[None, :], pool, everywhere)
    if not pool[:, -1].any():
        why = "; ".join(f"{name}: {text}" for name, text in reasons.items() if text)
        raise MethodError(f"{series.name} cannot be forecast: no allowed method fits it", where=series.name,
                          reason=f"no allowed method is eligible ({why})")
    return Alone(
        series=series, raw=raw, used=used, periods=periods,
        findings=find(series, closing, nonnegative=options.nonnegative), pattern=now,
        differencing_words=difference(used, m).words,
        reasons={name: text or _kept_out(name, now, len(raw) < 2 * m) for name, text in reasons.items()},
        cube=cube, offsets=len(raw) - known, pool=pool,
        members=members, constants=tuple({} if f is None else dict(f.constants) for f in fits),
        naive_scale=np.array([naive_error(known_then(int(k)), m) for k in (*known, len(raw))]),
        mase_scale=mase_scale(used, m))


def naive_error(values: Array, season_length: int) -> float:
    """Mean absolute change of one period, after the season where two seasons are known.

    The yardstick that every series has, however short; never zero (a constant series
    gets a thousandth of its level), so that errors can be divided by it.
    """
    lag = season_length if len(values) >= 2 * season_length + 1 else 1
    change = np.abs(values[lag:] - values[:-lag])
    floor = 1e-3 * max(float(np.mean(np.abs(values))), 1e-9)
    return max(float(change.mean()) if len(change) else 0.0, floor)


def _known_counts(n: int, season_length: int, horizon: int) -> NDArray[np.int64]:
    """Numbers of periods known at each origin, ascending: at least two seasons, or half of a short history."""
    least = max(3, min(2 * season_length + 1, n // 2))
    first = max(least, n - origin_count(season_length, horizon))
    return np.arange(first, n, dtype=np.int64)


UNDAMPED = ("holt", "differenced_ses")
"""Methods that carry a trend on without end."""


def _kept_out(method: str, seen: Pattern, young: bool) -> str:
    """Why a method may not enter the blend or the choice, given the pattern seen at that origin; empty if it may.

    While fewer than two seasons are known (`young`), what looks like a trend may be the
    season, and is not carried on undamped.
    """
    entry = METHODS[method]
    if entry.family == "benchmark":
        return "is a benchmark, there to be beaten"
    if seen.intermittent:
        return "" if entry.family == "demand rate" else "is not for intermittent demand"
    if entry.seasonal and not seen.season:
        return "repeats a season, and this series shows none"
    if seen.season and not entry.seasonal:
        return "knows no season, and this series has one"
    if young and method in UNDAMPED:
        return "would carry a trend on that may be the season: fewer than two years are known"
    return ""
