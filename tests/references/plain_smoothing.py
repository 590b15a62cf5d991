"""Plain twins of the compiled functions, written like the published formulas.

Additive season: Hyndman & Athanasopoulos (2018), section 7.3; multiplicative season: same
section; damped trend: section 7.2; the season against the new level: Winters (1960) and
NIST/SEMATECH e-Handbook 6.4.3.5. Croston: Croston (1972); TSB: Teunter, Syntetos & Babai (2011).
"""

from __future__ import annotations

import numpy as np


def smoothing(y, *, alpha, beta=0.0, gamma=0.0, phi=1.0, level, trend=0.0, season=None, kind="none",
              new_level=False, after=0):
    """One-step forecasts (NaN before `after`), last level, last trend, and the season by position."""
    m = len(season) if season is not None else 1
    s = list(season) if season is not None else [0.0]
    forecasts = [float("nan")] * after
    for t in range(after, len(y)):
        expected = level + phi * trend
        old = s[t % m]
        if kind == "none":
            forecasts.append(expected)
            new = alpha * y[t] + (1 - alpha) * expected
        elif kind == "additive":
            forecasts.append(expected + old)
            new = alpha * (y[t] - old) + (1 - alpha) * expected
            against = new if new_level else expected
            s[t % m] = gamma * (y[t] - against) + (1 - gamma) * old
        else:
            forecasts.append(expected * old)
            new = alpha * y[t] / old + (1 - alpha) * expected
            against = new if new_level else expected
            s[t % m] = gamma * y[t] / against + (1 - gamma) * old
        trend = beta * (new - level) + (1 - beta) * phi * trend
        level = new
    return np.array(forecasts), level, trend, s


def deviance(y, forecasts, relative):
    """Minus twice the log likelihood without constants: Hyndman et al. (2008), equation 5.1 and section 5.1."""
    known = ~np.isnan(forecasts)
    y, mean = np.asarray(y)[known], forecasts[known]
    if relative:
        return y.size * np.log(np.sum(((y - mean) / mean) ** 2)) + 2 * np.sum(np.log(mean))
    return y.size * np.log(np.sum((y - mean) ** 2))


def ahead(n, horizon, *, phi=1.0, level, trend=0.0, season=None, kind="none"):
    """Forecasts from last states after n periods."""
    path = []
    for h in range(1, horizon + 1):
        value = level + sum(phi**i for i in range(1, h + 1)) * trend
        if kind == "additive":
            value += season[(n + h - 1) % len(season)]
        if kind == "multiplicative":
            value *= season[(n + h - 1) % len(season)]
        path.append(value)
    return np.array(path)


def starting_states(y, *, alpha, beta=0.0, gamma=0.0, phi=1.0, trend=False, m=1, new_level=False):
    """Least-squares starting states of an additive form, by brute force: one regression."""
    kind = "additive" if m > 1 else "none"
    names = ["level"] + ["trend"] * trend + list(range(m - 1)) * (m > 1)

    def forecasts(values, unit):
        s = [0.0] * m
        if isinstance(unit, int):
            s[unit], s[m - 1] = 1.0, -1.0
        return smoothing(values, alpha=alpha, beta=beta, gamma=gamma, phi=phi, level=float(unit == "level"),
                         trend=float(unit == "trend"), season=s if m > 1 else None, kind=kind,
                         new_level=new_level)[0]

    own = np.asarray(y) - forecasts(y, None)
    columns = np.column_stack([forecasts(np.zeros(len(y)), name) for name in names])
    found, *_ = np.linalg.lstsq(columns, own, rcond=None)
    return dict(zip(names, found, strict=True)), float(np.sum((own - columns @ found) ** 2))


def croston(y, alpha, factor):
    """One-step forecasts (NaN up to the first demand), last size, last gap."""
    size = gap = None
    since = 0
    forecasts = []
    for value in y:
        since += 1
        forecasts.append(float("nan") if size is None else factor * size / gap)
        if value > 0:
            size = value if size is None else alpha * value + (1 - alpha) * size
            gap = since if gap is None else alpha * since + (1 - alpha) * gap
            since = 0
    return np.array(forecasts), size, gap


def tsb(y, alpha, beta, size, chance):
    """One-step forecasts, last size, last chance of a demand."""
    forecasts = []
    for value in y:
        forecasts.append(chance * size)
        occurred = 1.0 if value > 0 else 0.0
        chance = beta * occurred + (1 - beta) * chance
        if occurred:
            size = alpha * value + (1 - alpha) * size
    return np.array(forecasts), size, chance
