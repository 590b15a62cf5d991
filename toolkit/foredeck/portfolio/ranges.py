"""Ranges from the errors that past forecasts really made.

An error is divided by its series' scale; standardised errors of all series together
give the multipliers, per lead and level. Only errors known at an origin make the
ranges of that origin, so the coverage that is reported was achieved, not fitted
(split conformal prediction with whole origins kept together; Vovk, Gammerman & Shafer
2005, chapter 2, for exchangeable errors. Series share shocks, so that few origins are few
errors however many the series: the multipliers are widened as Student's t is).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy import stats

from foredeck.portfolio.alone import Alone
from foredeck.portfolio.procedure import Procedure

Array = NDArray[np.float64]

OWN_SHARE = 2 / 3
"""Most that a series' own backtest errors count in its scale; the rest is its naive error, which is
steadier."""

MIN_ORIGINS = 4
"""A lead gets no range from fewer origins than this; the nearest shorter lead's is widened instead."""


def scales(alone: Alone, procedure: Procedure, ratio: Array, nonnegative: bool) -> Array:
    """Scale of the error at each origin and now, per lead.

    Parameters
    ----------
    ratio : array, shape (largest offset + 1,)
        Portfolio ratio of own error to naive error as known at each offset from the closing period.

    Returns
    -------
    array, shape (origins + 1, horizon); the series' unit, positive
    """
    offsets = np.append(alone.offsets, 0)
    naive = alone.naive_scale * ratio[offsets]
    count = procedure.own_count
    share = OWN_SHARE * count / (count + 4.0)
    # a run of perfect forecasts must not claim that errors are impossible
    own = np.maximum(np.where(count > 0, procedure.own_error, naive), 0.02 * naive)
    scale = np.exp(share * np.log(own) + (1 - share) * np.log(naive))
    if not nonnegative:
        return np.repeat(scale[:, None], procedure.forecasts.shape[1], axis=1)
    # months that sell more also miss by more, though less than in proportion
    size = np.clip(np.nan_to_num(procedure.forecasts, nan=1.0) / procedure.level[:, None], 0.1, 10.0)
    return np.asarray(scale[:, None] * np.sqrt(size), dtype=np.float64)


def error_ratio(alones: list[Alone], procedures: list[Procedure], largest: int) -> Array:
    """Median over the series of own error to naive error, as known at each offset.

    Returns
    -------
    array, shape (largest + 1,); 1 where no series has three errors yet
    """
    table = np.full((len(alones), largest + 1), np.nan)
    for row, alone, procedure in zip(table, alones, procedures, strict=True):
        enough = procedure.own_count >= 3
        offsets = np.append(alone.offsets, 0)[enough]
        row[offsets] = (procedure.own_error / alone.naive_scale)[enough]
    result = np.ones(largest + 1)
    filled = np.isfinite(table).any(axis=0)
    result[filled] = np.nanmedian(table[:, filled], axis=0)
    return np.maximum(result, 0.05)


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
            pooled, origins = _known(standardised, offset, lead)
            if origins >= MIN_ORIGINS:
                out[offset, :, :, lead] = _both_sides(pooled, shares)
                independent[offset, lead] = origins * together
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


def _without_errors(levels: tuple[int, ...]) -> Array:
    """Multipliers for a first forecast that no past forecast stands behind: wide, from t with 2 degrees
    of freedom, the scale being a mean absolute error (sd = 1.2533 times it under normal errors)."""
    one = np.array([1.2533 * stats.t.ppf((1 + level / 100) / 2, 2.0) for level in levels])
    return np.repeat(one[:, None], 2, axis=1)


def _known(standardised: Array, offset: int, lead: int) -> tuple[Array, int]:
    """Errors at a lead, its neighbours included, that were known `offset` periods before the closing."""
    pooled, origins = [], 0
    for near in (lead - 1, lead, lead + 1):
        if not 0 <= near < standardised.shape[2]:
            continue
        cells = standardised[:, offset + near + 1:, near]
        cells = cells[:, np.isfinite(cells).any(axis=0)]
        if near == lead:
            origins = cells.shape[1]
        pooled.append(cells[np.isfinite(cells)])
    return np.concatenate(pooled), origins


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


def _both_sides(pooled: Array, shares: Array) -> Array:
    """Mean of symmetric and asymmetric quantiles, shape (levels, 2): lower and upper, both positive."""
    symmetric = np.quantile(np.abs(pooled), shares)
    lower, upper = np.quantile(pooled, np.array([(1 - shares) / 2, (1 + shares) / 2]))
    return np.maximum(np.stack([symmetric - lower, symmetric + upper], axis=1) / 2, 0.0)
