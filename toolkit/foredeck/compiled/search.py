"""Starting states and constants by least squares of one-step errors.

In additive forms the starting states enter every one-step forecast linearly: at given
constants the best ones follow from one small linear system (`profile`), and only the
constants are searched. In multiplicative forms the states are searched with the
constants. The search is a damped Gauss-Newton descent inside bounds (Levenberg 1944,
Marquardt 1963), begun cold from the best point of each block of a coarse grid; the best end is polished.
Everything is deterministic.

The caller hands in data of order one: `y` centred and scaled, or scaled alone.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from foredeck.compiled.compiler import compiled
from foredeck.compiled.recursions import NO_SEASON, run

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]

PROFILE, SEARCH, HOLD = 0, 1, 2
"""What becomes of the starting states: solved for, searched with the constants, or held."""

_PIVOT = 1e-9  # columns closer to the others than this share are left out: their states are not identified
_STEP = 1e-6  # of the numerical derivatives, on constants and scaled states of order one
_CLOSE, _DONE = 1e-4, 1e-11  # relative gains in the sum of squares that end a first and the last descent
_ROUNDS = 60
_TINY = 1e-24  # a mean squared error of scaled data under this is a perfect fit


@compiled
def solve(matrix: Array, right: Array) -> None:
    """Solve a symmetric positive system in place; unknowns that are not identified become 0.

    `matrix` is read and overwritten in its lower triangle; the solution stands in `right`.
    """
    size = right.size
    for j in range(size):
        pivot = matrix[j, j]
        for k in range(j):
            pivot -= matrix[j, k] * matrix[j, k]
        dropped = pivot <= _PIVOT * matrix[j, j]
        root = 0.0 if dropped else np.sqrt(pivot)
        matrix[j, j] = root
        for i in range(j + 1, size):
            entry = matrix[i, j]
            for k in range(j):
                entry -= matrix[i, k] * matrix[j, k]
            matrix[i, j] = 0.0 if dropped else entry / root
    for j in range(size):
        for k in range(j):
            right[j] -= matrix[j, k] * right[k]
        right[j] = 0.0 if matrix[j, j] == 0.0 else right[j] / matrix[j, j]
    for j in range(size - 1, -1, -1):
        for i in range(j + 1, size):
            right[j] -= matrix[i, j] * right[i]
        right[j] = 0.0 if matrix[j, j] == 0.0 else right[j] / matrix[j, j]


@compiled
def profile(
    y: Array, season: int, m: int, trend: bool, new_level: bool, constants: Array, state: Array, errors: Array
) -> float:
    """Fill `state` with the least-squares starting states of an additive form, `errors` with its errors.

    A unit of starting index `j` acts like a unit of index 0, `j` periods later, so one
    response serves all indices. Level and indices are known only up to a constant: the
    level is left out of the system and taken as the mean of the indices afterwards.
    """
    n = y.size
    size = m + 1 if trend else m
    nothing, unit, slope = np.zeros(n), np.zeros(n), np.zeros(n)
    state[:] = 0.0
    state[2 if season != NO_SEASON else 0] = 1.0
    run(nothing, 0, season, m, new_level, constants, state, unit)
    if trend:
        state[:] = 0.0
        state[1] = 1.0
        run(nothing, 0, season, m, new_level, constants, state, slope)
    state[:] = 0.0
    run(y, 0, season, m, new_level, constants, state, errors)

    # Errors fall by the response: the responses above are minus the one-step forecasts.
    gram, right = np.zeros((size, size)), np.zeros(size)
    for lag in range(m):
        product = 0.0
        for t in range(n - lag):
            product += unit[t] * unit[t + lag]
            later = n - 1 - t
            if later < m:
                gram[later, later - lag] = product
        for t in range(lag, n):
            right[lag] -= unit[t - lag] * errors[t]
            if trend:
                gram[m, lag] += unit[t - lag] * slope[t]
    if trend:
        for t in range(n):
            gram[m, m] += slope[t] * slope[t]
            right[m] -= slope[t] * errors[t]
    solve(gram, right)

    total = 0.0
    for lag in range(m):
        for t in range(lag, n):
            errors[t] += right[lag] * unit[t - lag]
    for t in range(n):
        if trend:
            errors[t] += right[m] * slope[t]
        total += errors[t] * errors[t]
    state[0] = np.mean(right[:m])
    state[1] = right[m] if trend else 0.0
    state[2:] = right[:m] - state[0]
    return total


@compiled
def evaluate(
    y: Array,
    first: int,
    season: int,
    m: int,
    trend: bool,
    new_level: bool,
    tied: bool,
    states: int,
    point: Array,
    state: Array,
    errors: Array,
) -> float:
    """Sum of squared one-step errors at a point `[alpha, beta, gamma, phi, level, trend, indices]`.

    `tied` reads the third entry as a share of `1 - alpha`, which keeps a searched gamma
    inside the usual region. `state` receives the starting states that were used.
    """
    constants = point[:4].copy()
    if tied:
        constants[2] *= 1.0 - constants[0]
    if states == PROFILE:
        return profile(y, season, m, trend, new_level, constants, state, errors)
    state[:] = point[4:]
    return run(y, first, season, m, new_level, constants, state.copy(), errors)


@compiled
def descend(
    y: Array,
    first: int,
    season: int,
    m: int,
    trend: bool,
    new_level: bool,
    tied: bool,
    states: int,
    lower: Array,
    upper: Array,
    point: Array,
    gain: float,
) -> float:
    """Move `point` downhill inside its bounds; return its sum of squared errors.

    Entries whose bounds agree are held. The descent ends when a step gains less than
    the share `gain` of the sum of squares.
    """
    n = y.size
    free = np.nonzero(upper > lower)[0]
    errors, trial = np.zeros(n), np.zeros(n)
    state = np.zeros(point.size - 4)
    best = evaluate(y, first, season, m, trend, new_level, tied, states, point, state, errors)
    slopes = np.zeros((free.size, n))
    damping = 1e-3
    for _ in range(_ROUNDS):
        if best <= _TINY * n:
            break
        gradient = np.zeros(free.size)
        for i in range(free.size):
            place = free[i]
            kept = point[place]
            step = _STEP if kept + _STEP <= upper[place] else -_STEP
            point[place] = kept + step
            evaluate(y, first, season, m, trend, new_level, tied, states, point, state, trial)
            point[place] = kept
            for t in range(first, n):
                slopes[i, t] = (trial[t] - errors[t]) / step
                gradient[i] += slopes[i, t] * errors[t]
        gram = np.zeros((free.size, free.size))
        for i in range(free.size):
            place = free[i]
            outward = (point[place] <= lower[place] and gradient[i] > 0.0) or (
                point[place] >= upper[place] and gradient[i] < 0.0
            )
            if outward:  # the entry stays on its bound in this round
                slopes[i, :] = 0.0
                gradient[i] = 0.0
            for k in range(i + 1):
                for t in range(first, n):
                    gram[i, k] += slopes[i, t] * slopes[k, t]
        before = best
        for _attempt in range(12):
            system, move = gram.copy(), -gradient
            for i in range(free.size):
                system[i, i] *= 1.0 + damping
            solve(system, move)
            candidate = point.copy()
            for i in range(free.size):
                place = free[i]
                candidate[place] = min(max(point[place] + move[i], lower[place]), upper[place])
            value = evaluate(y, first, season, m, trend, new_level, tied, states, candidate, state, trial)
            if value < best:
                best = value
                point[:] = candidate
                errors[:] = trial
                damping = max(damping / 8.0, 1e-10)
                break
            damping *= 6.0
        if not before - best > gain * before:
            break
    return best


@compiled
def search(
    y: Array,
    first: int,
    season: int,
    m: int,
    trend: bool,
    new_level: bool,
    tied: bool,
    states: int,
    grid: Array,
    blocks: int,
    lower: Array,
    upper: Array,
    start: Array,
) -> tuple[Array, Array, float]:
    """Best point, its starting states and its sum of squared errors.

    `grid` holds constants, shape (points, 4), in `blocks` runs of equal length; the best
    point of each run is a cold start. `start` holds the starting states that are held
    or from which the search of the states begins.
    """
    state, errors = np.zeros(start.size), np.zeros(y.size)
    found = np.zeros(4 + start.size)
    least = np.inf
    length = grid.shape[0] // blocks
    for block in range(blocks):
        point = np.zeros(4 + start.size)
        point[4:] = start
        chosen, lowest = block * length, np.inf
        for row in range(block * length, (block + 1) * length):
            point[:4] = grid[row]
            value = evaluate(y, first, season, m, trend, new_level, tied, states, point, state, errors)
            if value < lowest:
                chosen, lowest = row, value
        point[:4] = grid[chosen]
        value = descend(y, first, season, m, trend, new_level, tied, states, lower, upper, point, _CLOSE)
        if block == 0 or value < least * (1.0 - 1e-9):
            least = value
            found[:] = point
    least = descend(y, first, season, m, trend, new_level, tied, states, lower, upper, found, _DONE)
    evaluate(y, first, season, m, trend, new_level, tied, states, found, state, errors)
    return found, state, least
