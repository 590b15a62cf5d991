"""The fast model against a plain twin written as the formulas are."""

from __future__ import annotations

import numpy as np
import pytest

from foredeck.checks.expectation import _SEASON, _WANDER, fit, from_scale, to_scale

NOBODY = np.array([], dtype=np.intp)


def monthly(n: int, seed: int, noise: float = 0.08) -> np.ndarray:
    rng = np.random.default_rng(seed)
    t = np.arange(n)
    return (1000.0 + 5.0 * t) * (1.0 + 0.3 * np.sin(2 * np.pi * t / 12)) * np.exp(noise * rng.normal(size=n))


def plain_variance(n: int, season_length: int, candidate: int) -> np.ndarray:
    """V written out cell by cell: noise, a walk from period to period, a season that drifts year by year."""
    fixed, drift = _SEASON[candidate // len(_WANDER)]
    wander = _WANDER[candidate % len(_WANDER)]
    v = np.zeros((n, n))
    for i in range(n):
        for j in range(n):
            v[i, j] = (i == j) + wander * (min(i, j) + 1)
            if i % season_length == j % season_length:
                v[i, j] += fixed + drift * min(i // season_length, j // season_length)
    return v


@pytest.mark.parametrize("seed", range(4))
def test_a_spike_is_the_generalised_least_squares_coefficient_of_one_more_column(seed: int) -> None:
    """Aitken's estimator, written out for every period; tolerance 1e-8."""
    y = monthly(60, seed)
    model = fit(y, 12, NOBODY, NOBODY)
    assert model is not None
    inverse = np.linalg.inv(plain_variance(60, 12, model.candidate))
    z = to_scale(y / model.unit, model.scale)
    for p in range(60):
        x = np.column_stack([np.ones(60), np.arange(60.0), np.eye(60)[p], ])
        covariance = np.linalg.inv(x.T @ inverse @ x)
        beta = covariance @ x.T @ inverse @ z
        assert model.spike[p] == pytest.approx(beta[2], rel=1e-8, abs=1e-8)
        assert model.spread[p] == pytest.approx(model.sigma * np.sqrt(covariance[2, 2]), rel=1e-8)
        assert model.spike_t[p] == pytest.approx(beta[2] / model.spread[p], rel=1e-7, abs=1e-7)


def test_a_step_is_the_coefficient_of_a_column_that_jumps_to_one() -> None:
    y = monthly(48, 1)
    model = fit(y, 12, NOBODY, NOBODY)
    assert model is not None
    inverse = np.linalg.inv(plain_variance(48, 12, model.candidate))
    z = to_scale(y / model.unit, model.scale)
    for p in range(4, 45):
        x = np.column_stack([np.ones(48), np.arange(48.0), np.arange(48) >= p])
        beta = np.linalg.solve(x.T @ inverse @ x, x.T @ inverse @ z)
        assert model.step[p] == pytest.approx(beta[2], rel=1e-7, abs=1e-9)


def test_a_missing_period_is_expected_as_if_it_had_never_been_there() -> None:
    """Best linear unbiased prediction from the other 58 periods (Goldberger 1962); tolerance 1e-8."""
    y = monthly(60, 2)
    y[[20, 41]] = np.nan
    missing = np.array([20, 41])
    model = fit(y, 12, missing, NOBODY)
    assert model is not None
    there = np.setdiff1d(np.arange(60), missing)
    v = plain_variance(60, 12, model.candidate)
    inverse = np.linalg.inv(v[np.ix_(there, there)])
    x = np.column_stack([np.ones(60), np.arange(60.0)])
    z = to_scale(y[there] / model.unit, model.scale)
    beta = np.linalg.solve(x[there].T @ inverse @ x[there], x[there].T @ inverse @ z)
    predicted = x[missing] @ beta + v[np.ix_(missing, there)] @ inverse @ (z - x[there] @ beta)
    assert model.expected()[missing] == pytest.approx(from_scale(predicted, model.scale) * model.unit, rel=1e-8)


def test_a_period_left_out_is_expected_the_same_whatever_it_holds() -> None:
    y = monthly(60, 3)
    wild = y.copy()
    wild[30] = 1e6
    a, b = (fit(v, 12, np.array([30]), NOBODY) for v in (y, wild))
    assert a is not None
    assert b is not None
    assert a.expected()[30] == pytest.approx(b.expected()[30], rel=1e-10)
    assert abs(b.spike_t[30]) > 30 > abs(a.spike_t[30])


def test_a_multiplicative_season_is_taken_to_logarithms_and_counts_to_roots_or_logarithms() -> None:
    chosen = [fit(monthly(96, seed, 0.15), 12, NOBODY, NOBODY) for seed in range(10)]
    assert sum(m is not None and m.scale == "log" for m in chosen) >= 9
    rng = np.random.default_rng(5)
    counts = [fit(rng.poisson(2.0, 96).astype(float), 12, NOBODY, NOBODY) for _ in range(10)]
    assert all(m is not None and m.scale in ("raw", "root") for m in counts), "zeros have no logarithm"


@pytest.mark.parametrize("values", [np.full(30, 7.0), np.zeros(30), np.array([1.0, 2.0, 3.0, 4.0])])
def test_nothing_is_expected_of_a_constant_or_of_four_values(values: np.ndarray) -> None:
    assert fit(values, 12, NOBODY, NOBODY) is None


def test_values_below_zero_stay_on_the_raw_scale() -> None:
    values = np.random.default_rng(0).normal(size=48)
    model = fit(values, 12, NOBODY, NOBODY)
    assert model is not None
    assert model.scale == "raw"
