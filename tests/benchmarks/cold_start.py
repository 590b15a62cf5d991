"""How long the first forecast takes: with nothing compiled yet, and with the compiled code kept on disk.

    python tests/benchmarks/cold_start.py

Each run is a fresh interpreter that imports foredeck, fits one method (damped trend) to a monthly series of
84 periods, and then examines the whole series (pass 1: every usual method). The cold run begins with an
empty folder for compiled code, the cached one finds what the cold one has kept. Medians of 3.
"""

from __future__ import annotations

import argparse
import json
import os
import statistics
import subprocess
import sys
import tempfile

from open_data_sets import print_run, print_table

STEPS = ("import", "first fit", "first series examined")
PROGRAM = """
import json, time
began = time.perf_counter()
import numpy as np, pandas as pd
from foredeck.intake.history import SeriesHistory
from foredeck.periods import Frequency
from foredeck.portfolio.alone import ForecastOptions, examine
from foredeck.smoothing.catalogue import fit
seconds = [time.perf_counter() - began]
t = np.arange(84)
values = 1000 + 3 * t + 200 * np.sin(t * np.pi / 6) + np.random.default_rng(1).normal(size=84) * 60
began = time.perf_counter()
fit("damped_holt", values, 12).forecast(12)
seconds.append(time.perf_counter() - began)
began = time.perf_counter()
periods = pd.period_range(end=pd.Period("2020-12", freq="M"), periods=84, freq="M")
examine(SeriesHistory("series", Frequency.MONTHLY, periods, values), periods[-1], ForecastOptions())
seconds.append(time.perf_counter() - began)
print(json.dumps(seconds))
"""


def seconds(folder: str) -> list[float]:
    """Seconds of each step in a fresh interpreter that keeps its compiled code in a folder."""
    done = subprocess.run([sys.executable, "-c", PROGRAM], check=True, capture_output=True, text=True,
                          env={**os.environ, "NUMBA_CACHE_DIR": folder})
    return [float(step) for step in json.loads(done.stdout)]


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--runs", type=int, default=3)
    asked = parser.parse_args()
    print_run("Cold start", runs=asked.runs, seed=1)
    cold, cached = [], []
    for _ in range(asked.runs):
        with tempfile.TemporaryDirectory() as folder:
            cold.append(seconds(folder))
            cached.append(seconds(folder))
    rows = []
    for name, runs in (("nothing compiled", cold), ("compiled code kept", cached)):
        rows.append((name, *(f"{statistics.median(step):.2f} s" for step in zip(*runs, strict=True)),
                     f"{statistics.median(map(sum, runs)):.2f} s"))
    print_table(("", *STEPS, "together"), rows)


if __name__ == "__main__":
    main()
