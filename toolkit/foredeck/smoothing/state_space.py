"""Exponential smoothing with level, trend and season.

Conventions, all from the published sources named below:

- alpha, gamma and phi are those of Hyndman & Athanasopoulos' component form, beta
  smooths the trend as in Holt (1957): the state-space beta is `alpha * beta`.
- Estimated constants keep to `.0001 .. .9999`, phi to `.8 .. .98` and gamma to at most
  `1 - alpha` (with `season_update="expected level"`).
- Estimation maximises the likelihood of scaled data: with an additive error that is least
  squares of one-step errors, with a multiplicative one of relative errors, weighed by
  the size of the forecasts (Hyndman et al. 2008, section 5.1).
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import partial
from typing import Any

import numpy as np
from numpy.typing import NDArray

from foredeck.compiled.recursions import ADDITIVE, MULTIPLICATIVE, NO_SEASON, project
from foredeck.compiled.search import fit_one
from foredeck.errors import MethodError
from foredeck.smoothing.fitted import Fitted, variance
from foredeck.smoothing.starts import named_start, stated_start

Array = NDArray[np.float64]

SEASON_UPDATES = ("expected level", "new level")
CONSTANTS = ("alpha", "beta", "gamma", "phi")
_STARTS, _TOLERANCE = 12, 1e-9  # cold starts, and the gain of the deviance that no longer counts


@dataclass(frozen=True)
class Form:
    """A smoothing form: with a trend or not, damped or not, how the season and the error enter."""

    name: str
    title: str
    trend: bool = False
    damped: bool = False
    season: int = NO_SEASON
    error: int = ADDITIVE

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
        Finite; above zero for a multiplicative season or error.
    season_length : int
        Periods a season; read only by forms with a season.
    constants : Mapping[str, float]
        Constants to hold; those of the form that are not named are estimated.
    initial : {"estimated", "first value", "classical"} or Mapping
        Starting states. "estimated": together with the constants.
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
        Residuals and `sse` are in the series' unit for every form. With a multiplicative
        error `sigma2` is the variance of relative errors, and there is no `spread`.

    Raises
    ------
    MethodError
        for a season the series does not have, values at or under zero with a
        multiplicative season or error, and unknown or incomplete starting states.

    References
    ----------
    Holt (1957); Winters (1960); Gardner & McKenzie (1985); Hyndman, Koehler, Ord &
    Snyder (2008), tables 2.1-2.2; Hyndman & Athanasopoulos, Forecasting: Principles and
    Practice (2nd ed. 2018), chapter 7.
    """
    m = int(season_length) if form.season != NO_SEASON else 1
    _check(form, values, m, season_update)
    new_level = season_update == "new level"
    fixed = {name: float(value) for name, value in (constants or {}).items() if name in form.constants}
    values = np.array(values, dtype=np.float64)  # a writable row: for any other the compiler would begin anew
    before, first, estimated = _begin(form, values, m, initial)
    found, after, errors = np.empty(4), np.empty(m + 2), np.full(values.size, np.nan)
    _, sse, total = fit_one(
        values, first, form.error, form.trend, form.season, m, new_level, held(form, fixed), estimated, _STARTS,
        _TOLERANCE, found, before, after, errors,
    )
    alpha, beta, gamma, phi = found.tolist()
    used = {"alpha": alpha, "beta": beta, "gamma": gamma, "phi": phi}
    count = len(form.constants) - len(fixed) + (form.trend + m if estimated else 0)
    plain = form.season != MULTIPLICATIVE and form.error == ADDITIVE
    return Fitted(
        method=form.name, title=form.title, constants={name: used[name] for name in form.constants},
        initial=_named(before, form), final=_named(after, form), fitted=values - errors, residuals=errors,
        sse=sse, n_parameters=count, season_length=season_length,
        sigma2=variance(total, values.size - first, count),
        limits=(float(values.min()), float(values.max())),
        path=partial(_path, n=values.size, season=form.season, m=m, phi=phi, state=after),
        spread=partial(spread, alpha=alpha, beta=beta, gamma=gamma * (1.0 - alpha) if new_level else gamma,
                       phi=phi, m=m) if plain else None,
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
    if MULTIPLICATIVE in (form.season, form.error) and values.min() <= 0:
        position = int(np.argmin(values))
        raise MethodError(
            f"{form.title} needs values above zero; value {position + 1} is {values[position]:g}.",
            where=f"method {form.name}", allowed="values above zero",
            do="Use the form with additive season." if form.season else "Use the form with additive error.",
        )
    if season_update not in SEASON_UPDATES:
        raise MethodError(
            f"season_update is {season_update!r}.", where=f"method {form.name}",
            allowed=" or ".join(repr(name) for name in SEASON_UPDATES), do="Name one of them.",
        )


def held(form: Form, fixed: Mapping[str, float]) -> Array:
    """Constants as the search takes them: NaN where free, neutral where the form has none."""
    free = [fixed.get(name, np.nan) for name in CONSTANTS]
    return np.array([
        free[0], free[1] if form.trend else 0.0, free[2] if form.season else 0.0, free[3] if form.damped else 1.0,
    ])


def _begin(form: Form, values: Array, m: int, initial: str | Mapping[str, Any]) -> tuple[Array, int, bool]:
    """Starting states in the series' unit, the periods behind them, and whether they are yet to be estimated."""
    if not isinstance(initial, str):
        return *stated_start(initial, values.size, m, form.trend, form.season), False
    if initial == "estimated":
        return np.empty(m + 2), 0, True
    return named_start(initial, values, m, form.trend, form.season), 0, False


def _named(state: Array, form: Form) -> dict[str, Any]:
    """States by name, only those that the form has."""
    states: dict[str, Any] = {"level": float(state[0])}
    if form.trend:
        states["trend"] = float(state[1])
    if form.season != NO_SEASON:
        states["season"] = state[2:].copy()
    return states


def _path(horizon: int, *, n: int, season: int, m: int, phi: float, state: Array) -> Array:
    path = np.empty(horizon)
    project(n, season, m, phi, state, path)
    return path
