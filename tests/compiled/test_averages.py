"""The compiled averages against their plain twins, and against sums done by hand."""

from __future__ import annotations

import numpy as np
import pytest

from foredeck.compiled import averages
from references import plain_averages as plain

ALPHAS = np.array([0.02, 0.1, 0.3, 0.6, 0.99])
BETAS, PHIS = np.array([0.0, 0.1, 0.4]), np.array([0.8, 0.98])


@pytest.fixture(scope="module")
def walk():
    rng = np.random.default_rng(5)
    return 200 + np.cumsum(rng.normal(0.8, 2.0, 37)) + rng.normal(0, 3, 37)


@pytest.fixture(scope="module")
def seasonal():
    rng = np.random.default_rng(6)
    season = np.tile(rng.normal(1, 0.1, 12), 5)[:53]
    return (100 + np.arange(53.0)) * season * rng.normal(1, 0.06, 53)


@pytest.mark.parametrize("multiplicative", [True, False])
@pytest.mark.parametrize("m", [2, 3, 4, 7, 12, 26])
def test_indices_equal_their_plain_twin_to_1e_10(seasonal, m, multiplicative):
    indices = np.empty(m)
    averages.seasonal_indices(seasonal, m, multiplicative, indices)
    expected = plain.shrunken_indices(seasonal, m, multiplicative)
    np.testing.assert_allclose(indices, expected, rtol=1e-10, atol=1e-10)


def test_indices_by_hand_of_seven_values_with_a_season_of_two():
    # The averages of 0 4 0 4 0 8 0 are 2 2 2 3 4, the differences from them 2 -2 2 -3 4. Their means are 8/3 and
    # -5/2, so with mean 0 the indices are 31/12 and -31/12. The residuals are -7, 7, -7, -5 and 17 twelfths.
    indices = np.empty(2)
    averages.seasonal_indices(np.array([0.0, 4, 0, 4, 0, 8, 0]), 2, False, indices)
    noise = (3 * 49 + 25 + 289) / 144 / (5 - 2) / (5 / 2)
    taken = noise / (2 * (31 / 12) ** 2)
    np.testing.assert_allclose(indices, [-31 / 12 * (1 - taken), 31 / 12 * (1 - taken)], rtol=1e-12)


@pytest.mark.parametrize("alpha", [0.0, 0.25, 1.0])
def test_theta_equals_its_plain_twin_to_1e_10(walk, alpha):
    one_step = np.empty(37)
    used, level, trend = averages.theta(walk, np.array([alpha]), one_step)
    fit, path = plain.theta(walk, alpha, 6)
    np.testing.assert_allclose(one_step[1:], fit, rtol=1e-10)
    np.testing.assert_allclose(level + trend * np.arange(1, 7), path, rtol=1e-10)
    assert np.isnan(one_step[0])
    assert used == alpha


def test_theta_takes_the_alpha_of_least_absolute_error(walk):
    losses = [np.abs(walk[1:] - plain.theta(walk, alpha, 1)[0]).sum() for alpha in ALPHAS]
    assert averages.theta(walk, ALPHAS, np.empty(37))[0] == ALPHAS[np.argmin(losses)]


def test_running_lines_are_the_least_squares_lines_of_all_beginnings_to_1e_10(walk):
    means, slopes = np.empty(38), np.empty(38)
    averages.running_lines(walk, means, slopes)
    for t in range(1, 38):
        intercept, slope = plain.line(walk[:t])
        assert means[t] - slopes[t] * (t + 1) / 2 == pytest.approx(intercept, rel=1e-10)
        assert slopes[t] == pytest.approx(slope, rel=1e-9, abs=1e-10)


@pytest.mark.parametrize("alpha", [0.0, 0.02, 0.4, 0.99, 1.0])
def test_dynamic_theta_at_one_alpha_equals_its_plain_twin_to_1e_8(walk, alpha):
    one_step, states, path = np.empty(37), np.empty((1, 6)), np.empty(9)
    used, weight, _ = averages.dynamic_theta(walk, np.array([alpha]), one_step, states)
    averages.dynamic_theta_path(walk, states, path)
    level, expected = plain.best_start(walk, alpha)
    fit, ahead = plain.dynamic_theta(walk, alpha, level, expected, 9)
    assert used == alpha
    assert weight == pytest.approx(expected, rel=1e-8, abs=1e-8)
    np.testing.assert_allclose(one_step[2:], fit[2:], rtol=1e-8)
    np.testing.assert_allclose(path, ahead, rtol=1e-8)
    assert np.isnan(one_step[:2]).all()


