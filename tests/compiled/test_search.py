"""The search against brute force: its linear algebra, its starting states, its slopes, and its minima."""

from __future__ import annotations

from itertools import product

import numpy as np
import pytest
from scipy.optimize import minimize

from foredeck.compiled.recursions import ADDITIVE, MULTIPLICATIVE, NO_SEASON
from foredeck.compiled.search import (
    PROFILE,
    SEARCH,
    Task,
    descend,
    deviance,
    fit_one,
    profile,
    room_for,
    search,
    slopes,
    solve,
)
from foredeck.smoothing.state_space import Form, fit_form
from references import plain_smoothing as plain

KINDS = {NO_SEASON: "none", ADDITIVE: "additive", MULTIPLICATIVE: "multiplicative"}


def series(seed, n=48, m=4):
    rng = np.random.default_rng(seed)
    level = np.cumsum(rng.normal(0.2, 1, n))
    return 40 + level + np.resize(rng.normal(size=m) * 5, n) + rng.normal(size=n)


def task_for(y, *, error=ADDITIVE, trend=False, season=NO_SEASON, m=1, new_level=False, held=(np.nan, 0, 0, 1),
             states=PROFILE, start=None):
    """A task, and the room to work on it; every state of the form is searched."""
    start = np.zeros(m + 2) if start is None else np.array(start)
    unit = np.array([0.1, 0.02 if trend else 0.0, *[0.05 if season else 0.0] * m])
    task = Task(y, 0, error, trend, season, m, new_level, np.array(held, dtype=float), start, states, unit)
    return task, room_for(y.size, m, np.empty(4), np.empty(y.size))


def test_solve_agrees_with_numpy_on_a_full_system_to_1e_10():
    a = np.random.default_rng(0).normal(size=(9, 6))
    matrix, right = a.T @ a, np.arange(6.0)
    expected = np.linalg.solve(matrix, right)
    solve(matrix, right)
    np.testing.assert_allclose(right, expected, rtol=1e-10)


def test_solve_gives_zero_to_an_unknown_that_repeats_another_and_to_one_without_effect():
    a = np.array([[1.0, 2.0], [3.0, -1.0], [0.5, 0.0]])
    columns = np.column_stack([a, a[:, 0], np.zeros(3)])
    target = np.array([1.0, 2.0, 3.0])
    right = columns.T @ target
    solve(columns.T @ columns, right)
    expected, *_ = np.linalg.lstsq(a, target, rcond=None)
    np.testing.assert_allclose(right, [*expected, 0.0, 0.0], rtol=1e-10)


@pytest.mark.parametrize("new_level", [False, True])
@pytest.mark.parametrize("trend", [False, True])
@pytest.mark.parametrize("m", [1, 4, 5])
def test_profiled_starting_states_equal_one_regression_on_unit_states_to_1e_8(m, trend, new_level):
    y = series(3)
    alpha, beta, gamma, phi = 0.3, 0.2 if trend else 0.0, 0.25 if m > 1 else 0.0, 0.9 if trend else 1.0
    states, least = plain.starting_states(y, alpha=alpha, beta=beta, gamma=gamma, phi=phi, trend=trend, m=m,
                                          new_level=new_level)
    season = ADDITIVE if m > 1 else NO_SEASON
    task, room = task_for(y, trend=trend, season=season, m=m, new_level=new_level)
    room.constants[:] = alpha, beta, gamma, phi
    assert profile(task, room) == pytest.approx(least, rel=1e-9)
    assert np.sum(room.errors**2) == pytest.approx(least, rel=1e-9)
    assert room.state[0] == pytest.approx(states["level"], rel=1e-8)
    if trend:
        assert room.state[1] == pytest.approx(states["trend"], rel=1e-8)
    if m > 1:
        np.testing.assert_allclose(room.state[2 : m + 1], [states[j] for j in range(m - 1)], rtol=1e-7)
        assert room.state[2:].sum() == pytest.approx(0.0, abs=1e-9)


