"""Forecasting again from past origins: the cube of forecasts, and the table of its errors."""

from __future__ import annotations

import html
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from foredeck.backtests.choice import relative_errors
from foredeck.backtests.measures import mase_scale, mean_of
from foredeck.backtests.origins import known_counts
from foredeck.checks.eligibility import ineligible_reason
from foredeck.checks.intermittence import average_demand_interval
from foredeck.checks.repairs import repaired
from foredeck.errors import MethodError, ShapeError
from foredeck.intake.history import SeriesHistory
from foredeck.smoothing.catalogue import METHODS, fit, named
from foredeck.smoothing.values import AnySeries, from_first_value, raw_values

Array = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Cube:
    """Forecasts of one series by method, origin and lead, beside what came.

    Attributes
    ----------
    methods : tuple of str, length M
    known : array of int, shape (O,)
        Periods known at each origin.
    forecasts : array, shape (M, O, H); the series' unit
        NaN where the method was not eligible.
    actual : array, shape (O, H); the series' unit
        Raw actuals; NaN where none.
    scale : float
        `mase_scale` of the raw history.
    """

    methods: tuple[str, ...]
    known: NDArray[np.int64]
    forecasts: Array
    actual: Array
    scale: float = float("nan")

    @property
    def errors(self) -> Array:
        """Actual minus forecast, shape (M, O, H)."""
        difference: Array = self.actual[None] - self.forecasts
        return difference

    def known_cells(self, known: int) -> NDArray[np.bool_]:
        """Which cells (O, H) had their actual known when `known` periods were."""
        last = self.known[:, None] + np.arange(1, self.actual.shape[1] + 1)[None, :]
        return np.asarray((last <= known) & np.isfinite(self.actual))


@dataclass(frozen=True, eq=False)
class Backtest:
    """Backtest of one series: its error table and the cube it was made from.

    Attributes
    ----------
    table : DataFrame
        One row a method and lead: `summary`.
    cube : Cube
    relative : Series
        Error relative to the seasonal naive by method, averaged over leads
        (`choice.relative_errors`); under 1 is better.
    reasons : Mapping[str, str]
        Why a method is not eligible on the whole history; empty when it is.
    """

    table: pd.DataFrame
    cube: Cube
    relative: pd.Series[float]
    reasons: Mapping[str, str]

    def _repr_html_(self) -> str:
        rows = []
        for name, relative in self.relative.sort_values().items():
            errors = np.abs(self.cube.errors[self.cube.methods.index(str(name))])
            cells = (METHODS[str(name)].title, f"{float(mean_of(errors[:, 0])):.4g}",
                     f"{float(mean_of(errors)):.4g}", f"{relative:.2f}")
            rows.append('<tr><th scope="row">{}</th><td>{}</td><td>{}</td><td>{}</td></tr>'.format(
                *(html.escape(cell.replace("nan", "–")) for cell in cells)))
        heads = ("method", "mean miss, lead 1", "mean miss, all leads", "relative to the benchmark")
        head = "".join(f'<th scope="col">{text}</th>' for text in heads)
        caption = f"Backtest from {self.cube.known.size} origins, {self.cube.actual.shape[1]} leads"
        top = f"<table><caption>{caption}</caption><thead><tr>{head}</tr></thead>"
        return f"{top}<tbody>{''.join(rows)}</tbody></table>"


def build_cube(
    values: Array,
    season_length: int,
    horizon: int,
    methods: Sequence[str],
    known: NDArray[np.int64],
    prepare: Callable[[Array], Array],
    eligible: Callable[[str, Array], bool],
    constants: Mapping[str, float] | None = None,
) -> Cube:
    """Forecast again from every origin, each method fitted from a cold start.

    Parameters
    ----------
    values : array, shape (n,); the series' unit
        Raw, NaN where missing. Forecasts are judged against these.
    season_length, horizon : int
    methods : sequence of str
    known : array of int
        Periods known at each origin, 1 to n - 1.
    prepare : callable
        Repairs what is known at an origin: it is handed `values[:known]` and no more.
    eligible : callable
        `(method, prepared values) -> bool`.
    constants : Mapping[str, float], optional
        Constants to hold (`smoothing.catalogue.fit`).

    Returns
    -------
    Cube

    Raises
    ------
    MethodError
        for an unknown method.
    ShapeError
        for an origin that leaves nothing to learn from or nothing to be judged by.
    """
    n = values.size
    if known.size == 0 or known.min() < 1 or known.max() >= n:
        raise ShapeError(
            f"The origins know {', '.join(map(str, known.tolist())) or 'no'} periods of {n}.",
            where="backtest", allowed=f"1 to {n - 1} periods", do="Take the origins from known_counts.",
        )
    for name in methods:
        named(name)
    forecasts = np.full((len(methods), known.size, horizon), np.nan)
    actual = np.full((known.size, horizon), np.nan)
    for origin, count in enumerate(known.tolist()):
        ahead = values[count : count + horizon]
        actual[origin, : ahead.size] = ahead
        seen = prepare(values[:count].copy())
        for row, name in enumerate(methods):
            if eligible(name, seen):
                forecasts[row, origin] = fit(name, seen, season_length, constants).forecast(horizon)
    return Cube(tuple(methods), known, forecasts, actual, mase_scale(values, season_length))


