"""Weights of the blend: a fixed prior, what the portfolio's backtests say, and each series' own errors.

The plain mean of a few good methods is hard to beat (Clemen 1989, International Journal of
Forecasting 5, 559-583), so weights move away from a prior only as far as the number of
series allows: N series count N / (N + 50). Each series then leans toward the methods that
missed less on it, by the inverse square root of their mean absolute errors.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from foredeck.backtests.measures import mean_of
from foredeck.portfolio.alone import Alone, ForecastOptions, origin_count
from foredeck.smoothing.catalogue import METHODS

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]

PRIOR_SERIES = 50.0
"""The prior counts as much as this many series: below it, weights learned from a portfolio lose to equal ones."""

OWN_POWER = 0.5
"""Power of a series' own mean absolute error by which a method's weight falls."""

PULL = 0.03
"""Weight of the divergence from the prior while weights are learned: it keeps a method from being dropped by luck.

Settled on the M- and M3-competitions and both shifted back by a horizon: with .003 the blend's sMAPE was .3 % smaller
on M and 1.1 % larger on M3 shifted."""

CELLS = 6_000
"""Most errors that weights are learned from; beyond it, evenly spread ones serve as well."""

BENCHMARK_PRIOR = 0.04
"""A benchmark in the blend begins with this share of a member's weight: it has to earn more."""

BENCHMARK_STANDING = 0.2
"""Logarithm of a benchmark's error relative to the members', before anything is known of a portfolio
(seasonal naive and drift on the monthly, quarterly and yearly series of the M- and M3-competitions: .0 to .4)."""

_ROUNDS = 100
_DONE, _NEAR = 1e-22, 1e-11  # gains of a step, in units of the loss
_SOFT = 1e-3  # absolute errors in units of the scale are rounded off below this, so that they have a gradient


@dataclass(frozen=True)
class Learned:
    """What a portfolio's backtests say of its methods, as known at each offset from the closing period.

    Attributes
    ----------
    methods : tuple of str, length M
    weights : array, shape (largest offset + 1, M)
        The blend's, before a series' own errors; 0 for methods that do not speak.
    standing : array, shape (largest offset + 1, M)
        Mean over the series of the logarithm of a method's error relative to the members'
        geometric mean; NaN for methods that do not speak.
    """

    methods: tuple[str, ...]
    weights: Array
    standing: Array


def learn_from(alones: Sequence[Alone], options: ForecastOptions) -> Learned:
    """Weights and standings at each offset from the closing period, from errors known by then.

    Parameters
    ----------
    alones : sequence of Alone, at least one
        Origins at which a series was intermittent are left out: it had another family then.
    options : ForecastOptions
    """
    methods, season_length = alones[0].cube.methods, alones[0].series.season_length
    start = prior_weights(methods, options, season_length)
    speaking = np.flatnonzero(start > 0)
    begin = start[speaking]
    offsets = origin_count(season_length, options.horizon) + 1
    weights, standing = np.zeros((offsets, len(methods))), np.full((offsets, len(methods)), np.nan)
    cells = [_cells(alone, speaking) for alone in alones]
    for offset in range(offsets):
        known = [errors[ready >= offset] for errors, ready in cells]
        known = [errors for errors in known if len(errors)]
        first = np.where(begin < begin.max() / 2, BENCHMARK_STANDING, 0.0)
        weights[offset, speaking], standing[offset, speaking] = begin, first
        if known:
            share = len(known) / (len(known) + PRIOR_SERIES)
            weights[offset, speaking] = share * learn(*_gathered(known), begin) + (1 - share) * begin
            seen = np.mean([relative_logs(errors, begin) for errors in known], axis=0)
            standing[offset, speaking] = share * seen + (1 - share) * first
    return Learned(methods, weights, standing)


def prior_weights(methods: Sequence[str], options: ForecastOptions, season_length: int) -> Array:
    """Weights before anything is known: equal, a benchmark that was not asked for by name far less.

    Returns
    -------
    array, shape (methods,)
        Summing to 1; 0 for methods that do not speak, among them the demand-rate family,
        which has no learned weights.
    """
    voices = options.voices(season_length)
    start = np.array([0.0 if name not in voices or METHODS[name].family == "demand rate"
                      else BENCHMARK_PRIOR if METHODS[name].family == "benchmark" and not options.methods else 1.0
                      for name in methods])
    return np.asarray(start / max(start.sum(), 1.0))


def relative_logs(errors: Array, prior: Array) -> Array:
    """Logarithm of each method's mean absolute error, less its mean weighted by the prior; shape (methods,)."""
    logs = np.log(np.maximum(np.abs(errors).mean(axis=0), 1e-9))
    return np.asarray(logs - prior @ logs)


def _cells(alone: Alone, speaking: NDArray[np.int64]) -> tuple[Array, NDArray[np.int64]]:
    """Standardised errors of one series, shape (cells, methods), and the offset by which each was known."""
    cube = alone.cube
    errors = cube.errors[speaking] / alone.naive_scale[:-1, None]
    ready = alone.offsets[:, None] - np.arange(1, errors.shape[2] + 1)[None, :]
    spoke: Flags = np.asarray(alone.pool[speaking, :-1].any(axis=0))
    there = np.isfinite(errors).any(axis=0) & spoke[:, None]
    found = errors[:, there].T
    # where a method cannot be had it neither gains nor loses: it is given the mean of the others
    found = np.where(np.isfinite(found), found, mean_of(found, axis=1)[:, None])
    return found, np.broadcast_to(ready, there.shape)[there]


