"""Ranges of intermittent series, from a distribution of counts.

A forecast of .3 a period does not miss by a little to either side: most periods bring nothing
and some a whole demand. In a period there is demand or none, and a demand has one of the sizes
that the series has had (Croston 1972, Operational Research Quarterly 23, 289-303; Willemain,
Smart & Schwarz 2004, International Journal of Forecasting 20, 375-387, for the demand over a
lead time from the series' own past; Snyder, Ord & Beaumont 2012, the same 28, 485-496, for counts
and for what is not known of their parameters; page numbers from memory). Sums over several
periods are convolved, not resampled, so that the same history always gives the same limits.

The mean of the distribution is the forecast. What is not known widens it: the chance of a demand
has a Beta distribution around its value, sizes are spread around those seen, and all sizes of a
window may turn out larger or smaller together. In a single period only the sizes can widen it.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import special, stats

from foredeck.checks.intermittence import ADI_LIMIT, average_demand_interval
from foredeck.portfolio.alone import Alone
from foredeck.portfolio.procedure import Procedure

Array = NDArray[np.float64]

MEMORY = 20.0
"""Most periods that a forecast of a demand rate is worth, however long the history: demand moves on.

Between steady series (where more would do) and drifting ones (where 12 would) in the simulation of the tests."""

WILD = 50.0
"""A size so many times the median size was counted in another unit, and is no size of this series."""

LONE_VARIATION = 0.5
"""How much sizes vary (standard deviation of their logarithms) where only one was ever seen."""

CELLS = 4096
"""Steps between zero and the largest sum; where whole numbers need more, neighbours share a step."""

_MIDDLES = stats.norm.ppf((np.arange(7) + 0.5) / 7)
STEPS = _MIDDLES / np.sqrt((_MIDDLES**2).mean())
"""Seven equally likely values with mean 0 and variance 1 that stand for a normal distribution."""


@dataclass(frozen=True)
class Demand:
    """What is known of a series' demand: `n` periods, and the sizes of those that had one.

    `whole` says whether the series counts in whole numbers.
    """

    n: int
    sizes: Array
    whole: bool

    @property
    def worth(self) -> float:
        """How many periods the chance of a demand rests on."""
        return min(float(self.n), MEMORY)

    @property
    def variation(self) -> float:
        """Variance of the logarithms of the sizes, if they were lognormal."""
        if len(self.sizes) == 1:
            return LONE_VARIATION**2
        return float(np.log1p(np.var(self.sizes, ddof=1) / self.sizes.mean() ** 2))


def demand_of(values: Array) -> Demand:
    """What raw values tell of the demand; missing and negative ones are left out.

    Parameters
    ----------
    values : array, shape (n,); the series' unit
        Raw, as known at an origin.
    """
    known = values[np.isfinite(values) & (values >= 0)]
    sizes = known[known > 0]
    whole = bool((sizes == np.round(sizes)).all())
    return Demand(len(known), sizes[sizes <= WILD * np.median(sizes)] if len(sizes) else sizes, whole)


def intermittent_at(raw: Array, known: Sequence[int] | NDArray[np.int64], nonnegative: bool) -> NDArray[np.bool_]:
    """Whether counts make the ranges when so many periods are known; never where values may fall below zero."""
    return np.array([nonnegative and average_demand_interval(raw[:k]) >= ADI_LIMIT for k in known], dtype=np.bool_)


def origin_limits(alone: Alone, procedure: Procedure, levels: Sequence[int], nonnegative: bool) -> Array:
    """Limits of single periods at each origin and, in the last place, now, each from what was known there.

    Returns
    -------
    array, shape (origins + 1, levels, 2, horizon); the series' unit
        NaN at origins where the series was not intermittent.
    """
    counts = [*alone.cube.known.tolist(), len(alone.raw)]
    limits = np.full((len(counts), len(levels), 2, procedure.forecasts.shape[1]), np.nan)
    for at in np.flatnonzero(intermittent_at(alone.raw, counts, nonnegative)):
        known, forecasts = demand_of(alone.raw[:counts[at]]), procedure.forecasts[at]
        # demand rates are flat: what one lead says all of them say
        for value in np.unique(forecasts[np.isfinite(forecasts)]):
            limits[at][:, :, forecasts == value] = sum_limits(known, float(value), 1, levels)[:, :, None]
    return limits


def sum_limits(known: Demand, expected: float, periods: int, levels: Sequence[int]) -> Array:
    """Limits of the sum over so many periods to come.

    Counts are discrete: a limit is the smallest count whose chance of not being exceeded reaches its
    share, so that each level is at least reached, and exceeded where one count holds much of the
    distribution (zero alone may hold more than the whole level).

    Parameters
    ----------
    known : Demand
    expected : float; the series' unit
        The forecast of the sum; the mean of the distribution.
    periods : int
    levels : sequence of int
        Per cent.

    Returns
    -------
    array, shape (levels, 2); the series' unit, not below zero, whole where the series is
    """
    if not len(known.sizes) or expected <= 0:
        return np.zeros((len(levels), 2))
    chances, step = sum_distribution(known, expected, periods)
    # a share that is reached but for rounding is reached
    reached = np.cumsum(chances) + 1e-9
    shares = np.array([[(1 - level / 100) / 2, (1 + level / 100) / 2] for level in levels])
    return np.asarray(np.searchsorted(reached, shares) * step, dtype=np.float64)


def sum_distribution(known: Demand, expected: float, periods: int) -> tuple[Array, float]:
    """Chances of the sums 0, 1, 2, ... steps, and the step.

    Parameters as for `sum_limits`; there is at least one size, and `expected` is positive.

    Returns
    -------
    array, shape (cells,); summing to 1, with mean `expected` over the step
    float; the series' unit; 1 for whole numbers, unless sizes are large
    """
    sizes = _spread_sizes(known)
    chance = expected / periods / float(sizes.mean())
    most = (known.n + 0.5) / (known.n + 1.0)  # the mean of Jeffreys' posterior when every period had demand
    if chance > most:
        sizes, chance = sizes * chance / most, most
    step = _step(float(sizes.max()) * periods, known.whole)
    largest = int(sizes.max() / step) + 1
    if periods == 1:
        one = chance * _on_steps(sizes.ravel() / step, largest)
        one[0] += 1.0 - chance
        return one, step
    demands = number_of_demands(chance, known.worth, periods)
    length = largest * periods + 1
    transforms = np.fft.rfft([_on_steps(together.ravel() / step, largest) for together in sizes], length)
    total = np.zeros_like(transforms)
    for share in demands[::-1]:  # Horner: the sum of so many demands has the power of one's transform
        total = total * transforms + share
    return np.maximum(np.fft.irfft(total.mean(axis=0), length), 0.0), step


def number_of_demands(chance: float, worth: float, periods: int) -> Array:
    """Chances of 0, 1, ... periods with demand: beta-binomial, the Beta having the mean `chance`.

    The Beta counts as much as `worth` periods seen, and one more for Jeffreys' prior.

    Returns
    -------
    array, shape (periods + 1,)
    """
    k = np.arange(periods + 1)
    a, b = chance * (worth + 1.0), (1.0 - chance) * (worth + 1.0)
    ways = special.comb(periods, k)
    return np.asarray(ways * np.exp(special.betaln(k + a, periods - k + b) - special.betaln(a, b)), dtype=np.float64)


def _spread_sizes(known: Demand) -> Array:
    """Sizes that may come, equally likely; shape (together, sizes, alone).

    With d sizes of variance s^2 seen, a new one varies by s^2 (1 + 1/d) around their mean. The sizes seen have
    (1 - 1/d) of that; 1/d is spread around each one, and 1/d moves all together, being what is not known of the
    mean. On logarithms, so that no size is negative.
    """
    d = len(known.sizes)
    one = np.sqrt(known.variation / d)
    mean = np.sqrt(known.variation / d * known.n / known.worth)
    around = known.sizes[:, None] * np.exp(one * STEPS)[None, :]
    around *= known.sizes.mean() / around.mean()
    shift = np.exp(mean * STEPS)
    sizes = around[None] * (shift / shift.mean())[:, None, None]
    return np.asarray(np.maximum(sizes, 1.0) if known.whole else sizes)


def _step(largest: float, whole: bool) -> float:
    step = largest / CELLS
    return float(max(np.ceil(step), 1.0)) if whole else step


def _on_steps(sizes: Array, largest: int) -> Array:
    """Chances of 0 to `largest` steps, of sizes given in steps; one between two is shared so that the mean stays."""
    below = np.floor(sizes)
    part = sizes - below
    at = below.astype(np.int64)
    counted = np.bincount(at, 1.0 - part, largest + 1) + np.bincount(at + 1, part, largest + 1)
    return np.asarray(counted / len(sizes))
