"""What a period is expected to be, told by all the others: level, slope and season.

The model is a line, a level that may wander, and a season that may change slowly, all
linear and Gaussian on a scale (raw, root or logarithm) on which the remainders are even:

    z = a + b t + wandering level + season + noise,   variance of z = sigma^2 V

Every question asked of a series here (what should this period have been? is it too far
away? did the level jump?) is a generalised least squares regression on one more column:
a spike for one period, a step for a jump. That is the auxiliary-residual test of Harvey
& Koopman (1992) and de Jong & Penzer (1998); a missing period is a spike too, which
drops it exactly.

V of n periods is the leading block of V of more periods, so the inverse Cholesky factor
is kept once for all origins and a fit costs a few matrix-vector products. Most fits know every
period and allow for no jump: for those the level and slope are taken out once for a length.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from typing import Literal

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Scale = Literal["raw", "root", "log"]

LONGEST = 320
"""Periods looked at in one go; longer histories are looked at in pieces."""

_SMALL = 160
# Variances relative to the noise. Level: from none to all but a random walk. Season: size
# of the fixed part, then yearly drift; the large one leaves a strong season unshrunk.
_WANDER = (0.0, 0.02, 0.2, 2.0, 20.0)
_SEASON = ((0.0, 0.0), (1.0, 0.0), (30.0, 0.0), (30.0, 0.1))
# A whitened error beyond this many robust deviations counts as exactly this many, so that
# a few wild values do not choose the model. Further out in a short history, where the robust
# deviation is itself uncertain: tighter marks there let a season fit noise.
_CLIP = 3.5
_NORMAL_MAD = 1.4826


@dataclass(frozen=True, eq=False)
class _Whiteners:
    """What whitens values under every candidate; the leading block serves fewer periods.

    Attributes
    ----------
    inverse : array, shape (n_candidates, size, size)
        Inverse Cholesky factors of V.
    logs : array, shape (n_candidates, size)
        Log determinants of the leading blocks of V.
    """

    inverse: Array
    logs: Array


@lru_cache(maxsize=8)
def _whiteners(season_length: int, size: int, seasonal: bool) -> _Whiteners:
    t = np.arange(size)
    walk = np.minimum.outer(t, t) + 1.0
    same = (t[:, None] - t[None, :]) % season_length == 0
    years = np.minimum.outer(t // season_length, t // season_length)
    factors, logs = [], []
    for fixed, drift in _SEASON if seasonal else _SEASON[:1]:
        for wander in _WANDER:
            v = np.eye(size) + wander * walk + same * (fixed + drift * years)
            root = np.linalg.cholesky(v)
            factors.append(np.tril(np.linalg.inv(root)))
            logs.append(2.0 * np.cumsum(np.log(np.diag(root))))
    return _Whiteners(np.ascontiguousarray(factors), np.array(logs))


def _whiteners_of(season_length: int, n: int) -> _Whiteners:
    """Whiteners that hold n periods; a season is looked for from two full years on."""
    return _whiteners(season_length, _SMALL if n <= _SMALL else LONGEST, season_length > 1 and n >= 2 * season_length)


@dataclass(frozen=True, eq=False)
class _Line:
    """Level and slope of so many periods, whitened under every candidate.

    Attributes
    ----------
    basis : array, shape (n_candidates, n, 2)
        The two columns made orthonormal.
    volume : array, shape (n_candidates,)
        Log determinants of V and of the normal equations.
    spike_rest, step_rest : array, shape (n_candidates, n)
        From `_rest`.
    """

    basis: Array
    volume: Array
    spike_rest: Array
    step_rest: Array


@lru_cache(maxsize=256)
def _line(season_length: int, n: int) -> _Line:
    whiteners = _whiteners_of(season_length, n)
    inverse = whiteners.inverse[:, :n, :n]
    white = inverse @ _level_and_slope(n)
    basis = np.linalg.qr(white)[0]
    volume = whiteners.logs[:, n - 1] + np.linalg.slogdet(white.transpose(0, 2, 1) @ white)[1]
    return _Line(basis, volume, _rest(inverse, basis), _rest(_from_there_on(inverse), basis))


def _level_and_slope(n: int) -> Array:
    return np.column_stack([np.ones(n), np.linspace(-1.0, 1.0, n)])


def _rest(columns: Array, basis: Array) -> Array:
    """Squared lengths of whitened columns, (..., n, n_columns), beside what the fitted ones explain of them.

    Infinite where they explain the whole: such a column tells nothing.
    """
    own = (columns ** 2).sum(axis=-2)
    rest = own - ((basis.swapaxes(-1, -2) @ columns) ** 2).sum(axis=-2)
    return np.where(rest > 1e-8 * own, rest, np.inf)


def _from_there_on(spikes: Array) -> Array:
    """Sum over the last axis from each position to the end: what holds for spikes, for steps."""
    return spikes[..., ::-1].cumsum(axis=-1)[..., ::-1]


@dataclass(frozen=True)
class Expectation:
    """A series' expected values, fitted with some periods left out and some jumps allowed.

    Attributes
    ----------
    candidate : int
        Which of the listed levels and seasons it is.
    scale : {"raw", "root", "log"}
        Scale on which the remainders are even.
    unit : float
        What raw values were divided by before the scale was taken.
    z : array, shape (n,)
        The values on that scale; 0 where missing.
    sigma : float
        Robust standard deviation of the noise on that scale.
    spike_t, step_t : array, shape (n,)
        Standardised size of a spike at, or of a jump beginning at, each period; 0 where
        it cannot be told.
    spike, step : array, shape (n,)
        The sizes themselves on that scale; z - spike is what the others suggest.
    spread : array, shape (n,)
        Standard deviation of a spike's size: how well the others know the period.
    """

    candidate: int
    scale: Scale
    unit: float
    z: Array
    sigma: float
    spike_t: Array
    step_t: Array
    spike: Array
    step: Array
    spread: Array

    def expected(self, offset: float = 0.0) -> Array:
        """What the other periods suggest, in the raw unit; `offset` in standard deviations.

        The value itself where the others suggest nothing.
        """
        spread = np.where(np.isfinite(self.spread), self.spread, 0.0)
        return from_scale(self.z - self.spike + offset * spread, self.scale) * self.unit

    def distance(self, raw: float, position: int) -> float:
        """Standard deviations between a raw value and what the other periods suggest there."""
        z = to_scale(np.array([raw / self.unit]), self.scale)[0]
        return float((z - self.z[position] + self.spike[position]) / self.spread[position])


def to_scale(values: Array, scale: Scale) -> Array:
    """Take `values` to a scale; the caller has made sure that they can be."""
    if scale == "raw":
        return values
    return np.sqrt(values) if scale == "root" else np.log(values)


def from_scale(z: Array, scale: Scale) -> Array:
    """Take values on a scale back to raw ones."""
    if scale == "raw":
        return z
    # A root below zero can only be meant as zero.
    return np.maximum(z, 0.0) ** 2 if scale == "root" else np.exp(np.minimum(z, 700.0))


def _candidates(y: Array, heard: Array, like: Expectation | None) -> tuple[list[Scale], Array, Array]:
    """Scales that the values heard allow, all values on them, and each scale's log Jacobian."""
    lowest = heard.min()
    scales: list[Scale] = ["raw"]
    if lowest >= 0:
        scales = ["raw", "root", "log"] if lowest > 0 else ["raw", "root"]
    if like is not None and like.scale in scales:
        scales = [like.scale]
    z = np.zeros((len(scales), y.size))
    known = np.isfinite(y)
    # A left-out value that a scale cannot hold is taken there as very low: a thousandth of the lowest kept.
    held = np.maximum(y[known], 0.001 * lowest) if lowest >= 0 else y[known]
    for i, scale in enumerate(scales):
        z[i, known] = y[known] if scale == "raw" else to_scale(held, scale)
    if len(scales) == 1:
        return scales, z, np.zeros(1)
    # A zero has no logarithm: for the Jacobian it counts as half the smallest sale.
    smallest = lowest if lowest > 0 else heard[heard > 0].min(initial=np.inf)
    logs = np.log(np.maximum(heard, 0.5 * smallest)) if np.isfinite(smallest) else np.zeros(1)
    total = logs.sum()
    jacobian = {"raw": 0.0, "root": -heard.size * np.log(2.0) - 0.5 * total, "log": -total}
    return scales, z, np.array([jacobian[s] for s in scales])


