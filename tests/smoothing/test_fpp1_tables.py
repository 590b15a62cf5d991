"""Hyndman & Athanasopoulos, Forecasting: Principles and Practice, 1st ed. (2013), sections 7.1, 7.2, 7.5.

The figures stand in `references/fpp1_windows.json` with their source.
"""

from __future__ import annotations

import numpy as np
import pytest

from foredeck.compiled.recursions import ADDITIVE
from foredeck.smoothing.catalogue import smooth
from foredeck.smoothing.fitted import variance
from foredeck.smoothing.state_space import Form, fit_form, spread
from references.open_data import scenarios

FPP1 = scenarios("fpp1_windows")
SES, HOLT, DAMPED = Form("ses", "SES"), Form("holt", "Holt", True), Form("damped", "damped", True, True)
AAA, DAMPED_AAA = Form("aaa", "AAA", True, season=ADDITIVE), Form("aada", "AAdA", True, True, ADDITIVE)
ANA = Form("ana", "ANA", season=ADDITIVE)
FORMS = {
    "oil_fpp1": SES, "oil_fpp2": SES, "oil_fpp3": SES, "oil_ets": SES,
    "air_fpp1": HOLT, "air_fpp2": DAMPED, "air_ets": DAMPED,
    "aust_fpp1": AAA, "aust_ets1": AAA, "aust_ets2": DAMPED_AAA, "aust_ets3": ANA,
}
ESTIMATED = {"oil_fpp3": 2, "oil_ets": 2, "air_fpp2": 5, "air_ets": 5, "aust_fpp1": 8, "aust_ets1": 8,
             "aust_ets2": 9, "aust_ets3": 6}  # the published count; none where the start was "simple"


def case(name):
    entry = FPP1["cases"][name]
    return np.array(FPP1["data"][entry["series"]]), entry["parameters"], entry


def published(name):
    """The published constants and starting states in our words."""
    _, p, _ = case(name)
    beta = p.get("beta_star", p.get("beta", 0.0) / p["alpha"])
    constants = {"alpha": p["alpha"], "beta": beta, "gamma": p.get("gamma"), "phi": p.get("phi")}
    initial = {"level": p["l0"]}
    if "b0" in p:
        initial["trend"] = p["b0"]
    if "s0_0" in p:
        s = [p["s0_0"], p["s0_1"], p["s0_2"]]
        initial["season"] = [-sum(s), *reversed(s)]  # s0_0 is the season just before the first period
    return {key: value for key, value in constants.items() if value is not None}, initial


@pytest.mark.parametrize("name", list(FORMS))
def test_fpp1_row_at_the_published_constants_and_states_one_step_and_ahead_to_1e_7(name):
    y, p, entry = case(name)
    constants, initial = published(name)
    fitted = fit_form(FORMS[name], y, 4, constants, initial=initial)
    np.testing.assert_allclose(fitted.fitted, entry["fitted"], rtol=1e-9)
    np.testing.assert_allclose(fitted.forecast(len(entry["forecast"])), entry["forecast"], rtol=1e-7)
    if "sse" in p:
        assert fitted.sse == pytest.approx(p["sse"], rel=1e-9)
    if "mse" in p:
        assert fitted.sse / y.size == pytest.approx(p["mse"], rel=1e-8)
    # sigma2 is SSE/n for a simple start, else SSE/(n - k): derived from the table, it holds for every row
    assert variance(fitted.sse, y.size, ESTIMATED.get(name, 0)) == pytest.approx(p["sigma2"], rel=1e-8)


@pytest.mark.parametrize("name", [name for name in FORMS if name != "air_fpp1"])
def test_fpp1_95_percent_limits_from_the_published_sigma2_to_1e_6(name):
    y, p, entry = case(name)
    constants, initial = published(name)
    fitted = fit_form(FORMS[name], y, 4, constants, initial=initial)
    leads = len(entry["forecast"])
    half = 1.959963985 * np.sqrt(p["sigma2"] * fitted.spread(leads))
    checked = np.arange(1, leads + 1)
    if name.startswith("aust"):
        # At lead 4 of the quarterly rows the published limits already hold the season's own term,
        # which by table 6.1 of Hyndman et al. (2008) enters at lead 5.
        checked = checked[checked != 4]
    np.testing.assert_allclose((fitted.forecast(leads) - half)[checked - 1],
                               np.array(entry["lower_95"])[checked - 1], rtol=1e-6)
    np.testing.assert_allclose((fitted.forecast(leads) + half)[checked - 1],
                               np.array(entry["upper_95"])[checked - 1], rtol=1e-6)


