"""The compiled recursion and its gradient against their plain twins, which read like the published formulas."""

from __future__ import annotations

import numpy as np
import pytest

from foredeck.compiled.recursions import ADDITIVE, MULTIPLICATIVE, NO_SEASON, project, run, run_back
from references import plain_smoothing as plain

KINDS = {"none": NO_SEASON, "additive": ADDITIVE, "multiplicative": MULTIPLICATIVE}
SEASON = {"none": [0.0], "additive": [-4.0, 7.0, -1.0, -2.0], "multiplicative": [0.8, 1.3, 1.0, 0.9]}
ERRORS = [ADDITIVE, MULTIPLICATIVE]
EVERY_FORM = [
    pytest.mark.parametrize("after", [0, 1, 5]),
    pytest.mark.parametrize("new_level", [False, True]),
    pytest.mark.parametrize(("beta", "phi", "trend"), [(0.0, 1.0, 0.0), (0.2, 1.0, 0.5), (0.3, 0.9, 0.5)]),
    pytest.mark.parametrize("kind", list(KINDS)),
    pytest.mark.parametrize("error", ERRORS, ids=["additive error", "multiplicative error"]),
]


def every_form(test):
    for mark in EVERY_FORM:
        test = mark(test)
    return test


@pytest.fixture
def values():
    rng = np.random.default_rng(11)
    return 60 + 0.4 * np.arange(40) + np.tile([-5.0, 8, -1, -2], 10) + rng.normal(size=40) * 3


def twin(y, point, kind, new_level, after):
    """The plain twin at constants and states in one row, as in the gradient."""
    alpha, beta, gamma, phi, level, trend = point[:6]
    season = point[6:] if kind != "none" else None
    return plain.smoothing(y, alpha=alpha, beta=beta, gamma=gamma, phi=phi, level=level, trend=trend, season=season,
                           kind=kind, new_level=new_level, after=after)


def compiled(y, point, kind, error, new_level, after):
    """What `run` gives at the same row: total, logarithms, last state, errors, trace."""
    state, errors, trace = point[4:].copy(), np.full(y.size, np.nan), np.empty((3, y.size))
    total, logarithms = run(y, after, error, KINDS[kind], state.size - 2, new_level, point[:4].copy(), state, errors,
                            trace)
    return total, logarithms, state, errors, trace


@every_form
def test_run_equals_the_component_form_of_fpp2_section_7_to_1e_12(
    values, kind, beta, phi, trend, new_level, after, error
):
    season = SEASON[kind]
    point = np.array([0.35, beta, 0.25 if kind != "none" else 0.0, phi, 58.0, trend, *season])
    forecasts, level, slope, indices = twin(values, point, kind, new_level, after)
    total, logarithms, state, errors, trace = compiled(values, point, kind, error, new_level, after)
    np.testing.assert_allclose(values - errors, forecasts, rtol=1e-12)
    np.testing.assert_allclose(state, [level, slope, *indices], rtol=1e-12, atol=1e-12)
    relative = error == MULTIPLICATIVE
    misses = (values - forecasts) / (forecasts if relative else 1.0)
    assert total == pytest.approx(np.nansum(misses**2), rel=1e-11)
    deviance = (values.size - after) * np.log(total) + (logarithms if relative else 0.0)
    assert deviance == pytest.approx(plain.deviance(values, forecasts, relative), rel=1e-12)
    assert (trace[0, after], trace[1, after]) == (pytest.approx(58.0 + phi * trend), trend)

    path = np.empty(9)
    project(values.size, KINDS[kind], len(season), phi, state, path)
    ahead = plain.ahead(values.size, 9, phi=phi, level=level, trend=slope, season=indices, kind=kind)
    np.testing.assert_allclose(path, ahead, rtol=1e-12)


@every_form
def test_gradient_equals_central_differences_of_the_plain_deviance_to_1e_6(
    values, kind, beta, phi, trend, new_level, after, error
):
    y = values / 60  # of order one, as in the search: one step suits all
    scale = 1.0 if kind == "multiplicative" else 60.0
    season = np.array(SEASON[kind]) / scale
    point = np.array([0.35, beta, 0.25 if kind != "none" else 0.0, phi, 58 / 60, trend / 60, *season])
    total, _, _, errors, trace = compiled(y, point, kind, error, new_level, after)
    gradient = np.empty(point.size)
    run_back(y, after, error, KINDS[kind], season.size, new_level, point[:4].copy(), total, errors, trace, gradient)

    def deviance(row):
        return plain.deviance(y, twin(y, row, kind, new_level, after)[0], error == MULTIPLICATIVE)

    entries = [i for i in range(point.size) if kind != "none" or i not in (2, 6)]
    for i in entries:
        step = np.zeros(point.size)
        step[i] = 2e-5
        wide = (deviance(point + 2 * step) - deviance(point - 2 * step)) / 8e-5
        near = (deviance(point + step) - deviance(point - step)) / 4e-5
        assert gradient[i] == pytest.approx((4 * near - wide) / 3, rel=1e-6, abs=1e-6), i


def test_a_level_fallen_to_zero_leaves_the_factor_as_it_is_and_makes_the_sum_infinite():
    point = np.array([0.1, 0.1, 0.9, 1.0, 10.0, -12.0, 0.5, 1.5])
    total, _, state, errors, _ = compiled(np.array([1.0]), point, "multiplicative", ADDITIVE, False, 0)
    assert total == np.inf
    assert state[2] == 0.5
    assert np.isfinite(state).all()
    assert np.isfinite(errors).all()


def test_relative_errors_of_a_forecast_at_or_under_zero_make_the_sum_infinite():
    point = np.array([0.1, 0.1, 0.0, 1.0, 1.0, -2.0, 0.0])
    total, _, state, _, _ = compiled(np.array([1.0, 1.0]), point, "none", MULTIPLICATIVE, False, 0)
    assert total == np.inf
    assert np.isfinite(state).all()


def test_the_logarithms_of_a_thousand_large_forecasts_do_not_overflow():
    y = np.full(1000, 1e9)
    point = np.array([0.5, 0.0, 0.0, 1.0, 1e9, 0.0, 0.0])
    total, logarithms, *_ = compiled(y, point, "none", MULTIPLICATIVE, False, 0)
    assert total == 0.0
    assert logarithms == pytest.approx(2000 * np.log(1e9), rel=1e-13)
