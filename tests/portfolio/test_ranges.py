"""Multipliers of the ranges, against closed forms and against looking ahead."""

from __future__ import annotations

from types import SimpleNamespace

import numpy as np
import pytest
from scipy import stats

from foredeck.portfolio.ranges import (
    HALF_LIFE,
    MIN_ORIGINS,
    mean_correlation,
    multipliers,
    scales,
    weighted_quantiles,
)
from portfolio.invented import alone_of

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


def test_few_origins_widen_the_range_and_old_origins_are_fewer_than_they_count() -> None:
    # errors of one size, so that every quantile is 1: only the widening is left
    once = np.array([-1.0, 1.0, -1.0, 1.0])
    few = multipliers(np.concatenate([[0.0], once])[None, :, None], (90,))[0, 0, 0, 0]
    many = multipliers(np.concatenate([[0.0], np.tile(once, 100)])[None, :, None], (90,))[0, 0, 0, 0]
    # Kish (1965): weights 1, r, r^2, ... count as (1 + r) / (1 - r) origins when there are many of them
    r = 0.5 ** (1 / HALF_LIFE)
    four = r ** np.arange(4)
    effective = four.sum() ** 2 / (four**2).sum()
    assert effective < 4
    assert few == pytest.approx(stats.t.ppf(0.95, effective) / stats.norm.ppf(0.95), rel=1e-9)
    assert many == pytest.approx(stats.t.ppf(0.95, (1 + r) / (1 - r)) / stats.norm.ppf(0.95), rel=1e-9)


def test_weighted_quantiles_are_those_of_numpy_when_all_count_the_same_and_of_repeats_when_some_count_double() -> None:
    values = np.random.default_rng(7).normal(size=31)
    shares = np.array([0.0, 0.05, 0.25, 0.5, 0.9, 1.0])
    np.testing.assert_allclose(weighted_quantiles(values, np.full(31, 3.0), shares), np.quantile(values, shares))
    heavy = np.array([1.0, 2.0, 3.0])
    # a value that counts a thousand times as much as the others holds nearly the whole span
    assert weighted_quantiles(heavy, np.array([1.0, 1000.0, 1.0]), np.array([0.5]))[0] == pytest.approx(2.5, abs=0.01)


def test_recent_errors_count_more_than_old_ones() -> None:
    errors = np.concatenate([[0.0], np.tile([1.0, -1.0], 12), np.tile([9.0, -9.0], 12)])[None, :, None]
    recent_small = multipliers(errors, (50,))[0, 0, 0, 0]
    recent_large = multipliers(np.concatenate([[0.0], errors[0, :0:-1, 0]])[None, :, None], (50,))[0, 0, 0, 0]
    assert recent_small < 2 < 8 < recent_large


def error_sizes(alone: object, disagreement: float) -> np.ndarray:
    procedure = SimpleNamespace(
        own_error=np.full(21, 1.0), own_count=np.full(21, 20), forecasts=np.full((21, 3), 100.0),
        level=np.full(21, 100.0), disagreement=np.full((21, 3), disagreement))
    return scales(alone, procedure, nonnegative=True)  # type: ignore[arg-type]


def test_the_scale_grows_with_the_disagreement_of_the_methods_by_its_fifth_root() -> None:
    alone = alone_of(1, horizon=3)
    np.testing.assert_allclose(error_sizes(alone, 3.2) / error_sizes(alone, 0.1), 32.0 ** (1 / 5))


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