def _gathered(known: Sequence[Array]) -> tuple[Array, Array]:
    """Errors of all series, evenly thinned where they are very many, and cell weights: each series counts the same."""
    step = max(1, sum(map(len, known)) // CELLS)
    kept = [errors[::step] for errors in known]
    weight = np.concatenate([np.full(len(errors), 1.0 / len(errors)) for errors in kept])
    return np.concatenate(kept), weight / weight.sum()


def learn(errors: Array, cell_weight: Array, prior: Array) -> Array:
    """Weights on the simplex that make the blend's mean absolute error smallest, pulled toward the prior.

    Parameters
    ----------
    errors : array, shape (cells, methods)
        Errors of each method in units of its series' scale; no missing values.
    cell_weight : array, shape (cells,)
        How much each cell counts; summing to 1.
    prior : array, shape (methods,)
        Positive, summing to 1.

    Returns
    -------
    array, shape (methods,); positive, summing to 1

    Notes
    -----
    The absolute error, rounded off near zero, and the divergence from the prior are convex in
    the weights, and the divergence keeps them above zero: Newton's method on the weights, with
    their sum held at 1, ends at the one minimum (Boyd & Vandenberghe 2004, Convex Optimization,
    section 10.2). To the last digits, so that the result does not depend on the processor.
    """
    rows = np.ascontiguousarray(errors.T)
    weights = prior.copy()
    now = _miss(rows, cell_weight, prior, weights)
    for _ in range(_ROUNDS):
        step, gain = _newton_step(rows, cell_weight, prior, weights)
        if gain < _DONE:
            break
        part = min(1.0, 0.95 / max(float((-step / weights).max()), 1e-300))
        # closer than this to the minimum the loss itself is only rounding: Newton's own step is surer
        while gain > _NEAR and _miss(rows, cell_weight, prior, weights + part * step) > now - 1e-4 * part * gain:
            part /= 2
        weights = weights + part * step
        now = _miss(rows, cell_weight, prior, weights)
    return np.asarray(weights / weights.sum())


def _miss(rows: Array, cell_weight: Array, prior: Array, weights: Array) -> float:
    """Mean absolute error of the blend, rounded off near zero, and the pull of the prior."""
    blend = np.einsum("mc,m->c", rows, weights)
    return float((cell_weight * np.sqrt(blend * blend + _SOFT * _SOFT)).sum() - PULL * (prior * np.log(weights)).sum())


def _newton_step(rows: Array, cell_weight: Array, prior: Array, weights: Array) -> tuple[Array, float]:
    """Newton's step on the weights with their sum held, and what it gains by the quadratic it rests on."""
    # einsum, not matrix products: those are shared out over processors and add up in another order on each
    blend = np.einsum("mc,m->c", rows, weights)
    size = np.sqrt(blend * blend + _SOFT * _SOFT)
    slope = np.einsum("mc,c->m", rows, cell_weight * blend / size) - PULL * prior / weights
    curve = np.einsum("ic,jc->ij", rows * (cell_weight * _SOFT * _SOFT / size**3), rows)
    curve[np.diag_indices_from(curve)] += PULL * prior / weights**2
    methods = len(weights)
    system = np.ones((methods + 1, methods + 1))  # the last row holds the sum
    system[:methods, :methods] = curve
    system[methods, methods] = 0.0
    step = np.linalg.solve(system, np.append(-slope, 0.0))[:methods]
    return step, float(np.einsum("i,ij,j->", step, curve, step))


def own_weights(weights: Array, own_errors: Array, pool: Flags) -> Array:
    """Weights of one series: the portfolio's, leaned toward the methods that missed less on it.

    Parameters
    ----------
    weights : array, shape (methods,)
        The portfolio's.
    own_errors : array, shape (methods,); the series' unit
        Mean absolute error of each method on this series; NaN where none is known.
    pool : array of bool, shape (methods,)
        Methods that may speak for the series.

    Returns
    -------
    array, shape (methods,)
        Summing to 1; all 0 where the pool is empty.
    """
    typical = np.nanmean(own_errors[pool]) if np.isfinite(own_errors[pool]).any() else np.nan
    lean = np.ones(len(weights))
    if typical > 0:
        known = np.isfinite(own_errors)
        lean[known] = np.maximum(own_errors[known] / typical, 1e-6) ** -OWN_POWER
    leaned = np.where(pool, weights * lean, 0.0)
    total = leaned.sum()
    return leaned / total if total > 0 else leaned


def own_errors(alone: Alone) -> Array:
    """Mean absolute error of each method on one series, as known at each origin and, in the last row, now.

    For the demand-rate family the root of the mean squared error: on a series that is zero
    more often than not, absolute errors reward a forecast of zero.

    Returns
    -------
    array, shape (origins + 1, methods); the series' unit
        From the cells that all methods of the pool then share; NaN where none is known.
    """
    cube = alone.cube
    power = np.array([2.0 if METHODS[name].family == "demand rate" else 1.0 for name in cube.methods])
    sizes = np.abs(cube.errors) ** power[:, None, None]
    there = np.isfinite(sizes)
    found = np.full((cube.known.size + 1, len(cube.methods)), np.nan)
    for row, known in enumerate((*cube.known, len(alone.raw))):
        cells = there[alone.pool[:, row]].all(axis=0) & cube.known_cells(int(known))
        if cells.any():
            found[row] = mean_of(sizes[:, cells], axis=1) ** (1 / power)
    return found
