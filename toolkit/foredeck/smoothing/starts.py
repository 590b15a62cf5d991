"""Starting states of the smoothing forms: by rule, or as stated by the caller."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from foredeck.compiled.recursions import MULTIPLICATIVE, NO_SEASON, classical_start
from foredeck.errors import MethodError

Array = NDArray[np.float64]

NAMED = ("estimated", "first value", "classical")


def named_start(name: str, values: Array, m: int, trend: bool, season: int) -> Array:
    """Return the starting states `[level, trend, index 0, ..., index m-1]` of a named rule.

    The rules are described at `fit_form`. They hold before the first period.
    """
    if name == "first value":
        return _first_value(values, m, trend, season)
    if name == "classical":
        state = np.empty(m + 2)
        classical_start(values, m, trend, season, season == MULTIPLICATIVE, state)
        return state
    raise MethodError(
        f"The starting states are {name!r}.", where="initial",
        allowed=", ".join(map(repr, NAMED)) + ", or a mapping of level, trend, season and after",
        do="Name one of them.",
    )


def stated_start(given: Mapping[str, Any], n: int, m: int, trend: bool, season: int) -> tuple[Array, int]:
    """Return starting states as the caller stated them, and the number of periods behind them."""
    needed = ["level", *(["trend"] if trend else []), *(["season"] if season != NO_SEASON else [])]
    wrong = [key for key in given if key not in (*needed, "after")]
    missing = [key for key in needed if key not in given]
    if wrong or missing:
        parts = (("unknown", wrong), ("missing", missing))
        said = "; ".join(f"{word}: {', '.join(map(str, keys))}" for word, keys in parts if keys)
        raise MethodError(
            f"The starting states do not fit the method ({said}).", where="initial",
            allowed=f"{', '.join(needed)}, and after", do="Give exactly these states.",
        )
    indices = np.zeros(m) if season == NO_SEASON else np.asarray(given["season"], dtype=np.float64)
    state = np.concatenate([[float(given["level"]), float(given.get("trend", 0.0))], indices.ravel()])
    impossible = season == MULTIPLICATIVE and indices.size > 0 and indices.min() <= 0
    if indices.shape != (m,) or not np.isfinite(state).all() or impossible:
        raise MethodError(
            f"The starting states are level {given['level']!r}, trend {given.get('trend', 0.0)!r} and "
            f"{indices.size} seasonal indices.", where="initial",
            allowed=f"finite numbers; {m} seasonal indices, above zero when they are factors",
            do="Give one index for each period of the season, the first for the first value.",
        )
    after = given.get("after", 0)
    if isinstance(after, bool) or not isinstance(after, int | np.integer) or not 0 <= after < n:
        raise MethodError(
            f"`after` is {after!r}.", where="initial", allowed=f"a whole number from 0 to {n - 1}",
            do="Say how many periods lie behind the starting states.",
        )
    return state, int(after)


def _first_value(values: Array, m: int, trend: bool, season: int) -> Array:
    state = np.zeros(m + 2)
    if season == NO_SEASON:
        state[0] = values[0]
        state[1] = values[1] - values[0] if trend and values.size > 1 else 0.0
        return state
    state[0] = values[:m].mean()
    state[1] = (values[m : 2 * m].mean() - state[0]) / m if trend else 0.0
    state[2:] = values[:m] / state[0] if season == MULTIPLICATIVE else values[:m] - state[0]
    return state
