"""All methods by name, and the two ways to fit one: `fit` for arrays, `smooth` for people."""

from __future__ import annotations

import difflib
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from functools import partial
from types import MappingProxyType
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from foredeck.checks.eligibility import Requirements
from foredeck.compiled.recursions import ADDITIVE, MULTIPLICATIVE
from foredeck.errors import MethodError
from foredeck.smoothing import benchmarks, demand_rate
from foredeck.smoothing.differenced import fit_differenced
from foredeck.smoothing.fitted import Fitted
from foredeck.smoothing.state_space import Form, fit_form
from foredeck.smoothing.values import AnySeries, bare_values

Array = NDArray[np.float64]
Family = Literal["smoothing", "benchmark", "demand rate"]


@dataclass(frozen=True)
class Method:
    """One way to forecast.

    Attributes
    ----------
    name, title : str
        Name in settings and tables, and name for readers.
    sentence : str
        The method in plain words, for reports.
    requirements : Requirements
        What it needs of a series.
    fit : callable
        `(values, season_length, constants, **options) -> Fitted`; `fit` of this module
        checks what it is given.
    source : str
        Publication.
    seasonal : bool
        True when the forecast repeats a season.
    constants : tuple of str
        Constants that may be fixed.
    options : tuple of str
        Further arguments it takes (`initial`, `season_update`).
    family : {"smoothing", "benchmark", "demand rate"}
    """

    name: str
    title: str
    sentence: str
    requirements: Requirements
    fit: Callable[..., Fitted]
    source: str
    seasonal: bool
    constants: tuple[str, ...]
    options: tuple[str, ...]
    family: Family


def _form(form: Form, requirements: Requirements, source: str, sentence: str) -> Method:
    seasonal = form.season in (ADDITIVE, MULTIPLICATIVE)
    return Method(
        form.name, form.title, sentence, requirements, partial(fit_form, form), source, seasonal,
        form.constants, ("initial", "season_update") if seasonal else ("initial",), "smoothing",
    )


def _changes(name: str, title: str, requirements: Requirements, seasonal: bool, sentence: str) -> Method:
    def fit_changes(values: Array, m: int, constants: Mapping[str, float], **options: Any) -> Fitted:
        return fit_differenced(name, title, values, m, m if seasonal else 1, constants, **options)

    source = "Box & Jenkins (1970); Holt (1957)"
    return Method(
        name, title, sentence, requirements, fit_changes, source, seasonal, ("alpha",), ("initial",),
        "smoothing",
    )


def _benchmark(
    name: str, title: str, requirements: Requirements, fit_one: Callable[..., Fitted], sentence: str,
    seasonal: bool = False, constants: tuple[str, ...] = (),
) -> Method:
    def fit_benchmark(values: Array, m: int, constants: Mapping[str, float]) -> Fitted:
        return fit_one(values, m, **constants)

    source = "Hyndman & Athanasopoulos (2018), section 3.1"
    return Method(
        name, title, sentence, requirements, fit_benchmark, source, seasonal, constants, (), "benchmark"
    )


def _rate(
    name: str, title: str, fit_one: Callable[..., Fitted], source: str, constants: tuple[str, ...],
    sentence: str,
) -> Method:
    only = Requirements(4, intermittent="only")
    return Method(name, title, sentence, only, fit_one, source, False, constants, (), "demand rate")


_SEASONAL = Requirements(8, min_seasons=2, intermittent="never")
_POSITIVE = Requirements(8, min_seasons=2, positive=True, intermittent="never")
_WINTERS = "Holt (1957); Winters (1960)"
_DAMPED = "Gardner & McKenzie (1985); Winters (1960)"

