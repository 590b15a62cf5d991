"""Pass 1: each series alone.

Findings, repairs, pattern and eligibility of one series, its errors from past
origins, and what each method says now. Nothing here knows another series, so
the pass can be spread over workers and a fault stops one series only.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from functools import cache

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from foredeck.backtests.error_table import Cube, build_cube
from foredeck.backtests.measures import mase_scale
from foredeck.checks.differencing import difference
from foredeck.checks.eligibility import Pattern, ineligible_reason, pattern, shows_season
from foredeck.checks.findings import find
from foredeck.checks.intermittence import ADI_LIMIT, average_demand_interval
from foredeck.checks.repairs import repaired
from foredeck.errors import MethodError, SettingsError
from foredeck.intake.history import SeriesHistory
from foredeck.smoothing.catalogue import METHODS, fit, usual_methods

Array = NDArray[np.float64]

MIN_PERIODS = 4
"""Below this many periods with a value a series is listed, not forecast."""

FEWEST_KNOWN = 8
"""Periods known at the first origin, where the history allows: errors from fewer tell little of today's."""

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

    def allowed(self, season_length: int) -> tuple[str, ...]:
        """Names of the methods to compute, in the catalogue's order: those that may speak, and the benchmarks.

        Raises
        ------
        SettingsError
            if a name is not in the catalogue.
        """
        for name in self.methods:
            if name not in METHODS:
                raise SettingsError(f"method {name!r} is not in the catalogue", where="[forecast] methods",
                                    allowed=", ".join(METHODS), do="take the name from the list")
        voices = self.voices(season_length)
        return tuple(name for name, method in METHODS.items() if name in voices or method.family == "benchmark")

    def voices(self, season_length: int) -> tuple[str, ...]:
        """Names of the methods that may speak in a forecast: those asked for, or the usual ones."""
        return self.methods or usual_methods(season_length)


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
    methods = options.allowed(m)
    then = _Then(raw, m, options.nonnegative)
    used = then.repaired(len(raw))
    known = _known_counts(len(raw), m, horizon)
    cube = build_cube(raw, m, horizon, methods, known, lambda seen: then.repaired(len(seen)),
                      lambda name, seen: not then.reason(name, len(seen)), options.constants)
    lowest = 0.0 if options.nonnegative else -np.inf
    cube = replace(cube, forecasts=np.maximum(cube.forecasts, lowest))
    now = pattern(used, m, used=used)
    reasons = {name: then.reason(name, len(raw)) for name in methods}
    fits = [None if reasons[name] else fit(name, used, m, options.constants) for name in methods]
    members = np.array([np.full(horizon, np.nan) if f is None else f.forecast(horizon) for f in fits])
    members = np.maximum(members, lowest)
    voices = options.voices(m)
    asked = np.array([name in voices for name in methods])
    everywhere = np.isfinite(np.concatenate([cube.forecasts, members[:, None]], axis=1)).all(axis=2) & asked[:, None]
    pool = everywhere & np.array([[not then.kept_out(name, int(k), options) for k in (*known, len(raw))]
                                  for name in methods])
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
        reasons={name: text or then.kept_out(name, len(raw), options) for name, text in reasons.items()},
        cube=cube, offsets=len(raw) - known, pool=pool,
        members=members, constants=tuple({} if f is None else dict(f.constants) for f in fits),
        naive_scale=np.array([naive_error(then.repaired(int(k)), m) for k in (*known, len(raw))]),
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
    least = max(3, min(max(2 * season_length + 1, FEWEST_KNOWN), n // 2))
    first = max(least, n - origin_count(season_length, horizon))
    return np.arange(first, n, dtype=np.int64)


class _Then:
    """What a forecaster knew of one series when so many of its periods were known."""

    def __init__(self, raw: Array, season_length: int, nonnegative: bool) -> None:
        self.season_length = season_length
        # every origin needs these several times: each is made once, from what was known then
        self.repaired: Callable[[int], Array] = cache(
            lambda known: repaired(raw[:known], season_length, nonnegative=nonnegative))
        self.season: Callable[[int], bool] = cache(lambda known: shows_season(self.repaired(known), season_length))
        self.interval: Callable[[int], float] = cache(lambda known: average_demand_interval(self.repaired(known)))

    def intermittent(self, known: int) -> bool:
        """Whether demand was missing in so many periods that the demand-rate family speaks."""
        return self.interval(known) >= ADI_LIMIT

    def reason(self, method: str, known: int) -> str:
        """Why the method may not be used at all; empty when it may."""
        return ineligible_reason(METHODS[method].requirements, self.repaired(known), self.season_length,
                                 self.interval(known))

    def kept_out(self, method: str, known: int, options: ForecastOptions) -> str:
        """Why a method may not enter the blend or the choice at that origin; empty if it may.

        Methods asked for by name have to fit the season; the usual ones find out how much of
        one there is, or earn their weight. While fewer than two seasons are known, what looks
        like a trend may be the season, and is not carried on without end.
        """
        entry = METHODS[method]
        if method not in options.voices(self.season_length):
            return "is a benchmark, there to be beaten"
        if self.intermittent(known):
            return "" if entry.family == "demand rate" else "is not for intermittent demand"
        if options.methods and entry.season == "repeated" and not self.season(known):
            return "repeats a season, and this series shows none"
        if options.methods and entry.season == "none" and self.season(known):
            return "knows no season, and this series has one"
        if known < 2 * self.season_length and entry.endless_trend:
            return "would carry a trend on that may be the season: fewer than two years are known"
        return ""