FREE = [np.nan, np.nan, np.nan, np.nan]


@pytest.mark.parametrize("new_level", [False, True])
@pytest.mark.parametrize(("error", "season", "states"), [
    (ADDITIVE, ADDITIVE, PROFILE), (ADDITIVE, ADDITIVE, SEARCH), (ADDITIVE, MULTIPLICATIVE, SEARCH),
    (MULTIPLICATIVE, ADDITIVE, SEARCH), (MULTIPLICATIVE, MULTIPLICATIVE, SEARCH),
])
def test_slopes_equal_central_differences_of_the_deviance_in_the_variables_of_the_search(
    error, season, states, new_level
):
    y = series(4) / 40
    index = 1.0 if season == MULTIPLICATIVE else 0.0
    task, room = task_for(y, error=error, trend=True, season=season, m=4, new_level=new_level, held=FREE,
                          states=states, start=[1.0, 0.01, *[index] * 4])
    angles = [1.1, 0.9, 0.8, 1.6]
    point = np.array(angles if states == PROFILE else [*angles, 0.3, -0.2, 0.4, 0.1, -0.5, 0.2])
    _, total = deviance(task, point, room)
    gradient = np.empty(point.size)
    slopes(task, point, total, room, gradient)
    for i in range(point.size):
        step = np.zeros(point.size)
        step[i] = 1e-5
        rise = deviance(task, point + step, room)[0] - deviance(task, point - step, room)[0]
        assert gradient[i] == pytest.approx(rise / 2e-5, rel=1e-5, abs=1e-5), i


def test_descent_from_a_poor_point_ends_where_the_search_ends_and_keeps_held_entries():
    y = np.cumsum(np.random.default_rng(5).normal(size=48)) / 3
    y += np.random.default_rng(6).normal(size=48) / 2
    task, room = task_for(y, trend=True, held=(np.nan, 0.25, 0, 0.9))
    point = np.array([2.9])
    value = descend(task, room, 1, point, 1e-11, np.inf)
    assert search(task, 8, 1e-11, room) == pytest.approx(value, abs=1e-9)
    assert room.constants[0] == pytest.approx(1e-4 + 0.9998 * (0.5 - 0.5 * np.cos(point[0])), abs=1e-5)
    assert room.constants[1:].tolist() == [0.25, 0.0, 0.9]


# With a season the surface has more than one bottom, and the cold starts may miss the lowest by a little.
ADDITIVE_FORMS = [
    Form("level", "level"), Form("trend", "trend", trend=True), Form("damped", "damped", True, True),
    Form("season", "season", season=ADDITIVE), Form("all", "all", True, True, ADDITIVE),
]


@pytest.mark.parametrize("seed", range(4))
@pytest.mark.parametrize("form", ADDITIVE_FORMS, ids=lambda form: form.name)
def test_no_point_of_a_fine_grid_beats_the_search_by_more_than_1e_7_or_1_percent_with_a_season(form, seed):
    y = series(seed)
    m = 4 if form.season else 1
    steps = np.array([1e-4, 0.03, 0.1, 0.2, 0.35, 0.5, 0.65, 0.8, 0.93, 0.9999])
    axes = [steps if name != "phi" else np.linspace(0.8, 0.98, 5) for name in form.constants]
    fitted = fit_form(form, y, m)
    task, room = task_for(y - y.mean(), trend=form.trend, season=form.season, m=m)
    least = np.inf
    for point in product(*axes):
        given = dict(zip(form.constants, point, strict=True))
        gamma = given.get("gamma", 0) * (1 - given["alpha"])
        room.constants[:] = given["alpha"], given.get("beta", 0), gamma, given.get("phi", 1)
        least = min(least, profile(task, room))
    assert fitted.sse <= least * (1 + (0.01 if form.season else 1e-7))