_ENTRIES = (
    _benchmark(
        "naive", "Last value (naive)", Requirements(1), benchmarks.fit_naive,
        "The forecast is the last known value.",
    ),
    _benchmark(
        "seasonal_naive", "Same season last year (seasonal naive)", Requirements(1, min_seasons=1),
        benchmarks.fit_seasonal_naive, "The forecast is the value of the same season a year before.",
        seasonal=True,
    ),
    _benchmark(
        "mean", "Mean of all periods", Requirements(1), benchmarks.fit_mean,
        "The forecast is the mean of all known periods.",
    ),
    _benchmark(
        "moving_average", "Moving average", Requirements(3), benchmarks.fit_moving_average,
        "The forecast is the mean of the latest periods.", constants=("window",),
    ),
    _benchmark(
        "drift", "Last value with drift", Requirements(3), benchmarks.fit_drift,
        "The forecast goes on from the last value by the average change since the first.",
    ),
    _form(
        Form("ses", "Simple exponential smoothing"), Requirements(3, intermittent="never"),
        "Brown (1959); Holt (1957)",
        "The forecast is a weighted mean of past periods in which recent ones weigh most; it is the same "
        "for all periods ahead.",
    ),
    _changes(
        "differenced_ses", "Smoothed changes", Requirements(4, intermittent="never"), False,
        "The changes from period to period are smoothed, and the forecast goes on from the last value by "
        "the smoothed change.",
    ),
    _changes(
        "seasonally_differenced_ses", "Smoothed changes on last year",
        Requirements(4, min_seasons=1.5, intermittent="never"), True,
        "The changes on the same season of the year before are smoothed, and the smoothed change is added "
        "to last year's values.",
    ),
    _form(
        Form("holt", "Holt's linear trend", trend=True), Requirements(5, intermittent="never"), "Holt (1957)",
        "A level and a trend are smoothed, and the forecast goes on along the latest trend.",
    ),
    _form(
        Form("damped_holt", "Damped trend", trend=True, damped=True), Requirements(6, intermittent="never"),
        "Gardner & McKenzie (1985)",
        "A level and a trend are smoothed, and the forecast follows the latest trend less and less.",
    ),
    _form(
        Form("holt_winters_additive", "Holt-Winters, additive season", trend=True, season=ADDITIVE),
        _SEASONAL, _WINTERS,
        "Level, trend and season are smoothed; each season adds or takes away about the same amount "
        "every year.",
    ),
    _form(
        Form("damped_holt_winters_additive", "Damped Holt-Winters, additive season", True, True, ADDITIVE),
        _SEASONAL, _DAMPED,
        "Level, a trend that fades out, and season are smoothed; each season adds or takes away about the "
        "same amount every year.",
    ),
    _form(
        Form("holt_winters_multiplicative", "Holt-Winters, multiplicative season", True, False,
             MULTIPLICATIVE),
        _POSITIVE, _WINTERS,
        "Level, trend and season are smoothed; each season is about the same percentage above or below "
        "every year.",
    ),
    _form(
        Form("damped_holt_winters_multiplicative", "Damped Holt-Winters, multiplicative season", True, True,
             MULTIPLICATIVE),
        _POSITIVE, _DAMPED,
        "Level, a trend that fades out, and season are smoothed; each season is about the same percentage "
        "above or below every year.",
    ),
    _rate(
        "croston", "Croston", demand_rate.fit_croston, "Croston (1972)", ("alpha",),
        "The usual size of a demand is divided by the usual gap between demands.",
    ),
    _rate(
        "sba", "Syntetos-Boylan approximation", partial(demand_rate.fit_croston, corrected=True),
        "Syntetos & Boylan (2005)", ("alpha",),
        "The usual size of a demand is divided by the usual gap between demands, less a correction for the "
        "known bias of that ratio.",
    ),
    _rate(
        "tsb", "Teunter-Syntetos-Babai", demand_rate.fit_tsb, "Teunter, Syntetos & Babai (2011)",
        ("alpha", "beta"),
        "The usual size of a demand is multiplied by the current chance of one, which falls while no demand "
        "comes.",
    ),
)

METHODS: Mapping[str, Method] = MappingProxyType({entry.name: entry for entry in _ENTRIES})
"""Every method by name, simple before elaborate: near-ties of a backtest go to the earlier one."""


def named(name: str) -> Method:
    """Return a method by name.

    Raises
    ------
    MethodError
        for an unknown name, with the nearest one.
    """
    if name not in METHODS:
        near = difflib.get_close_matches(str(name), METHODS, 1)
        raise MethodError(
            f"There is no method {name!r}.", where="method", allowed=", ".join(METHODS),
            do=f"Did you mean {near[0]!r}?" if near else "Name one of these.",
            nearest=near[0] if near else None,
        )
    return METHODS[name]