def _median(ordered: Array) -> Array:
    """Median over the last axis of values in ascending order."""
    half = ordered.shape[-1] // 2
    if ordered.shape[-1] % 2:
        return np.asarray(ordered[..., half])
    return np.asarray((ordered[..., half - 1] + ordered[..., half]) / 2.0)


def _robust_squares(errors: Array, free: int, clip: float) -> Array:
    """Sum of squares over the last-but-one axis, wild values clipped at so many robust deviations."""
    size = np.abs(errors)
    ordered = np.sort(np.ascontiguousarray(size.swapaxes(-1, -2)), axis=-1)
    mad = _median(ordered)[..., None, :] * _NORMAL_MAD * np.sqrt(errors.shape[-2] / free)
    # More than half the errors being nil (rounded counts) leaves the mean size to go by.
    if mad.min() <= 1e-9:
        mad = np.where(mad > 1e-9, mad, 1.2533 * size.mean(axis=-2, keepdims=True))
    return np.asarray((np.minimum(size, clip * mad) ** 2).sum(axis=-2))


def fit(values: Array, season_length: int, left_out: NDArray[np.intp],
        jumps: NDArray[np.intp], like: Expectation | None = None) -> Expectation | None:
    """Fit level, slope and season, and measure every period against all the others.

    Parameters
    ----------
    values : array, shape (n,), n <= LONGEST; the series' unit
        NaN only at positions in `left_out`.
    season_length : int
        Periods a year; a season is looked for from two full years on.
    left_out : array of int
        Positions that must not speak: missing ones and those under suspicion.
    jumps : array of int
        Positions at which the level jumps for good.
    like : Expectation, optional
        Keep its scale, level and season instead of choosing them again (quicker).

    Returns
    -------
    Expectation, or None when fewer than five values are left or all of them are one number

    References
    ----------
    Harvey & Koopman (1992), Journal of Business & Economic Statistics 10, 377-389.
    de Jong & Penzer (1998), Journal of the American Statistical Association 93, 796-806.
    """
    n = values.size
    free = n - left_out.size - 2 - jumps.size
    if free < 3:
        return None
    heard = np.delete(values, left_out) if left_out.size else values
    ordered = np.sort(np.abs(heard))
    unit = float(_median(ordered)) or float(ordered[-1])
    if unit == 0.0 or heard.max() == heard.min():
        return None
    scales, z, jacobian = _candidates(values / unit, heard / unit, like)
    whiteners = _whiteners_of(season_length, n)
    tried = slice(None) if like is None else slice(like.candidate, like.candidate + 1)
    plain = _line(season_length, n) if left_out.size + jumps.size == 0 else None
    if plain:
        errors, volume = _errors(whiteners, tried, z, plain), plain.volume[tried]
    else:
        errors, volume, fixed = _errors_with_columns(whiteners, tried, z, left_out, jumps)
    squares = np.maximum(_robust_squares(errors, free, _CLIP * (1.0 + season_length / free)), 1e-18)
    merit = jacobian - 0.5 * (volume[:, None] + free * np.log(squares))
    best, scale = divmod(int(merit.argmax()), len(scales))
    candidate = best + (like.candidate if like else 0)
    inverse, error = whiteners.inverse[candidate, :n, :n], errors[best, :, scale]
    along = inverse.T @ error
    chosen = candidate, scales[scale], unit, z[scale], float(np.sqrt(squares[best, scale] / free))
    if plain:
        return _measured(*chosen, along, _from_there_on(along), plain.spike_rest[candidate], plain.step_rest[candidate])
    basis, triangle = np.linalg.qr(fixed[best])
    # Written out: beside a period left out two steps can be the same one, and rounding decides between them.
    steps = _from_there_on(inverse)
    model = _measured(*chosen, along, steps.T @ error, _rest(inverse, basis), _rest(steps, basis))
    _measure_columns(model, basis.T @ (inverse @ model.z), triangle, left_out, jumps)
    return model


