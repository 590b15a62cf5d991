"""The whole procedure lived through past origins, for one series.

At every origin the blend, or the single method, is settled anew from what was known
then. Its errors are the reliability that reports quote; a method's training error
plays no part anywhere.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from foredeck.backtests.choice import choose, equal_weights
from foredeck.backtests.error_table import Cube
from foredeck.portfolio.alone import Alone

Array = NDArray[np.float64]

OWN_LEADS = 3
"""Own errors at the first leads make a series' scale: they are the most numerous and the least overlapping."""


@dataclass(frozen=True)
class Procedure:
    """One series' procedure at each origin of its backtest and, in the last place, now.

    `weights` has shape (origins + 1, methods), `forecasts` (origins + 1, horizon),
    `own_error` and `own_count` (origins + 1,): the mean absolute error known by then over
    the first leads (NaN when none) and how many errors it rests on; `level` the mean of
    the last season known by then.
    """

    weights: Array
    forecasts: Array
    own_error: Array
    own_count: NDArray[np.int64]
    level: Array


def known_cells(cube: Cube, known: int) -> NDArray[np.bool_]:
    """Which (origin, lead) cells had their actual known when `known` periods were."""
    horizon = cube.actual.shape[1]
    last_target = cube.known[:, None] + np.arange(horizon)[None, :]
    cells: NDArray[np.bool_] = (last_target < known) & np.isfinite(cube.actual)
    return cells


def live_through(alone: Alone, style: str) -> Procedure:
    """Weights, forecasts and own errors of the procedure at each origin and now.

    Parameters
    ----------
    alone : Alone
    style : {"blend", "single"}
    """
    cube = alone.cube
    counts = np.append(cube.known, len(alone.raw))
    members = np.concatenate([cube.forecasts, alone.members[:, None, :]], axis=1)
    weights = np.stack([_weights(alone, style, alone.pool[:, o], int(known)) for o, known in enumerate(counts)])
    forecasts = np.einsum("om,moh->oh", weights, np.nan_to_num(members))
    forecasts[weights.sum(axis=1) == 0] = np.nan
    errors = np.abs(cube.actual - forecasts[:-1])[:, :OWN_LEADS]
    own_error, own_count = np.full(len(counts), np.nan), np.zeros(len(counts), dtype=np.int64)
    for o, known in enumerate(counts):
        cells = errors[known_cells(cube, int(known))[:, :OWN_LEADS]]
        cells = cells[np.isfinite(cells)]
        own_count[o] = len(cells)
        if len(cells):
            own_error[o] = cells.mean()
    season = max(alone.series.season_length, 4)
    level = np.array([np.mean(np.abs(alone.used[max(0, k - season):k])) for k in counts])
    return Procedure(weights=weights, forecasts=forecasts, own_error=own_error, own_count=own_count,
                     level=np.maximum(level, alone.naive_scale))


def _weights(alone: Alone, style: str, pool: NDArray[np.bool_], known: int) -> Array:
    if style == "blend" or not pool.any():
        return equal_weights(pool)
    cube = alone.cube
    errors = np.where(known_cells(cube, known)[None, :, :], cube.actual[None] - cube.forecasts, np.nan)
    weights = np.zeros(len(pool))
    weights[choose(cube.methods, errors, pool)] = 1.0
    return weights