def fit(
    name: str,
    values: Array,
    season_length: int,
    constants: Mapping[str, float] | None = None,
    **options: Any,
) -> Fitted:
    """Fit a method to values.

    Parameters
    ----------
    name : str
        Name in `METHODS`.
    values : array, shape (n,)
        Finite, at least one.
    season_length : int
        Periods a season; 1 for none.
    constants : Mapping[str, float]
        Constants to hold, for example from the settings; those that the method does not
        have are ignored, so that one mapping serves all methods.
    **options
        `initial` and `season_update`, for the methods that take them (`fit_form`).

    Returns
    -------
    Fitted

    Raises
    ------
    MethodError
        for an unknown method or option, impossible constants, missing values, and values
        that the method cannot take.
    """
    entry = named(name)
    held = {key: _constant(key, value) for key, value in (constants or {}).items() if key in entry.constants}
    for option in options:
        if option not in entry.options:
            raise MethodError(
                f"{entry.title} takes no {option!r}.", where=f"method {name}",
                allowed=", ".join((*entry.constants, *entry.options)) or "nothing to set", do="Leave it out.",
            )
    return entry.fit(_finite(values, name), season_length, held, **options)


def smooth(
    series: AnySeries,
    method: str,
    season_length: int | None = None,
    *,
    initial: str | Mapping[str, Any] | None = None,
    season_update: str | None = None,
    nonnegative: bool = True,
    **constants: float,
) -> Fitted:
    """Fit one method to one series, with constants estimated or fixed.

    Parameters
    ----------
    series : SeriesHistory, Series over a PeriodIndex, or array, shape (n,)
        Missing values of a `SeriesHistory` are repaired first; in a Series or an array
        they are refused.
    method : str
        Name in `METHODS`, such as "ses", "damped_holt" or "holt_winters_multiplicative".
    season_length : int, optional
        Periods a season. By default that of the series' frequency; 1 for an array.
    initial, season_update : optional
        Starting states, and the level against which the season is smoothed (`fit_form`).
    nonnegative : bool
        Whether a value under zero of a `SeriesHistory` is a fault to be repaired.
    **constants : float
        Constants to hold: `alpha`, `beta`, `gamma`, `phi`, `window`. Common practice is
        an alpha of .1 to .2; a moving average of w periods has the same mean age of data
        as alpha = 2/(w + 1). What is not held is estimated.

    Returns
    -------
    Fitted

    Raises
    ------
    MethodError
        for an unknown method or constant, an impossible value of one, missing values, and
        values that the method cannot take.

    Examples
    --------
    >>> import numpy as np
    >>> complaints = np.array([27.0, 34, 31, 24, 18, 19])
    >>> smooth(complaints, "ses", alpha=0.2, initial="first value").forecast(2).round(2)
    array([24.56, 24.56])
    """
    values, m = bare_values(series, season_length, nonnegative)
    entry = named(method)
    for name in constants:
        if name not in entry.constants:
            raise MethodError(
                f"{entry.title} has no constant {name!r}.", where=f"method {method}",
                allowed=", ".join((*entry.constants, *entry.options)) or "nothing to set", do="Leave it out.",
            )
    given = {"initial": initial, "season_update": season_update}
    options = {key: value for key, value in given.items() if value is not None}
    return fit(method, values, m, constants, **options)


def _constant(name: str, value: Any) -> float:
    low, high = (1.0, np.inf) if name == "window" else (0.0, 1.0)
    number = isinstance(value, int | float | np.number) and not isinstance(value, bool)
    if not number or not low <= float(value) <= high:
        raise MethodError(
            f"The constant {name} is {value!r}.", where=name,
            allowed="a number of at least 1" if name == "window" else "a number from 0 to 1",
            do="Give such a number, or leave it out to have it estimated.",
        )
    return float(value)


def _finite(values: Array, name: str) -> Array:
    y = np.array(values, dtype=np.float64)
    if y.ndim != 1 or y.size == 0:
        raise MethodError(
            f"The values have the shape {y.shape}.", where=f"method {name}",
            allowed="one row of at least one value", do="Hand in the values of one series.",
        )
    if not np.isfinite(y).all():
        position = int(np.argmin(np.isfinite(y)))
        raise MethodError(
            f"Value {position + 1} of {y.size} is {y[position]:g}.", where=f"method {name}",
            allowed="finite values, none missing",
            do="Repair the series first, or hand in a series history, which is repaired on the way.",
        )
    return y
