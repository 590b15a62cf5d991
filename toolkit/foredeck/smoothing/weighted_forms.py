"""Fifteen smoothing forms at once: the best by Akaike's criterion, or all of them weighted by it.

The forms are those of Hyndman, Koehler, Ord & Snyder (2008) that are numerically stable
(section 2.5): additive and multiplicative errors, no, linear and damped trends, no,
additive and multiplicative seasons, without the additive error on a multiplicative
season. They are named by error, trend and season: `AAdN` has an additive error, a damped
trend and no season. Above 24 periods a season only forms without season are had, fitted
to the values as handed in: the states of a season of 52 weeks would outnumber the data, so
whoever knows the season takes it out before.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import lru_cache, partial
from itertools import product

import numpy as np
from numpy.typing import NDArray

from foredeck.compiled.recursions import ADDITIVE, MULTIPLICATIVE, NO_SEASON, project
from foredeck.compiled.search import all_forms, mix
from foredeck.smoothing.fitted import Fitted, from_forecasts
from foredeck.smoothing.state_space import CONSTANTS, Form, fit_form, spread

Array = NDArray[np.float64]

LONGEST_SEASON = 24
"""Periods of the longest season that is estimated within a form."""

_STARTS, _TOLERANCE = 1, 1e-4
_LETTERS = {NO_SEASON: "N", ADDITIVE: "A", MULTIPLICATIVE: "M"}
_TRENDS = ("N", "A", "Ad")
FORMS: tuple[Form, ...] = tuple(
    Form(f"{_LETTERS[error]}{_TRENDS[trend]}{_LETTERS[season]}",
         f"Smoothing form {_LETTERS[error]}{_TRENDS[trend]}{_LETTERS[season]}", trend > 0, trend == 2, season, error)
    for season, error, trend in product((NO_SEASON, ADDITIVE, MULTIPLICATIVE), (ADDITIVE, MULTIPLICATIVE), (0, 1, 2))
    if (error, season) != (ADDITIVE, MULTIPLICATIVE)
)
"""The fifteen forms, without season first."""


@dataclass(frozen=True, eq=False)
class FormFits:
    """Several forms fitted to one series.

    Attributes
    ----------
    forms : tuple of Form, length F
    n, m : int
        Number of values; season length, 1 where only forms without season were had.
    fitted : array, shape (F, n)
        One-step forecasts.
    weights : array, shape (F,)
        Akaike weights (Burnham & Anderson 2002, section 2.9.1), which add up to 1; all 0
        when the series is too short for any form.
    constants, states, sigma2, counts : arrays, shapes (F, 4), (F, m + 2), (F,), (F,)
        alpha, beta, gamma, phi; the states after the last period; the residual variance,
        of relative errors where the error is multiplicative; the number of constants and
        starting states estimated.
    """

    forms: tuple[Form, ...]
    n: int
    m: int
    fitted: Array
    weights: Array
    constants: Array
    states: Array
    sigma2: Array
    counts: NDArray[np.int64]

    def path(self, horizon: int, *, lowest: float = -np.inf) -> Array:
        """Weighted mean of the forms' forecasts, each at least `lowest`."""
        path = np.empty(horizon)
        mix(self.n, self.m, _codes(self.forms), self.weights, self.constants, self.states, lowest, path)
        return path


def fit_forms(
    values: Array, season_length: int, constants: Mapping[str, float] | None = None,
    forms: tuple[Form, ...] = FORMS,
) -> FormFits:
    """Fit forms to one series, with the named constants held in all forms that have them."""
    m = season_length if season_length <= LONGEST_SEASON else 1
    fixed = {name: float(value) for name, value in (constants or {}).items() if name in CONSTANTS}
    held = np.array([fixed.get(name, np.nan) for name in CONSTANTS])
    n, size = values.size, len(forms)
    fitted, aicc = np.zeros((size, n)), np.empty(size)
    used, states, sigma2 = np.zeros((size, 4)), np.zeros((size, m + 2)), np.full(size, np.nan)
    own = np.array(values, dtype=np.float64)  # a writable row: for any other the compiler would begin anew
    all_forms(own, m, _codes(forms), held, _STARTS, _TOLERANCE, np.empty((size, 0)), fitted, aicc, used, states, sigma2)
    best = aicc.min()
    weights = np.exp(-0.5 * (aicc - best)) if np.isfinite(best) else np.zeros(size)
    return FormFits(
        forms, n, m, fitted, weights / max(weights.sum(), 1e-300), used, states, sigma2,
        _counts(forms, tuple(fixed), m),
    )


@lru_cache(maxsize=64)
def _counts(forms: tuple[Form, ...], fixed: tuple[str, ...], m: int) -> NDArray[np.int64]:
    """Constants and starting states that each form estimates."""
    return np.array([
        sum(name not in fixed for name in form.constants) + form.trend + (m if form.season else 1) for form in forms
    ])