def summary(cube: Cube) -> pd.DataFrame:
    """Errors by method and lead.

    Returns
    -------
    DataFrame
        Columns method, lead, n (cells judged), mae, bias (above zero: forecasts too low),
        rmse (all in the series' unit), mase. NaN where n is 0.
    """
    errors = cube.errors
    _, _, leads = errors.shape
    mae = mean_of(np.abs(errors), axis=1)
    return pd.DataFrame({
        "method": np.repeat(np.array(cube.methods, dtype=object), leads),
        "lead": np.tile(np.arange(1, leads + 1), len(cube.methods)),
        "n": np.isfinite(errors).sum(axis=1).ravel(),
        "mae": mae.ravel(),
        "bias": mean_of(errors, axis=1).ravel(),
        "rmse": np.sqrt(mean_of(errors**2, axis=1)).ravel(),
        "mase": (mae / cube.scale).ravel(),
    })


def backtest(
    series: AnySeries,
    horizon: int | None = None,
    methods: Sequence[str] | None = None,
    season_length: int | None = None,
    origins: int | None = None,
    *,
    nonnegative: bool | None = None,
) -> Backtest:
    """Judge methods on one series by forecasting again from past origins.

    At every origin the series is repaired, its pattern read and each method fitted anew,
    with nothing but what was known then. Errors are measured against the raw actuals.

    Parameters
    ----------
    series : SeriesHistory, Series over a PeriodIndex, or array, shape (n,)
        NaN where missing; missing ones at the beginning are left out.
    horizon : int, optional
        Leads; by default one season, 6 without a season.
    methods : sequence of str, optional
        By default all of `METHODS`. The benchmarks "naive" and "seasonal_naive" always
        stand beside them.
    season_length : int, optional
        By default that of the series' frequency; 1 for an array.
    origins : int, optional
        Number of origins (`known_counts`).
    nonnegative : bool, optional
        Whether a value under zero is a fault to be repaired for fitting. By default for a
        `SeriesHistory`, not for a bare Series or array.

    Returns
    -------
    Backtest

    Raises
    ------
    MethodError
        for an unknown method, or a history too short to hold anything back.
    """
    values, m = raw_values(series, season_length)
    values = from_first_value(values)
    leads = horizon if horizon is not None else (m if m > 1 else 6)
    wanted = tuple(METHODS) if methods is None else tuple(dict.fromkeys(named(name).name for name in methods))
    wanted += tuple(name for name in ("naive", "seasonal_naive") if name not in wanted)
    if isinstance(leads, bool) or not isinstance(leads, int | np.integer):
        raise MethodError(
            f"The horizon is {leads!r}.", where="backtest", allowed="a whole number of periods, at least 1",
            do="Give the number of periods to forecast.",
        )
    known = known_counts(values.size, m, int(leads), origins)
    faulty_sign = isinstance(series, SeriesHistory) if nonnegative is None else nonnegative

    def prepare(seen: Array) -> Array:
        return repaired(seen, m, nonnegative=faulty_sign)

    def reason(name: str, seen: Array) -> str:
        return ineligible_reason(METHODS[name].requirements, seen, m, average_demand_interval(seen))

    def eligible(name: str, seen: Array) -> bool:
        return reason(name, seen) == ""

    cube = build_cube(values, m, int(leads), wanted, known, prepare, eligible)
    whole = prepare(values)
    relative = relative_errors(cube.methods, cube.errors)
    return Backtest(
        table=summary(cube), cube=cube, relative=pd.Series(relative, index=list(wanted), name="relative"),
        reasons={name: reason(name, whole) for name in wanted},
    )
