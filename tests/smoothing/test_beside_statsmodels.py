"""The table that sets a fit beside that of statsmodels."""

from __future__ import annotations

import numpy as np
import pytest

from foredeck.errors import MethodError
from foredeck.smoothing.beside_statsmodels import beside_statsmodels, suitable_form
from foredeck.smoothing.catalogue import METHODS, smooth

FORMS = ("ses", "holt", "damped_holt", "seasonal_ses_additive", "holt_winters_additive",
         "damped_holt_winters_additive", "ses_relative", "holt_relative", "holt_winters_additive_relative")


def values(seed: int = 5) -> np.ndarray:
    rng = np.random.default_rng(seed)
    return 80 + np.cumsum(rng.normal(0.3, 2, 48)) + np.tile([-6.0, 9, -1, -2], 12) + rng.normal(size=48) * 3


@pytest.mark.parametrize("name", FORMS)
def test_given_our_constants_and_states_statsmodels_says_the_same_to_1e_9_of_the_values(name):
    beside = beside_statsmodels(smooth(values(), name, 4), horizon=9)
    given = beside["difference given ours"]
    assert given["largest difference, one step"] < 1e-7
    assert given["largest difference, 9 ahead"] < 1e-7
    assert given["sum of squares"] < 1e-9 * beside.loc["sum of squares", "foredeck"]
    assert given["log-likelihood"] < 1e-8


@pytest.mark.parametrize("name", FORMS)
def test_what_we_estimate_is_no_less_likely_than_what_statsmodels_estimates(name):
    beside = beside_statsmodels(smooth(values(), name, 4))
    assert beside.loc["log-likelihood", "foredeck"] >= beside.loc["log-likelihood", "statsmodels"] - 0.01


@pytest.mark.parametrize("name", ["ses", "holt", "holt_winters_additive", "holt_relative"])
def test_the_log_likelihood_is_the_one_that_statsmodels_states(name):
    from statsmodels.tsa.exponential_smoothing.ets import ETSModel

    y = values()
    model = ETSModel(y, error="mul" if name.endswith("relative") else "add", trend=None if name == "ses" else "add",
                     seasonal="add" if "winters" in name else None, seasonal_periods=4 if "winters" in name else None)
    theirs = model.fit(disp=False, maxiter=1000)
    beside = beside_statsmodels(smooth(y, name, 4))
    # their search ends a little elsewhere when the values differ in their last bits
    assert beside.loc["log-likelihood", "statsmodels"] == pytest.approx(theirs.llf, rel=1e-6)
    squares = ((y - theirs.fittedvalues) ** 2).sum()
    assert beside.loc["sum of squares", "statsmodels"] == pytest.approx(squares, rel=1e-4)


def test_the_table_names_constants_misses_and_forecasts_and_both_largest_differences():
    fitted = smooth(values(), "damped_holt", 4)
    beside = beside_statsmodels(fitted, horizon=2)
    assert list(beside.index) == [
        "alpha", "beta", "phi", "sum of squares", "log-likelihood", "forecast, 1 ahead", "forecast, 2 ahead",
        "largest difference, one step", "largest difference, 2 ahead"]
    assert list(beside.columns) == ["foredeck", "statsmodels", "difference", "given ours", "difference given ours"]
    assert beside.loc["sum of squares", "foredeck"] == pytest.approx(fitted.sse)
    assert beside.loc["alpha", "given ours"] == pytest.approx(fitted.constants["alpha"])
    assert beside.loc["beta", "given ours"] == pytest.approx(fitted.constants["beta"])
    apart = (beside["foredeck"] - beside["statsmodels"]).abs().dropna()
    assert beside["difference"][apart.index].to_numpy() == pytest.approx(apart.to_numpy())


@pytest.mark.parametrize("name", ["holt_winters_multiplicative", "theta", "naive"])
def test_methods_without_a_counterpart_are_refused_with_what_is_allowed(name):
    with pytest.raises(MethodError) as caught:
        beside_statsmodels(smooth(values(), name, 4))
    assert str(caught.value).startswith(f"{METHODS[name].title} has no counterpart in statsmodels to be set beside.")
    assert "smoothing forms without season or with an additive one" in str(caught.value)


@pytest.mark.parametrize(("count", "season_length", "form"), [
    (36, 12, "holt_winters_additive"), (35, 12, "holt"), (200, 52, "holt"), (20, 1, "holt"), (7, 12, "ses")])
def test_the_form_that_is_chosen_can_be_fitted_to_a_series_of_that_length(count, season_length, form):
    assert suitable_form(np.ones(count), season_length) == form
