"""Constants and starting states by maximum likelihood, for one form or for many at once.

The criterion is the deviance `n log(SSE) + 2 sum(log forecast)` of Hyndman, Koehler, Ord &
Snyder (2008), section 5.1, with relative errors and the second part when the error is
multiplicative; when it is additive this is least squares. The descent is that of Broyden,
Fletcher, Goldfarb and Shanno (Nocedal & Wright 2006, section 6.1), begun cold from the
best points of a coarse grid. A constant between its bounds is searched as an angle,
`low + (high - low) (1 - cos angle) / 2`, which reaches the bounds themselves: the best
constants of short series mostly lie there. In additive forms the starting states enter
every one-step forecast linearly, so at given constants the best ones are solved for
(`profile`); in multiplicative forms they are searched, in units of a typical error.
Everything is deterministic, to the last bit also with the compiler switched off.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from foredeck.compiled.compiler import compiled
from foredeck.compiled.recursions import (
    ADDITIVE,
    MULTIPLICATIVE,
    NO_SEASON,
    classical_start,
    normal_equations,
    project,
    remaining,
    respond,
    run,
    run_back,
)

Array = NDArray[np.float64]

LOWEST, HIGHEST = (1e-4, 1e-4, 1e-4, 0.8), (0.9999, 0.9999, 0.9999, 0.98)
"""Bounds of estimated constants; a gamma against the expected level is a share of what alpha leaves to 1."""

PROFILE, SEARCH, HOLD = 0, 1, 2
"""What becomes of the starting states: solved for, searched with the constants, or held."""

_PERFECT = 1e-18  # a mean squared error of scaled data under this is a perfect fit
_PIVOT = 1e-9  # states that the others tell up to this share are not identified: they stay at 0
_STEPS = 200
_ALPHAS = (0.56, 1.09, 1.77, 2.44)  # angles of the cold starts: alpha about .08, .27, .60, .88
_BETAS, _GAMMAS, _PHI = (0.44, 1.09, 2.5), (0.44, 1.09), 2.05  # about .05, .27, .90; .05, .27; and .93


class Task(NamedTuple):
    """What is to be fitted: data of order one, a form, what is held, and where to begin."""

    y: Array
    first: int
    error: int
    trend: bool
    season: int
    m: int
    new_level: bool
    held: Array
    start: Array
    states: int
    unit: Array


class Room(NamedTuple):
    """Arrays that one run, its way back, and the system for the starting states fill."""

    constants: Array
    state: Array
    errors: Array
    trace: Array
    gradient: Array
    unit: Array
    slope: Array
    gram: Array
    right: Array
    indices: Array


@compiled
def room_for(n: int, m: int, constants: Array, errors: Array) -> Room:
    """Arrays for `n` values and a season of `m` periods, around two that the caller reads afterwards."""
    return Room(
        constants, np.empty(m + 2), errors, np.empty((3, n)), np.empty(m + 6), np.empty(n), np.empty(n),
        np.empty((m + 1, m + 1)), np.empty(m + 1), np.empty((3, m)),
    )


@compiled
def solve(matrix: Array, right: Array) -> None:
    """Solve a symmetric positive system in place; unknowns that are not identified become 0.

    `matrix` is read and overwritten from its diagonal on; the solution stands in `right`.
    """
    size = right.size
    for i in range(1, size):
        matrix[i, 0] = matrix[i, i]  # the diagonal as given, kept where nothing is read
    for j in range(size):
        pivot = matrix[j, j]
        if pivot <= _PIVOT * (matrix[j, 0] if j > 0 else pivot) or pivot <= 0.0:
            matrix[j, j] = 0.0
            continue
        for i in range(j + 1, size):
            share = matrix[j, i] / pivot
            right[i] -= share * right[j]
            for k in range(i, size):
                matrix[i, k] -= share * matrix[j, k]
    for j in range(size - 1, -1, -1):
        if matrix[j, j] == 0.0:
            right[j] = 0.0
            continue
        for i in range(j + 1, size):
            right[j] -= matrix[j, i] * right[i]
        right[j] /= matrix[j, j]


@compiled
def profile(task: Task, room: Room) -> float:
    """Fill the state with the best starting states of an additive form, the errors with those that remain.

    One-step errors are linear in the starting states, so these follow from least
    squares. Level and indices are known only up to a constant: the level is left out of
    the system and taken as the mean of the indices.
    """
    m = task.m
    respond(
        task.y, task.season, m, task.new_level, room.constants, room.indices, room.errors, room.unit, room.slope
    )
    size = m + task.trend
    gram, found = room.gram[:size, :size], room.right[:size]
    normal_equations(room.unit, room.slope, room.errors, task.trend, gram, found)
    solve(gram, found)
    total = remaining(room.unit, room.slope, room.errors, task.trend, found)
    level = 0.0
    for j in range(m):
        level += found[j] / m
    room.state[0] = level
    room.state[1] = found[m] if task.trend else 0.0
    for j in range(m):
        room.state[2 + j] = found[j] - level
    return total


@compiled
def carry(source: Array, target: Array) -> None:
    """Copy a row into another. (A slice that takes an array costs the compiler two seconds.)"""
    for i in range(target.size):
        target[i] = source[i]


@compiled
def place(task: Task, point: Array, room: Room) -> None:
    """Turn a point of the search into constants and starting states.

    A point holds the angles of the constants that are not held (NaN in `held`), then, where
    they are searched, the distances of level, trend and indices from `start` in the task's units.
    """
    at = 0
    for i in range(4):
        room.constants[i] = task.held[i]
        if math.isnan(task.held[i]):
            room.constants[i] = LOWEST[i] + (HIGHEST[i] - LOWEST[i]) * (0.5 - 0.5 * math.cos(point[at]))
            at += 1
    if math.isnan(task.held[2]) and not task.new_level:
        room.constants[2] *= 1.0 - room.constants[0]
    for j in range(task.start.size):
        room.state[j] = task.start[j]
    if task.states == SEARCH:
        for j in range(task.start.size):
            if task.unit[j] > 0.0:
                room.state[j] += task.unit[j] * point[at]
                at += 1


@compiled
def deviance(task: Task, point: Array, room: Room) -> tuple[float, float]:
    """Deviance at a point, infinite outside the positive region, and the sum of squares behind it."""
    place(task, point, room)
    if task.states == PROFILE:
        total, logarithms = profile(task, room), 0.0
    else:
        total, logarithms = run(
            task.y, task.first, task.error, task.season, task.m, task.new_level, room.constants, room.state,
            room.errors, room.trace,
        )
    count = task.y.size - task.first
    total = max(total, _PERFECT * count)
    if not total < 1e300:
        return np.inf, np.inf
    return count * math.log(total) + logarithms, total


@compiled
def slopes(task: Task, point: Array, total: float, room: Room, gradient: Array) -> None:
    """Derivatives of the deviance by the entries of the point that `room` was last filled at.

    At the best starting states the deviance does not change with them, so where they
    are solved for its derivatives by the constants are those at held states.
    """
    if task.states == PROFILE:
        run(
            task.y, task.first, task.error, task.season, task.m, task.new_level, room.constants, room.state,
            room.errors, room.trace,
        )
    run_back(
        task.y, task.first, task.error, task.season, task.m, task.new_level, room.constants, total, room.errors,
        room.trace, room.gradient,
    )
    by = room.gradient
    if math.isnan(task.held[2]) and not task.new_level:
        share = room.constants[2] / (1.0 - room.constants[0])
        by[0] -= by[2] * share
        by[2] *= 1.0 - room.constants[0]
    at = 0
    for i in range(4):
        if math.isnan(task.held[i]):
            gradient[at] = by[i] * (HIGHEST[i] - LOWEST[i]) * 0.5 * math.sin(point[at])
            at += 1
    if task.states == SEARCH:
        for j in range(task.start.size):
            if task.unit[j] > 0.0:
                gradient[at] = by[4 + j] * task.unit[j]
                at += 1


@compiled
def line_search(
    task: Task, room: Room, point: Array, move: Array, value: float, fall: float, longest: float, trial: Array,
) -> tuple[float, float]:
    """Go along `move` until the deviance falls enough (Armijo); return it, or infinity when it does not.

    `fall` is its slope along the move. Steps are shortened by a parabola through what is known.
    """
    step = 1.0 if longest <= 3.0 else 3.0 / longest
    for _attempt in range(20):
        for i in range(point.size):
            trial[i] = point[i] + step * move[i]
        reached, total = deviance(task, trial, room)
        if reached <= value + 1e-4 * step * fall:
            return reached, total
        if reached < np.inf:
            bend = 2.0 * (reached - value - step * fall)
            lowest = -fall * step * step / bend if bend > 0.0 else 0.5 * step
            step = min(max(lowest, 0.1 * step), 0.5 * step)
        else:
            step *= 0.3
    return np.inf, np.inf


@compiled
def begin(inverse: Array, angles: int) -> None:
    """Set the inverse Hessian to its first guess."""
    inverse[:, :] = 0.0
    for i in range(inverse.shape[0]):
        inverse[i, i] = 0.3 if i < angles else 0.1


@compiled
def times(matrix: Array, vector: Array, product: Array) -> None:
    """Fill `product` with a symmetric matrix times a vector, row by row: the machine does several entries at once."""
    product[:] = 0.0
    for i in range(vector.size):
        entry = vector[i]
        for j in range(vector.size):
            product[j] += matrix[i, j] * entry


@compiled
def learn(inverse: Array, step: Array, change: Array, product: Array) -> bool:
    """Update the inverse Hessian by a step and the change of the gradient; False where that says nothing."""
    size = step.size
    along, square = 0.0, 0.0
    for i in range(size):
        along += step[i] * change[i]
        square += change[i] * change[i]
    if not along > 1e-10 * math.sqrt(square):
        return False
    times(inverse, change, product)
    bend = 0.0
    for i in range(size):
        bend += product[i] * change[i]
    weight = (1.0 + bend / along) / along
    for i in range(size):
        left, right = weight * step[i] - product[i] / along, step[i] / along
        for j in range(size):
            inverse[i, j] += left * step[j] - right * product[j]
    return True


@compiled
def descend(
    task: Task, room: Room, angles: int, point: Array, tolerance: float, hopeless: float
) -> float:
    """Move `point` downhill; return its deviance.

    The descent ends when two steps in a row gain less than `tolerance`, or when after 15
    steps the deviance is more than 5 above `hopeless`, the best one known.
    """
    size = point.size
    inverse = np.empty((size, size))
    gradient, other, move = np.empty(size), np.empty(size), np.empty(size)
    trial, change, product = np.empty(size), np.empty(size), np.empty(size)
    begin(inverse, angles)
    fresh = True
    value, total = deviance(task, point, room)
    slopes(task, point, total, room, gradient)
    perfect = _PERFECT * (task.y.size - task.first)
    small, step = 0, 0
    while step < _STEPS and total > perfect:
        step += 1
        fall, longest = 0.0, 0.0
        times(inverse, gradient, move)
        for i in range(size):
            move[i] = -move[i]
            fall += move[i] * gradient[i]
            longest = max(longest, abs(move[i]))
        if not fresh and -fall < tolerance:  # the gain promised is half of this
            break
        reached = np.inf
        if fall < 0.0:
            reached, total_there = line_search(task, room, point, move, value, fall, longest, trial)
        if not reached < np.inf:
            if fresh:
                break
            begin(inverse, angles)
            fresh = True
            continue
        total = total_there
        slopes(task, trial, total, room, other)
        for i in range(size):
            move[i] = trial[i] - point[i]
            change[i] = other[i] - gradient[i]
            point[i] = trial[i]
            gradient[i] = other[i]
        if learn(inverse, move, change, product):
            fresh = False
        gain = value - reached
        value = reached
        small = small + 1 if gain < tolerance else 0
        if small == 2 or (step == 15 and value > hopeless + 5.0):
            break
    return value


@compiled
def cold_starts(task: Task, room: Room, size: int, betas: int, points: Array, values: Array) -> float:
    """Fill the best points of a coarse grid, by halves of alpha, by beta and by gamma, and their deviances.

    Returns the least sum of squares met, or infinity where every point leaves the positive region.
    """
    values[:] = np.inf
    least, best = np.inf, np.inf
    point = np.zeros(size)
    free = np.isnan(task.held)
    for a in range(4 if free[0] else 1):
        for b in range(betas if free[1] else 1):
            for g in range(2 if free[2] else 1):
                at = 0
                if free[0]:
                    point[at] = _ALPHAS[a]
                    at += 1
                if free[1]:
                    point[at] = _BETAS[b]
                    at += 1
                if free[2]:
                    point[at] = _GAMMAS[g]
                    at += 1
                if free[3]:
                    point[at] = _PHI
                value, total = deviance(task, point, room)
                group = a // 2 + 2 * b + 6 * g
                if value < values[group]:
                    values[group] = value
                    carry(point, points[group])
                if value < best:
                    best, least = value, total
    return least


@compiled
def in_units(task: Task, least: float) -> None:
    """Set the units of the free starting states from the sum of squares of the best cold start."""
    typical = math.sqrt(least / (task.y.size - task.first))
    level = max(abs(task.start[0]), 1e-3)
    if task.error == MULTIPLICATIVE:
        typical *= level
    typical = max(typical, 1e-6)
    task.unit[0] = typical
    task.unit[1] = 0.2 * typical if task.trend else 0.0
    if task.season != NO_SEASON:
        task.unit[2:] = typical / level if task.season == MULTIPLICATIVE else typical


@compiled
def search(task: Task, starts: int, tolerance: float, room: Room) -> float:
    """Best deviance found from the `starts` best cold starts; `room` then holds the constants used.

    The task's `start` becomes the starting states found. Infinite, with `start` as it
    was, where no cold start stays inside the positive region.
    """
    # sums of arrays, not counts from a literal 0: for the compiler that would be a type of its own
    angles = int(np.isnan(task.held).sum())
    size = angles
    if task.states == SEARCH:
        size += int((task.unit > 0.0).sum())
    points, values = np.zeros((12, size)), np.empty(12)
    found = np.zeros(size)
    least = cold_starts(task, room, size, 3 if starts > 2 else 2, points, values)
    best = np.inf
    if least < np.inf:
        in_units(task, least)
        group = int(np.argmin(values))
        for _start in range(starts):
            value = descend(task, room, angles, points[group], tolerance, best)
            if value < best:
                best = value
                carry(points[group], found)
            values[group] = np.inf
            # The next start comes from the other half of alphas, where the deepest other valley mostly lies.
            half = 1 - group % 2
            group = half + 2 * int(np.argmin(values[half::2]))
            if not values[group] < np.inf:
                group = int(np.argmin(values))
            if not values[group] < np.inf:
                break
    place(task, found, room)
    if task.states == PROFILE:
        profile(task, room)
    carry(room.state, task.start)
    return best


@compiled
def units(values: Array, positive: bool) -> tuple[float, float]:
    """Centre and scale that bring data to order one.

    Additive forms do not mind a shift, so a small movement on a large level keeps its
    digits. A mean absolute distance neither overflows nor vanishes as squares would.
    """
    n = values.size
    mean, distance = 0.0, 0.0
    for t in range(n):
        mean += values[t] / n
    for t in range(n):
        distance += abs(values[t] - mean) / n
    size = abs(mean) if abs(mean) > 0.0 else 1.0
    if positive:
        return 0.0, size
    return mean, distance if distance > 1e-13 * size else size


@compiled
def fit_one(
    values: Array, first: int, error: int, trend: bool, season: int, m: int, new_level: bool, held: Array,
    free_states: bool, starts: int, tolerance: float, constants: Array, before: Array, after: Array, errors: Array,
) -> tuple[float, float, float]:
    """Fit one form to values in their own unit.

    Parameters
    ----------
    held : (4,)
        Constants, NaN where free; those the form does not have at 0 (phi: 1).
    free_states : bool
        Whether the starting states are estimated; otherwise `before` holds them.
    constants, before, after, errors : (4,), (m + 2,), (m + 2,), (n,)
        Filled with the constants used, the states before period `first` and after the
        last one, and actual minus forecast.

    Returns
    -------
    The deviance (infinite when every start leaves the region above zero that
    multiplicative forms need), the sum of squared errors, and that of relative ones
    (equal to the other when the error is additive).
    """
    n = values.size
    positive = error == MULTIPLICATIVE or season == MULTIPLICATIVE
    centre, scale = units(values, positive)
    factor = 1.0 if season == MULTIPLICATIVE else scale
    y = np.empty(n)
    for t in range(n):
        y[t] = (values[t] - centre) / scale
    room = room_for(n, m, constants, errors)
    unit = np.ones(m + 2)
    if not trend:
        unit[1] = 0.0
    if season == NO_SEASON:
        unit[2] = 0.0
    if not free_states:
        states = HOLD
        before[0] = (before[0] - centre) / scale
        before[1] /= scale
        for j in range(2, m + 2):
            before[j] /= factor
    else:
        states = SEARCH if positive else PROFILE
        classical_start(y, m, trend, season, positive, before)
    task = Task(y, first, error, trend, season, m, new_level, held, before, states, unit)
    best = search(task, starts, tolerance, room)
    if states == SEARCH:
        if not best < np.inf:
            # Every path from the classical start left the region: begin again from a level without trend.
            before[0], before[1] = np.mean(y), 0.0
            before[2:] = 0.0 if season != MULTIPLICATIVE else 1.0
            best = search(task, starts, tolerance, room)
        balance(season, before)
    carry(before, after)
    total, _ = run(y, first, error, season, m, new_level, constants, after, errors, room.trace)
    square = 0.0
    for t in range(first, n):
        square += errors[t] * errors[t]
    for t in range(n):
        errors[t] *= scale
    for state in (before, after):
        state[0] = state[0] * scale + centre
        state[1] *= scale
        for j in range(2, m + 2):
            state[j] *= factor
    square *= scale * scale
    best += (n - first) * (2.0 * math.log(scale) - math.log(n - first))
    return best, square, total if error == MULTIPLICATIVE else square


@compiled
def balance(season: int, state: Array) -> None:
    """Give additive indices the mean 0 and factors the mean 1: with the level they are known only up to that."""
    mean = 0.0
    for j in range(2, state.size):
        mean += state[j] / (state.size - 2)
    if season == ADDITIVE:
        state[0] += mean
        for j in range(2, state.size):
            state[j] -= mean
    elif season == MULTIPLICATIVE:
        state[0] *= mean
        state[1] *= mean
        for j in range(2, state.size):
            state[j] /= mean


@compiled
def all_forms(
    values: Array, m: int, codes: NDArray[np.int64], held: Array, starts: int, tolerance: float, forecasts: Array,
    fitted: Array, aicc: Array, constants: Array, states: Array, sigma2: Array,
) -> None:
    """Fit every form of a list to one series.

    Parameters
    ----------
    values : (n,)
    m : int
        Season length; 1 for none.
    codes : (forms, 3)
        Error (ADDITIVE or MULTIPLICATIVE), trend (0 none, 1 linear, 2 damped), season.
    held : (4,)
        Constants to hold in every form that has them, NaN where free.
    starts : int
        Cold starts descended from, at most 4.
    tolerance : float
        Gain of the deviance that no longer counts.
    forecasts, fitted : (forms, horizon), (forms, n)
        Filled, as are the rest, for every form that can be had.
    aicc : (forms,)
        The deviance plus Akaike's correction for short series (Hurvich & Tsai 1989);
        infinite where the form cannot be had: a season takes `m + 5` values, factors and
        relative errors values above zero, the criterion two values more than constants
        and states.
    constants, states, sigma2 : (forms, 4), (forms, m + 2), (forms,)
        As used, after the last period, and the residual variance on the degrees of
        freedom left (of relative errors when the error is multiplicative).
    """
    n = values.size
    lowest = np.min(values)
    own, none = np.empty(4), (0.0, 0.0, 0.0, 1.0)
    before, errors = np.empty(m + 2), np.empty(n)
    for f in range(codes.shape[0]):
        error, season = codes[f, 0], codes[f, 2]
        trend, damped = codes[f, 1] > 0, codes[f, 1] == 2
        cycle = m if season != NO_SEASON else 1
        for i in range(4):
            own[i] = none[i]
        count = 2
        for i in range(4):
            if i == 0 or (i == 1 and trend) or (i == 2 and season != NO_SEASON) or (i == 3 and damped):
                own[i] = held[i]
                count += math.isnan(held[i])
        count += trend + (cycle - 1)
        aicc[f] = np.inf
        seasonal = season == NO_SEASON or (m > 1 and n >= m + 5)
        positive = lowest > 0.0 or (error == ADDITIVE and season != MULTIPLICATIVE)
        if not (seasonal and positive and n - count - 1 > 0):
            continue
        after = states[f, : cycle + 2]
        best, _, total = fit_one(
            values, 0, error, trend, season, cycle, False, own, True, starts, tolerance, constants[f],
            before[: cycle + 2], after, errors,
        )
        if not best < np.inf:
            continue
        aicc[f] = best + 2.0 * count + 2.0 * count * (count + 1) / (n - count - 1)
        sigma2[f] = total / (n - count + 1)
        for t in range(n):
            fitted[f, t] = values[t] - errors[t]
        project(n, season, cycle, constants[f, 3], after, forecasts[f])


@compiled
def mix(
    n: int, m: int, codes: NDArray[np.int64], weights: Array, constants: Array, states: Array, lowest: float,
    path: Array,
) -> None:
    """Fill `path` with the weighted mean of the forecasts of forms, each at least `lowest`.

    `n`, `m`, `codes`, `constants` and `states` are those of `all_forms`; forms of weight 0 are not read.
    """
    path[:] = 0.0
    one = np.empty(path.size)
    for f in range(codes.shape[0]):
        if weights[f] > 0.0:
            season = codes[f, 2]
            cycle = m if season != NO_SEASON else 1
            project(n, season, cycle, constants[f, 3], states[f, : cycle + 2], one)
            for lead in range(path.size):
                path[lead] += weights[f] * max(one[lead], lowest)
