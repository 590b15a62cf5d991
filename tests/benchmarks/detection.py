"""How often a planted spike and a planted step are named, at their very month.

    python tests/benchmarks/detection.py

Monthly series of 84 periods with Gaussian noise (level only; season; season and trend), 300 of each.
The spike is six standard deviations of the noise, the step three, lasting; both stand in the middle half.
"""

from __future__ import annotations

import numpy as np
import pandas as pd

from foredeck.checks.findings import find
from foredeck.intake.history import SeriesHistory
from foredeck.periods import Frequency

PERIODS, SERIES = 84, 300


def plain(kind: str, rng: np.random.Generator) -> tuple[np.ndarray, float]:
    """One clean series and the standard deviation of its noise."""
    t = np.arange(PERIODS)
    share = rng.uniform(0.03, 0.08)
    season = 0.3 * np.sin(2 * np.pi * (t / 12 + rng.uniform())) if kind != "level only" else 0.0
    trend = rng.uniform(-0.05, 0.15) * t / 12 if kind == "season and trend" else 0.0
    return 1000 * (1 + season + trend + share * rng.normal(size=PERIODS)), 1000 * share


def named(values: np.ndarray, at: int, code: str) -> bool:
    index = pd.period_range("2019-11", periods=PERIODS, freq="M")
    found = find(SeriesHistory("s", Frequency.MONTHLY, index, values), index[-1], nonnegative=False)
    return bool(((found["code"] == code) & (found["period"] == str(index[at]))).any())


def main() -> None:
    for kind in ("level only", "season", "season and trend"):
        rng = np.random.default_rng(3)
        spikes = steps = 0
        for _ in range(SERIES):
            values, sd = plain(kind, rng)
            at, sign = int(rng.integers(PERIODS // 4, 3 * PERIODS // 4)), rng.choice([-1, 1])
            spike, step = values.copy(), values.copy()
            spike[at] += sign * 6 * sd
            step[at:] += sign * 3 * sd
            spikes += named(spike, at, "outlier")
            steps += named(step, at, "level_shift")
        print(f"{kind}: spike {spikes / SERIES:.2f}, step {steps / SERIES:.2f}")


if __name__ == "__main__":
    main()
