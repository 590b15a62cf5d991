"""What the benchmarks share: open competition series, the three passes over them, measures, plain tables.

The files M1 and M3 (Makridakis et al. 1982; Makridakis & Hibon 2000) hold the columns series, freq
(YEARLY, QUARTERLY, MONTHLY, OTHER), part (train, test), t, value. OTHER has no season and is laid out in
years. All series of a frequency are set to end in one period, so that their origins lie side by side.
"""

from __future__ import annotations

import platform
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import ProcessPoolExecutor
from contextlib import contextmanager
from dataclasses import dataclass, replace
from multiprocessing import get_context
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from foredeck.backtests.measures import mase, mase_scale, smape
from foredeck.intake.history import SeriesHistory
from foredeck.periods import Frequency
from foredeck.portfolio.alone import Alone, ForecastOptions
from foredeck.portfolio.fit import PortfolioFit, fit_portfolio
from foredeck.portfolio.procedure import Procedure
from foredeck.portfolio.spread import examine_each
from foredeck.smoothing.catalogue import METHODS, usual_methods
from foredeck.studies import versions

Array = NDArray[np.float64]

HORIZONS = {"YEARLY": 6, "QUARTERLY": 8, "MONTHLY": 18, "OTHER": 8}
SPACING = {"YEARLY": Frequency.YEARLY, "QUARTERLY": Frequency.QUARTERLY, "MONTHLY": Frequency.MONTHLY,
           "OTHER": Frequency.YEARLY}
LEVELS = (50, 80, 90, 95)
FEWEST = {"YEARLY": 9, "QUARTERLY": 9, "MONTHLY": 25, "OTHER": 9}
"""Shifted series with fewer periods left to learn from are left out: two seasons and one period, at least nine."""
WORKERS = 2


@dataclass(frozen=True)
class OpenSeries:
    """One series: what may be learned from and what is then judged."""

    name: str
    train: Array
    test: Array


@dataclass(frozen=True)
class Passed:
    """A portfolio after the passes; `alones`, `procedures` and `tests` stand side by side."""

    alones: list[Alone]
    tests: list[Array]
    procedures: list[Procedure]
    fits: list[PortfolioFit]
    standardised: list[Array]
    stopped: list[str]


def read_open_series(path: str) -> dict[str, list[OpenSeries]]:
    """Series of a file by frequency, in the order of `HORIZONS`."""
    data = pd.read_parquet(path).sort_values(["series", "t"], kind="stable")
    found: dict[str, list[OpenSeries]] = {name: [] for name in HORIZONS if (data["freq"] == name).any()}
    for (freq, name), rows in data.groupby(["freq", "series"]):
        training = (rows["part"] == "train").to_numpy()
        values = rows["value"].to_numpy(float)
        found[str(freq)].append(OpenSeries(str(name), values[training], values[~training]))
    return found


def shifted(series: Sequence[OpenSeries], freq: str) -> list[OpenSeries]:
    """The last training values, one horizon, as the test, what precedes them as the training; short ones left out."""
    horizon = HORIZONS[freq]
    moved = [replace(one, train=one.train[:-horizon], test=one.train[-horizon:]) for one in series]
    return [one for one in moved if len(one.train) >= FEWEST[freq]]


def drawn(series: Sequence[OpenSeries], count: int | None, seed: int) -> list[OpenSeries]:
    """A seeded draw without replacement, or all of them."""
    if count is None or count >= len(series):
        return list(series)
    return [series[at] for at in np.random.default_rng(seed).permutation(len(series))[:count]]


def histories(series: Sequence[OpenSeries], frequency: Frequency) -> tuple[list[SeriesHistory], pd.Period]:
    """The training parts as series histories that end in one closing period."""
    code = frequency.pandas_code
    closing = pd.Period("2020-12-31", freq=code)
    spans = [pd.period_range(end=closing, periods=len(one.train), freq=code) for one in series]
    return [SeriesHistory(one.name, frequency, span, one.train)
            for one, span in zip(series, spans, strict=True)], closing


def examined(series: Sequence[OpenSeries], frequency: Frequency,
             options: ForecastOptions) -> tuple[list[Alone], list[Array], list[str]]:
    """Pass 1 over processes: what is known of each series, its test part, and the names of those that stopped."""
    known, closing = histories(series, frequency)
    found = list(zip(examine_each(known, closing, options, WORKERS), series, strict=True))
    there = [(alone, one.test) for alone, one in found if isinstance(alone, Alone)]
    return ([alone for alone, _ in there], [test for _, test in there],
            [f"{one.name}: {fault}" for fault, one in found if not isinstance(fault, Alone)])


