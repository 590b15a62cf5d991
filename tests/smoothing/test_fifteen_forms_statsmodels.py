"""All fifteen forms against statsmodels' ETSModel: the likelihood at fixed constants and states, and the optimum."""

from __future__ import annotations

import numpy as np
import pytest
from statsmodels.tsa.exponential_smoothing.ets import ETSModel

from foredeck.compiled.recursions import ADDITIVE, MULTIPLICATIVE, NO_SEASON
from foredeck.smoothing.state_space import fit_form
from foredeck.smoothing.weighted_forms import FORMS
from references import plain_smoothing as plain

CONSTANTS = {"alpha": 0.35, "beta": 0.2, "gamma": 0.3, "phi": 0.92}
SEASON = {NO_SEASON: [0.0] * 4, ADDITIVE: [-4.0, 7.0, -1.0, -2.0], MULTIPLICATIVE: [0.9, 1.15, 0.98, 0.97]}
NAMED = {ADDITIVE: "add", MULTIPLICATIVE: "mul", NO_SEASON: None}


def invented(seed):
    rng = np.random.default_rng(seed)
    return 80 + np.cumsum(rng.normal(0.3, 2, 44)) + np.tile([-6.0, 9, -1, -2], 11) + rng.normal(size=44) * 3


def model(form, y):
    return ETSModel(y, error=NAMED[form.error], trend="add" if form.trend else None, damped_trend=form.damped,
                    seasonal=NAMED[form.season], seasonal_periods=4 if form.season else None)


def deviance_of(result):
    """Minus twice their log likelihood, with the constants taken off that ours leaves out."""
    n = result.nobs
    return -2 * result.llf - n * (np.log(2 * np.pi) + 1) + n * np.log(n)


@pytest.mark.parametrize("form", FORMS, ids=lambda form: form.name)
def test_deviance_and_forecasts_at_fixed_constants_and_states_equal_theirs_to_1e_10(form):
    y = invented(1)
    ours_start = {"level": 78.0} | ({"trend": 0.6} if form.trend else {})
    constants, options = {name: CONSTANTS[name] for name in form.constants}, {}
    if form.season:
        ours_start["season"] = SEASON[form.season]
    if form.season == MULTIPLICATIVE:
        # There a multiplicative season is smoothed against the new level, by gamma / (1 - alpha).
        constants["gamma"] /= 1 - constants["alpha"]
        options["season_update"] = "new level"
    backwards = SEASON[form.season][::-1]  # their index 0 is the season just before period 1
    given = {
        "smoothing_level": CONSTANTS["alpha"], "smoothing_trend": CONSTANTS["alpha"] * CONSTANTS["beta"],
        "smoothing_seasonal": CONSTANTS["gamma"], "damping_trend": CONSTANTS["phi"],
        "initial_level": 78.0, "initial_trend": 0.6, **{f"initial_seasonal.{j}": backwards[j] for j in range(4)},
    }
    theirs_model = model(form, y)
    theirs = theirs_model.smooth([given[name] for name in theirs_model.param_names])
    ours = fit_form(form, y, 4, constants, initial=ours_start, **options)
    np.testing.assert_allclose(ours.fitted, theirs.fittedvalues, rtol=1e-12)
    np.testing.assert_allclose(ours.path(9), theirs.forecast(9), rtol=1e-10)
    deviance = plain.deviance(y, ours.fitted, form.error == MULTIPLICATIVE)
    assert deviance == pytest.approx(deviance_of(theirs), rel=1e-10)


@pytest.mark.parametrize("seed", [2, 3])
@pytest.mark.parametrize("form", [form for form in FORMS if form.name in ("ANN", "AAN", "AAdN", "MAN", "AAA", "MAM")],
                         ids=lambda form: form.name)
def test_estimated_deviance_is_no_more_than_a_hundredth_above_theirs(form, seed):
    # With a multiplicative season theirs smooths it against the new level: near, but not the same form.
    y = invented(seed)
    ours = fit_form(form, y, 4)
    theirs = model(form, y).fit(disp=False, maxiter=1000)
    allowed = 0.01 if form.season != MULTIPLICATIVE else 0.5
    assert plain.deviance(y, ours.fitted, form.error == MULTIPLICATIVE) <= deviance_of(theirs) + allowed


@pytest.mark.parametrize("form", [form for form in FORMS if form.error == MULTIPLICATIVE], ids=lambda form: form.name)
def test_with_a_multiplicative_error_residuals_are_in_the_unit_and_the_variance_of_relative_errors(form):
    y = invented(4)
    fitted = fit_form(form, y, 4)
    np.testing.assert_allclose(fitted.residuals, y - fitted.fitted, rtol=1e-9)
    assert fitted.sse == pytest.approx(np.sum((y - fitted.fitted) ** 2), rel=1e-9)
    relative = fitted.residuals / fitted.fitted
    assert fitted.sigma2 == pytest.approx(np.sum(relative**2) / (y.size - fitted.n_parameters), rel=1e-9)
    assert fitted.spread is None
