"""Repairs for fitting: the values a method may see instead of the raw ones."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray


def repaired(values: NDArray[np.float64], season_length: int,
             nonnegative: bool = True) -> NDArray[np.float64]:
    """Return `values` with gaps filled from the straight line between their neighbours."""
    y = np.array(values, dtype=np.float64)
    known = np.flatnonzero(np.isfinite(y))
    if known.size == 0:
        return np.zeros_like(y)
    return np.interp(np.arange(y.size), known, y[known])
