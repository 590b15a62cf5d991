"""Simple smoothing of changes: from period to period, or from year to year."""

from __future__ import annotations

from collections.abc import Mapping
from functools import partial
from typing import Any

import numpy as np
from numpy.typing import NDArray

from foredeck.compiled.recursions import NO_SEASON
from foredeck.errors import MethodError
from foredeck.smoothing.fitted import Fitted, from_forecasts
from foredeck.smoothing.state_space import Form, fit_form

Array = NDArray[np.float64]


def fit_differenced(
    name: str,
    title: str,
    values: Array,
    season_length: int,
    lag: int,
    constants: Mapping[str, float] | None = None,
    *,
    initial: str | Mapping[str, Any] = "estimated",
) -> Fitted:
    """Smooth the differences at a lag, and add the forecast difference back.

    Parameters
    ----------
    name, title : str
        Name in the catalogue, and for readers.
    values : array, shape (n,)
        Finite; n greater than `lag`.
    season_length : int
    lag : int
        1 for changes from period to period, the season length for changes on the year.
    constants, initial
        Of simple smoothing, as for `fit_form`.

    Returns
    -------
    Fitted
        One-step forecasts and residuals are those of the values; NaN in the first `lag`.

    Raises
    ------
    MethodError
        if there are not more values than the lag.

    References
    ----------
    Box & Jenkins (1970): with ordinary differences this is ARIMA(0,2,1) with
    theta = 1 - alpha, with seasonal ones (0,1,1)(0,1,0).
    """
    if values.size <= lag:
        raise MethodError(
            f"{title} needs more than {lag} periods; there are {values.size}.", where=f"method {name}",
            allowed=f"at least {lag + 1} periods", do="Use a method that needs less history.",
        )
    form = Form(name, title, season=NO_SEASON)
    changes = fit_form(form, values[lag:] - values[:-lag], 1, constants, initial=initial)
    one_step = np.concatenate([np.full(lag, np.nan), values[:-lag] + changes.fitted])
    change = float(changes.final["level"])
    return from_forecasts(
        values, one_step, method=name, title=title, season_length=season_length,
        constants=changes.constants, initial={"change": changes.initial["level"]}, final={"change": change},
        n_parameters=changes.n_parameters,
        path=partial(_path, season=values[-lag:].copy(), change=change),
        spread=partial(_spread, alpha=changes.constants["alpha"], lag=lag),
    )


def _path(horizon: int, *, season: Array, change: float) -> Array:
    turn = np.arange(horizon) // season.size + 1
    return np.resize(season, horizon) + change * turn


def _spread(horizon: int, *, alpha: float, lag: int) -> Array:
    """Variance by lead: the weights of past errors on the changes, summed along the lag."""
    weights = np.concatenate([[1.0], np.full(horizon - 1, alpha)])
    for lead in range(lag, horizon):
        weights[lead] += weights[lead - lag]
    return np.cumsum(weights**2)


