"""Ranges from the errors that past forecasts really made.

An error is divided by its series' scale; standardised errors of all series together
give the multipliers, per lead and level. Only errors known at an origin make the
ranges of that origin, so the coverage that is reported was achieved, not fitted
(split conformal prediction with whole origins kept together; Vovk, Gammerman & Shafer
2005, chapter 2, for exchangeable errors. Series share shocks, so that few origins are few
errors however many the series: the multipliers are widened as Student's t is).
Intermittent series have ranges of their own: `count_ranges`.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy import stats

from foredeck.portfolio.alone import Alone
from foredeck.portfolio.procedure import Procedure

Array = NDArray[np.float64]

OWN_SHARE = 1 / 2
"""Most that a series' own backtest errors count in its scale; the rest is its naive error, which is
steadier."""

SIZE_POWER = 1 / 2
"""Periods that sell more also miss by more, though less than in proportion."""

DISAGREEMENT_POWER = 1 / 5
"""Where the methods disagree, all of them miss by more."""

HALF_LIFE = 6.0
"""An error counts half as much as one that became known so many periods later: the latest misses tell most of
the next ones."""

MIN_ORIGINS = 4
"""A lead gets no range from fewer origins than this; the nearest shorter lead's is widened instead."""


def scales(alone: Alone, procedure: Procedure, nonnegative: bool) -> Array:
    """Scale of the error at each origin and now, per lead.

    The geometric mean of the series' own errors, as far as they are known, and its naive error;
    where no own error is known the naive error alone, which is the larger. More where the
    methods disagree and, for values that cannot fall below zero, in periods that sell more.

    Returns
    -------
    array, shape (origins + 1, horizon); the series' unit, positive
    """
    naive = alone.naive_scale
    count = procedure.own_count
    share = OWN_SHARE * count / (count + 4.0)
    # a run of perfect forecasts must not claim that errors are impossible
    own = np.maximum(np.where(count > 0, procedure.own_error, naive), 0.02 * naive)
    scale = np.exp(share * np.log(own) + (1 - share) * np.log(naive))
    apart = np.maximum(procedure.disagreement / alone.naive_scale[:, None], 0.02) ** DISAGREEMENT_POWER
    if not nonnegative:
        return np.asarray(scale[:, None] * apart, dtype=np.float64)
    size = np.clip(np.nan_to_num(procedure.forecasts, nan=1.0) / procedure.level[:, None], 0.1, 10.0)
    return np.asarray(scale[:, None] * apart * size**SIZE_POWER, dtype=np.float64)


def multipliers(standardised: Array, levels: tuple[int, ...]) -> Array:
    """How many scales to either side of the forecast hold each level, at each origin and lead.

    Parameters
    ----------
    standardised : array, shape (series, largest offset + 1, horizon)
        Errors over scales, by offset of the origin from the closing period; NaN where none.
    levels : tuple of int
        Per cent.

    Returns
    -------
    array, shape (largest offset + 1, levels, 2, horizon)
        Lower and upper multipliers, both positive, for forecasts made at each offset
        (offset 0: now); NaN where too few origins were known.
    """
    _, width, horizon = standardised.shape
    shares = np.array(levels) / 100
    out = np.full((width, len(levels), 2, horizon), np.nan)
    independent = np.full((width, horizon), np.nan)
    for offset in range(width):
        together = _together(standardised, offset)
        for lead in range(horizon):
            pooled, weight, origins = _known(standardised, offset, lead)
            if len(origins) >= MIN_ORIGINS:
                out[offset, :, :, lead] = both_sides(pooled, weight, shares)
                # origins that count less are fewer origins (Kish 1965, Survey Sampling, section 11.7)
                independent[offset, lead] = together * origins.sum() ** 2 / (origins**2).sum()
    middle = (1 + shares)[:, None, None] / 2
    widen = stats.t.ppf(middle, np.maximum(independent, 2.0)) / stats.norm.ppf(middle)
    out *= np.moveaxis(widen, 0, 1)[:, :, None, :]
    for lead in range(horizon):
        gap = np.isnan(out[:, 0, 0, lead])
        # what is not known is not surer than the shorter lead
        out[gap, :, :, lead] = out[gap, :, :, lead - 1] * np.sqrt((lead + 1) / lead) if lead else np.nan
        if lead == 0 and gap[0]:
            out[0, :, :, 0] = _without_errors(levels)
    return out


