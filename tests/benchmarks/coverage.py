"""Coverage and width of the ranges on the open competition series, by frequency.

    python tests/benchmarks/coverage.py m3.parquet
    python tests/benchmarks/coverage.py m3.parquet --freq QUARTERLY --series 200

The series of a frequency are one portfolio: three passes on the training part, judged on the test part.
Per level: the share of test values inside over all leads, at lead 1, and at the lead that is furthest off,
with its deviation; the mean scaled interval score (width plus 2/alpha times the distance by which a value
lies outside, alpha = 1 - level; Gneiting & Raftery 2007, Journal of the American Statistical Association
102, 359-378, section 6.2), in units of MASE's scale; and the share of sums over the next 3 and 12 periods
inside their ranges, which are those of the round's table of totals.
"""

from __future__ import annotations

import argparse
from pathlib import Path

import numpy as np
import pandas as pd
from open_data_sets import (
    HORIZONS,
    LEVELS,
    SPACING,
    Array,
    Passed,
    drawn,
    pass_through,
    print_run,
    print_table,
    read_open_series,
)

from foredeck.backtests.measures import mase_scale
from foredeck.periods import FinancialYear
from foredeck.portfolio.alone import ForecastOptions
from foredeck.portfolio.applied import apply_fit
from foredeck.portfolio.totals import totals_table
from foredeck.studies import unadjusted

WINDOWS = {"next 3": 3, "next 12": 12}


def forecasts_of(passed: Passed) -> pd.DataFrame:
    """Pass 3: forecasts and limits of all series."""
    said = [apply_fit(*one)["forecasts"] for one in zip(passed.alones, passed.procedures, passed.fits, strict=True)]
    return pd.concat(said, ignore_index=True)


def limits_of(table: pd.DataFrame, level: int) -> tuple[Array, Array]:
    return table[f"lower_{level}"].to_numpy(float), table[f"upper_{level}"].to_numpy(float)


def inside(table: pd.DataFrame, level: int, actual: Array) -> Array:
    """1 where the actual lies within the limits, 0 where not."""
    lower, upper = limits_of(table, level)
    return ((actual >= lower) & (actual <= upper)).astype(float)


def interval_score(table: pd.DataFrame, level: int, actual: Array) -> Array:
    """Gneiting & Raftery (2007), equation 43."""
    lower, upper = limits_of(table, level)
    return upper - lower + 2 / (1 - level / 100) * (np.maximum(lower - actual, 0) + np.maximum(actual - upper, 0))


def sums_inside(passed: Passed, forecasts: pd.DataFrame) -> dict[tuple[str, int], float]:
    """Share of the series whose sum over a window came out inside, by window and level."""
    totals = totals_table(passed.alones, passed.procedures, passed.fits[0], passed.standardised[0],
                          unadjusted(forecasts), (), WINDOWS, FinancialYear(1))
    found = {}
    for window, span in WINDOWS.items():
        rows = totals[(totals["scope"] == "series") & (totals["window"] == window)].set_index("member")
        if len(rows):
            rows = rows.loc[[alone.series.name for alone in passed.alones]]
            actual = np.array([test[:span].sum() for test in passed.tests])
            found.update({(window, level): float(inside(rows, level, actual).mean()) for level in LEVELS})
    return found


def rows_of(passed: Passed, horizon: int) -> list[tuple[str, ...]]:
    """One row a level."""
    forecasts = forecasts_of(passed)
    actual = np.concatenate(passed.tests)
    scale = np.repeat([mase_scale(alone.raw, alone.series.season_length) for alone in passed.alones], horizon)
    sums, rows = sums_inside(passed, forecasts), []
    for level in LEVELS:
        by_lead = 100 * inside(forecasts, level, actual).reshape(-1, horizon).mean(axis=0)
        worst = int(np.argmax(np.abs(by_lead - level)))
        score = np.nanmean(interval_score(forecasts, level, actual) / scale)
        rows.append((str(level), f"{by_lead.mean():.1f}", f"{by_lead[0]:.1f}",
                     f"lead {worst + 1}: {by_lead[worst] - level:+.1f}", f"{score:.3f}",
                     *(f"{100 * sums[window, level]:.1f}" if (window, level) in sums else "-" for window in WINDOWS)))
    return rows


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("path")
    parser.add_argument("--freq", choices=["all", *HORIZONS], default="all")
    parser.add_argument("--series", type=int, help="how many are drawn of each frequency; all when not given")
    parser.add_argument("--style", choices=["blend", "single"], default="blend")
    parser.add_argument("--seed", type=int, default=1)
    asked = parser.parse_args()
    print_run("Coverage", file=Path(asked.path).name, style=asked.style, drawn=asked.series or "all", seed=asked.seed)
    for freq, series in read_open_series(asked.path).items():
        if asked.freq not in ("all", freq):
            continue
        options = ForecastOptions(horizon=HORIZONS[freq], levels=LEVELS, style=asked.style)
        passed = pass_through(drawn(series, asked.series, asked.seed), SPACING[freq], options)
        print(f"\n{freq.lower()}: {len(passed.alones)} series, {len(passed.stopped)} without a forecast")
        print_table(("level", "inside", "lead 1", "worst lead", "MSIS", *WINDOWS), rows_of(passed, HORIZONS[freq]))


if __name__ == "__main__":
    main()