@pytest.mark.parametrize("seed", range(3))
@pytest.mark.parametrize("form", [
    Form("factors", "factors", trend=True, season=MULTIPLICATIVE),
    Form("relative", "relative", trend=True, error=MULTIPLICATIVE),
    Form("both", "both", trend=True, season=MULTIPLICATIVE, error=MULTIPLICATIVE),
    Form("mixed", "mixed", season=ADDITIVE, error=MULTIPLICATIVE),
], ids=lambda form: form.name)
def test_scipy_finds_no_better_multiplicative_fit_from_where_the_search_ended(form, seed):
    y = series(seed) / 10
    fitted = fit_form(form, y, 4)
    kind, relative = KINDS[form.season], form.error == MULTIPLICATIVE
    names = [name for name in ("alpha", "beta", "gamma") if name in form.constants]

    def criterion(x):
        given = dict(zip(names, x, strict=False))
        gamma = given.get("gamma", 0.0) * (1 - given["alpha"])
        rest = x[len(names) :]
        forecasts, *_ = plain.smoothing(
            y, alpha=given["alpha"], beta=given.get("beta", 0.0), gamma=gamma, level=rest[0],
            trend=rest[1] if form.trend else 0.0, season=rest[1 + form.trend :] if form.season else None, kind=kind)
        return plain.deviance(y, forecasts, relative)

    used = dict(fitted.constants)
    if "gamma" in used:
        used["gamma"] /= 1 - used["alpha"]
    start = np.array([*[used[name] for name in names], fitted.initial["level"],
                      *([fitted.initial["trend"]] if form.trend else []), *fitted.initial.get("season", [])])
    ours = plain.deviance(y, fitted.fitted, relative)
    assert criterion(start) == pytest.approx(ours, abs=1e-7)
    low = 0.01 if form.season == MULTIPLICATIVE else None
    inside = [(1e-4, 1 - 1e-4)] * len(names) + [(None, None)] * (1 + form.trend) + [(low, None)] * (
        4 if form.season else 0)
    other = minimize(criterion, start, method="L-BFGS-B", bounds=inside)
    assert ours <= other.fun + 1e-5


def fitted_at(values, error, season, m, held, *, before=None):
    """Deviance, sum of squares, and last states of `fit_one`, with the starting states held when they are given."""
    first, after, errors = np.empty(m + 2), np.empty(m + 2), np.empty(values.size)
    if before is not None:
        first[:] = before
    best, square, _ = fit_one(values, 0, error, True, season, m, False, np.array(held, dtype=float), before is None, 4,
                              1e-8, np.empty(4), first, after, errors)
    return best, square, after, errors


def test_a_path_that_leaves_the_region_above_zero_is_infinitely_bad_and_still_leaves_finite_states():
    values = np.concatenate([np.tile([1.0, 2.0, 1.5, 0.5], 4), [30.0, 1.0, 45.0, 60.0]])
    before = [1.0, -5.0, 0.8, 1.6, 1.2, 0.4]
    for error in (ADDITIVE, MULTIPLICATIVE):
        best, square, after, errors = fitted_at(values, error, MULTIPLICATIVE, 4, (0.1, 0.1, 0.1, 1), before=before)
        assert best == np.inf
        assert np.isfinite(square)
        assert np.isfinite([*after, *errors]).all()


@pytest.mark.parametrize("scale", [1e-9, 1.0, 1e12])
@pytest.mark.parametrize(("error", "season"), [(ADDITIVE, ADDITIVE), (MULTIPLICATIVE, MULTIPLICATIVE)])
def test_deviance_of_another_unit_differs_by_twice_n_logarithms_of_the_unit(error, season, scale):
    y = series(2)
    best, square, *_ = fitted_at(y, error, season, 4, FREE)
    again, larger, *_ = fitted_at(y * scale, error, season, 4, FREE)
    assert again == pytest.approx(best + 2 * y.size * np.log(scale), abs=1e-6)
    assert larger / scale**2 == pytest.approx(square, rel=1e-6)
