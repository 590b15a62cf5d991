"""Exponential smoothing with level, trend and season.

Conventions, all from the published sources named below:

- alpha, gamma and phi are those of Hyndman & Athanasopoulos' component form, beta
  smooths the trend as in Holt (1957): the state-space beta is `alpha * beta`.
- Estimated constants keep to `.0001 .. .9999`, phi to `.8 .. .98` and gamma to at most
  `1 - alpha` (with `season_update="expected level"`).
- Estimation minimises the sum of squared one-step errors on scaled data.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import lru_cache, partial
from itertools import product
from typing import Any

import numpy as np
from numpy.typing import NDArray

from foredeck.compiled.recursions import ADDITIVE, MULTIPLICATIVE, NO_SEASON, project, run
from foredeck.compiled.search import HOLD, PROFILE, SEARCH, search
from foredeck.errors import MethodError
from foredeck.smoothing.fitted import Fitted, variance
from foredeck.smoothing.starts import named_start, stated_start

Array = NDArray[np.float64]

SEASON_UPDATES = ("expected level", "new level")
_LOW, _HIGH = 1e-4, 1 - 1e-4
_PHI_LOW, _PHI_HIGH = 0.8, 0.98


@dataclass(frozen=True)
class Form:
    """A smoothing form: with a trend or not, damped or not, and how the season enters."""

    name: str
    title: str
    trend: bool = False
    damped: bool = False
    season: int = NO_SEASON

    @property
    def constants(self) -> tuple[str, ...]:
        """Names of the form's constants."""
        there = {"beta": self.trend, "gamma": self.season != NO_SEASON, "phi": self.damped}
        return ("alpha", *(name for name, has in there.items() if has))


def fit_form(
    form: Form,
    values: Array,
    season_length: int,
    constants: Mapping[str, float] | None = None,
    *,
    initial: str | Mapping[str, Any] = "estimated",
    season_update: str = "expected level",
) -> Fitted:
    """Fit a smoothing form to one series.

    Parameters
    ----------
    form : Form
    values : array, shape (n,)
        Finite; above zero for a multiplicative season.
    season_length : int
        Periods a season; read only by forms with a season.
    constants : Mapping[str, float]
        Constants to hold; those of the form that are not named are estimated.
    initial : {"estimated", "first value", "classical"} or Mapping
        Starting states. "estimated": by least squares together with the constants.
        "first value": before the first period stand level `y[0]` and trend
        `y[1] - y[0]`; with a season, the mean of the first season, the mean change to
        the second, and the first season's distances from its mean (the simple start of
        Hyndman & Athanasopoulos 2014). "classical": from a first decomposition
        (Hyndman et al. 2008, section 2.6.1). A mapping states `level`, `trend`, `season`
        (`season[j]` for `values[j]`) and `after`, the number of periods already behind
        these states (default 0): the first forecast is of `values[after]`.
    season_update : {"expected level", "new level"}
        Level against which the season is smoothed: the one expected before the period
        (Hyndman & Athanasopoulos) or the new one (Winters 1960, NIST/SEMATECH 6.4.3.5).

    Returns
    -------
    Fitted

    Raises
    ------
    MethodError
        for a season the series does not have, values at or under zero with a
        multiplicative season, and unknown or incomplete starting states.

    References
    ----------
    Holt (1957); Winters (1960); Gardner & McKenzie (1985); Hyndman, Koehler, Ord &
    Snyder (2008), tables 2.1-2.2; Hyndman & Athanasopoulos, Forecasting: Principles and
    Practice (2nd ed. 2018), chapter 7.
    """
    m = season_length if form.season != NO_SEASON else 1
    _check(form, values, m, season_update)
    new_level = season_update == "new level"
    fixed = {name: float(value) for name, value in (constants or {}).items() if name in form.constants}
    centre, scale = _units(values, form)
    y = (values - centre) / scale
    start, first, handling = _begin(form, values, m, initial)
    point, state, sse = _estimate(form, y, first, m, new_level, handling, fixed,
                                  _scaled(start, centre, scale, form.season))
    before = _stated(state, centre, scale, form)
    errors = np.full(y.size, np.nan)
    run(y, first, form.season, m, new_level, point, state, errors)
    after = _stated(state, centre, scale, form)
    last = np.concatenate([[after["level"], after.get("trend", 0.0)], after.get("season", np.zeros(m))])
    alpha, beta, gamma, phi = point.tolist()
    used = {"alpha": alpha, "beta": beta, "gamma": gamma, "phi": phi}
    estimated = len(form.constants) - len(fixed)
    if handling != HOLD:
        estimated += 1 + form.trend + (m - 1)
    share = gamma * (1.0 - alpha) if new_level else gamma
    sse *= scale * scale  # not scale**2, which raises where the square leaves the number range
    return Fitted(
        method=form.name, title=form.title, constants={name: used[name] for name in form.constants},
        initial=before, final=after, fitted=values - errors * scale, residuals=errors * scale,
        sse=sse, n_parameters=estimated, season_length=season_length,
        sigma2=variance(sse, y.size - first, estimated),
        limits=(float(values.min()), float(values.max())),
        path=partial(_path, n=y.size, season=form.season, m=m, phi=phi, state=last),
        spread=None if form.season == MULTIPLICATIVE else partial(
            spread, alpha=alpha, beta=beta, gamma=share, phi=phi, m=m),
    )


