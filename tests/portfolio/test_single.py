"""The single choice: shrunken toward the portfolio, and steady."""

from __future__ import annotations

import numpy as np

from foredeck.portfolio.single import MATERIAL, REPEATED, SHRINK, choices, expected_errors

POOL = np.ones((8, 2), dtype=bool)
EVEN = np.zeros((8, 2))


def own(second_less: list[float]) -> np.ndarray:
    """Own errors of two methods at eight origins, the second's smaller by a logarithm that outweighs the shrinkage."""
    return np.exp(-np.outer(np.array(second_less) * (1 + SHRINK), [0.0, 1.0]))


def test_own_errors_count_once_against_the_portfolio_s_standing() -> None:
    standing = np.array([[0.1, -0.1]])
    found = expected_errors(np.array([[1.0, 1.0]]), standing, np.ones((1, 2), dtype=bool))
    # equal own errors: only the portfolio tells the two apart, by SHRINK / (1 + SHRINK) of its difference
    np.testing.assert_allclose(found[0, 0] - found[0, 1], 0.2 * SHRINK / (1 + SHRINK))


def test_a_lucky_series_follows_the_portfolio() -> None:
    standing = np.tile([0.0, 0.1], (8, 1))
    lucky = np.tile([1.0, 0.7], (8, 1))  # less than the portfolio's standing undoes
    assert np.log(0.7) + SHRINK * 0.1 > 0
    assert choices(lucky, standing, POOL).tolist() == [0] * 8


def test_a_rival_takes_over_only_after_being_materially_better_at_several_origins_running() -> None:
    better = 2 * MATERIAL
    found = choices(own([-better, -better, better, better, better, better, better, better]), EVEN, POOL)
    assert REPEATED == 3
    assert found.tolist() == [0, 0, 0, 0, 1, 1, 1, 1]


def test_a_trifle_or_a_single_good_month_changes_nothing() -> None:
    trifle = choices(own([-0.1] + [MATERIAL / 2] * 7), EVEN, POOL)
    flicker = choices(own([-0.1, 0.1, 0.1, -0.1, 0.1, 0.1, -0.1, 0.1]), EVEN, POOL)
    assert trifle.tolist() == flicker.tolist() == [0] * 8


def test_a_method_that_left_the_pool_is_replaced_at_once() -> None:
    pool = POOL.copy()
    pool[5:, 0] = False
    assert choices(own([-0.1] * 8), EVEN, pool).tolist() == [0] * 5 + [1] * 3


def test_before_any_error_is_known_the_portfolio_decides_and_an_empty_pool_gives_none() -> None:
    nothing = np.full((2, 2), np.nan)
    standing = np.array([[0.05, -0.05], [0.05, -0.05]])
    pool = np.array([[True, True], [False, False]])
    assert choices(nothing, standing, pool).tolist() == [1, -1]
