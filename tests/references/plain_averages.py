"""Plain twins of the compiled averages, written like the published formulas.

Seasonal indices: Miller & Williams (2003) with the classical ratio or difference to a centred
moving average. Theta: Assimakopoulos & Nikolopoulos (2000). Dynamic theta: Fiorucci et al.
(2016), with the line fitted again by least squares in every period. Damped trend: Gardner &
McKenzie (1985), by the twin of `plain_smoothing`.
"""

from __future__ import annotations

from itertools import product

import numpy as np

from references.plain_smoothing import ahead, smoothing


def classical_indices(y, m, multiplicative):
    """Classical indices with mean 1 or 0, and the values relative to their moving average by season."""
    weights = np.full(m, 1 / m) if m % 2 else np.concatenate([[0.5], np.ones(m - 1), [0.5]]) / m
    average = np.convolve(y, weights, mode="valid")
    inner = y[m // 2 : len(y) - m // 2]
    relative = inner / average if multiplicative else inner - average
    seasons = (np.arange(len(relative)) + m // 2) % m
    by_season = [relative[seasons == j] for j in range(m)]
    raw = np.array([values.mean() for values in by_season])
    return (raw / raw.mean() if multiplicative else raw - raw.mean()), by_season


def shrunken_indices(y, m, multiplicative):
    """James-Stein: index = neutral + (1 - B) (classical - neutral), B = V / S^2 (m - 3) / (m - 1)."""
    classical, by_season = classical_indices(y, m, multiplicative)
    neutral = 1.0 if multiplicative else 0.0
    count = sum(map(len, by_season))
    residual = sum(np.sum((values - index) ** 2) for values, index in zip(by_season, classical, strict=True))
    v = residual / (count - m) / (count / m)
    s2 = np.sum((classical - neutral) ** 2) / (m - 1)
    b = min(1.0, v / s2 * max(m - 3, 1) / (m - 1))
    return neutral + (1 - b) * (classical - neutral)


def line(y):
    """Intercept and slope of the least-squares line through y at 1, 2, ..., n."""
    if len(y) == 1:
        return y[0], 0.0
    slope, intercept = np.polyfit(np.arange(1, len(y) + 1), y, 1)
    return intercept, slope


def theta(y, alpha, horizon):
    """One-step forecasts from the second period on, and forecasts: the mean of the lines 0 and 2."""
    n = len(y)
    intercept, slope = line(y)
    zero = intercept + slope * np.arange(1, n + horizon + 1)
    two = 2 * np.asarray(y) - zero[:n]
    forecasts, level, *_ = smoothing(two, alpha=alpha, level=two[0])
    return (forecasts[1:] + zero[1:n]) / 2, (level + zero[n:]) / 2


def dynamic_theta(y, alpha, level, weight, horizon):
    """One-step forecasts of all periods, and forecasts from the forecasts before them.

    mu_t = level_(t-1) + weight [(1-alpha)^(t-1) A_(t-1) + (1 - (1-alpha)^t) / alpha B_(t-1)]
    """
    known, means = list(y), []
    for t in range(1, len(y) + horizon + 1):
        a, b = line(known[: t - 1]) if t > 1 else (0.0, 0.0)
        reach = (1 - (1 - alpha) ** t) / alpha if alpha > 0 else t
        means.append(level + weight * ((1 - alpha) ** (t - 1) * a + reach * b))
        if t > len(y):
            known.append(means[-1])
        level = alpha * known[t - 1] + (1 - alpha) * level
    return np.array(means[: len(y)]), np.array(means[len(y) :])


def best_start(y, alpha):
    """Level and weight of least squares from the third period on, the weight from 0 to .98, by regression."""
    own = dynamic_theta(y, alpha, 0.0, 0.0, 0)[0]
    by_level = dynamic_theta(y, alpha, 1.0, 0.0, 0)[0] - own
    by_weight = dynamic_theta(y, alpha, 0.0, 1.0, 0)[0] - own
    rest = (np.asarray(y) - own)[2:]
    (_, weight), *_ = np.linalg.lstsq(np.column_stack([by_level, by_weight])[2:], rest, rcond=None)
    weight = min(max(weight, 0.0), 0.98)
    (level,), *_ = np.linalg.lstsq(by_level[2:, None], rest - weight * by_weight[2:], rcond=None)
    return level, weight


def likelihood_weights(sse, count):
    """Weights proportional to SSE^(-count / 2)."""
    weights = (np.asarray(sse) / np.min(sse)) ** (-count / 2)
    return weights / weights.sum()


def averaged_dynamic_theta(y, alphas, horizon):
    """Weighted one-step forecasts from the third period on, forecasts, and weights."""
    runs = [dynamic_theta(y, alpha, *best_start(y, alpha), horizon) for alpha in alphas]
    weights = likelihood_weights([np.sum((y - fit)[2:] ** 2) for fit, _ in runs], len(y) - 2)
    return weights @ [fit[2:] for fit, _ in runs], weights @ [path for _, path in runs], weights


def back_cast_damped(y, alpha, beta, phi, horizon):
    """One-step forecasts from the second period on, and forecasts, from a back-cast start."""
    constants = {"alpha": alpha, "beta": beta, "phi": phi}
    _, level, reversed_trend, _ = smoothing(y[::-1][1:], level=y[-1], **constants)
    forecasts, level, trend, _ = smoothing(y[1:], level=level, trend=-reversed_trend, **constants)
    return forecasts, ahead(len(y), horizon, phi=phi, level=level, trend=trend)


def averaged_damped(y, alphas, betas, phis, horizon):
    """Weighted one-step forecasts from the second period on, forecasts, and weights over all constants."""
    runs = [back_cast_damped(y, *point, horizon) for point in product(alphas, betas, phis)]
    weights = likelihood_weights([np.sum((y[1:] - fit) ** 2) for fit, _ in runs], len(y) - 1)
    return weights @ [fit for fit, _ in runs], weights @ [path for _, path in runs], weights
