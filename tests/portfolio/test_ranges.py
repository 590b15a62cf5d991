"""Multipliers of the ranges, against closed forms and against looking ahead."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from foredeck.portfolio.ranges import MIN_ORIGINS, mean_correlation, multipliers

LEVELS = (50, 80, 90)


def normal_errors(series: int = 200, offsets: int = 37, horizon: int = 3, seed: int = 1) -> np.ndarray:
    return np.random.default_rng(seed).normal(size=(series, offsets, horizon))


@pytest.mark.parametrize(("at", "level"), list(enumerate(LEVELS)))
def test_multipliers_of_many_normal_errors_are_the_normal_quantiles(at: int, level: int) -> None:
    # closed form: the two-sided quantile of the standard normal distribution
    found = multipliers(normal_errors(), LEVELS)[0, at]
    assert found == pytest.approx(np.full((2, 3), stats.norm.ppf((1 + level / 100) / 2)), abs=0.06)


def test_skewed_errors_get_unequal_sides() -> None:
    skewed = np.random.default_rng(2).exponential(size=(200, 37, 1)) - 1.0
    lower, upper = multipliers(skewed, (90,))[0, 0, :, 0]
    assert upper > 1.3 * lower > 0


def test_ranges_of_an_origin_rest_only_on_errors_known_then() -> None:
    errors = normal_errors(series=20)
    before = multipliers(errors, LEVELS)
    changed = errors.copy()
    offset = 10
    for lead in range(3):
        # an error of lead h at offset o is known o - h periods before the closing
        changed[:, : offset + lead + 1, lead] += 100.0
    after = multipliers(changed, LEVELS)
    np.testing.assert_array_equal(after[offset:], before[offset:])
    assert not np.allclose(after[0], before[0])


def test_few_origins_widen_the_range() -> None:
    # symmetric errors, so that both quantile rules agree: only the widening is left
    once = np.array([-2.0, -1.0, 1.0, 2.0])
    few = multipliers(np.concatenate([[0.0], once])[None, :, None], (90,))[0, 0, 0, 0]
    many = multipliers(np.concatenate([[0.0], np.tile(once, 100)])[None, :, None], (90,))[0, 0, 0, 0]
    # t with 4 degrees of freedom against t with 400, 95th percentiles (from printed tables): 2.132 and 1.649
    quantiles = np.quantile(once, 0.95) + np.quantile(np.abs(once), 0.9)
    quantiles_many = np.quantile(np.tile(once, 100), 0.95) + np.quantile(np.abs(np.tile(once, 100)), 0.9)
    assert few / many == pytest.approx(2.132 / 1.649 * quantiles / quantiles_many, rel=1e-3)


def test_a_first_forecast_without_any_past_error_still_gets_a_wide_range() -> None:
    nothing = np.full((1, 13, 3), np.nan)
    found = multipliers(nothing, (90,))
    # 1.2533 times the 95th percentile of t with 2 degrees of freedom (2.920), growing with the square root of the lead
    assert found[0, 0, 0] == pytest.approx(1.2533 * 2.920 * np.sqrt([1, 2, 3]), rel=1e-3)
    assert np.isnan(found[1:]).all()


def test_leads_with_too_few_origins_take_the_shorter_lead_wider() -> None:
    errors = normal_errors(series=5, offsets=MIN_ORIGINS + 3, horizon=6)
    for lead in range(6):
        errors[:, : lead + 1, lead] = np.nan
    found = multipliers(errors, (90,))[0, 0, 0]
    assert found[5] == pytest.approx(found[4] * np.sqrt(6 / 5))


def test_mean_correlation_equals_the_mean_of_the_correlation_matrix() -> None:
    rng = np.random.default_rng(4)
    rows = rng.normal(size=(6, 40)) + 0.8 * rng.normal(size=40)
    matrix = np.corrcoef(rows)
    expected = (matrix.sum() - 6) / 30
    assert mean_correlation(rows) == pytest.approx(expected, abs=1e-12)


def test_mean_correlation_of_one_row_or_of_constants_is_zero() -> None:
    assert mean_correlation(np.ones((1, 9))) == 0.0
    assert mean_correlation(np.ones((4, 9))) == 0.0
