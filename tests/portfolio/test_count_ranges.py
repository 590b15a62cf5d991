"""Ranges of intermittent series, against closed forms and by coverage over an invented portfolio."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
from scipy import stats

from foredeck.intake.history import SeriesHistory
from foredeck.periods import FinancialYear, Frequency
from foredeck.portfolio import count_ranges
from foredeck.portfolio.alone import ForecastOptions, examine
from foredeck.portfolio.applied import apply_fit
from foredeck.portfolio.count_ranges import (
    CELLS,
    LONE_VARIATION,
    WILD,
    Demand,
    demand_of,
    intermittent_at,
    number_of_demands,
    sum_distribution,
    sum_limits,
)
from foredeck.portfolio.fit import fit_portfolio
from foredeck.portfolio.ranges import multipliers, of_ordinary_series
from foredeck.portfolio.totals import totals_table
from foredeck.smoothing.demand_rate import fit_croston, fit_tsb
from foredeck.studies import unadjusted

LEVELS = (50, 80, 90, 95)
SPANS = (1, 3, 12)
SHARES = np.array([[(1 - level / 100) / 2, (1 + level / 100) / 2] for level in LEVELS])


def every(size: float, gap: int, periods: int = 60) -> np.ndarray:
    values = np.zeros(periods)
    values[gap - 1::gap] = size
    return values


def invented(seed: int, periods: int, drift: float = 0.0) -> np.ndarray:
    """Demand by chance, with sizes of one, or Poisson, geometric or lognormal ones."""
    rng = np.random.default_rng([7, seed])
    chance = np.clip(rng.uniform(0.1, 0.7) * np.exp(np.cumsum(rng.normal(0, drift, periods))), 0.03, 0.8)
    sizes = (np.ones(periods), 1.0 + rng.poisson(rng.uniform(1, 6), periods), 1.0 + rng.geometric(0.1, periods),
             1.0 + np.round(rng.lognormal(4, 0.9, periods)))[seed % 4]
    return np.where(rng.random(periods) < chance, sizes, 0.0)


def history(values: np.ndarray, name: str = "one") -> SeriesHistory:
    periods = pd.period_range(end="2026-10", periods=len(values), freq="M")
    return SeriesHistory(name=name, frequency=Frequency.MONTHLY, periods=periods, values=values)


# -- closed forms --


@pytest.mark.parametrize("periods", [1, 3, 12, 52])
def test_with_one_size_and_a_chance_that_is_known_limits_are_those_of_the_binomial_distribution(
        periods: int, monkeypatch: pytest.MonkeyPatch) -> None:
    # closed form: the number of demands in so many periods is binomial; a million periods leave no doubt of the chance
    monkeypatch.setattr(count_ranges, "MEMORY", 1e6)
    known = Demand(n=1_000_000, sizes=np.full(30, 5.0), whole=True)
    found = sum_limits(known, 0.31 * 5.0 * periods, periods, LEVELS)
    np.testing.assert_array_equal(found, 5.0 * stats.binom.ppf(SHARES, periods, 0.31))


def test_with_one_size_limits_are_those_of_the_beta_binomial_distribution() -> None:
    known = demand_of(every(5.0, 4, periods=16))
    a, b = 0.25 * 17, 0.75 * 17  # 16 periods seen, and one of Jeffreys' prior
    np.testing.assert_array_equal(sum_limits(known, 0.25 * 5.0 * 12, 12, LEVELS),
                                  5.0 * stats.betabinom.ppf(SHARES, 12, a, b))


def test_numbers_of_demands_are_beta_binomial() -> None:
    np.testing.assert_allclose(number_of_demands(0.3, 20.0, 12),
                               stats.betabinom.pmf(np.arange(13), 12, 0.3 * 21, 0.7 * 21), atol=1e-13)


def test_the_sum_of_two_periods_is_the_convolution_written_out() -> None:
    # ten equal sizes leave nothing to spread: 0, 1 or 2 demands of 3
    chances, step = sum_distribution(demand_of(every(3.0, 2, periods=20)), 3.0, 2)
    none, one, two = number_of_demands(0.5, 20.0, 2)
    assert step == 1.0
    np.testing.assert_allclose(chances, [none, 0, 0, one, 0, 0, two, *np.zeros(len(chances) - 7)], atol=1e-15)


@pytest.mark.parametrize("periods", [1, 3, 12])
@pytest.mark.parametrize("share", [0.2, 1.0, 3.0, 30.0])
@pytest.mark.parametrize("seed", range(4))
def test_the_mean_is_the_forecast_even_where_sizes_must_grow_to_reach_it(seed: int, share: float, periods: int) -> None:
    values = invented(seed, 80)
    expected = share * values.mean() * periods
    chances, step = sum_distribution(demand_of(values), expected, periods)
    assert chances.sum() == pytest.approx(1.0, abs=1e-12)
    assert step * (np.arange(len(chances)) @ chances) == pytest.approx(expected, rel=1e-9)


def test_a_new_size_varies_by_what_was_seen_and_by_what_is_not_known_of_its_mean() -> None:
    # s^2 (1 + 1/d) for small variation, where logarithms change nothing; the chance is as near to 1 as it may be
    sizes = 1000.0 + 40.0 * np.random.default_rng(3).normal(size=16)
    known = Demand(n=16, sizes=sizes, whole=False)
    chances, step = sum_distribution(known, 1.0, 1)
    values, chances = step * np.arange(1, len(chances)), chances[1:] / chances[1:].sum()
    mean = values @ chances
    assert mean == pytest.approx(sizes.mean(), rel=1e-3)
    assert (values - mean) ** 2 @ chances == pytest.approx(sizes.var(ddof=1) * (1 + 1 / 16), rel=0.02)


# -- what limits are like --


def test_each_level_is_at_least_reached_and_no_smaller_limit_would_do() -> None:
    known = demand_of(invented(2, 90))
    chances, step = sum_distribution(known, 20.0, 3)
    reached = np.cumsum(chances)
    at = np.round(sum_limits(known, 20.0, 3, LEVELS) / step).astype(int)
    assert (reached[at] >= SHARES - 1e-9).all()
    assert (reached[at[:, 1] - 1] < SHARES[:, 1]).all()


def test_limits_are_whole_and_nested_and_not_below_zero_and_the_same_each_time() -> None:
    for seed in range(12):
        values = invented(seed, 60)
        for periods in (1, 3, 12):
            found = sum_limits(demand_of(values), values.mean() * periods, periods, LEVELS)
            np.testing.assert_array_equal(found, np.round(found))
            assert (found[:, 0] >= 0).all()
            assert (np.diff(found[:, 0]) <= 0).all()
            assert (np.diff(found[:, 1]) >= 0).all()
            np.testing.assert_array_equal(
                found, sum_limits(demand_of(values.copy()), values.mean() * periods, periods, LEVELS))


def test_sizes_that_are_not_whole_scale_with_their_unit() -> None:
    values = invented(3, 80) * 0.37
    whole = sum_limits(demand_of(values), 3 * values.mean(), 3, LEVELS)
    np.testing.assert_allclose(sum_limits(demand_of(values / 64), 3 * values.mean() / 64, 3, LEVELS), whole / 64)


def test_a_short_history_makes_wider_ranges_than_a_long_one_of_the_same_demand() -> None:
    block = np.array([0.0, 3.0, 0.0, 0.0, 5.0, 0.0, 9.0, 0.0])
    few, many = (np.ptp(sum_limits(demand_of(np.tile(block, n)), 12 * block.mean(), 12, LEVELS), axis=1)
                 for n in (1, 12))
    assert (few > 1.15 * many).all()


def test_one_size_seen_says_nothing_of_how_sizes_vary_and_is_spread() -> None:
    lone = demand_of(np.array([0.0, 0.0, 40.0, 0.0, 0.0]))
    assert lone.variation == LONE_VARIATION**2
    assert sum_limits(lone, 30.0, 1, (90,))[0, 1] > 40.0


def test_where_there_never_was_a_demand_or_none_is_forecast_nothing_is_expected() -> None:
    np.testing.assert_array_equal(sum_limits(demand_of(np.zeros(9)), 0.0, 3, LEVELS), 0.0)
    np.testing.assert_array_equal(sum_limits(demand_of(every(2.0, 3)), 0.0, 3, LEVELS), 0.0)


def test_missing_and_impossible_values_and_sizes_of_another_unit_are_left_out() -> None:
    values = every(2.0, 3)
    marred = np.concatenate([[np.nan, -4.0], values, [np.nan]])
    assert demand_of(marred).n == len(values)
    np.testing.assert_array_equal(demand_of(marred).sizes, demand_of(values).sizes)
    values[5] *= 1.01 * WILD
    assert demand_of(values).sizes.max() == 2.0


def test_large_sizes_are_binned_and_stay_whole_and_close() -> None:
    small = invented(1, 80)
    large = demand_of(small * 12_345.0)
    chances, step = sum_distribution(large, 52 * 12_345.0 * small.mean(), 52)
    assert len(chances) <= CELLS + 2 * 52
    assert step == round(step) > 1
    fine = sum_limits(demand_of(small), 52 * small.mean(), 52, LEVELS)
    found = sum_limits(large, 52 * 12_345.0 * small.mean(), 52, LEVELS)
    np.testing.assert_array_equal(found, np.round(found))
    np.testing.assert_allclose(found / 12_345.0, fine, rtol=0.03, atol=1.0)


# -- coverage --


def covered(drift: float, count: int = 600) -> tuple[np.ndarray, np.ndarray]:
    """Share of sums to come inside their limits, and the share that the distributions themselves hold.

    Both of shape (sums over 1, 3 and 12 periods, levels).
    """
    inside, held = [], []
    for seed in range(count):
        values = invented(seed, (60, 84, 120)[seed % 3], drift)
        past, ahead = values[:-12], values[-12:]
        if not past.any() or not intermittent_at(past, [len(past)], nonnegative=True)[0]:
            continue
        rate = float(np.mean([fit_croston(past, 12).forecast(1), fit_croston(past, 12, corrected=True).forecast(1),
                              fit_tsb(past, 12, {"alpha": 0.1, "beta": 0.1}).forecast(1)]))
        for periods in SPANS:
            limits = sum_limits(demand_of(past), rate * periods, periods, LEVELS)
            chances, step = sum_distribution(demand_of(past), rate * periods, periods)
            at = np.round(limits / step).astype(int)
            reached = np.concatenate([[0.0], np.cumsum(chances)])
            came = ahead[:periods].sum()
            inside.append((limits[:, 0] <= came) & (came <= limits[:, 1]))
            held.append(reached[at[:, 1] + 1] - reached[at[:, 0]])
    inside_of, held_of = (np.reshape(each, (-1, len(SPANS), len(LEVELS))) for each in (inside, held))
    return inside_of.mean(axis=0), held_of.mean(axis=0)


@pytest.mark.parametrize("drift", [0.0, 0.06])
def test_coverage_is_at_least_nominal_and_no_more_than_discreteness_explains(drift: float) -> None:
    # 600 series: a share of one half is known to .02 (one standard error), of nine tenths to .012
    inside, held = covered(drift)
    nominal = np.array(LEVELS) / 100
    error = np.sqrt(nominal * (1 - nominal) / 600)
    assert (inside >= nominal - 2 * error).all()
    assert (inside <= held + 2 * error).all()


# -- in a portfolio --

OPTIONS = ForecastOptions(horizon=4, levels=LEVELS)


def ordinary(seed: int, periods: int = 60) -> np.ndarray:
    return np.round(200 + 10 * np.random.default_rng(seed).normal(size=periods))


@pytest.fixture(scope="module")
def mixed() -> list[SeriesHistory]:
    return [history(invented(1, 60), "rare"), *(history(ordinary(seed), f"often {seed}") for seed in range(4))]


def test_at_each_origin_limits_are_those_of_what_was_known_then(mixed: list[SeriesHistory]) -> None:
    alone = examine(mixed[0], mixed[0].periods[-1], OPTIONS)
    fit, (procedure,), _ = fit_portfolio([alone], OPTIONS)
    said = apply_fit(alone, procedure, fit)["reliability"]
    names = [str(p) for p in alone.periods]
    assert len(said) > 50
    for row in said.iloc[::7].to_dict("records"):
        known = demand_of(alone.raw[:names.index(row["origin"]) + 1])
        limits = sum_limits(known, row["forecast"], 1, LEVELS)
        assert [[row[f"lower_{k}"], row[f"upper_{k}"]] for k in LEVELS] == limits.tolist()


def test_ordinary_series_get_the_ranges_that_they_get_without_intermittent_ones(mixed: list[SeriesHistory]) -> None:
    alones = [examine(one, one.periods[-1], OPTIONS) for one in mixed]
    fit, _, standardised = fit_portfolio(alones, OPTIONS)
    assert np.isfinite(standardised[0]).any()
    np.testing.assert_array_equal(fit.multipliers, multipliers(standardised[1:], LEVELS))


def test_a_portfolio_of_intermittent_series_alone_still_has_multipliers() -> None:
    errors = np.random.default_rng(1).normal(size=(3, 20, 2))
    np.testing.assert_array_equal(of_ordinary_series(errors, np.ones((3, 20), dtype=bool)), errors)
    some = np.zeros((3, 20), dtype=bool)
    some[1, 4] = True
    assert np.isnan(of_ordinary_series(errors, some)).sum() == 2


def test_the_total_of_an_intermittent_series_has_the_limits_of_its_sum_moved_by_what_is_known_and_adjusted(
        mixed: list[SeriesHistory]) -> None:
    alones = [examine(one, one.periods[-1], OPTIONS) for one in mixed]
    fit, procedures, standardised = fit_portfolio(alones, OPTIONS)
    parts = [apply_fit(a, p, fit)["forecasts"] for a, p in zip(alones, procedures, strict=True)]
    adjusted = unadjusted(pd.concat(parts, ignore_index=True))
    rare = adjusted["series"] == "rare"
    expected = float(adjusted.loc[rare & (adjusted["lead"] <= 2), "baseline"].sum())
    adjusted.loc[rare & (adjusted["lead"] == 2), "adjusted"] += 6.0
    # of the year from March eight months are known and four are to come
    totals = totals_table(alones, procedures, fit, standardised, adjusted, (), {"next 2": 2}, FinancialYear(3))
    rows = totals[(totals["scope"] == "series") & (totals["member"] == "rare")].set_index("window")
    limits = 6.0 + sum_limits(demand_of(mixed[0].values), expected, 2, LEVELS)
    for side, name in enumerate(("lower", "upper")):
        assert [rows[f"{name}_{k}"]["next 2"] for k in LEVELS] == pytest.approx(limits[:, side])
    done = mixed[0].values[-8:].sum()
    year = sum_limits(demand_of(mixed[0].values), 2 * expected, 4, LEVELS)
    assert rows.loc["year", "upper_90"] == pytest.approx(done + 6.0 + year[2, 1])
    assert rows.loc["year", "lower_90"] >= done


def test_where_values_may_fall_below_zero_no_series_is_ranged_by_counts() -> None:
    assert not intermittent_at(every(2.0, 3), [30, 60], nonnegative=False).any()
    assert intermittent_at(every(2.0, 3), [30, 60], nonnegative=True).all()
