"""Shrunken seasonal indices, the theta lines, and smoothing averaged over a grid of constants.

Bare arrays in and out. Every function brings its values to order one before it squares
anything, and gives its results back in the unit of the values. One-step forecasts are NaN
before the first error that counts. Index `j` of a season belongs to the periods
`t` with `t % m == j`, counted from the first value.

References
----------
Assimakopoulos & Nikolopoulos (2000), International Journal of Forecasting 16, 521-530.
Fiorucci, Pellegrini, Louzada, Petropoulos & Koehler (2016), same journal 32, 1151-1161.
Gardner & McKenzie (1985), Management Science 31, 1237-1246 (damped trend).
Miller & Williams (2003), International Journal of Forecasting 19, 669-684.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from foredeck.compiled.compiler import compiled

Array = NDArray[np.float64]

LOWEST_INDEX = 0.02
"""Smallest seasonal factor: taking the season out magnifies no value more than fifty-fold."""

HIGHEST_WEIGHT = 0.98
"""Largest weight of the trend line in the dynamic theta method: a theta of 50."""

_PERFECT = 1e-20  # a mean squared error of scaled data under this is a perfect fit
_ROUNDING = 1e-14  # distances from the mean under this part of it are rounding
_TIE = 1e-10  # losses that differ by less than this part are equal: rounding must not choose


@compiled
def scaled(values: Array) -> tuple[Array, float, float]:
    """Return values of order one, and the centre and the scale they had.

    The centre is the mean, the scale the mean absolute distance from it; where that is no
    more than rounding, the values are constant and the scale is their size, or 1 for
    zeros. Neither sum nor squares are formed, which may leave the number range.
    """
    centre, distance = 0.0, 0.0
    for t in range(values.size):
        centre += values[t] / values.size
    for t in range(values.size):
        distance += abs(values[t] - centre) / values.size
    scale = distance
    if distance <= _ROUNDING * abs(centre):
        scale = abs(centre) if centre != 0.0 else 1.0
    return (values - centre) / scale, centre, scale


@compiled
def distances(values: Array, m: int, multiplicative: bool, relative: Array) -> None:
    """Fill `relative` with the values relative to their centred moving average over `m` periods; NaN at the ends.

    They are divided by it for factors, otherwise it is taken away. For an even `m` the
    first and the last of `m + 1` values count half.
    """
    half = m // 2
    end = 0.5 if m % 2 == 0 else 1.0
    relative[:] = np.nan
    for t in range(half, values.size - half):
        average = end * (values[t - half] + values[t + half])
        for k in range(t - half + 1, t + half):
            average += values[k]
        average /= m
        relative[t] = values[t] / average if multiplicative else values[t] - average


@compiled
def seasonal_indices(values: Array, m: int, multiplicative: bool, indices: Array) -> None:
    """Fill `indices` (m,) with classical seasonal indices, shrunk towards none by the rule of James and Stein.

    The classical index is the mean of what `distances` gives for a season, and the indices
    have the mean 1 (factors) or 0. Of its distance from there a share is taken away, the
    variance of an index over the variance among the indices times `(m - 3) / (m - 1)`,
    where `m - 3` is not under 1 and the share not over 1. With fewer than `2 m + 1` values
    there is no season.

    References
    ----------
    James & Stein (1961), Proceedings of the Fourth Berkeley Symposium 1, 361-379.
    Miller & Williams (2003).
    """
    neutral = 1.0 if multiplicative else 0.0
    indices[:] = neutral
    if m < 2 or values.size < 2 * m + 1:
        return
    y, _, scale = scaled(values)
    relative = np.empty(values.size)
    distances(values if multiplicative else y, m, multiplicative, relative)
    first, last = m // 2, values.size - m // 2
    sums, counts = np.zeros(m), np.zeros(m)
    for t in range(first, last):
        sums[t % m] += relative[t]
        counts[t % m] += 1.0
    mean = 0.0
    for j in range(m):
        indices[j] = sums[j] / counts[j]
        mean += indices[j] / m
    among, within = 0.0, 0.0
    for j in range(m):
        indices[j] = max(indices[j] / mean, LOWEST_INDEX) if multiplicative else indices[j] - mean
        among += (indices[j] - neutral) ** 2 / (m - 1)
    for t in range(first, last):
        within += (relative[t] - indices[t % m]) ** 2
    known = last - first
    noise = within / (known - m) / (known / m)
    taken = 1.0
    if among > 0.0:
        taken = min(1.0, noise / among * max(m - 3.0, 1.0) / (m - 1.0))
    for j in range(m):
        indices[j] = neutral + (1.0 - taken) * (indices[j] - neutral)
        if not multiplicative:
            indices[j] *= scale


@compiled
def likelihood_weights(sse: Array, count: int, weights: Array) -> None:
    """Fill `weights` with `sse ** (-count / 2)`, scaled to the sum 1.

    That is the likelihood of each row's constants, under normal errors of unknown
    variance, and so their probability where all were as likely before. `sse` is of
    scaled data and `count` the number of its errors.
    """
    floor = _PERFECT * max(count, 1)
    best = max(sse.min(), floor)
    total = 0.0
    for i in range(sse.size):
        weights[i] = math.exp(-0.5 * count * math.log(max(sse[i], floor) / best))
        total += weights[i]
    for i in range(sse.size):
        weights[i] /= total


@compiled
def theta(values: Array, alphas: Array, one_step: Array) -> tuple[float, float, float]:
    """Fit the theta method with the lines 0 and 2; return alpha, and level and trend of the forecasts.

    The theta-0 line is the least-squares line `intercept + slope t` through the values
    of the periods 1, 2, ...; the theta-2 line, twice the values less that line, is smoothed
    from its first value on. Of `alphas` (rising) that of the least sum of absolute
    one-step errors is taken. Forecasts are the mean of both lines: at lead h they are
    `level + trend h`, where the trend is half the slope.
    """
    n = values.size
    y, centre, scale = scaled(values)
    middle, slope, squares = 0.5 * (n + 1), 0.0, 0.0
    for t in range(n):
        slope += (t + 1 - middle) * y[t]
        squares += (t + 1 - middle) ** 2
    slope = slope / squares if n > 1 else 0.0
    line = np.empty(n)
    for t in range(n):
        line[t] = 2.0 * y[t] - slope * (t + 1 - middle)
    levels, losses = np.full(alphas.size, line[0]), np.zeros(alphas.size)
    for t in range(1, n):
        for i in range(alphas.size):
            miss = line[t] - levels[i]
            losses[i] += abs(miss)
            levels[i] += alphas[i] * miss
    best, least = 0, np.inf
    for i in range(alphas.size):
        loss = max(losses[i], math.sqrt(_PERFECT) * n)
        if loss < least * (1.0 - _TIE):
            best, least = i, loss
    level = line[0]
    one_step[0] = np.nan
    for t in range(1, n):
        one_step[t] = centre + scale * 0.5 * (level + slope * (t + 1 - middle))
        level += alphas[best] * (line[t] - level)
    level = 0.5 * (level + slope * (n - middle))
    return alphas[best], centre + scale * level, scale * 0.5 * slope


@compiled
def running_lines(y: Array, means: Array, slopes: Array) -> None:
    """Fill entry `t` with mean and slope of the least-squares line through the first `t` values.

    The slope is updated as in Fiorucci et al. (2016); it is 0 for one value.
    The line's intercept is `mean - slope (t + 1) / 2`.
    """
    means[0], slopes[0] = 0.0, 0.0
    for t in range(1, y.size + 1):
        means[t] = means[t - 1] + (y[t - 1] - means[t - 1]) / t
        slopes[t] = 0.0
        if t > 1:
            slopes[t] = ((t - 2) * slopes[t - 1] + 6.0 / t * (y[t - 1] - means[t - 1])) / (t + 1)


@compiled
def best_start(y: Array, means: Array, slopes: Array, alpha: float) -> tuple[float, float]:
    """Return the starting level and the weight of the line that give the least sum of squared errors.

    For a given alpha each one-step forecast is linear in both, so this is a regression
    without search. Errors count from the third period, the first with a line through the
    values before it. The weight is kept from 0 to `HIGHEST_WEIGHT`; it is .5, the weight of
    the standard method, where the values do not tell.
    """
    decay, reach, own = 1.0, 1.0, 0.0
    aa, ab, bb, ay, by = 0.0, 0.0, 0.0, 0.0, 0.0
    for t in range(1, y.size + 1):
        if t > 2:
            pull = decay * (means[t - 1] - slopes[t - 1] * 0.5 * t) + reach * slopes[t - 1]
            rest = y[t - 1] - own
            aa += decay * decay
            ab += decay * pull
            bb += pull * pull
            ay += decay * rest
            by += pull * rest
        own += alpha * (y[t - 1] - own)
        decay *= 1.0 - alpha
        reach = 1.0 + (1.0 - alpha) * reach
    weight = 0.5
    determinant = aa * bb - ab * ab
    if determinant > 1e-12 * aa * bb:
        weight = min(max((aa * by - ab * ay) / determinant, 0.0), HIGHEST_WEIGHT)
    elif aa < 1e-12 * bb:
        weight = min(max(by / bb, 0.0), HIGHEST_WEIGHT)
    level = (ay - weight * ab) / aa if aa > 1e-12 * max(bb, 1e-30) else (1.0 - weight) * y[0]
    return level, weight


@compiled
def dynamic_theta_errors(
    y: Array, means: Array, slopes: Array, alpha: float, state: Array, one_step: Array
) -> float:
    """Run the dynamic theta method at one alpha; return the sum of squared errors from the third period on.

    `state` receives alpha, the weight `1 - 1/theta` of the line, the level after the last
    period, `(1 - alpha)^n` and `1 + (1 - alpha) + ... + (1 - alpha)^n`.
    """
    level, weight = best_start(y, means, slopes, alpha)
    decay, reach, total = 1.0, 1.0, 0.0
    for t in range(1, y.size + 1):
        pull = decay * (means[t - 1] - slopes[t - 1] * 0.5 * t) + reach * slopes[t - 1]
        one_step[t - 1] = level + weight * pull
        if t > 2:
            total += (y[t - 1] - one_step[t - 1]) ** 2
        level += alpha * (y[t - 1] - level)
        decay *= 1.0 - alpha
        reach = 1.0 + (1.0 - alpha) * reach
    state[0], state[1], state[2], state[3], state[4] = alpha, weight, level, decay, reach
    return total


@compiled
def dynamic_theta(values: Array, alphas: Array, one_step: Array, states: Array) -> tuple[float, float, float]:
    """Average the dynamic theta method over `alphas`, weighted by likelihood.

    `states` (alphas, 6) receives the state of each run (`dynamic_theta_errors`) and last
    its weight in the average; `dynamic_theta_path` forecasts from them. Returns the
    weighted means of alpha, the line's weight and the level after the last period.
    """
    n, k = values.size, alphas.size
    y, centre, scale = scaled(values)
    means, slopes = np.empty(n + 1), np.empty(n + 1)
    running_lines(y, means, slopes)
    sse, weights, forecasts = np.empty(k), np.empty(k), np.empty((k, n))
    for i in range(k):
        sse[i] = dynamic_theta_errors(y, means, slopes, alphas[i], states[i], forecasts[i])
    likelihood_weights(sse, max(n - 2, 0), weights)
    one_step[:] = centre
    mean_alpha, mean_weight, mean_level = 0.0, 0.0, 0.0
    for i in range(k):
        states[i, 5] = weights[i]
        mean_alpha += weights[i] * alphas[i]
        mean_weight += weights[i] * states[i, 1]
        # A shift of the values moves the level less than itself as long as the start is remembered.
        mean_level += weights[i] * (scale * states[i, 2] + centre * (1.0 - states[i, 1] * states[i, 3]))
        for t in range(n):
            one_step[t] += weights[i] * scale * forecasts[i, t]
    one_step[:2] = np.nan
    return mean_alpha, mean_weight, mean_level


@compiled
def dynamic_theta_path(values: Array, states: Array, path: Array) -> None:
    """Fill `path` with the average forecast of the periods after `values`, from the states of `dynamic_theta`.

    Each run takes its own forecast for the next value, so its line and level go on being
    updated.
    """
    n = values.size
    y, centre, scale = scaled(values)
    means, slopes = np.empty(n + 1), np.empty(n + 1)
    running_lines(y, means, slopes)
    path[:] = centre
    for i in range(states.shape[0]):
        alpha, weight, level, decay, reach = states[i, 0], states[i, 1], states[i, 2], states[i, 3], states[i, 4]
        mean, slope = means[n], slopes[n]
        for lead in range(path.size):
            t = n + lead + 1
            forecast = level + weight * (decay * (mean - slope * 0.5 * t) + reach * slope)
            path[lead] += states[i, 5] * scale * forecast
            level += alpha * (forecast - level)
            decay *= 1.0 - alpha
            reach = 1.0 + (1.0 - alpha) * reach
            slope = ((t - 2) * slope + 6.0 / t * (forecast - mean)) / (t + 1)
            mean += (forecast - mean) / t


@compiled
def dynamic_theta_alpha(values: Array, alphas: Array) -> float:
    """Return the alpha of least squared one-step error: the best of `alphas` (rising), refined between its neighbours.

    The refinement is a golden-section search, to a thousandth.
    """
    n = values.size
    y, _, _ = scaled(values)
    means, slopes = np.empty(n + 1), np.empty(n + 1)
    running_lines(y, means, slopes)
    state, one_step = np.empty(5), np.empty(n)
    best, least = 0, np.inf
    for i in range(alphas.size):
        sse = max(dynamic_theta_errors(y, means, slopes, alphas[i], state, one_step), _PERFECT * n)
        if sse < least * (1.0 - _TIE):
            best, least = i, sse
    coarse = float(alphas[best])
    if least <= _PERFECT * n:
        return coarse
    low, high = float(alphas[max(best - 1, 0)]), float(alphas[min(best + 1, alphas.size - 1)])
    ratio = 0.5 * (math.sqrt(5.0) - 1.0)
    left, right = high - ratio * (high - low), low + ratio * (high - low)
    at_left = dynamic_theta_errors(y, means, slopes, left, state, one_step)
    at_right = dynamic_theta_errors(y, means, slopes, right, state, one_step)
    while high - low > 1e-3:
        if at_left <= at_right:
            high, right, at_right = right, left, at_left
            left = high - ratio * (high - low)
            at_left = dynamic_theta_errors(y, means, slopes, left, state, one_step)
        else:
            low, left, at_left = left, right, at_right
            right = low + ratio * (high - low)
            at_right = dynamic_theta_errors(y, means, slopes, right, state, one_step)
    middle = 0.5 * (low + high)
    return middle if dynamic_theta_errors(y, means, slopes, middle, state, one_step) < least else coarse


@compiled
def damped_pass(y: Array, alphas: Array, gains: Array, phis: Array, levels: Array, trends: Array,
                forecasts: Array) -> None:
    """Run the damped trend recursion backwards for its start, then forwards, at all constants side by side.

    Backwards it begins with the last value and no trend, and ends with level and reversed
    trend of the first period. `gains` are alpha times Holt's beta. `levels` and `trends`
    receive the states after the last period, `forecasts[t]` the one-step forecasts of
    period `t`, from the second on.
    """
    n, k = y.size, alphas.size
    levels[:] = y[n - 1]
    trends[:] = 0.0
    for t in range(n - 2, -1, -1):
        for i in range(k):
            damped = phis[i] * trends[i]
            miss = y[t] - levels[i] - damped
            levels[i] += damped + alphas[i] * miss
            trends[i] = damped + gains[i] * miss
    for i in range(k):
        trends[i] = -trends[i]
    for t in range(1, n):
        for i in range(k):
            damped = phis[i] * trends[i]
            forecasts[t, i] = levels[i] + damped
            miss = y[t] - forecasts[t, i]
            levels[i] = forecasts[t, i] + alphas[i] * miss
            trends[i] = damped + gains[i] * miss


@compiled
def averaged_damped(
    values: Array, alphas: Array, betas: Array, phis: Array, one_step: Array, trends: Array
) -> tuple[float, float, float, float]:
    """Average the damped trend method over all constants of the three axes, weighted by likelihood.

    `trends` (phis,) receives the weighted trend of each phi, so the average forecast at
    lead h is `level + sum(trends * (phis + ... + phis^h))`. Returns the weighted level and
    the weighted means of alpha, beta and phi.
    """
    n, k = values.size, alphas.size * betas.size * phis.size
    y, centre, scale = scaled(values)
    every_alpha, every_beta, every_phi = np.empty(k), np.empty(k), np.empty(k)
    for i in range(k):
        every_alpha[i] = alphas[i // (betas.size * phis.size)]
        every_beta[i] = betas[i // phis.size % betas.size]
        every_phi[i] = phis[i % phis.size]
    levels, last_trends, forecasts = np.empty(k), np.empty(k), np.empty((n, k))
    damped_pass(y, every_alpha, every_alpha * every_beta, every_phi, levels, last_trends, forecasts)
    sse, weights = np.zeros(k), np.empty(k)
    for t in range(1, n):
        for i in range(k):
            sse[i] += (y[t] - forecasts[t, i]) ** 2
    likelihood_weights(sse, n - 1, weights)
    one_step[0] = np.nan
    for t in range(1, n):
        total = 0.0
        for i in range(k):
            total += weights[i] * forecasts[t, i]
        one_step[t] = centre + scale * total
    level, alpha, beta, phi = 0.0, 0.0, 0.0, 0.0
    trends[:] = 0.0
    for i in range(k):
        level += weights[i] * levels[i]
        alpha += weights[i] * every_alpha[i]
        beta += weights[i] * every_beta[i]
        phi += weights[i] * every_phi[i]
        trends[i % phis.size] += weights[i] * last_trends[i] * scale
    return centre + scale * level, alpha, beta, phi
