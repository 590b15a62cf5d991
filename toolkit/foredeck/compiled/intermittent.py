"""Demand rates of series with many zeros: Croston's recursion and that of Teunter, Syntetos & Babai.

Bare arrays in and out. Values at or under zero count as periods without demand.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from foredeck.compiled.compiler import compiled

Array = NDArray[np.float64]


@compiled
def croston(y: Array, alpha: float, factor: float, state: Array, one_step: Array) -> float:
    """Smooth the sizes of demands and the gaps between them; return the sum of squared errors.

    The first demand gives the starting size, and the periods up to and including it the
    starting gap. `one_step` receives `factor * size / gap` as known before each period,
    NaN up to and including the first demand. `state` receives size and gap after the
    last period, both 0 where there was no demand.

    References
    ----------
    Croston (1972), Operational Research Quarterly 23, 289-303. `factor` is 1 there, and
    1 - alpha/2 in Syntetos & Boylan (2005), International Journal of Forecasting 21, 303-314.
    """
    size, gap, waited = 0.0, 0.0, 1.0
    total = 0.0
    for t in range(y.size):
        if gap > 0.0:
            one_step[t] = factor * size / gap
            total += (y[t] - one_step[t]) ** 2
        else:
            one_step[t] = np.nan
        if y[t] > 0.0:
            if gap > 0.0:
                size += alpha * (y[t] - size)
                gap += alpha * (waited - gap)
            else:
                size, gap = y[t], waited
            waited = 1.0
        else:
            waited += 1.0
    state[0], state[1] = size, gap
    return total


@compiled
def tsb(y: Array, alpha: float, beta: float, state: Array, one_step: Array) -> float:
    """Smooth demand sizes and the probability of a demand; return the sum of squared errors.

    `state` holds size and probability before the first period and, afterwards, those
    after the last. `one_step` receives their product as known before each period.

    References
    ----------
    Teunter, Syntetos & Babai (2011), European Journal of Operational Research 214, 606-615.
    """
    size, chance = state[0], state[1]
    total = 0.0
    for t in range(y.size):
        one_step[t] = size * chance
        total += (y[t] - one_step[t]) ** 2
        if y[t] > 0.0:
            size += alpha * (y[t] - size)
            chance += beta * (1.0 - chance)
        else:
            chance -= beta * chance
    state[0], state[1] = size, chance
    return total
