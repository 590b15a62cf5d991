"""One recursion for every trend and season form of exponential smoothing.

Bare arrays in and out. A state is an array `[level, trend, index 0, ..., index m-1]`;
index `j` belongs to the periods `t` with `t % m == j`, counted from the first value.
Constants are an array `[alpha, beta, gamma, phi]`: beta smooths the trend as in Holt
(1957), so the state-space coefficient of Hyndman et al. (2008) is `alpha * beta`.
A form without trend has trend 0, beta 0 and phi 1; one without season has `m = 1`.

References
----------
Holt (1957), reprinted in International Journal of Forecasting 20 (2004), 5-10.
Winters (1960), Management Science 6, 324-342.
Gardner & McKenzie (1985), Management Science 31, 1237-1246 (damped trend).
Hyndman, Koehler, Ord & Snyder (2008), Forecasting with Exponential Smoothing,
tables 2.1 and 2.2.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from foredeck.compiled.compiler import compiled

Array = NDArray[np.float64]

NO_SEASON, ADDITIVE, MULTIPLICATIVE = 0, 1, 2
"""How the season enters the forecast: not at all, added, or as a factor."""


@compiled
def run(
    y: Array, first: int, season: int, m: int, new_level: bool, constants: Array, state: Array, errors: Array
) -> float:
    """Run the recursion from period `first` to the end; return the sum of squared one-step errors.

    `state` holds the states before period `first` and, afterwards, those after the last
    period. `errors` (shape of `y`) is filled from `first` on with actual minus forecast.
    The season is smoothed against the level expected before the period (`new_level`
    False, the state-space form) or against the new level (True, Winters 1960).
    """
    alpha, beta, gamma, phi = constants[0], constants[1], constants[2], constants[3]
    level, trend = state[0], state[1]
    share = gamma * (1.0 - alpha) if new_level else gamma
    place = 2 + first % m
    total = 0.0
    for t in range(first, y.size):
        expected = level + phi * trend
        if season == MULTIPLICATIVE:
            index = state[place]
            error = y[t] - expected * index
            step = alpha * error / index
            reference = expected + step if new_level else expected
            # A level that has fallen to zero says nothing about the season: the index stays as it is.
            if reference > 0.0:
                state[place] = index + gamma * (y[t] / reference - index)
        elif season == ADDITIVE:
            error = y[t] - expected - state[place]
            step = alpha * error
            state[place] += share * error
        else:
            error = y[t] - expected
            step = alpha * error
        level = expected + step
        trend = phi * trend + beta * step
        errors[t] = error
        total += error * error
        place += 1
        if place == m + 2:
            place = 2
    state[0], state[1] = level, trend
    return total


@compiled
def project(n: int, season: int, m: int, phi: float, state: Array, path: Array) -> None:
    """Fill `path` with the forecasts of the periods after the `n` known ones, from the last states."""
    damping, reach = 1.0, 0.0
    for lead in range(path.size):
        damping *= phi
        reach += damping
        path[lead] = state[0] + reach * state[1]
        if season == MULTIPLICATIVE:
            path[lead] *= state[2 + (n + lead) % m]
        elif season == ADDITIVE:
            path[lead] += state[2 + (n + lead) % m]
