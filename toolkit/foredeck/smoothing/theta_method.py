"""The theta method, and its dynamic form, optimised or averaged.

All are fitted to seasonally adjusted values (`fit_adjusted`). The `learn_` functions are
the methods themselves, without season.

References
----------
Assimakopoulos & Nikolopoulos (2000), International Journal of Forecasting 16, 521-530.
Hyndman & Billah (2003), International Journal of Forecasting 19, 287-290.
Fiorucci, Pellegrini, Louzada, Petropoulos & Koehler (2016), International Journal of
Forecasting 32, 1151-1161.
"""

from __future__ import annotations

from collections.abc import Mapping
from functools import partial

import numpy as np
from numpy.typing import NDArray

from foredeck.compiled import averages
from foredeck.smoothing.fitted import Fitted
from foredeck.smoothing.seasonal_indices import Core, fit_adjusted

Array = NDArray[np.float64]

_HUNDREDTHS = np.arange(1, 100) / 100.0
_ALPHAS = np.array([0.02, 0.05, 0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9, 0.99])


def fit_theta(values: Array, season_length: int, constants: Mapping[str, float] | None = None) -> Fitted:
    """Theta method: half a straight line through all values, half simple smoothing of the line theta = 2.

    The smoothing starts from the first value; alpha is the hundredth from .01 to .99 of
    the least mean absolute one-step error. The published method takes a season out only
    where a test finds one; here the indices are shrunken instead.

    Parameters
    ----------
    values : array, shape (n,); any unit
        Finite, at least one.
    season_length : int
        Periods a season; 1 for none.
    constants : Mapping[str, float]
        `alpha`, to hold it.

    Returns
    -------
    Fitted
        `final` holds level and trend of the forecasts (of adjusted values); the trend is
        half the slope of the line.

    References
    ----------
    Assimakopoulos & Nikolopoulos (2000).
    """
    return fit_adjusted(learn_theta, values, season_length, constants, method="theta", title="Theta")


def fit_optimised_theta(
    values: Array, season_length: int, constants: Mapping[str, float] | None = None
) -> Fitted:
    """Dynamic theta method with the alpha, starting level and theta of least squared one-step error.

    Parameters
    ----------
    values, season_length, constants
        As for `fit_theta`.

    Returns
    -------
    Fitted
        The constant `theta_weight` is `1 - 1 / theta`, the weight of the line, from 0 to
        .98. The line is fitted again in every period, so one-step forecasts begin with the third.

    References
    ----------
    Fiorucci et al. (2016), the dynamic optimised theta model.
    """
    return fit_adjusted(
        learn_optimised_theta, values, season_length, constants, method="optimised_theta", title="Optimised theta"
    )


def fit_dynamic_theta(
    values: Array, season_length: int, constants: Mapping[str, float] | None = None
) -> Fitted:
    """Dynamic theta method, averaged over alpha instead of choosing one.

    At each of twelve alphas from .02 to .99 starting level and theta are those of least
    squares; the forecasts are averaged with weights proportional to `SSE ** (-k / 2)`,
    the likelihood of that alpha, where `k` is the number of one-step errors.

    Parameters
    ----------
    values, season_length, constants
        As for `fit_theta`.

    Returns
    -------
    Fitted
        `alpha` and `theta_weight` (see `fit_optimised_theta`) are weighted means.

    References
    ----------
    Fiorucci et al. (2016). Hoeting, Madigan, Raftery & Volinsky (1999),
    Statistical Science 14, 382-417, for averages weighted by likelihood.
    """
    return fit_adjusted(
        learn_dynamic_theta, values, season_length, constants, method="dynamic_theta", title="Dynamic theta"
    )


def learn_theta(values: Array, season_length: int, constants: Mapping[str, float] | None = None) -> Core:
    """Fit the theta method to values without season."""
    alphas, free = _axis(constants, _HUNDREDTHS)
    one_step = np.empty(values.size)
    alpha, level, trend = averages.theta(values, alphas, one_step)
    return Core(one_step, partial(_line, level=level, trend=trend), {"alpha": alpha},
                {"level": level, "trend": trend}, 2 + free)


def learn_optimised_theta(
    values: Array, season_length: int, constants: Mapping[str, float] | None = None
) -> Core:
    """Fit the dynamic optimised theta method to values without season."""
    alphas, free = _axis(constants, _ALPHAS)
    if free:
        alphas = np.array([averages.dynamic_theta_alpha(values, alphas)])
    return _dynamic(values, alphas, free)


def learn_dynamic_theta(
    values: Array, season_length: int, constants: Mapping[str, float] | None = None
) -> Core:
    """Fit the averaged dynamic theta method to values without season."""
    return _dynamic(values, *_axis(constants, _ALPHAS))


def _axis(constants: Mapping[str, float] | None, grid: Array) -> tuple[Array, int]:
    """Alphas to try, and 1 where alpha is free."""
    if constants and "alpha" in constants:
        return np.array([constants["alpha"]], dtype=np.float64), 0
    return grid, 1


def _dynamic(values: Array, alphas: Array, free: int) -> Core:
    one_step, states = np.empty(values.size), np.empty((alphas.size, 6))
    alpha, weight, level = averages.dynamic_theta(values, alphas, one_step, states)
    return Core(one_step, partial(_dynamic_path, values=values, states=states),
                {"alpha": alpha, "theta_weight": weight}, {"level": level}, 2 + free)


def _line(horizon: int, *, level: float, trend: float) -> Array:
    return level + trend * np.arange(1.0, horizon + 1)


def _dynamic_path(horizon: int, *, values: Array, states: Array) -> Array:
    path = np.empty(horizon)
    averages.dynamic_theta_path(values, states, path)
    return path
