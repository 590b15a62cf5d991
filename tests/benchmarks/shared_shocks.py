"""Coverage on portfolios whose series share shocks: how far it moves from one portfolio to the next.

    python tests/benchmarks/shared_shocks.py --portfolios 40

Each portfolio holds 24 invented monthly series of 84 known and 12 held-out periods whose innovations
correlate by .4 (`open_data_sets.invented_months`). A portfolio's coverage at the 90 % level is the mean over
the last 12 origins of its backtest (procedure and ranges as they would have been given then), and over the
12 held-out periods, forecast now. The total of all 24 over the next 3 months is judged once a portfolio.
"""

from __future__ import annotations

import argparse

import numpy as np
import pandas as pd
from open_data_sets import (
    Array,
    OpenSeries,
    Passed,
    examined,
    invented_months,
    print_run,
    print_table,
)

from foredeck.periods import FinancialYear, Frequency
from foredeck.portfolio.alone import ForecastOptions
from foredeck.portfolio.applied import apply_fit
from foredeck.portfolio.fit import fit_portfolio
from foredeck.portfolio.totals import totals_table
from foredeck.studies import unadjusted

SERIES, KNOWN, AHEAD, COMMON, LEVEL, ORIGINS = 24, 84, 12, 0.4, 90, 12
OPTIONS = ForecastOptions(horizon=AHEAD, levels=(50, LEVEL))


def portfolio(number: int, seed: int) -> list[OpenSeries]:
    made = invented_months(SERIES, (seed, number), KNOWN + AHEAD, COMMON)
    return [OpenSeries(f"{number}-{at}", values[:KNOWN], values[KNOWN:]) for at, values in enumerate(made)]


def shares(passed: Passed) -> tuple[float, float, float]:
    """Share inside at past origins, in the held-out periods, and whether the total came out inside."""
    fit = passed.fits[0]
    parts = [apply_fit(alone, procedure, fit)
             for alone, procedure in zip(passed.alones, passed.procedures, strict=True)]
    forecasts, past = (pd.concat([part[name] for part in parts], ignore_index=True)
                       for name in ("forecasts", "reliability"))
    origins = sorted(past["origin"].unique())[-ORIGINS:]
    past = past[past["origin"].isin(origins) & past[f"lower_{LEVEL}"].notna()]
    by_origin = within(past, past["actual"].to_numpy()).groupby(past["origin"]).mean()
    totals = totals_table(passed.alones, passed.procedures, fit, passed.standardised[0], unadjusted(forecasts), (),
                          {"next 3": 3}, FinancialYear(1))
    total = totals[(totals["scope"] == "all") & (totals["window"] == "next 3")]
    came = np.array([sum(test[:3].sum() for test in passed.tests)])
    return (float(by_origin.mean()), float(within(forecasts, np.concatenate(passed.tests)).mean()),
            float(within(total, came).iloc[0]))


def within(table: pd.DataFrame, actual: Array) -> pd.Series[bool]:
    return (table[f"lower_{LEVEL}"] <= actual) & (table[f"upper_{LEVEL}"] >= actual)


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--portfolios", type=int, default=40)
    parser.add_argument("--seed", type=int, default=1)
    asked = parser.parse_args()
    print_run("Shared shocks", portfolios=asked.portfolios, series_each=SERIES, periods=KNOWN, held_out=AHEAD,
              correlation=COMMON, level=LEVEL, seed=asked.seed)
    each = [portfolio(number, asked.seed) for number in range(asked.portfolios)]
    # series do not know each other in pass 1: all portfolios go through it at once
    alones, tests, stopped = examined([one for series in each for one in series], Frequency.MONTHLY, OPTIONS)
    if stopped:
        raise SystemExit("; ".join(stopped))
    found = []
    for number in range(asked.portfolios):
        mine = slice(number * SERIES, (number + 1) * SERIES)
        fit, procedures, standardised = fit_portfolio(alones[mine], OPTIONS)
        found.append(shares(Passed(alones[mine], tests[mine], procedures, [fit], [standardised], [])))
    shown = 100 * np.array(found)
    rows = [(name, f"{one.mean():.1f}", f"{one.std(ddof=1):.1f}", *(f"{q:.1f}" for q in np.quantile(one, [0.1, 0.9])))
            for name, one in zip((f"last {ORIGINS} origins, mean by origin", f"{AHEAD} held-out periods"), shown.T[:2],
                                 strict=True)]
    share = shown[:, 2].mean()
    error = np.sqrt(share * (100 - share) / len(shown))
    print_table((f"inside {LEVEL}, per cent", "mean", "sd", "10th", "90th"),
                [*rows, (f"total of {SERIES}, next 3 (standard error {error:.1f})", f"{share:.1f}", "-", "-", "-")])


if __name__ == "__main__":
    main()
