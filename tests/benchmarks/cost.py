"""Seconds and memory of the three passes, by number of series and of processes.

    python tests/benchmarks/cost.py
    python tests/benchmarks/cost.py --series 100 1000

Invented monthly series of about 84 periods (`open_data_sets.invented_months`), 12 months ahead, levels 50 and
90, everything kept as a round keeps it: pass 1 (`examine_each`), pass 2 (`fit_portfolio`), pass 3 (`apply_fit`
of every series) and the table of totals. Each case runs in a process of its own, with all code compiled and
loaded before; with two processes pass 1 holds the seconds in which they start. Memory is the highest resident
size so far, of that process and of its largest worker. The first table is one process:
members at 12 origins and nothing else, the whole of pass 1, and whether memory grows with series whose
results are dropped (resident size after 100 and after 1,000).
"""

from __future__ import annotations

import argparse
import json
import resource
import subprocess
import sys
import time
from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pandas as pd
from open_data_sets import OpenSeries, histories, invented_months, print_run, print_table

from foredeck.backtests.error_table import build_cube
from foredeck.intake.history import SeriesHistory
from foredeck.periods import FinancialYear, Frequency
from foredeck.portfolio.alone import Alone, ForecastOptions
from foredeck.portfolio.applied import apply_fit
from foredeck.portfolio.fit import fit_portfolio
from foredeck.portfolio.spread import examine_each
from foredeck.portfolio.totals import totals_table
from foredeck.smoothing.catalogue import METHODS, usual_methods
from foredeck.studies import unadjusted

HORIZON, ORIGINS, DROPPED = 12, 12, (100, 1000)
OPTIONS = ForecastOptions(horizon=HORIZON)


def invented(count: int, seed: int) -> tuple[list[SeriesHistory], pd.Period]:
    """Series of 72 to 96 periods, 84 in the mean."""
    lengths = np.random.default_rng(seed).integers(72, 97, count)
    made = [invented_months(1, (seed, at), int(length))[0] for at, length in enumerate(lengths)]
    return histories([OpenSeries(f"series {at}", values, values[:0]) for at, values in enumerate(made)],
                     Frequency.MONTHLY)


def megabytes(who: int) -> float:
    """Highest resident size so far; kilobytes on Linux."""
    return resource.getrusage(who).ru_maxrss / 1024


def resident() -> float:
    """Resident size now, in megabytes."""
    pages = int(Path("/proc/self/statm").read_text().split()[1])
    return pages * resource.getpagesize() / 2**20


def warm(series: list[SeriesHistory], closing: pd.Period) -> None:
    """Load the compiled code before anything is timed."""
    list(examine_each(series[:2], closing, OPTIONS, 1))


def one_process(count: int, seed: int) -> dict[str, float]:
    """Members at 12 origins alone, pass 1, and memory with dropped results."""
    series, closing = invented(max(count, DROPPED[-1]), seed)
    warm(series, closing)
    methods = [name for name in usual_methods(12) if METHODS[name].family != "demand rate"]
    began = time.perf_counter()
    for one in series[:count]:
        n = len(one.values)
        build_cube(one.values, 12, HORIZON, methods, np.arange(n - ORIGINS, n), lambda seen: seen, lambda *_: True)
    members = time.perf_counter() - began
    began, found = time.perf_counter(), {}
    for done, _ in enumerate(examine_each(series[:DROPPED[-1]], closing, OPTIONS, 1), start=1):
        if done == count:
            found["pass 1"] = 1000 * (time.perf_counter() - began) / count
        if done in DROPPED:
            found[f"after {done}"] = resident()
    return {"members": 1000 * members / count, **found}


def passes(count: int, workers: int, seed: int) -> dict[str, float]:
    """Seconds and memory of the passes over one portfolio."""
    series, closing = invented(count, seed)
    warm(series, closing)
    found: dict[str, float] = {}
    stages = _stages(series, closing, workers)
    while True:
        began = time.perf_counter()
        stage = next(stages, None)
        if stage is None:
            return found
        found[f"{stage} seconds"] = time.perf_counter() - began
        found[f"{stage} memory"] = megabytes(resource.RUSAGE_SELF)
        found["worker memory"] = megabytes(resource.RUSAGE_CHILDREN)


def _stages(series: list[SeriesHistory], closing: pd.Period, workers: int) -> Iterator[str]:
    """Yield a pass's name when it is done."""
    alones = [found for found in examine_each(series, closing, OPTIONS, workers) if isinstance(found, Alone)]
    if len(alones) < len(series):
        raise SystemExit(f"{len(series) - len(alones)} series stopped")
    yield "pass 1"
    fit, procedures, standardised = fit_portfolio(alones, OPTIONS)
    yield "pass 2"
    parts = [apply_fit(alone, procedure, fit) for alone, procedure in zip(alones, procedures, strict=True)]
    yield "pass 3"
    forecasts = pd.concat([part["forecasts"] for part in parts], ignore_index=True)
    totals_table(alones, procedures, fit, standardised, unadjusted(forecasts), (), {"next 3": 3}, FinancialYear(1))
    yield "totals"


def apart(*case: object) -> dict[str, float]:
    """Run one case in a process of its own."""
    done = subprocess.run([sys.executable, __file__, "--case", *map(str, case)], check=True, capture_output=True,
                          text=True)
    return {name: float(value) for name, value in json.loads(done.stdout).items()}


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--series", type=int, nargs="+", default=[100, 1000, 10000])
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--case", type=int, nargs="+", help=argparse.SUPPRESS)
    asked = parser.parse_args()
    if asked.case:
        print(json.dumps(one_process(*asked.case) if len(asked.case) == 2 else passes(*asked.case)))
        return
    print_run("Cost of the passes", series=asked.series, seed=asked.seed, origins_of_members=ORIGINS, horizon=HORIZON)
    apart(2, 1, asked.seed)  # whatever has to be compiled is compiled here
    lone = apart(DROPPED[0], asked.seed)
    print("\none process, a series")
    print_table(("members, 12 origins", "pass 1", *(f"resident after {n:,}" for n in DROPPED)),
                [(f"{lone['members']:.1f} ms", f"{lone['pass 1']:.1f} ms",
                  *(f"{lone[f'after {n}']:.0f} MB" for n in DROPPED))])
    stages, rows = ("pass 1", "pass 2", "pass 3", "totals"), []
    for count in asked.series:
        for workers in (1, 2):
            case = apart(count, workers, asked.seed)
            rows.append((f"{count:,}", workers, *(f"{case[f'{stage} seconds']:.1f}" for stage in stages),
                         *(f"{case[f'{stage} memory']:.0f}" for stage in stages), f"{case['worker memory']:.0f}"))
    print("\nseconds, and highest resident size in megabytes by the end of each")
    print_table(("series", "processes", *(f"{stage}, s" for stage in stages), *(f"{stage}, MB" for stage in stages),
                 "worker, MB"), rows)


if __name__ == "__main__":
    main()
