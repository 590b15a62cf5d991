"""Accuracy of the forecasts on the open competition series, by frequency and over all.

    python tests/benchmarks/accuracy.py m3.parquet
    python tests/benchmarks/accuracy.py m3.parquet --shift --style single
    python tests/benchmarks/accuracy.py m3.parquet --freq MONTHLY --series 100 --alone

The series of a frequency are one portfolio; with `--alone` each is a portfolio of its own. With
`--shift` the last H training values are judged (H = 6, 8, 18, 8 for yearly, quarterly, monthly, other)
and what precedes them is learned from; series with under two seasons and one period left, or under nine
periods, are left out. sMAPE and MASE are means over leads, then over series; the scale
of MASE comes from what was learned from. Below the procedure, from the same pass: the plain mean of its
five members, and each usual method alone (over the series for which it can be had).
"""

from __future__ import annotations

import argparse
import time
from collections.abc import Callable
from functools import partial
from pathlib import Path

import numpy as np
from open_data_sets import (
    HORIZONS,
    SPACING,
    Array,
    Passed,
    drawn,
    equal_forecast,
    member_forecast,
    misses,
    pass_through,
    print_run,
    print_table,
    read_open_series,
    shifted,
)

from foredeck.portfolio.alone import Alone, ForecastOptions
from foredeck.smoothing.catalogue import usual_methods


def judged(passed: Passed, said: Callable[[Alone], Array]) -> Array:
    """sMAPE and MASE, shape (series, 2), of the series for which `said` has a forecast."""
    forecasts = [(alone, said(alone), test) for alone, test in zip(passed.alones, passed.tests, strict=True)]
    return np.array([misses(*one) for one in forecasts if np.isfinite(one[1]).all()]).reshape(-1, 2)


def lines_of(passed: Passed, style: str, season_length: int) -> dict[str, Array]:
    """Figures of the procedure, the equal weights, and each usual method alone."""
    now = {id(alone): procedure.forecasts[-1]
           for alone, procedure in zip(passed.alones, passed.procedures, strict=True)}
    found = {f"procedure ({style})": judged(passed, lambda alone: now[id(alone)]),
             "equal weights of five": judged(passed, equal_forecast)}
    for name in usual_methods(season_length):
        found[name] = judged(passed, partial(member_forecast, name=name))
    return found


def print_lines(title: str, lines: dict[str, Array], note: str = "") -> None:
    print(f"\n{title}{note}")
    # a scale of zero leaves a series without a MASE
    print_table(("", "series", "sMAPE", "MASE"),
                [(name, len(rows), f"{rows[:, 0].mean():.3f}", f"{np.nanmean(rows[:, 1]):.4f}")
                 for name, rows in lines.items() if len(rows)])


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("path")
    parser.add_argument("--freq", choices=["all", *HORIZONS], default="all")
    parser.add_argument("--series", type=int, help="how many are drawn of each frequency; all when not given")
    parser.add_argument("--style", choices=["blend", "single"], default="blend")
    parser.add_argument("--shift", action="store_true")
    parser.add_argument("--alone", action="store_true")
    parser.add_argument("--seed", type=int, default=1)
    asked = parser.parse_args()
    print_run("Accuracy", file=Path(asked.path).name, style=asked.style, shifted=asked.shift, each_alone=asked.alone,
              drawn=asked.series or "all", seed=asked.seed)
    whole: dict[str, list[Array]] = {}
    for freq, series in read_open_series(asked.path).items():
        if asked.freq not in ("all", freq):
            continue
        began, chosen, left_out = time.perf_counter(), drawn(series, asked.series, asked.seed), 0
        if asked.shift:
            left_out, chosen = len(chosen), shifted(chosen, freq)
            left_out -= len(chosen)
        options = ForecastOptions(horizon=HORIZONS[freq], style=asked.style)
        passed = pass_through(chosen, SPACING[freq], options, each_alone=asked.alone)
        lines = lines_of(passed, asked.style, SPACING[freq].season_length)
        for name, rows in lines.items():
            whole.setdefault(name, []).append(rows)
        print_lines(freq.lower(), lines, f": {len(chosen)} series, {left_out} left out as too short, "
                    f"{len(passed.stopped)} without a forecast, {time.perf_counter() - began:.0f} s")
        for line in passed.stopped:
            print(f"  {line}")
    if asked.freq == "all":
        print_lines("all series", {name: np.concatenate(rows) for name, rows in whole.items()})


if __name__ == "__main__":
    main()