def pass_through(series: Sequence[OpenSeries], frequency: Frequency, options: ForecastOptions, *,
                 each_alone: bool = False) -> Passed:
    """Passes 1 and 2: all series as one portfolio, or each as a portfolio of its own."""
    alones, tests, stopped = examined(series, frequency, options)
    if not each_alone:
        fit, procedures, standardised = fit_portfolio(alones, options)
        return Passed(alones, tests, procedures, [fit] * len(alones), [standardised], stopped)
    with processes() as each:
        lone = list(each(fit_one_series, alones, [options] * len(alones)))
    return Passed(alones, tests, [found[1][0] for found in lone], [found[0] for found in lone],
                  [found[2] for found in lone], stopped)


def fit_one_series(alone: Alone, options: ForecastOptions) -> tuple[PortfolioFit, list[Procedure], Array]:
    """A portfolio of one."""
    return fit_portfolio([alone], options)


@contextmanager
def processes() -> Iterator[Callable[..., Iterator[Any]]]:
    """Yield a `map` over fresh processes."""
    with ProcessPoolExecutor(WORKERS, mp_context=get_context("spawn")) as pool:
        yield lambda function, *rows: pool.map(function, *rows, chunksize=4)


def five_members(season_length: int) -> list[str]:
    """The usual methods that are neither benchmarks nor for intermittent demand."""
    return [name for name in usual_methods(season_length) if METHODS[name].family not in ("benchmark", "demand rate")]


def member_forecast(alone: Alone, name: str) -> Array:
    """What one method says now; NaN where it cannot be had."""
    return np.asarray(alone.members[alone.cube.methods.index(name)])


def equal_forecast(alone: Alone) -> Array:
    """Plain mean of the five members, of those that can be had."""
    said = np.array([member_forecast(alone, name) for name in five_members(alone.series.season_length)])
    return np.asarray(said[np.isfinite(said).all(axis=1)].mean(axis=0))


def misses(alone: Alone, forecast: Array, actual: Array) -> tuple[float, float]:
    """sMAPE and MASE of one series over all leads (Makridakis & Hibon 2000; Hyndman & Koehler 2006)."""
    scale = mase_scale(alone.raw, alone.series.season_length)
    return float(smape(actual, forecast)), float(mase(actual, forecast, scale))


def invented_months(count: int, seed: Sequence[int], periods: int, common: float = 0.0) -> list[Array]:
    """Seeded monthly series with a moving level, a season and a trend; innovations share `common` of their variance.

    The model has one source of error: the level moves by alpha times the innovation. Levels lie between
    300 and 3,000, seasons up to 30 %, trends up to 8 % a year, innovations at 4 to 12 % of the level.
    """
    rng = np.random.default_rng(seed)
    shocks = rng.normal(size=periods)
    found = []
    for _ in range(count):
        alpha, spread = rng.uniform(0.05, 0.5), rng.uniform(0.04, 0.12)
        start = np.exp(rng.uniform(*np.log([300, 3000])))
        season = rng.uniform(0, 0.3) * np.sin(2 * np.pi * (np.arange(12) / 12 + rng.uniform()))
        innovation = spread * (np.sqrt(common) * shocks + np.sqrt(1 - common) * rng.normal(size=periods))
        level = 1 + np.cumsum(alpha * innovation + rng.uniform(-0.04, 0.08) / 12) - alpha * innovation
        found.append(np.maximum(start * (level + season[np.arange(periods) % 12] + innovation), 0.0))
    return found


def print_run(title: str, **run: object) -> None:
    """What was run, and with which versions."""
    print(title)
    print("  " + ", ".join(f"{name.replace('_', ' ')} {value}" for name, value in run.items()))
    print(f"  python {platform.python_version()}, " + ", ".join(f"{name} {it}" for name, it in versions().items()),
          flush=True)


def print_table(heads: Sequence[str], rows: Sequence[Sequence[object]]) -> None:
    """A plain table: the first column to the left, figures to the right."""
    shown = [[*map(str, heads)], *([*map(str, row)] for row in rows)]
    widths = [max(len(row[at]) for row in shown) for at in range(len(heads))]
    for row in shown:
        cells = [row[0].ljust(widths[0]), *(cell.rjust(width) for cell, width in zip(row[1:], widths[1:], strict=True))]
        print("  ".join(cells).rstrip(), flush=True)
