"""All methods by name, and the two ways to fit one: `fit` for arrays, `smooth` for people."""

from __future__ import annotations

import difflib
from collections.abc import Mapping
from types import MappingProxyType
from typing import Any

import numpy as np
from numpy.typing import NDArray

from foredeck.errors import MethodError
from foredeck.smoothing.entries import ENTRIES
from foredeck.smoothing.fitted import Fitted
from foredeck.smoothing.method import Method
from foredeck.smoothing.values import AnySeries, bare_values

Array = NDArray[np.float64]

METHODS: Mapping[str, Method] = MappingProxyType({entry.name: entry for entry in ENTRIES})
"""Every method by name, simple before elaborate: near-ties of a backtest go to the earlier one."""


def usual_methods(season_length: int) -> tuple[str, ...]:
    """Names of the methods that speak in a forecast when none are asked for.

    Five members that count the same to begin with, two benchmarks that may earn a voice,
    and the demand-rate family for intermittent series. A temporal hierarchy helps monthly
    series and hurts quarterly ones: there its lowest level, the weighted forms, stands.
    """
    forms = "temporal_hierarchy" if season_length == 12 else "weighted_forms"
    return ("seasonal_naive", "drift_with_season", "log_theta", "dynamic_theta", "log_dynamic_theta",
            "averaged_damped", forms, "croston", "sba", "tsb")


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
