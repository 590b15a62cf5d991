"""Agreement with statsmodels at fixed constants and fixed starting states, for every form."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
from statsmodels.tsa.exponential_smoothing.ets import ETSModel
from statsmodels.tsa.holtwinters import ExponentialSmoothing, Holt, SimpleExpSmoothing

from foredeck.smoothing.catalogue import smooth

CONSTANTS = {"alpha": 0.35, "beta": 0.2, "gamma": 0.3, "phi": 0.92}
ADDED, FACTORS = [-4.0, 7.0, -1.0, -2.0], [0.9, 1.15, 0.98, 0.97]
FORMS = {
    "ses": (False, False, None), "holt": (True, False, None), "damped_holt": (True, True, None),
    "holt_winters_additive": (True, False, "add"), "damped_holt_winters_additive": (True, True, "add"),
    "holt_winters_multiplicative": (True, False, "mul"),
    "damped_holt_winters_multiplicative": (True, True, "mul"),
}


@pytest.fixture(scope="module")
def values():
    rng = np.random.default_rng(21)
    return 80 + 0.5 * np.arange(36) + np.tile([-6.0, 9, -1, -2], 9) + rng.normal(size=36) * 3


def held(trend, damped, season):
    names = ["alpha", *["beta"] * trend, *["gamma"] * (season is not None), *["phi"] * damped]
    initial = {"level": 78.0}
    if trend:
        initial["trend"] = 0.6
    if season is not None:
        initial["season"] = ADDED if season == "add" else FACTORS
    return {name: CONSTANTS[name] for name in names}, initial


@pytest.mark.parametrize("name", list(FORMS))
def test_one_step_and_12_ahead_equal_statsmodels_exponential_smoothing_to_1e_8(values, name):
    trend, damped, season = FORMS[name]
    constants, initial = held(trend, damped, season)
    ours = smooth(values, name, 4, initial=initial, **constants)
    start = {"initialization_method": "known", "initial_level": 78.0}
    if season is None and not trend:
        model = SimpleExpSmoothing(values, **start)
    elif season is None:
        model = Holt(values, damped_trend=damped, initial_trend=0.6, **start)
    else:
        model = ExponentialSmoothing(values, trend="add", damped_trend=damped, seasonal=season,
                                     seasonal_periods=4, initial_trend=0.6,
                                     initial_seasonal=initial["season"], **start)
    theirs_named = {"alpha": "smoothing_level", "beta": "smoothing_trend", "gamma": "smoothing_seasonal",
                    "phi": "damping_trend"}
    theirs = model.fit(optimized=False, **{theirs_named[key]: value for key, value in constants.items()})
    np.testing.assert_allclose(ours.fitted, theirs.fittedvalues, rtol=1e-8)
    # Their forecasts leave out the last update of the season's index (statsmodels 0.15, last line of
    # the smoothing in holtwinters/model.py), so the leads of the last known season are compared with
    # ETSModel alone, below.
    leads = np.arange(1, 13)
    compared = leads % 4 != 0 if season else leads > 0
    np.testing.assert_allclose(ours.forecast(12)[compared], theirs.forecast(12)[compared], rtol=1e-8)
    assert ours.sse == pytest.approx(theirs.sse, rel=1e-8)


def ets_model(values, name):
    trend, damped, season = FORMS[name]
    # a Series, since their ranges ask for an index
    return ETSModel(pd.Series(values), error="add", trend="add" if trend else None, damped_trend=damped,
                    seasonal=season, seasonal_periods=4 if season else None)


def ets_at_fixed_constants(values, name):
    model = ets_model(values, name)
    _, initial = held(*FORMS[name])
    backwards = initial.get("season", [0.0] * 4)[::-1]  # their index 0 is the season just before period 1
    given = {
        "smoothing_level": CONSTANTS["alpha"], "smoothing_trend": CONSTANTS["alpha"] * CONSTANTS["beta"],
        "smoothing_seasonal": CONSTANTS["gamma"], "damping_trend": CONSTANTS["phi"],
        "initial_level": 78.0, "initial_trend": 0.6,
        **{f"initial_seasonal.{j}": backwards[j] for j in range(4)},
    }
    return model.smooth([given[parameter] for parameter in model.param_names])


@pytest.mark.parametrize("name", list(FORMS))
def test_one_step_and_12_ahead_equal_statsmodels_ets_model_to_1e_8(values, name):
    constants, initial = held(*FORMS[name])
    options = {}
    if FORMS[name][2] == "mul":
        # There a multiplicative season is smoothed against the new level, by gamma / (1 - alpha).
        options["season_update"] = "new level"
        constants["gamma"] /= 1 - constants["alpha"]
    ours = smooth(values, name, 4, initial=initial, **options, **constants)
    theirs = ets_at_fixed_constants(values, name)
    np.testing.assert_allclose(ours.fitted, theirs.fittedvalues, rtol=1e-8)
    np.testing.assert_allclose(ours.forecast(12), theirs.forecast(12), rtol=1e-8)


@pytest.mark.parametrize("name", ["ses", "holt", "damped_holt", "holt_winters_additive",
                                  "damped_holt_winters_additive"])
def test_variance_by_lead_equals_that_of_statsmodels_ets_model_to_1e_8(values, name):
    constants, initial = held(*FORMS[name])
    ours, theirs = smooth(values, name, 4, initial=initial, **constants), ets_at_fixed_constants(values, name)
    variance = np.asarray(theirs.get_prediction(36, 47, method="exact").forecast_variance)
    np.testing.assert_allclose(ours.spread(12), variance / variance[0], rtol=1e-8)


@pytest.mark.parametrize("name", list(FORMS))
def test_estimated_fit_is_no_worse_than_that_of_statsmodels_on_the_same_series(values, name):
    theirs = ets_model(values, name).fit(disp=False)
    # one part in a thousand: their bounds are a little wider than ours
    assert smooth(values, name, 4).sse <= float(np.sum(theirs.resid**2)) * 1.001
