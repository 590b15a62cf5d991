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
is kept once for all origins and a fit costs a few matrix-vector products.
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


@lru_cache(maxsize=8)
def _whiteners(season_length: int, size: int, seasonal: bool) -> tuple[Array, Array]:
    """Inverse Cholesky factors of V for every candidate, and cumulated log determinants."""
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
    return np.ascontiguousarray(factors), np.array(logs)


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


def _candidates(y: Array, kept: NDArray[np.bool_],
                like: Expectation | None) -> tuple[list[Scale], Array, Array]:
    """Scales the kept values allow, the values on them, and each scale's log Jacobian."""
    lowest = y[kept].min()
    scales: list[Scale] = ["raw"]
    if lowest >= 0:
        scales = ["raw", "root", "log"] if lowest > 0 else ["raw", "root"]
    if like is not None and like.scale in scales:
        scales = [like.scale]
    z = np.zeros((y.size, len(scales)))
    known = np.isfinite(y)
    # A left-out value that a scale cannot hold is taken there as very low: a thousandth of the lowest kept.
    held = np.maximum(y[known], 0.001 * lowest) if lowest >= 0 else y[known]
    for i, scale in enumerate(scales):
        z[known, i] = y[known] if scale == "raw" else to_scale(held, scale)
    if len(scales) == 1:
        return scales, z, np.zeros(1)
    # A zero has no logarithm: for the Jacobian it counts as half the smallest sale.
    positive = y[kept][y[kept] > 0]
    logs = np.log(np.maximum(y[kept], 0.5 * positive.min())) if positive.size else np.zeros(1)
    jacobian = {"raw": 0.0, "root": -kept.sum() * np.log(2.0) - 0.5 * logs.sum(), "log": -logs.sum()}
    return scales, z, np.array([jacobian[s] for s in scales])


def _robust_squares(errors: Array, free: int, clip: float) -> Array:
    """Sum of squares over the first-but-one axis, wild values clipped at so many robust deviations."""
    size = np.abs(errors)
    mad = np.median(size, axis=-2, keepdims=True) * _NORMAL_MAD * np.sqrt(errors.shape[-2] / free)
    # More than half the errors being nil (rounded counts) leaves the mean size to go by.
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
    kept = np.ones(n, dtype=bool)
    kept[left_out] = False
    free = int(kept.sum()) - 2 - jumps.size
    if free < 3:
        return None
    unit = float(np.median(np.abs(values[kept]))) or float(np.abs(values[kept]).max())
    if unit == 0.0 or np.ptp(values[kept]) == 0.0:
        return None
    y = values / unit
    scales, z, jacobian = _candidates(y, kept, like)
    seasonal = season_length > 1 and n >= 2 * season_length
    inverse, logs = _whiteners(season_length, _SMALL if n <= _SMALL else LONGEST, seasonal)
    first, last = (0, len(inverse)) if like is None else (like.candidate, like.candidate + 1)
    block = inverse[first:last, :n, :n]
    columns = np.column_stack([np.ones(n), np.linspace(-1.0, 1.0, n),
                               (np.arange(n)[:, None] >= jumps[None, :]).astype(float), z])
    white = block @ columns
    fixed = np.concatenate([white[:, :, :2 + jumps.size], block[:, :, left_out]], axis=2)
    target = white[:, :, 2 + jumps.size:]
    gram = fixed.transpose(0, 2, 1) @ fixed
    errors = target - fixed @ np.linalg.solve(gram, fixed.transpose(0, 2, 1) @ target)
    squares = np.maximum(_robust_squares(errors, free, _CLIP * (1.0 + season_length / free)), 1e-18)
    volume = logs[first:last, n - 1] + np.linalg.slogdet(gram)[1]
    merit = jacobian - 0.5 * (volume[:, None] + free * np.log(squares))
    best, scale = np.unravel_index(int(np.argmax(merit)), merit.shape)
    return _measure(first + int(best), block[best], fixed[best], errors[best, :, scale], z[:, scale],
                    float(np.sqrt(squares[best, scale] / free)), scales[scale], unit, left_out, jumps)


def _measure(candidate: int, inverse: Array, fixed: Array, error: Array, z: Array, sigma: float, scale: Scale,
             unit: float, left_out: NDArray[np.intp], jumps: NDArray[np.intp]) -> Expectation:
    """Size and standard deviation of a spike and of a step at every period."""
    basis, triangle = np.linalg.qr(fixed)
    steps = np.cumsum(inverse[:, ::-1], axis=1)[:, ::-1]
    spike, spike_t, spread = _sizes(inverse, basis, error, sigma)
    step, step_t, _ = _sizes(steps, basis, error, sigma)
    if left_out.size or jumps.size:
        # What is a column already has its own coefficient as its size.
        root = np.linalg.inv(triangle)
        size = root @ (basis.T @ (inverse @ z))
        size_spread = sigma * np.sqrt((root ** 2).sum(axis=1))
        last = 2 + jumps.size
        step[jumps] = size[2:last]
        step_t[jumps] = size[2:last] / size_spread[2:last]
        spike[left_out] = size[last:]
        spread[left_out] = size_spread[last:]
        spike_t[left_out] = size[last:] / size_spread[last:]
    return Expectation(candidate, scale, unit, z, sigma, spike_t, step_t, spike, step, spread)


def _sizes(columns: Array, basis: Array, error: Array, sigma: float) -> tuple[Array, Array, Array]:
    own = (columns ** 2).sum(axis=0)
    rest = own - ((basis.T @ columns) ** 2).sum(axis=0)
    # A column that the others explain wholly tells nothing.
    tells = rest > 1e-8 * own
    rest = np.where(tells, rest, 1.0)
    size = np.where(tells, columns.T @ error / rest, 0.0)
    spread = np.where(tells, sigma / np.sqrt(rest), np.inf)
    return size, np.where(tells, size / spread, 0.0), spread