def spread(horizon: int, *, alpha: float, beta: float, gamma: float, phi: float, m: int) -> Array:
    """Variance of the error at leads 1..horizon in units of the one-step variance.

    One plus the sum of squares of `alpha (1 + beta (phi + ... + phi^j)) + gamma [j % m = 0]`
    over `j` from 1 to the lead less one (Hyndman et al. 2008, table 6.1).
    """
    j = np.arange(1, horizon)
    weights = alpha * (1.0 + beta * np.cumsum(phi**j)) + gamma * (j % m == 0)
    return np.concatenate([[1.0], 1.0 + np.cumsum(weights**2)])


def _check(form: Form, values: Array, m: int, season_update: str) -> None:
    if form.season != NO_SEASON and m < 2:
        raise MethodError(
            f"{form.title} needs a season; the season length is {m}.", where=f"method {form.name}",
            allowed="a season length of at least 2 periods",
            do="Give season_length (12 for months, 4 for quarters), or use a method without season.",
        )
    if form.season != NO_SEASON and values.size < 2 * m:
        raise MethodError(
            f"{form.title} needs two full seasons; there are {values.size} periods of {2 * m}.",
            where=f"method {form.name}", allowed=f"at least {2 * m} periods at a season length of {m}",
            do="Use a method without season until there is more history.",
        )
    if form.season == MULTIPLICATIVE and values.min() <= 0:
        position = int(np.argmin(values))
        raise MethodError(
            f"{form.title} needs values above zero; value {position + 1} is {values[position]:g}.",
            where=f"method {form.name}", allowed="values above zero",
            do="Use the form with additive season.",
        )
    if season_update not in SEASON_UPDATES:
        raise MethodError(
            f"season_update is {season_update!r}.", where=f"method {form.name}",
            allowed=" or ".join(repr(name) for name in SEASON_UPDATES), do="Name one of them.",
        )


def _units(values: Array, form: Form) -> tuple[float, float]:
    """Centre and scale that bring the data to order one.

    Additive forms do not mind a shift, so a small movement on a large level keeps its
    digits. A mean absolute distance neither overflows nor vanishes as squares would.
    """
    mean = float(values.mean())
    if form.season == MULTIPLICATIVE:
        return 0.0, mean
    distance = float(np.abs(values - mean).mean())
    return mean, distance if distance > 0.0 else 1.0


def _begin(form: Form, values: Array, m: int, initial: str | Mapping[str, Any]) -> tuple[Array, int, int]:
    """Starting states in the series' unit, the periods behind them, and what becomes of them."""
    if not isinstance(initial, str):
        return *stated_start(initial, values.size, m, form.trend, form.season), HOLD
    if initial != "estimated":
        return named_start(initial, values, m, form.trend, form.season), 0, HOLD
    if form.season == MULTIPLICATIVE:
        return named_start("classical", values, m, form.trend, form.season), 0, SEARCH
    return np.zeros(m + 2), 0, PROFILE


