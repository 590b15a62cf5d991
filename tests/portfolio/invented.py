"""One invented series after pass 1, made from given errors instead of fits."""

from __future__ import annotations

from types import SimpleNamespace
from typing import Any

import numpy as np

from foredeck.backtests.error_table import Cube

METHODS = ("naive", "seasonal_naive", "ses", "holt", "damped_holt")
SPREAD = np.array([2.0, 1.5, 1.0, 1.3, 0.8])


def alone_of(seed: int, horizon: int, origins: int = 20, periods: int = 60) -> Any:
    """What `weights`, `procedure` and `ranges` read of an `Alone`: five methods, `origins` origins."""
    rng = np.random.default_rng(seed)
    known = np.arange(periods - origins, periods)
    forecasts = 100 + rng.normal(size=(5, origins, horizon)) * SPREAD[:, None, None]
    actual = 100 + rng.normal(size=(origins, horizon))
    actual[known[:, None] + np.arange(1, horizon + 1)[None, :] > periods] = np.nan
    raw = 100 + rng.normal(size=periods)
    pool = np.repeat(np.array([False, False, True, True, True])[:, None], origins + 1, axis=1)
    return SimpleNamespace(
        cube=Cube(METHODS, known, forecasts, actual), offsets=periods - known, raw=raw, used=raw, pool=pool,
        members=100 + rng.normal(size=(5, horizon)) * SPREAD[:, None], naive_scale=np.ones(origins + 1),
        series=SimpleNamespace(season_length=12), pattern=SimpleNamespace(intermittent=False),
        constants=({}, {}, {"alpha": 0.2}, {"alpha": 0.3, "beta": 0.1}, {"alpha": 0.5}))
