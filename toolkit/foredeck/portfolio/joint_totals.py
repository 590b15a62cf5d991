"""Ranges of totals over leads, groups and the year. Ranges do not add.

The spread of a total comes from the past errors of its parts, taken together origin by
origin: over leads the errors of a series are summed as they came, over series their
correlation is shrunk toward one common correlation (Ledoit & Wolf 2003, Journal of
Empirical Finance 10, 603-621), since few origins stand behind many pairs.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from foredeck.backtests.measures import mean_of
from foredeck.portfolio.ranges import both_sides, mean_correlation

Array = NDArray[np.float64]

PRIOR_ORIGINS = 12.0
"""The common correlation counts as much as this many origins."""


@dataclass(frozen=True)
class WindowErrors:
    """Errors of one window (a set of leads), for all series of a portfolio.

    `spread` (series,) is the standard deviation of each series' total over the window;
    `unit` (series, origins) its past standardised window errors, NaN where unknown;
    `shape` (levels, 2) the pooled lower and upper quantiles of `unit`, both positive;
    `common` the mean correlation.
    """

    spread: Array
    unit: Array
    shape: Array
    common: float


def window_errors(standardised: Array, scale: Array, leads: NDArray[np.int64], levels: tuple[int, ...],
                  plain_shape: Array) -> WindowErrors:
    """Errors of the sum over `leads`, standardised per series.

    Parameters
    ----------
    standardised : array, shape (series, largest offset + 1, horizon)
        As in `ranges.multipliers`.
    scale : array, shape (series, horizon)
        Scales of the errors to come; the series' unit.
    leads : array of int
        0-based leads in the window.
    plain_shape : array, shape (levels, 2, horizon)
        Multipliers of single leads, used while no window error is known; treated as if leads moved as one.
    """
    cells = standardised[:, :, leads]
    summed = np.einsum("sol,sl->so", np.nan_to_num(cells), scale[:, leads])
    summed[~np.isfinite(cells).all(axis=2)] = np.nan
    size = scale[:, leads].sum(axis=1)
    relative = summed / size[:, None]
    known = relative[np.isfinite(relative)]
    if np.isfinite(relative).any(axis=0).sum() < 3 or not known.any():
        shape = plain_shape[:, :, leads].mean(axis=2)
        return WindowErrors(spread=size, unit=np.full_like(relative, np.nan), shape=shape, common=0.0)
    pooled = float(np.sqrt((known ** 2).mean()))
    unit = relative / pooled
    shape = both_sides(known / pooled, np.ones_like(known), np.array(levels) / 100)
    return WindowErrors(spread=pooled * size, unit=unit, shape=shape,
                        common=mean_correlation(_complete(unit)))


def total_range(errors: WindowErrors, members: NDArray[np.int64]) -> Array:
    """Distance from the total's forecast down and up to its limits.

    Parameters
    ----------
    members : array of int
        Rows of the series that are added.

    Returns
    -------
    array, shape (levels, 2); the series' unit, positive
    """
    spread, unit = errors.spread[members], errors.unit[members]
    variance = _common_variance(spread, errors.common)
    whole = np.isfinite(unit).any(axis=1)
    origins = np.isfinite(unit[whole]).all(axis=0) if whole.any() else np.zeros(unit.shape[1], dtype=bool)
    if origins.sum() >= 3:
        seen = float(((spread[whole, None] * unit[whole][:, origins]).sum(axis=0) ** 2).mean())
        own = _common_variance(spread[whole], errors.common)
        trust = origins.sum() / (origins.sum() + PRIOR_ORIGINS)
        variance = max(variance + trust * (seen - own), 0.1 * variance)
    return np.asarray(errors.shape * np.sqrt(variance))


def past_bias(errors: WindowErrors, members: NDArray[np.int64]) -> float:
    """Mean past error of the total, at today's scale: above zero where such totals came out above their forecast.

    Forecasts of a series aim at its middle, and members on logarithms lie under the mean; summed
    over many series that may show, so it is measured.

    Parameters
    ----------
    members : array of int
        Rows of the series that are added.

    Returns
    -------
    float; the series' unit; NaN where no error of any member is known
    """
    unit = errors.unit[members]
    known = np.isfinite(unit).any(axis=1)
    if not known.any():
        return float("nan")
    return float(errors.spread[members][known] @ mean_of(unit[known], axis=1))


def _common_variance(spread: Array, common: float) -> float:
    return float((1 - common) * (spread ** 2).sum() + common * spread.sum() ** 2)


def _complete(unit: Array) -> Array:
    rows = unit[np.isfinite(unit).any(axis=1)]
    return rows[:, np.isfinite(rows).all(axis=0)]
