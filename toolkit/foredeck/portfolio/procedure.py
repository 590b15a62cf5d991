"""The whole procedure lived through past origins, for one series.

At every origin the blend, or the single method, is settled anew from what was known
then, of this series and of the portfolio. Its errors are the reliability that reports
quote; a method's training error plays no part anywhere.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from foredeck.backtests.choice import equal_weights
from foredeck.portfolio.alone import Alone
from foredeck.portfolio.single import choices
from foredeck.portfolio.weights import Learned, own_errors, own_weights
from foredeck.smoothing.catalogue import METHODS

Array = NDArray[np.float64]

OWN_LEADS = 3
"""Own errors at the first leads make a series' scale: they are the most numerous and the least overlapping."""


@dataclass(frozen=True)
class Procedure:
    """One series' procedure at each origin of its backtest and, in the last place, now.

    `weights` has shape (origins + 1, methods), `forecasts` (origins + 1, horizon),
    `own_error` and `own_count` (origins + 1,): the mean absolute error known by then over
    the first leads (NaN when none) and how many errors it rests on; `level` the mean of
    the last season known by then; `disagreement` (origins + 1, horizon) the standard deviation of
    the forecasts of the methods that might speak, benchmarks apart.
    """

    weights: Array
    forecasts: Array
    own_error: Array
    own_count: NDArray[np.int64]
    level: Array
    disagreement: Array


def live_through(alone: Alone, style: str, learned: Learned) -> Procedure:
    """Weights, forecasts and own errors of the procedure at each origin and now.

    Parameters
    ----------
    alone : Alone
    style : {"blend", "single"}
    learned : Learned
        Of the portfolio, for the same methods in the same order.
    """
    cube = alone.cube
    counts = np.append(cube.known, len(alone.raw))
    members = np.concatenate([cube.forecasts, alone.members[:, None, :]], axis=1)
    weights = _weights(alone, style, learned)
    forecasts = np.einsum("om,moh->oh", weights, np.nan_to_num(members))
    forecasts[weights.sum(axis=1) == 0] = np.nan
    errors = np.abs(cube.actual - forecasts[:-1])[:, :OWN_LEADS]
    own_error, own_count = np.full(len(counts), np.nan), np.zeros(len(counts), dtype=np.int64)
    for o, known in enumerate(counts):
        cells = errors[cube.known_cells(int(known))[:, :OWN_LEADS]]
        cells = cells[np.isfinite(cells)]
        own_count[o] = len(cells)
        if len(cells):
            own_error[o] = cells.mean()
    season = max(alone.series.season_length, 4)
    level = np.array([np.mean(np.abs(alone.used[max(0, k - season):k])) for k in counts])
    return Procedure(weights=weights, forecasts=forecasts, own_error=own_error, own_count=own_count,
                     level=np.maximum(level, alone.naive_scale), disagreement=_disagreement(alone, members))


def _weights(alone: Alone, style: str, learned: Learned) -> Array:
    """Weights of the methods at each origin and now, shape (origins + 1, methods)."""
    at = np.append(alone.offsets, 0)
    own = own_errors(alone)
    pool = alone.pool.T
    if style == "single":
        weights = np.zeros(pool.shape)
        chosen = choices(own, learned.standing[at], pool)
        weights[np.flatnonzero(chosen >= 0), chosen[chosen >= 0]] = 1.0
        return weights
    rows = []
    for row, offset in enumerate(at):
        # the demand-rate family has no learned weights: absolute errors would favour whoever says nothing comes
        known = learned.weights[offset] * pool[row]
        rows.append(own_weights(known, own[row], pool[row]) if known.any() else equal_weights(pool[row]))
    return np.stack(rows)


def _disagreement(alone: Alone, members: Array) -> Array:
    """Standard deviation over methods, shape (origins + 1, horizon); 0 where fewer than two might speak."""
    proper = np.array([METHODS[name].family != "benchmark" for name in alone.cube.methods])
    counted = np.isfinite(members) & (alone.pool & proper[:, None])[:, :, None]
    n = np.maximum(counted.sum(axis=0), 1)
    mean = np.where(counted, members, 0.0).sum(axis=0) / n
    return np.asarray(np.sqrt(np.where(counted, (members - mean) ** 2, 0.0).sum(axis=0) / n))
