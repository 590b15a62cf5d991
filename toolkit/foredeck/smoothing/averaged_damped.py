"""The damped trend method, averaged over its constants."""

from __future__ import annotations

from collections.abc import Mapping
from functools import partial

import numpy as np
from numpy.typing import NDArray

from foredeck.compiled import averages
from foredeck.smoothing.fitted import Fitted
from foredeck.smoothing.seasonal_indices import Core, fit_adjusted

Array = NDArray[np.float64]

_GRID: Mapping[str, Array] = {
    "alpha": np.array([0.05, 0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9, 0.99]),
    "beta": np.array([0.0, 0.05, 0.1, 0.2, 0.4]),
    "phi": np.array([0.8, 0.9, 0.95, 0.98]),
}


def fit_averaged_damped(
    values: Array, season_length: int, constants: Mapping[str, float] | None = None
) -> Fitted:
    """Damped trend, averaged over 220 combinations of constants instead of choosing one.

    Eleven alphas from .05 to .99, the betas 0, .05, .1, .2 and .4 of Holt (1957) and the
    phis .8, .9, .95 and .98 are all combined, so simple smoothing (beta = 0) has a fifth of
    the weight at the outset. Level and trend of the first period are had by running the
    same recursion backwards from the last value. Forecasts are averaged with weights
    proportional to `SSE ** (-k / 2)`, the likelihood of the constants, where `k` is the
    number of one-step errors. Nothing is searched, so there is no local optimum.

    Parameters
    ----------
    values : array, shape (n,); any unit
        Finite, at least one. Seasonally adjusted first (`fit_adjusted`).
    season_length : int
        Periods a season; 1 for none.
    constants : Mapping[str, float]
        `alpha`, `beta`, `phi`, to hold them.

    Returns
    -------
    Fitted
        The constants are weighted means; `final` holds the weighted level and trend.

    References
    ----------
    Gardner & McKenzie (1985), Management Science 31, 1237-1246.
    Hoeting, Madigan, Raftery & Volinsky (1999), Statistical Science 14, 382-417.
    """
    return fit_adjusted(
        learn_averaged_damped, values, season_length, constants, method="averaged_damped",
        title="Averaged damped trend",
    )


def learn_averaged_damped(
    values: Array, season_length: int, constants: Mapping[str, float] | None = None
) -> Core:
    """Fit the averaged damped trend to values without season."""
    axes = dict(_GRID)
    fixed = {name: float(value) for name, value in (constants or {}).items() if name in axes}
    for name, value in fixed.items():
        axes[name] = np.array([value])
    one_step, trends = np.empty(values.size), np.empty(axes["phi"].size)
    level, alpha, beta, phi = averages.averaged_damped(
        values, axes["alpha"], axes["beta"], axes["phi"], one_step, trends
    )
    return Core(one_step, partial(_path, level=level, trends=trends, phis=axes["phi"]),
                {"alpha": alpha, "beta": beta, "phi": phi},
                {"level": level, "trend": float(trends.sum())}, 5 - len(fixed))


def _path(horizon: int, *, level: float, trends: Array, phis: Array) -> Array:
    reach = np.cumsum(phis ** np.arange(1, horizon + 1)[:, np.newaxis], axis=0)
    path: Array = level + (reach * trends).sum(axis=1)
    return path
