"""Methods fitted to the logarithms of seasonally adjusted values.

The forecast is the exponential of a forecast of logarithms. Where the errors of the
logarithms are symmetric it is the median of what may come, not the mean, which lies
above it; it is not corrected, for medians have the smaller absolute errors.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from functools import partial
from typing import Any

import numpy as np
from numpy.typing import NDArray

from foredeck.errors import MethodError
from foredeck.smoothing.averaged_damped import learn_averaged_damped
from foredeck.smoothing.fitted import Fitted
from foredeck.smoothing.seasonal_indices import Core, FitOne, fit_adjusted
from foredeck.smoothing.state_space import Form, fit_form
from foredeck.smoothing.theta_method import learn_dynamic_theta, learn_optimised_theta, learn_theta

Array = NDArray[np.float64]

_HIGHEST = 700.0  # logarithm of the largest value given back: room for a seasonal factor is left


def fit_on_logs(
    fit_one: FitOne,
    values: Array,
    season_length: int,
    constants: Mapping[str, float] | None = None,
    *,
    method: str,
    title: str,
    **options: Any,
) -> Fitted:
    """Fit a method that knows no season to the logarithms of seasonally adjusted values.

    Parameters
    ----------
    fit_one : callable
        `(values, season_length, constants, **options)` to a `Fitted` or a `Core`; it is
        handed logarithms of the values over a power of two in their middle.
    values : array, shape (n,); any unit
        Finite, above zero.
    season_length : int
        Periods a season; 1 for none.
    constants : Mapping[str, float]
        Constants to hold, handed on.
    method, title : str
        Name in the catalogue, and for readers.
    **options
        Handed on.

    Returns
    -------
    Fitted
        Forecasts are medians in the unit of the values. `final` holds the states of the
        logarithms, each named `log_...`, and the seasonal factors as `season`.

    Raises
    ------
    MethodError
        for values at or under zero.
    """
    if values.min() <= 0.0:
        position = int(np.argmin(values))
        raise MethodError(
            f"{title} needs values above zero; value {position + 1} is {values[position]:g}.",
            where=f"method {method}", allowed="values above zero",
            do="Use the method without logarithms.",
        )
    return fit_adjusted(
        partial(_learn, fit_one), values, season_length, constants, method=method, title=title, **options
    )


def fit_log_theta(values: Array, season_length: int, constants: Mapping[str, float] | None = None) -> Fitted:
    """Theta method on logarithms (`fit_theta`, `fit_on_logs`)."""
    return fit_on_logs(
        learn_theta, values, season_length, constants, method="log_theta", title="Theta on logarithms"
    )


def fit_log_optimised_theta(
    values: Array, season_length: int, constants: Mapping[str, float] | None = None
) -> Fitted:
    """Dynamic optimised theta method on logarithms (`fit_optimised_theta`, `fit_on_logs`)."""
    return fit_on_logs(
        learn_optimised_theta, values, season_length, constants, method="log_optimised_theta",
        title="Optimised theta on logarithms",
    )


def fit_log_dynamic_theta(
    values: Array, season_length: int, constants: Mapping[str, float] | None = None
) -> Fitted:
    """Averaged dynamic theta method on logarithms (`fit_dynamic_theta`, `fit_on_logs`)."""
    return fit_on_logs(
        learn_dynamic_theta, values, season_length, constants, method="log_dynamic_theta",
        title="Dynamic theta on logarithms",
    )


def fit_log_averaged_damped(
    values: Array, season_length: int, constants: Mapping[str, float] | None = None
) -> Fitted:
    """Averaged damped trend on logarithms (`fit_averaged_damped`, `fit_on_logs`)."""
    return fit_on_logs(
        learn_averaged_damped, values, season_length, constants, method="log_averaged_damped",
        title="Averaged damped trend on logarithms",
    )


def fit_log_ses(values: Array, season_length: int, constants: Mapping[str, float] | None = None) -> Fitted:
    """Simple exponential smoothing of logarithms (`fit_form`, `fit_on_logs`)."""
    return fit_on_logs(
        partial(fit_form, _SES), values, season_length, constants, method=_SES.name, title=_SES.title
    )


def fit_log_holt(values: Array, season_length: int, constants: Mapping[str, float] | None = None) -> Fitted:
    """Holt's linear trend on logarithms (`fit_form`, `fit_on_logs`)."""
    return fit_on_logs(
        partial(fit_form, _HOLT), values, season_length, constants, method=_HOLT.name, title=_HOLT.title
    )


def fit_log_damped_holt(
    values: Array, season_length: int, constants: Mapping[str, float] | None = None
) -> Fitted:
    """Damped trend on logarithms (`fit_form`, `fit_on_logs`)."""
    return fit_on_logs(
        partial(fit_form, _DAMPED), values, season_length, constants, method=_DAMPED.name, title=_DAMPED.title
    )


_SES = Form("log_ses", "Simple exponential smoothing of logarithms")
_HOLT = Form("log_holt", "Holt's linear trend on logarithms", trend=True)
_DAMPED = Form("log_damped_holt", "Damped trend on logarithms", trend=True, damped=True)


def _learn(
    fit_one: FitOne, values: Array, season_length: int, constants: Mapping[str, float] | None, **options: Any
) -> Core:
    # A power of two in the middle of the exponents: dividing by it neither rounds nor leaves the number range.
    unit = math.ldexp(1.0, (math.frexp(values.min())[1] + math.frexp(values.max())[1]) // 2)
    learned = fit_one(np.log(values / unit), season_length, constants, **options)
    return Core(
        _exponential(learned.fitted, unit), partial(_path, path=learned.path, unit=unit), learned.constants,
        {f"log_{name}": state for name, state in learned.final.items()}, learned.n_parameters,
    )


def _path(horizon: int, *, path: Callable[[int], Array], unit: float) -> Array:
    return _exponential(path(horizon), unit)


def _exponential(logarithms: Array, unit: float) -> Array:
    """Exponentials times the unit; none leaves the number range."""
    return np.exp(np.minimum(logarithms, _HIGHEST - max(math.log(unit), 0.0))) * unit
