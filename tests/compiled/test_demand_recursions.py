"""The compiled demand-rate recursions against their plain twins, and against sums done by hand."""

from __future__ import annotations

import numpy as np
import pytest

from foredeck.compiled.recursions import croston, tsb
from references import plain_smoothing as plain


@pytest.fixture
def demand():
    rng = np.random.default_rng(4)
    return np.where(rng.random(60) < 0.3, rng.gamma(4, 2.5, 60), 0.0)


@pytest.mark.parametrize("factor", [1.0, 0.9])
def test_croston_equals_its_plain_twin_to_1e_12(demand, factor):
    forecasts, size, gap = plain.croston(demand, 0.2, factor)
    state, one_step = np.empty(2), np.empty(60)
    total = croston(demand, 0.2, factor, state, one_step)
    np.testing.assert_allclose(one_step, forecasts, rtol=1e-12)
    np.testing.assert_allclose(state, [size, gap], rtol=1e-12)
    assert total == pytest.approx(np.nansum((demand - forecasts) ** 2), rel=1e-12)


def test_tsb_equals_its_plain_twin_to_1e_12(demand):
    forecasts, size, chance = plain.tsb(demand, 0.2, 0.1, 8.0, 0.4)
    state, one_step = np.array([8.0, 0.4]), np.empty(60)
    total = tsb(demand, 0.2, 0.1, state, one_step)
    np.testing.assert_allclose(one_step, forecasts, rtol=1e-12)
    np.testing.assert_allclose(state, [size, chance], rtol=1e-12)
    assert total == pytest.approx(np.sum((demand - forecasts) ** 2), rel=1e-12)


def test_croston_by_hand_size_and_gap_3_then_2_5_and_2_5():
    state, one_step = np.empty(2), np.empty(5)
    croston(np.array([0, 0, 3.0, 0, 2]), 0.5, 1.0, state, one_step)
    np.testing.assert_allclose(one_step, [np.nan, np.nan, np.nan, 1, 1])
    np.testing.assert_allclose(state, [2.5, 2.5])


def test_tsb_by_hand_chance_of_a_half_to_three_eighths_to_seventeen_thirty_seconds():
    state, one_step = np.array([2.0, 0.5]), np.empty(2)
    tsb(np.array([0.0, 4.0]), 0.5, 0.25, state, one_step)
    np.testing.assert_allclose(one_step, [1.0, 0.75])
    np.testing.assert_allclose(state, [3.0, 17 / 32])


def test_a_series_without_demand_has_no_size_and_no_gap():
    state, one_step = np.empty(2), np.empty(4)
    assert croston(np.zeros(4), 0.2, 1.0, state, one_step) == 0.0
    assert np.isnan(one_step).all()
    assert state.tolist() == [0.0, 0.0]