@lru_cache(maxsize=64)
def _codes(forms: tuple[Form, ...]) -> NDArray[np.int64]:
    """Error, trend (0 none, 1 linear, 2 damped) and season of each form, as the compiled search reads them."""
    return np.array([(form.error, form.trend + form.damped, form.season) for form in forms], dtype=np.int64)


def fit_best_form(values: Array, season_length: int, constants: Mapping[str, float] | None = None) -> Fitted:
    """Fit the form with the smallest AICc of the fifteen.

    Parameters
    ----------
    values : array, shape (n,)
        Finite. Multiplicative forms are had where all are above zero, seasons with five
        values more than a season, and every form with two more than it has constants
        and states; a series too short for any is smoothed simply.
    season_length : int
        Up to 24 periods; a longer season is taken to be out of the values already.
    constants : Mapping[str, float]
        Constants to hold in all forms that have them.

    Returns
    -------
    Fitted
        `final` names the form beside its states; `sigma2` is of relative errors when its
        error is multiplicative.

    References
    ----------
    Hyndman, Koehler, Ord & Snyder (2008), section 2.8; Hurvich & Tsai (1989), Biometrika 76, 297-307.
    """
    name, title = "best_form", "Best smoothing form"
    fits = fit_forms(values, season_length, constants)
    if not fits.weights.any():
        return _simple(name, title, values, season_length, constants)
    best = int(np.argmax(fits.weights))
    form, m = FORMS[best], fits.m if FORMS[best].season else 1
    state = fits.states[best, : m + 2]
    alpha, beta, gamma, phi = fits.constants[best].tolist()
    used = {"alpha": alpha, "beta": beta, "gamma": gamma, "phi": phi}
    final = {"form": form.name, "level": float(state[0])}
    if form.trend:
        final["trend"] = float(state[1])
    if form.season:
        final["season"] = state[2:]
    plain = form.error == ADDITIVE and form.season != MULTIPLICATIVE
    residuals = values - fits.fitted[best]
    with np.errstate(over="ignore", under="ignore"):  # squares of very large values may be infinite
        sse = float(residuals @ residuals)
    return Fitted(
        method=name, title=title, constants={key: used[key] for key in form.constants}, initial={}, final=final,
        fitted=fits.fitted[best], residuals=residuals, sse=sse, n_parameters=int(fits.counts[best]),
        sigma2=float(fits.sigma2[best]), season_length=season_length,
        limits=(float(values.min()), float(values.max())),
        path=partial(_path, n=fits.n, season=form.season, m=m, phi=phi, state=state),
        spread=partial(spread, alpha=alpha, beta=beta, gamma=gamma, phi=phi, m=m) if plain else None,
    )


def fit_weighted_forms(values: Array, season_length: int, constants: Mapping[str, float] | None = None) -> Fitted:
    """Average the forecasts of the fifteen forms with Akaike weights.

    The weights are `exp(-difference / 2)` of the AICc to the smallest one, so a form is not
    chosen where several describe the series about equally well.

    Parameters
    ----------
    values, season_length, constants
        As for `fit_best_form`.

    Returns
    -------
    Fitted
        Forecasts and one-step forecasts are weighted means, `constants` holds the
        weighted mean alpha, `final` the weights by name of the form, and `n_parameters`
        the weighted mean number of constants and states, rounded.

    References
    ----------
    Burnham & Anderson (2002), Model Selection and Multimodel Inference, section 2.9;
    Kolassa (2011), International Journal of Forecasting 27, 238-251.
    """
    name, title = "weighted_forms", "Weighted smoothing forms"
    fits = fit_forms(values, season_length, constants)
    if not fits.weights.any():
        return _simple(name, title, values, season_length, constants)
    return from_forecasts(
        values, fits.weights @ fits.fitted, method=name, title=title, season_length=season_length, path=fits.path,
        constants={"alpha": float(fits.weights @ fits.constants[:, 0])}, final=weights_by_name(fits),
        n_parameters=round(float(fits.weights @ fits.counts)),
    )


def weights_by_name(fits: FormFits) -> dict[str, float]:
    """Weights of the forms that were had."""
    return {form.name: float(weight) for form, weight in zip(fits.forms, fits.weights, strict=True) if weight > 0}


def _simple(
    name: str, title: str, values: Array, season_length: int, constants: Mapping[str, float] | None
) -> Fitted:
    return fit_form(Form(name, title), values, season_length, constants)


def _path(horizon: int, *, n: int, season: int, m: int, phi: float, state: Array) -> Array:
    path = np.empty(horizon)
    project(n, season, m, phi, state, path)
    return path

