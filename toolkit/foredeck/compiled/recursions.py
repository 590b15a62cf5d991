"""One recursion for every error, trend and season form of exponential smoothing; its gradient; its beginning.

Bare arrays in and out. A state is an array `[level, trend, index 0, ..., index m-1]`;
index `j` belongs to the periods `t` with `t % m == j`, counted from the first value.
Constants are an array `[alpha, beta, gamma, phi]`: beta smooths the trend as in Holt
(1957), so the state-space coefficient of Hyndman et al. (2008) is `alpha * beta`.
A form without trend has trend 0, beta 0 and phi 1; one without season has `m = 1`.
At the end stand the two recursions for demand that comes now and then.

References
----------
Holt (1957), reprinted in International Journal of Forecasting 20 (2004), 5-10.
Winters (1960), Management Science 6, 324-342.
Gardner & McKenzie (1985), Management Science 31, 1237-1246 (damped trend).
Hyndman, Koehler, Ord & Snyder (2008), Forecasting with Exponential Smoothing,
tables 2.1 to 2.3; section 5.1 for the criterion.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from foredeck.compiled.compiler import compiled

Array = NDArray[np.float64]

NO_SEASON, ADDITIVE, MULTIPLICATIVE = 0, 1, 2
"""How the season enters the forecast: not at all, added, or as a factor. An error is one of the last two."""

_FLOOR = 1e-8  # of data of order one: a level, factor or forecast under it counts as no longer above zero


@compiled
def run(
    y: Array, first: int, error: int, season: int, m: int, new_level: bool, constants: Array, state: Array,
    errors: Array, trace: Array,
) -> tuple[float, float]:
    """Run the recursion from period `first` to the end.

    `state` holds the states before period `first` and, afterwards, those after the last
    period. `errors` (shape of `y`) is filled from `first` on with actual minus forecast,
    `trace` (3, n) with the expected level, the trend and the season's index before each
    period. The season is smoothed against the level expected before the period
    (`new_level` False, the state-space form) or the new level (True, Winters 1960).

    Returns the sum of squared one-step errors, of relative ones (error over forecast)
    when the error is multiplicative, and then twice the sum of the forecasts' logarithms.
    Where a form that needs them loses values above zero, the sum is infinite.
    """
    alpha, beta, gamma, phi = constants[0], constants[1], constants[2], constants[3]
    slope = alpha * beta
    reach = alpha + phi * slope
    lift = alpha if new_level else 0.0
    share = gamma * (1.0 - lift)
    level, trend = state[0], state[1]
    damped = phi * trend
    expected = level + damped
    place = 2 + first % m
    total, logarithms, product = 0.0, 0.0, 1.0
    inside = True
    for t in range(first, y.size):
        trace[0, t], trace[1, t] = expected, trend
        if season == MULTIPLICATIVE:
            index = state[place]
            trace[2, t] = index
            forecast = expected * index
            miss = y[t] - forecast
            pull = y[t] / index - expected
            reference = expected + lift * pull
            # A level that has fallen to zero says nothing about the season: the index stays as it is.
            if reference > 0.0:
                state[place] = index + gamma * (y[t] / reference - index)
            inside = inside and expected > _FLOOR and reference > _FLOOR and index > _FLOOR
        elif season == ADDITIVE:
            index = state[place]
            forecast = expected + index
            miss = y[t] - forecast
            pull = miss
            state[place] = index + share * miss
        else:
            forecast = expected
            miss = y[t] - forecast
            pull = miss
        level = expected + alpha * pull
        # The next expected level, level + phi * trend, with its parts in the order that keeps
        # the chain from one forecast to the next short: that chain is what a run takes its time for.
        expected = (expected + phi * damped) + reach * pull
        trend = damped + slope * pull
        damped = phi * trend
        errors[t] = miss
        if error == ADDITIVE:
            total += miss * miss
        elif forecast > _FLOOR:
            relative = miss / forecast
            total += relative * relative
            product *= forecast
            if product > 1e100 or product < 1e-100:  # one logarithm for many factors
                logarithms += math.log(product)
                product = 1.0
        else:
            inside = False
        place += 1
        if place == m + 2:
            place = 2
    state[0], state[1] = level, trend
    return (total if inside else np.inf), 2.0 * (logarithms + math.log(product))


@compiled
def run_back(
    y: Array, first: int, error: int, season: int, m: int, new_level: bool, constants: Array, total: float,
    errors: Array, trace: Array, gradient: Array,
) -> None:
    """Fill `gradient` with the derivatives of the deviance, by running the recursion backwards.

    The deviance is `n log(total) + 2 sum(log forecast)`, the last part for multiplicative
    errors; `total`, `errors` and `trace` are those of `run` inside the positive region.
    The order is that of constants and state: alpha, beta, gamma, phi, level, trend,
    indices. Every line is the derivative of a line of `run` (the adjoint of the
    recursion), so all derivatives come in one pass, whatever their number.
    """
    alpha, beta, gamma, phi = constants[0], constants[1], constants[2], constants[3]
    slope = alpha * beta
    lift, lifted = (alpha, 1.0) if new_level else (0.0, 0.0)
    share = gamma * (1.0 - lift)
    by_alpha, by_beta, by_gamma, by_share, by_phi, by_level, by_trend = 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0
    gradient[6:] = 0.0
    n = y.size
    factor = 2.0 * (n - first) / total
    place = 6 + (n - 1) % m
    for t in range(n - 1, first - 1, -1):
        miss, expected, trend = errors[t], trace[0, t], trace[1, t]
        by_forecast = -factor * miss
        if error == MULTIPLICATIVE:
            inverse = 1.0 / (y[t] - miss)
            by_forecast = inverse * (2.0 - factor * miss * y[t] * inverse * inverse)
        pull = miss
        kept = (1.0 - alpha) * by_level
        by_step = by_level + beta * by_trend
        if season == MULTIPLICATIVE:
            index, by_index = trace[2, t], gradient[place]
            scaled = y[t] / index
            pull = scaled - expected
            reference = expected + lift * pull
            ratio = y[t] / reference
            by_gamma += by_index * (ratio - index)
            by_reference = -gamma * by_index * ratio / reference
            by_step += lifted * by_reference
            gradient[place] = (1.0 - gamma) * by_index + by_forecast * expected - alpha * by_step * scaled / index
            kept += by_forecast * index + (1.0 - lift) * by_reference
        elif season == ADDITIVE:
            by_index = gradient[place]
            by_share += by_index * miss
            by_forecast -= share * by_index
            gradient[place] = by_index + by_forecast - alpha * by_step
            kept += by_forecast
        else:
            kept += by_forecast
        by_alpha += by_step * pull
        by_beta += by_trend * pull
        by_expected = kept - slope * by_trend
        by_damped = by_trend + by_expected
        by_phi += by_damped * trend
        by_trend = phi * by_damped
        by_level = by_expected
        place -= 1
        if place == 5:
            place = m + 5
    by_beta *= alpha
    by_alpha -= lifted * by_share * gamma
    by_share *= 1.0 - lift
    gradient[0], gradient[1], gradient[2], gradient[3] = by_alpha, by_beta, by_gamma + by_share, by_phi
    gradient[4], gradient[5] = by_level, by_trend


@compiled
def respond(
    y: Array, season: int, m: int, new_level: bool, constants: Array, indices: Array, errors: Array, unit: Array,
    slope: Array,
) -> None:
    """Run an additive form from starting states of 0, and its responses to one unit of a state.

    `errors` receives the one-step errors; `unit` and `slope` minus what a unit of the
    first index (of the level, without season) and of the trend adds to the forecasts of
    nothing. The three runs side by side take hardly longer than one. `indices` (3, m) is
    room for their seasons.
    """
    alpha, beta, gamma, phi = constants[0], constants[1], constants[2], constants[3]
    steep = alpha * beta
    reach = alpha + phi * steep
    share = gamma * (1.0 - alpha) if new_level else gamma
    seasonal = season != NO_SEASON
    indices[:, :] = 0.0
    indices[1, 0] = 1.0
    own, own_damped = 0.0, 0.0
    one, one_damped = (0.0 if seasonal else 1.0), 0.0
    trend, trend_damped = phi, phi
    place = 0
    for t in range(y.size):
        miss, less, lesser = y[t] - own, -one, -trend
        if seasonal:
            miss -= indices[0, place]
            less -= indices[1, place]
            lesser -= indices[2, place]
            indices[0, place] += share * miss
            indices[1, place] += share * less
            indices[2, place] += share * lesser
            place += 1
            if place == m:
                place = 0
        own = (own + phi * own_damped) + reach * miss
        one = (one + phi * one_damped) + reach * less
        trend = (trend + phi * trend_damped) + reach * lesser
        own_damped = phi * (own_damped + steep * miss)
        one_damped = phi * (one_damped + steep * less)
        trend_damped = phi * (trend_damped + steep * lesser)
        errors[t], unit[t], slope[t] = miss, less, lesser


@compiled
def normal_equations(unit: Array, slope: Array, errors: Array, trend: bool, gram: Array, right: Array) -> None:
    """Fill the system of least squares from the responses to one unit, to the trend, and the errors to be explained.

    The unit acts `j` periods later for unknown `j`, so products of responses are those
    at the distance of their lags, cut off where the later one runs out.
    """
    n, m = unit.size, right.size - trend
    gram[:, :] = 0.0
    body = max(n - m, 0) // 2 * 2
    for lag in range(m):
        # Sums over even and odd periods run side by side.
        squares, more, pulls, odd, across, other = 0.0, 0.0, 0.0, 0.0, 0.0, 0.0
        for t in range(0, body, 2):
            squares += unit[t] * unit[t + lag]
            more += unit[t + 1] * unit[t + 1 + lag]
            pulls -= unit[t] * errors[t + lag]
            odd -= unit[t + 1] * errors[t + 1 + lag]
            across += unit[t] * slope[t + lag]
            other += unit[t + 1] * slope[t + 1 + lag]
        squares, pulls, across = squares + more, pulls + odd, across + other
        for t in range(body, n - lag):
            squares += unit[t] * unit[t + lag]
            pulls -= unit[t] * errors[t + lag]
            across += unit[t] * slope[t + lag]
            later = n - 1 - t
            if later < m:
                gram[later - lag, later] = squares
        right[lag] = pulls
        if trend:
            gram[lag, m] = across
    if trend:
        square, pulls = 0.0, 0.0
        for t in range(n):
            square += slope[t] * slope[t]
            pulls -= slope[t] * errors[t]
        gram[m, m], right[m] = square, pulls


@compiled
def remaining(unit: Array, slope: Array, errors: Array, trend: bool, found: Array) -> float:
    """Add to the errors the responses to the states found; return the sum of squares left."""
    n, m = unit.size, found.size - trend
    for lag in range(m):
        later, state = errors[lag:], found[lag]
        for t in range(n - lag):
            later[t] += state * unit[t]
    climb = found[m] if trend else 0.0
    total = 0.0
    for t in range(n):
        errors[t] += climb * slope[t]
        total += errors[t] * errors[t]
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


@compiled
def classical_start(y: Array, m: int, trend: bool, season: int, positive: bool, state: Array) -> None:
    """Fill `state` by Hyndman, Koehler, Ord & Snyder (2008), section 2.6.1.

    The season comes from ratios or distances to the centred moving average of the first four
    seasons (as many as there are; indices stay neutral under two), level and trend from
    a line through the first ten seasonally adjusted values.
    """
    state[:] = 0.0
    if season != NO_SEASON:
        state[2:] = 1.0 if season == MULTIPLICATIVE else 0.0
        if y.size >= 2 * m:
            first_indices(y, m, season, state)
    few = min(10, y.size)
    middle = (few - 1) / 2.0
    mean, product, square = 0.0, 0.0, 0.0
    for t in range(few):
        value = y[t]
        if season == MULTIPLICATIVE:
            value /= state[2 + t % m]
        elif season == ADDITIVE:
            value -= state[2 + t % m]
        mean += value / few
        product += (t - middle) * value
        square += (t - middle) * (t - middle)
    slope = product / square if few > 1 else 0.0
    state[0] = mean - slope * (middle + 1.0)
    state[1] = slope if trend else 0.0
    if positive and state[0] <= 1e-3 * mean:
        # A steep rise from nothing: factors and relative errors need a level above zero.
        state[0], state[1] = mean, 0.0


@compiled
def first_indices(y: Array, m: int, season: int, state: Array) -> None:
    """Fill the indices of `state` with the mean ratios or distances to the centred moving average."""
    half = m // 2
    counts = np.zeros(m)
    indices = np.zeros(m)
    for t in range(half, m * min(4, y.size // m) - half):
        smooth = 0.0
        for k in range(t - half, t + half + 1):
            smooth += y[k] / m
        if m % 2 == 0:
            smooth -= 0.5 * (y[t - half] + y[t + half]) / m
        indices[t % m] += y[t] / smooth if season == MULTIPLICATIVE else y[t] - smooth
        counts[t % m] += 1.0
    mean = 0.0
    for j in range(m):
        indices[j] /= counts[j]
        mean += indices[j] / m
    for j in range(m):
        state[2 + j] = indices[j] / mean if season == MULTIPLICATIVE else indices[j] - mean


@compiled
def croston(y: Array, alpha: float, factor: float, state: Array, one_step: Array) -> float:
    """Smooth the sizes of demands and the gaps between them; return the sum of squared errors.

    The first demand gives the starting size, and the periods up to and including it the
    starting gap. `one_step` receives `factor * size / gap` as known before each period,
    NaN up to and including the first demand. `state` receives size and gap after the
    last period, both 0 where there was no demand.

    References
    ----------
    Croston (1972), Operational Research Quarterly 23, 289-303. `factor` is 1 there, and
    1 - alpha/2 in Syntetos & Boylan (2005), International Journal of Forecasting 21, 303-314.
    """
    size, gap, waited = 0.0, 0.0, 1.0
    total = 0.0
    for t in range(y.size):
        if gap > 0.0:
            one_step[t] = factor * size / gap
            total += (y[t] - one_step[t]) ** 2
        else:
            one_step[t] = np.nan
        if y[t] > 0.0:
            if gap > 0.0:
                size += alpha * (y[t] - size)
                gap += alpha * (waited - gap)
            else:
                size, gap = y[t], waited
            waited = 1.0
        else:
            waited += 1.0
    state[0], state[1] = size, gap
    return total


@compiled
def tsb(y: Array, alpha: float, beta: float, state: Array, one_step: Array) -> float:
    """Smooth demand sizes and the probability of a demand; return the sum of squared errors.

    `state` holds size and probability before the first period and, afterwards, those
    after the last. `one_step` receives their product as known before each period.

    References
    ----------
    Teunter, Syntetos & Babai (2011), European Journal of Operational Research 214, 606-615.
    """
    size, chance = state[0], state[1]
    total = 0.0
    for t in range(y.size):
        one_step[t] = size * chance
        total += (y[t] - one_step[t]) ** 2
        if y[t] > 0.0:
            size += alpha * (y[t] - size)
            chance += beta * (1.0 - chance)
        else:
            chance -= beta * chance
    state[0], state[1] = size, chance
    return total
