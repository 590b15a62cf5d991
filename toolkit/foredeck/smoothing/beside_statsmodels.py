"""A smoothing form fitted here and by statsmodels, side by side.

statsmodels' `ETSModel` has the same forms with the same bounds on the constants. Given
our constants and starting states it makes the same forecasts but for rounding; left to
estimate them itself, it ends where its own search ends.
"""

from __future__ import annotations

import warnings
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from foredeck.compiled.recursions import ADDITIVE, MULTIPLICATIVE, NO_SEASON
from foredeck.errors import MethodError
from foredeck.smoothing.catalogue import METHODS
from foredeck.smoothing.fitted import Fitted
from foredeck.smoothing.state_space import Form

Array = NDArray[np.float64]

_NAMES = {NO_SEASON: None, ADDITIVE: "add", MULTIPLICATIVE: "mul"}
_LONGEST_SEASON = 24  # beyond it, their search has too many starting states to come to an end


def suitable_form(values: Array, season_length: int) -> str:
    """Name of a form that a series of this length can carry: with season, with trend, or neither."""
    if 1 < season_length <= _LONGEST_SEASON and len(values) >= 3 * season_length:
        return "holt_winters_additive"
    return "holt" if len(values) >= 8 else "ses"


def beside_statsmodels(fitted: Fitted, horizon: int = 12) -> pd.DataFrame:
    """The fit of a form beside statsmodels' fit of the same form, estimated and as given.

    Parameters
    ----------
    fitted : Fitted
        Of a smoothing form, from `smooth`, with a season smoothed against the expected level.
    horizon : int
        Leads that are compared.

    Returns
    -------
    DataFrame
        One row a figure (constants, sum of squares, log-likelihood, the next three
        forecasts) and a last one for the largest difference of forecasts, one step
        ahead or up to `horizon` ahead. Columns `foredeck`; `statsmodels` and `difference`,
        it having estimated for itself; `given ours` and `difference given ours`, it
        having been given our constants and starting states.

    Raises
    ------
    MethodError
        for methods that are no smoothing form, and for a multiplicative season, which
        statsmodels smooths against the new level.
    """
    form = _form(fitted)
    values = fitted.fitted + fitted.residuals
    model = _model(form, values, fitted.season_length)
    with warnings.catch_warnings():  # that its search did not converge shows in the table
        warnings.simplefilter("ignore")
        alone = model.fit(disp=False, maxiter=1000)
    given = model.smooth(_parameters(model.param_names, fitted))
    columns = {"foredeck": _figures(fitted.constants, values, fitted.fitted, fitted.path(horizon), form)}
    for name, theirs in (("statsmodels", alone), ("given ours", given)):
        one_step, ahead = np.asarray(theirs.fittedvalues), np.asarray(theirs.forecast(horizon))
        columns[name] = _figures(_constants(theirs, form), values, one_step, ahead, form)
        columns["difference" if name == "statsmodels" else f"difference {name}"] = {
            key: abs(value - columns["foredeck"][key]) for key, value in columns[name].items()} | {
            "largest difference, one step": float(np.abs(one_step - fitted.fitted).max()),
            f"largest difference, {horizon} ahead": float(np.abs(ahead - fitted.path(horizon)).max())}
    return pd.DataFrame(columns, index=list(columns["difference"]))


def _form(fitted: Fitted) -> Form:
    parts = getattr(METHODS[fitted.method].fit, "args", ()) if fitted.method in METHODS else ()
    if not parts or not isinstance(parts[0], Form) or parts[0].season == MULTIPLICATIVE:
        raise MethodError(
            f"{fitted.title} has no counterpart in statsmodels to be set beside.", where=f"method {fitted.method}",
            allowed="smoothing forms without season or with an additive one",
            do="Fit ses, holt, damped_holt or holt_winters_additive, for example.")
    return parts[0]


def _model(form: Form, values: Array, season_length: int) -> Any:
    from statsmodels.tsa.exponential_smoothing.ets import ETSModel

    return ETSModel(values, error=_NAMES[form.error], trend="add" if form.trend else None, damped_trend=form.damped,
                    seasonal=_NAMES[form.season], seasonal_periods=season_length if form.season else None)


def _parameters(names: list[str], fitted: Fitted) -> list[float]:
    """Our constants and starting states as theirs: their beta is `alpha * beta`, their season runs backwards."""
    constants, states = fitted.constants, fitted.initial
    known = {"smoothing_level": constants["alpha"],
             "smoothing_trend": constants["alpha"] * constants.get("beta", 0.0),
             "smoothing_seasonal": constants.get("gamma", 0.0), "damping_trend": constants.get("phi", 1.0),
             "initial_level": states["level"], "initial_trend": states.get("trend", 0.0)}
    for back, value in enumerate(np.asarray(states.get("season", ()))[::-1]):
        known[f"initial_seasonal.{back}"] = float(value)
    return [known[name] for name in names]


def _constants(theirs: Any, form: Form) -> dict[str, float]:
    found = dict(zip(theirs.model.param_names, theirs.params, strict=True))
    named = {"alpha": found["smoothing_level"], "phi": found.get("damping_trend"),
             "gamma": found.get("smoothing_seasonal"),
             "beta": found.get("smoothing_trend", 0.0) / max(found["smoothing_level"], 1e-12)}
    return {name: float(named[name]) for name in form.constants}


def _figures(constants: Any, values: Array, one_step: Array, ahead: Array, form: Form) -> dict[str, float]:
    """Figures of one fit, computed in the same way for both.

    The log-likelihood is that of normal errors, concentrated over their variance; relative
    errors take off the logarithms of what they are relative to (Hyndman et al. 2008, section 5.1).
    """
    errors = values - one_step
    relative = form.error == MULTIPLICATIVE
    scaled = errors / one_step if relative else errors
    likelihood = -0.5 * len(values) * (np.log(2 * np.pi * np.mean(scaled**2)) + 1)
    likelihood -= np.log(np.abs(one_step)).sum() if relative else 0.0
    return {**constants, "sum of squares": float(errors @ errors), "log-likelihood": float(likelihood),
            **{f"forecast, {lead} ahead": float(value) for lead, value in enumerate(ahead[:3], 1)}}
