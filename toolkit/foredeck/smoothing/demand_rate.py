"""The Croston family: forecasts of a demand rate for series with many zeros.

Constants that are not fixed are taken from a fixed grid of cautious values by the sum of
squared one-step errors. Absolute errors would not do: on a series that is zero more
often than not, a forecast of zero has the smallest.
"""

from __future__ import annotations

from collections.abc import Mapping
from functools import partial

import numpy as np
from numpy.typing import NDArray

from foredeck.compiled.recursions import croston, tsb
from foredeck.smoothing.fitted import Fitted, from_forecasts

Array = NDArray[np.float64]

GRID = (0.01, 0.02, 0.03, 0.05, 0.07, 0.1, 0.13, 0.16, 0.2, 0.25, 0.3)
"""Constants tried where none is fixed; up to .3, as in the studies of the method (.05 to .2 is usual)."""


def fit_croston(
    values: Array,
    season_length: int,
    constants: Mapping[str, float] | None = None,
    *,
    corrected: bool = False,
) -> Fitted:
    """Croston's method, or with `corrected` the Syntetos-Boylan approximation.

    Parameters
    ----------
    values : array, shape (n,)
        Finite; periods without demand are 0. Sizes and gaps share the constant alpha.
    season_length : int
        Kept for the result only.
    constants : Mapping[str, float]
        `alpha`, to hold it.
    corrected : bool
        Multiply the rate by 1 - alpha/2, which takes away most of its upward bias.

    Returns
    -------
    Fitted
        Flat at the demand rate; 0 where there never was a demand.

    References
    ----------
    Croston (1972); Syntetos & Boylan (2005).
    """
    name, title = ("sba", "Syntetos-Boylan approximation") if corrected else ("croston", "Croston")
    fixed = (constants or {}).get("alpha")
    state, one_step = np.zeros(2), np.empty(values.size)
    scale = _scale(values)
    y = values / scale

    def miss(alpha: float) -> float:
        return croston(y, alpha, _factor(alpha, corrected), state, one_step)

    alpha = float(fixed) if fixed is not None else min(GRID, key=miss)
    miss(alpha)
    rate = _factor(alpha, corrected) * state[0] / state[1] * scale if state[1] > 0 else 0.0
    return from_forecasts(
        values, one_step * scale, method=name, title=title, season_length=season_length,
        constants={"alpha": alpha}, final={"size": float(state[0] * scale), "gap": float(state[1])},
        n_parameters=int(fixed is None), path=partial(_flat, value=float(rate)),
    )


def fit_tsb(values: Array, season_length: int, constants: Mapping[str, float] | None = None) -> Fitted:
    """Teunter, Syntetos & Babai: the probability of a demand is updated in every period.

    So the forecast falls while no demand comes, which suits items that are running out.

    Parameters
    ----------
    values : array, shape (n,)
        Finite; periods without demand are 0.
    season_length : int
        Kept for the result only.
    constants : Mapping[str, float]
        `alpha` (sizes) and `beta` (probability), to hold them.

    Returns
    -------
    Fitted
        Flat at size times probability. Both start at their averages over all known periods.

    References
    ----------
    Teunter, Syntetos & Babai (2011).
    """
    fixed = {name: float(value) for name, value in (constants or {}).items() if name in ("alpha", "beta")}
    scale = _scale(values)
    y = values / scale
    demands = y[y > 0]
    start = np.array([demands.mean() if demands.size else 0.0, demands.size / y.size])
    state, one_step = start.copy(), np.empty(values.size)

    def miss(pair: tuple[float, float]) -> float:
        state[:] = start
        return tsb(y, pair[0], pair[1], state, one_step)

    alphas = (fixed["alpha"],) if "alpha" in fixed else GRID
    betas = (fixed["beta"],) if "beta" in fixed else GRID
    alpha, beta = min(((a, b) for a in alphas for b in betas), key=miss)
    miss((alpha, beta))
    return from_forecasts(
        values, one_step * scale, method="tsb", title="Teunter-Syntetos-Babai", season_length=season_length,
        constants={"alpha": alpha, "beta": beta},
        initial={"size": float(start[0] * scale), "chance": float(start[1])},
        final={"size": float(state[0] * scale), "chance": float(state[1])}, n_parameters=2 - len(fixed),
        path=partial(_flat, value=float(state[0] * state[1] * scale)),
    )


def _factor(alpha: float, corrected: bool) -> float:
    return 1.0 - alpha / 2.0 if corrected else 1.0


def _scale(values: Array) -> float:
    size = float(np.abs(values).mean())
    return size if size > 0 else 1.0


def _flat(horizon: int, *, value: float) -> Array:
    return np.full(horizon, value)
