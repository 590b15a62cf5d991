"""Clean series of many kinds: nothing in them deserves a query."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

KINDS = ("level", "trend", "damped trend", "additive season", "multiplicative season", "season and trend",
         "even shares", "changing season", "wandering level", "random walk", "echo", "counts")


def clean_series(kind: str, n: int, season_length: int, rng: np.random.Generator) -> NDArray[np.float64]:
    """One series of `n` periods: Gaussian noise (log-Gaussian with a multiplicative season), no odd value.

    Level 100 to 5,000, noise 3 to 20 % of it, yearly growth up to 15 %, season up to 50 %.
    """
    t = np.arange(n)
    years = t / season_length if season_length > 1 else t / 8.0
    level = np.exp(rng.uniform(np.log(100.0), np.log(5000.0)))
    share = rng.uniform(0.03, 0.20)
    noise = rng.normal(size=n)
    # Never down to under two fifths of the beginning.
    growth = rng.uniform(max(-0.10, -0.6 / max(years[-1], 1.0)), 0.15)
    wave = _wave(season_length, rng)[t % season_length] if season_length > 1 else np.zeros(n)
    if kind == "trend":
        return _floored(level * (1.0 + growth * years + share * noise))
    if kind == "damped trend":
        return _floored(level * (1.0 + 0.5 * (1.0 - rng.uniform(0.9, 0.98) ** t) + share * noise))
    if kind == "additive season":
        return _floored(level * (1.0 + wave + share * noise))
    if kind == "multiplicative season":
        return np.asarray(level * (1.0 + wave) * np.exp(share * noise))
    if kind == "season and trend":
        return np.asarray(level * (1.0 + wave) * np.exp(np.log1p(growth) * years + share * noise))
    if kind == "even shares":
        line = np.maximum(1.0 + growth * years, 0.2)
        return _floored(level * (1.0 + wave) * line * (1.0 + 0.5 * share * noise))
    if kind == "changing season":
        other = _wave(season_length, rng)[t % season_length]
        turning = wave * np.cos(0.15 * years) + other * np.sin(0.15 * years)
        return _floored(level * (1.0 + turning + share * noise))
    if kind == "wandering level":
        walk = np.cumsum(rng.normal(size=n))
        return np.asarray(level * (1.0 + wave) * np.exp(share * (0.3 * walk + noise)))
    if kind == "random walk":
        return np.asarray(level * np.exp(0.04 * np.cumsum(noise)))
    if kind == "echo":
        for i in range(1, n):
            noise[i] = 0.5 * noise[i - 1] + np.sqrt(0.75) * noise[i]
        return _floored(level * (1.0 + share * noise))
    if kind == "counts":
        return rng.poisson(rng.uniform(3.0, 40.0) * (1.0 + wave)).astype(float)
    return _floored(level * (1.0 + share * noise))


def _wave(season_length: int, rng: np.random.Generator) -> NDArray[np.float64]:
    """A season of up to 50 % either way: one wave with unequal shoulders, or free months."""
    place = np.arange(season_length) / season_length
    smooth = np.sin(2 * np.pi * (place + rng.uniform())) + 0.4 * np.sin(4 * np.pi * (place + rng.uniform()))
    free = rng.normal(size=season_length)
    shape = smooth if rng.uniform() < 0.6 else free - free.mean()
    return np.asarray(rng.uniform(0.1, 0.5) * shape / np.abs(shape).max())


def _floored(values: NDArray[np.float64]) -> NDArray[np.float64]:
    return np.maximum(values, 0.0)