def test_fpp1_air_limits_of_the_simple_start_take_beta_for_the_state_space_coefficient():
    y, p, entry = case("air_fpp1")
    fitted = fit_form(HOLT, y, 1, {"alpha": 0.8, "beta": 0.2}, initial="first value")
    leads = len(entry["forecast"])
    np.testing.assert_allclose(fitted.forecast(leads), entry["forecast"], rtol=1e-9)
    assert fitted.ranges(1)[0, 0] == pytest.approx(entry["lower_95"][0], rel=1e-8)
    # The printed limits spread with alpha * beta = .2, though the recursion ran with .8 * .2.
    wide = spread(leads, alpha=0.8, beta=0.25, gamma=0.0, phi=1.0, m=1)
    half = 1.959963985 * np.sqrt(p["sigma2"] * wide)
    np.testing.assert_allclose(np.array(entry["forecast"]) - half, entry["lower_95"], rtol=1e-7)


@pytest.mark.parametrize(("name", "constants"), [
    ("oil_fpp1", {"alpha": 0.2}), ("oil_fpp2", {"alpha": 0.6}), ("air_fpp1", {"alpha": 0.8, "beta": 0.2}),
])
def test_fpp1_rows_with_the_simple_start_give_sse_sigma2_and_forecasts_to_1e_9(name, constants):
    y, p, entry = case(name)
    fitted = fit_form(FORMS[name], y, 1, constants, initial="first value")
    assert fitted.initial["level"] == pytest.approx(p["l0"])
    assert fitted.sse == pytest.approx(p["sse"], rel=1e-9)
    assert fitted.sigma2 == pytest.approx(p["sigma2"], rel=1e-9)
    assert fitted.n_parameters == 0
    np.testing.assert_allclose(fitted.forecast(5), entry["forecast"][:5], rtol=1e-9)


def test_fpp1_oil_estimated_alpha_892_level_447_48_sigma2_757_34_forecast_496_49_and_its_ranges():
    y, p, entry = case("oil_fpp3")
    fitted = fit_form(SES, y, 1)
    assert fitted.constants["alpha"] == pytest.approx(p["alpha"], abs=2e-4)
    assert fitted.initial["level"] == pytest.approx(p["l0"], abs=0.01)
    assert fitted.sigma2 == pytest.approx(p["sigma2"], rel=1e-7)
    np.testing.assert_allclose(fitted.forecast(17), entry["forecast"], atol=0.002)
    np.testing.assert_allclose(fitted.ranges(17), [entry["lower_95"], entry["upper_95"]], atol=0.02)


def test_fpp1_air_damped_with_alpha_and_beta_held_gives_phi_8502_level_13_96_and_its_forecasts():
    y, p, entry = case("air_fpp2")
    fitted = fit_form(DAMPED, y, 1, {"alpha": 0.8, "beta": 0.25})
    assert fitted.constants["phi"] == pytest.approx(p["phi"], abs=1e-4)
    assert fitted.initial["level"] == pytest.approx(p["l0"], abs=1e-3)
    assert fitted.initial["trend"] == pytest.approx(p["b0"], abs=1e-3)
    np.testing.assert_allclose(fitted.forecast(14), entry["forecast"], atol=0.002)
    # The publication counts the two held constants as estimated too; we do not.
    assert fitted.n_parameters == 3
    assert variance(fitted.sse, 15, 5) == pytest.approx(p["sigma2"], rel=1e-7)


@pytest.mark.parametrize(("name", "tolerance"), [
    ("aust_fpp1", 5e-4), ("aust_ets1", 5e-4), ("aust_ets2", 2e-3), ("aust_ets3", 2e-4), ("air_ets", 0.013),
])
def test_fpp1_row_with_constants_held_profiles_starting_states_no_worse_than_the_published(name, tolerance):
    # The published states were not searched to the end: ours fit up to 6 % better. States long past
    # hardly matter, so the forecasts agree; least where beta is near 0 and the first trend lives on (air).
    y, p, entry = case(name)
    constants, _ = published(name)
    fitted = fit_form(FORMS[name], y, 4, constants)
    assert 0.94 * p["mse"] <= fitted.sse / y.size <= p["mse"] * (1 + 1e-9)
    np.testing.assert_allclose(fitted.forecast(5), entry["forecast"][:5], rtol=tolerance)


@pytest.mark.parametrize(("name", "less"), [
    ("oil_fpp3", 0.0), ("air_ets", 0.06), ("aust_fpp1", 0.13), ("aust_ets2", 0.16), ("aust_ets3", 0.001),
])
def test_fpp1_row_estimated_freely_ends_no_higher_than_the_published_local_optimum(name, less):
    y, p, _ = case(name)
    fitted = fit_form(FORMS[name], y, 4)
    assert fitted.sse / y.size <= p["mse"] * (1 - less)


def test_fpp1_aust_multiplicative_season_estimated_gives_61_3083_37_3730_46_9652_51_5578():
    # section 7.5; figures shipped in statsmodels 0.15, holtwinters/tests/test_holtwinters.py (test_predict);
    # their alpha ends at 0, ours at its bound .0001
    y, *_ = case("aust_fpp1")
    fitted = smooth(y, "holt_winters_multiplicative", 4)
    np.testing.assert_allclose(fitted.forecast(4), [61.3083, 37.3730, 46.9652, 51.5578], atol=5e-4)