def _scaled(start: Array, centre: float, scale: float, season: int) -> Array:
    scaled = start / scale
    scaled[0] = (start[0] - centre) / scale
    if season == MULTIPLICATIVE:
        scaled[2:] = start[2:]
    return scaled


def _stated(state: Array, centre: float, scale: float, form: Form) -> dict[str, Any]:
    """States in the series' unit, only those that the form has."""
    states: dict[str, Any] = {"level": float(state[0] * scale + centre)}
    if form.trend:
        states["trend"] = float(state[1] * scale)
    if form.season == ADDITIVE:
        states["season"] = state[2:] * scale
    elif form.season == MULTIPLICATIVE:
        states["season"] = state[2:].copy()
    return states


def _path(horizon: int, *, n: int, season: int, m: int, phi: float, state: Array) -> Array:
    path = np.empty(horizon)
    project(n, season, m, phi, state, path)
    return path


def _estimate(
    form: Form, y: Array, first: int, m: int, new_level: bool, handling: int,
    fixed: Mapping[str, float], start: Array,
) -> tuple[Array, Array, float]:
    """Constants, starting states and sum of squared errors, all in scaled units."""
    tied = "gamma" in form.constants and "gamma" not in fixed and not new_level
    grid, blocks, lower, upper = _plan(form, tuple(sorted(fixed.items())))
    low, high = np.concatenate([lower, start]), np.concatenate([upper, start])
    if handling == SEARCH:
        low[4:], high[4:] = 0.01, 10.0
        low[5], high[5] = (-0.5, 0.5) if form.trend else (0.0, 0.0)
        start = np.clip(start, low[4:], high[4:])
    point, state, sse = search(y, first, form.season, m, form.trend, new_level, tied, handling,
                               grid, blocks, low, high, start)
    constants = point[:4].copy()
    if tied:
        constants[2] *= 1.0 - constants[0]
    if handling == SEARCH:
        # Level and indices are known only up to a factor: the indices are given the mean 1.
        mean = state[2:].mean()
        state[:2] *= mean
        state[2:] /= mean
    return constants, state, sse


_NAMES = ("alpha", "beta", "gamma", "phi")
_ABSENT = {"alpha": 0.0, "beta": 0.0, "gamma": 0.0, "phi": 1.0}
_COARSE = {
    "alpha": (0.02, 0.1, 0.2, 0.4, 0.6, 0.9),
    "beta": (0.02, 0.2, 0.9),
    "gamma": (0.02, 0.4),
    "phi": (0.8, 0.98),
}
_FINE_ALPHA = (0.02, 0.06, 0.12, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9, 0.98)  # where alpha is alone


@lru_cache(maxsize=256)
def _plan(form: Form, fixed: tuple[tuple[str, float], ...]) -> tuple[Array, int, Array, Array]:
    """Coarse grid of cold starts in blocks by alpha, and the bounds of the constants.

    The third constant of the grid is gamma's share of what alpha leaves (see `evaluate`),
    or gamma itself where it is fixed or smoothed against the new level.
    """
    held = _ABSENT | dict(fixed)
    axes: list[tuple[float, ...]] = []
    lower, upper = np.zeros(4), np.zeros(4)
    for place, name in enumerate(_NAMES):
        if name in form.constants and name not in dict(fixed):
            axes.append(_FINE_ALPHA if form.constants == ("alpha",) else _COARSE[name])
            lower[place], upper[place] = (_PHI_LOW, _PHI_HIGH) if name == "phi" else (_LOW, _HIGH)
        else:
            axes.append((held[name],))
            lower[place] = upper[place] = held[name]
    blocks = 2 if len(axes[0]) > 1 else 1
    return np.array(list(product(*axes)), dtype=np.float64), blocks, lower, upper