def _errors(whiteners: _Whiteners, tried: slice, z: Array, line: _Line) -> Array:
    """Whitened errors (candidate, period, scale) of fits with nothing left out and no jump."""
    n = z.shape[1]
    basis = line.basis[tried]
    errors = z @ whiteners.inverse[tried, :n, :n].transpose(0, 2, 1)
    errors -= (errors @ basis) @ basis.transpose(0, 2, 1)
    return errors.transpose(0, 2, 1)


def _errors_with_columns(whiteners: _Whiteners, tried: slice, z: Array, left_out: NDArray[np.intp],
                         jumps: NDArray[np.intp]) -> tuple[Array, Array, Array]:
    """The same with a column for each period left out and for each jump; also the volume and all columns."""
    n, lines = z.shape[1], 2 + jumps.size
    inverse = whiteners.inverse[tried, :n, :n]
    white = inverse @ np.column_stack([_level_and_slope(n), np.arange(n)[:, None] >= jumps, z.T])
    fixed = np.concatenate([white[:, :, :lines], inverse[:, :, left_out]], axis=2)
    target = white[:, :, lines:]
    turned = fixed.transpose(0, 2, 1)
    gram = turned @ fixed
    errors = target - fixed @ np.linalg.solve(gram, turned @ target)
    volume = whiteners.logs[tried, n - 1] + np.linalg.slogdet(gram)[1]
    return errors, volume, fixed


def _measured(candidate: int, scale: Scale, unit: float, z: Array, sigma: float, spikes: Array, steps: Array,
              spike_rest: Array, step_rest: Array) -> Expectation:
    """Size and standard deviation of a spike and of a step at every period.

    `spikes` and `steps` hold the products of whitened ones with the error, and `..._rest` are from `_rest`.
    """
    spike, step = spikes / spike_rest, steps / step_rest
    # An infinite remainder says that nothing can be told, so that the spread is infinite, not nil.
    spread = np.where(np.isfinite(spike_rest), sigma / np.sqrt(spike_rest), np.inf)
    step_spread = np.where(np.isfinite(step_rest), sigma / np.sqrt(step_rest), np.inf)
    return Expectation(candidate, scale, unit, z, sigma, spike / spread, step / step_spread, spike, step, spread)


def _measure_columns(model: Expectation, along: Array, triangle: Array, left_out: NDArray[np.intp],
                     jumps: NDArray[np.intp]) -> None:
    """Give what is a column its own coefficient as its size."""
    root = np.linalg.inv(triangle)
    size = root @ along
    spread = model.sigma * np.sqrt((root ** 2).sum(axis=1))
    last = 2 + jumps.size
    model.step[jumps] = size[2:last]
    model.step_t[jumps] = size[2:last] / spread[2:last]
    model.spike[left_out] = size[last:]
    model.spread[left_out] = spread[last:]
    model.spike_t[left_out] = size[last:] / spread[last:]
