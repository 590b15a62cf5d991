"""One method for a series, for the style `single`: shrunken choice, and no change of mind without cause.

The method that did best on a series in backtest owes most of its lead to luck. A series'
own errors therefore count once against `SHRINK` times the portfolio's, and a method stays
until a rival is better by more than a trifle at several origins running.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]

SHRINK = 5.0
"""How much the portfolio's standings count beside a series' own errors (empirical Bayes; Efron & Morris 1975,
Journal of the American Statistical Association 70, 311-319)."""

MATERIAL = 0.02
"""A rival has to be expected to miss by this share less."""

REPEATED = 3
"""At so many origins running, the latest included."""


def choices(own_errors: Array, standing: Array, pool: Flags) -> NDArray[np.int64]:
    """Method of a series at each origin, the last being now.

    Parameters
    ----------
    own_errors : array, shape (origins, methods); the series' unit
        Mean absolute errors as known at each origin; NaN where none.
    standing : array, shape (origins, methods)
        The portfolio's (`weights.Learned`), at the same origins.
    pool : array of bool, shape (origins, methods)

    Returns
    -------
    array of int, shape (origins,)
        Position of the method; -1 where the pool is empty.
    """
    expected = expected_errors(own_errors, standing, pool)
    chosen = np.full(len(pool), -1, dtype=np.int64)
    held, better = -1, 0
    for origin, allowed in enumerate(pool):
        if not allowed.any():
            continue
        rival = int(np.argmin(np.where(allowed, expected[origin], np.inf)))
        if held < 0 or not allowed[held]:
            held, better = rival, 0
        else:
            leads = expected[origin, rival] < expected[origin, held] + np.log1p(-MATERIAL)
            better = better + 1 if leads else 0
            if better >= REPEATED:
                held, better = rival, 0
        chosen[origin] = held
    return chosen


def expected_errors(own_errors: Array, standing: Array, pool: Flags) -> Array:
    """Logarithm of each method's error relative to the others', own and portfolio's taken together.

    Returns
    -------
    array, shape (origins, methods); finite where the method is in the pool
    """
    common = np.where(np.isfinite(standing), standing, 0.0)
    logs = np.log(np.maximum(np.where(pool, own_errors, np.nan), 1e-12))
    known = np.isfinite(logs)
    centre = np.where(known, logs, 0.0).sum(axis=1) / np.maximum(known.sum(axis=1), 1)
    middle = np.where(known, common, 0.0).sum(axis=1) / np.maximum(known.sum(axis=1), 1)
    # what is not known of a method on this series is taken from the portfolio
    own = np.where(known, logs - centre[:, None] + middle[:, None], common)
    return np.asarray((own + SHRINK * common) / (1.0 + SHRINK))
