"""Weights of the blend: learned, drawn toward the prior, leaned toward what a series itself says."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.optimize import linprog

from foredeck.portfolio.alone import ForecastOptions
from foredeck.portfolio.weights import PULL, learn, learn_from, own_errors, own_weights, prior_weights
from portfolio.invented import alone_of

EQUAL = np.full(3, 1 / 3)


def some_errors(cells: int = 400, seed: int = 3) -> np.ndarray:
    rng = np.random.default_rng(seed)
    return rng.normal(size=(cells, 1)) * 0.6 + rng.normal(size=(cells, 3)) * [0.4, 0.8, 1.2] + [0.1, -0.3, 0.0]


def least_absolute(errors: np.ndarray) -> tuple[np.ndarray, float]:
    """The same weights without a prior, as a linear programme."""
    cells, methods = errors.shape
    identity = np.eye(cells)
    above = np.hstack([errors, -identity])
    below = np.hstack([-errors, -identity])
    found = linprog(np.r_[np.zeros(methods), np.full(cells, 1 / cells)], A_ub=np.vstack([above, below]),
                    b_ub=np.zeros(2 * cells), A_eq=np.r_[np.ones(methods), np.zeros(cells)][None], b_eq=[1.0])
    return found.x[:methods], found.fun


def test_learned_weights_reach_the_least_mean_absolute_error_of_a_linear_programme() -> None:
    errors = some_errors()
    weights = learn(errors, np.full(400, 1 / 400), EQUAL)
    _, least = least_absolute(errors)
    missed = np.abs(errors @ weights).mean()
    away = PULL * float(EQUAL @ np.log(EQUAL / weights))
    assert least <= missed <= least + away + 1e-3
    assert weights.sum() == pytest.approx(1.0)
    assert (weights > 0).all()


def test_cells_that_do_not_count_do_not_matter() -> None:
    errors = some_errors()
    counts = np.zeros(400)
    counts[:200] = 1 / 200
    spoilt = errors.copy()
    spoilt[200:] += 50.0
    np.testing.assert_allclose(learn(spoilt, counts, EQUAL), learn(errors, counts, EQUAL), atol=1e-6)


def test_methods_that_err_alike_keep_the_weights_of_the_prior() -> None:
    same = np.repeat(np.random.default_rng(1).normal(size=(200, 1)), 3, axis=1)
    prior = np.array([0.5, 0.3, 0.2])
    np.testing.assert_allclose(learn(same, np.full(200, 1 / 200), prior), prior, atol=1e-6)


def test_a_series_leans_by_the_inverse_root_of_its_own_errors_and_only_within_its_pool() -> None:
    pool = np.array([True, True, False])
    weights = own_weights(EQUAL, np.array([1.0, 4.0, 0.1]), pool)
    # 1 / sqrt(1) to 1 / sqrt(4)
    np.testing.assert_allclose(weights, [2 / 3, 1 / 3, 0.0])


def test_a_series_without_errors_takes_the_portfolio_s_weights() -> None:
    weights = own_weights(np.array([0.5, 0.25, 0.25]), np.full(3, np.nan), np.array([True, True, True]))
    np.testing.assert_allclose(weights, [0.5, 0.25, 0.25])
    assert own_weights(EQUAL, np.ones(3), np.zeros(3, dtype=bool)).tolist() == [0, 0, 0]


def test_the_prior_is_equal_for_methods_asked_for_and_small_for_benchmarks_that_were_not() -> None:
    usual = prior_weights(("naive", "seasonal_naive", "dynamic_theta", "averaged_damped", "croston"),
                          ForecastOptions(), 12)
    np.testing.assert_allclose(usual, np.array([0, 0.04, 1, 1, 0]) / 2.04)
    asked = prior_weights(("naive", "seasonal_naive", "ses"), ForecastOptions(methods=("seasonal_naive", "ses")), 12)
    np.testing.assert_allclose(asked, [0, 0.5, 0.5])


def test_weights_of_an_offset_rest_only_on_errors_known_then() -> None:
    options = ForecastOptions(horizon=3, methods=("ses", "holt", "damped_holt"))
    alones = [alone_of(seed, horizon=3) for seed in range(4)]
    before = learn_from(alones, options)
    offset = 5
    for alone in alones:
        for row, behind in enumerate(alone.offsets):
            for lead in range(3):
                if behind - (lead + 1) < offset:  # became known later than `offset` periods before the closing
                    alone.cube.actual[row, lead] += 1000.0
    after = learn_from(alones, options)
    np.testing.assert_array_equal(after.weights[offset:], before.weights[offset:])
    np.testing.assert_array_equal(after.standing[offset:], before.standing[offset:])
    assert not np.allclose(after.weights[0], before.weights[0])


def test_few_series_stay_near_the_prior() -> None:
    options = ForecastOptions(horizon=3, methods=("ses", "holt", "damped_holt"))
    start = prior_weights(("naive", "seasonal_naive", "ses", "holt", "damped_holt"), options, 12)
    one, many = (learn_from([alone_of(seed, horizon=3) for seed in range(count)], options).weights[0]
                 for count in (1, 40))
    assert np.abs(one - start).sum() <= 2 / 51 + 1e-9  # one series counts 1 / (1 + 50)
    assert np.abs(many - start).sum() > np.abs(one - start).sum()


def test_own_errors_compare_methods_in_the_cells_that_all_of_them_have() -> None:
    alone = alone_of(1, horizon=2)
    hard = alone.cube.actual.copy()
    alone.cube.forecasts[2, :3] = np.nan  # came late
    found = own_errors(alone)
    later = np.abs(alone.cube.errors[:, 3:])
    np.testing.assert_allclose(found[-1], np.nanmean(later, axis=(1, 2)))
    np.testing.assert_array_equal(alone.cube.actual, hard)
    assert np.isnan(found[0]).all()


def test_origins_at_which_a_series_was_intermittent_teach_nothing_about_the_others() -> None:
    options = ForecastOptions(horizon=2, methods=("ses", "holt", "damped_holt"))
    ordinary, changed = alone_of(1, horizon=2), alone_of(2, horizon=2)
    changed.pool[:, :12] = False  # its demand-rate family spoke then
    before = learn_from([ordinary, changed], options)
    changed.cube.forecasts[:, :12] += 500.0
    after = learn_from([ordinary, changed], options)
    np.testing.assert_array_equal(after.weights, before.weights)
    np.testing.assert_array_equal(after.standing, before.standing)