def of_ordinary_series(standardised: Array, counted: NDArray[np.bool_]) -> Array:
    """Standardised errors without those of intermittent series, whose ranges come from counts.

    Parameters
    ----------
    standardised : array, shape (series, largest offset + 1, horizon)
    counted : array of bool, shape (series, largest offset + 1)
        Where a series was intermittent by what was known then.

    Returns
    -------
    array, the shape of `standardised`
        All errors where nothing else is left: some range is better than none.
    """
    left = np.where(counted[:, :, None], np.nan, standardised)
    return left if np.isfinite(left).any() else standardised


def _without_errors(levels: tuple[int, ...]) -> Array:
    """Multipliers for a first forecast that no past forecast stands behind: wide, from t with 2 degrees
    of freedom, the scale being a mean absolute error (sd = 1.2533 times it under normal errors)."""
    one = np.array([1.2533 * stats.t.ppf((1 + level / 100) / 2, 2.0) for level in levels])
    return np.repeat(one[:, None], 2, axis=1)


def age_weights(ages: Array) -> Array:
    """How much errors count that became known so many periods before the origin."""
    return np.asarray(0.5 ** (ages / HALF_LIFE))


MOST_ERRORS = 100_000
"""Errors that one multiplier rests on at most; of more, those of evenly spread series are as good."""


def _known(standardised: Array, offset: int, lead: int) -> tuple[Array, Array, Array]:
    """Errors at a lead, its neighbours included, that were known `offset` periods before the closing.

    Returns
    -------
    errors, how much each counts, and how much each origin of the lead itself counts
    """
    pooled, weights, origins = [], [], np.zeros(0)
    standardised = standardised[:: 1 + 3 * standardised.shape[0] * (standardised.shape[1] - offset) // MOST_ERRORS]
    for near in (lead - 1, lead, lead + 1):
        if not 0 <= near < standardised.shape[2]:
            continue
        cells = standardised[:, offset + near + 1:, near]
        there = np.isfinite(cells)
        counts = np.broadcast_to(age_weights(np.arange(float(cells.shape[1]))), cells.shape)
        if near == lead:
            origins = counts[0][there.any(axis=0)]
        pooled.append(cells[there])
        weights.append(counts[there])
    return np.concatenate(pooled), np.concatenate(weights), origins


def _together(standardised: Array, offset: int) -> float:
    """How many independent series the portfolio is worth, given how far errors move together."""
    first = standardised[:, offset + 1:, 0]
    first = first[np.isfinite(first).all(axis=1)] if first.size else first
    return len(first) / (1 + (len(first) - 1) * mean_correlation(first)) if len(first) > 1 else 1.0


def mean_correlation(rows: Array) -> float:
    """Mean correlation between rows, not below zero; from sums, so that 10,000 rows cost nothing.

    Parameters
    ----------
    rows : array, shape (series, origins); no missing values
    """
    n, origins = rows.shape
    if n < 2 or origins < 3:
        return 0.0
    centred = rows - rows.mean(axis=1, keepdims=True)
    spread = centred.std(axis=1, keepdims=True)
    unit = centred[spread[:, 0] > 0] / spread[spread[:, 0] > 0]
    n = len(unit)
    if n < 2:
        return 0.0
    return float(np.clip(((unit.sum(axis=0) ** 2).mean() - n) / (n * (n - 1)), 0.0, 1.0))


def both_sides(pooled: Array, weight: Array, shares: Array) -> Array:
    """Mean of symmetric and asymmetric quantiles, shape (levels, 2): lower and upper, both positive."""
    symmetric = weighted_quantiles(np.abs(pooled), weight, shares)
    lower, upper = weighted_quantiles(pooled, weight, np.stack([1 - shares, 1 + shares]) / 2)
    return np.maximum(np.stack([symmetric - lower, symmetric + upper], axis=1) / 2, 0.0)


def weighted_quantiles(values: Array, weight: Array, shares: Array) -> Array:
    """Quantiles of values that count unequally; with equal weights those of Hyndman & Fan (1996), type 7.

    Parameters
    ----------
    values, weight : array, shape (n,), at least one; weights positive
    shares : array, 0 to 1
    """
    order = np.argsort(values, kind="stable")
    sorted_values, counts = values[order], weight[order]
    if len(values) == 1:
        return np.full(np.shape(shares), sorted_values[0])
    reached = np.cumsum(counts) - counts
    return np.asarray(np.interp(shares, reached / reached[-1], sorted_values))