def test_the_level_of_dynamic_theta_is_the_smoothed_one_of_its_plain_twin(walk):
    _, weight, level = averages.dynamic_theta(walk, np.array([0.1]), np.empty(37), np.empty((1, 6)))
    start, _ = plain.best_start(walk, 0.1)
    for value in walk:
        start = 0.1 * value + 0.9 * start
    assert level == pytest.approx(start, rel=1e-9)
    assert 0 < weight < averages.HIGHEST_WEIGHT


def test_the_weight_of_the_line_keeps_to_its_bounds_and_the_level_is_then_the_best_left():
    steep = np.concatenate([np.zeros(3), np.geomspace(1, 400, 15)])
    levelling = np.concatenate([np.arange(0.0, 18, 3), np.full(14, 5.0)])
    for values, bound in ((steep, averages.HIGHEST_WEIGHT), (levelling, 0.0)):
        one_step, states = np.empty(values.size), np.empty((1, 6))
        assert averages.dynamic_theta(values, np.array([0.3]), one_step, states)[1] == bound
        fit, _ = plain.dynamic_theta(values, 0.3, *plain.best_start(values, 0.3), 1)
        np.testing.assert_allclose(one_step[2:], fit[2:], rtol=1e-8, atol=1e-8)


def test_averaged_dynamic_theta_equals_its_plain_twin_to_1e_8(walk):
    one_step, states, path = np.empty(37), np.empty((5, 6)), np.empty(9)
    alpha, _, _ = averages.dynamic_theta(walk, ALPHAS, one_step, states)
    averages.dynamic_theta_path(walk, states, path)
    fit, ahead, weights = plain.averaged_dynamic_theta(walk, ALPHAS, 9)
    np.testing.assert_allclose(states[:, 5], weights, rtol=1e-7)
    np.testing.assert_allclose(one_step[2:], fit, rtol=1e-8)
    np.testing.assert_allclose(path, ahead, rtol=1e-8)
    assert alpha == pytest.approx(weights @ ALPHAS, rel=1e-8)


def test_the_optimised_alpha_is_no_worse_than_any_of_a_thousand(walk):
    def sse(alpha):
        fit, _ = plain.dynamic_theta(walk, alpha, *plain.best_start(walk, alpha), 1)
        return np.sum((walk - fit)[2:] ** 2)

    found = averages.dynamic_theta_alpha(walk, ALPHAS)
    assert 0.02 < found < 0.99
    assert sse(found) <= min(sse(alpha) for alpha in np.linspace(0.02, 0.99, 971)) * (1 + 1e-6)


def test_where_every_alpha_is_as_good_the_smallest_is_taken():
    pair, constant = np.array([5.0, 8.0]), np.full(9, 7.3)
    for values in (pair, constant):
        assert averages.theta(values, ALPHAS, np.empty(values.size))[0] == 0.02
        assert averages.dynamic_theta_alpha(values, ALPHAS) == 0.02


def test_averaged_damped_trend_equals_its_plain_twin_to_1e_9(walk):
    one_step, trends = np.empty(37), np.empty(2)
    level, *means = averages.averaged_damped(walk, ALPHAS, BETAS, PHIS, one_step, trends)
    fit, ahead, weights = plain.averaged_damped(walk, ALPHAS, BETAS, PHIS, 9)
    path = level + np.cumsum(PHIS ** np.arange(1, 10)[:, None], axis=0) @ trends
    np.testing.assert_allclose(one_step[1:], fit, rtol=1e-9)
    np.testing.assert_allclose(path, ahead, rtol=1e-9)
    cube = weights.reshape(5, 3, 2)
    sums = [cube.sum((1, 2)) @ ALPHAS, cube.sum((0, 2)) @ BETAS, cube.sum((0, 1)) @ PHIS]
    np.testing.assert_allclose(means, sums, rtol=1e-8)


def test_weights_by_hand_twice_the_squared_error_in_four_periods_is_a_quarter_as_likely():
    weights = np.empty(2)
    averages.likelihood_weights(np.array([1.0, 2.0]), 4, weights)
    np.testing.assert_allclose(weights, [0.8, 0.2], rtol=1e-12)


def test_fits_that_are_perfect_to_rounding_share_the_weight():
    weights = np.empty(3)
    averages.likelihood_weights(np.array([0.0, 1e-29, 1.0]), 40, weights)
    np.testing.assert_allclose(weights, [0.5, 0.5, 0.0], atol=1e-100)


def test_without_errors_to_judge_by_all_constants_weigh_the_same():
    weights = np.empty(2)
    averages.likelihood_weights(np.zeros(2), 0, weights)
    assert weights.tolist() == [0.5, 0.5]
