"""Simulates the limits in foredeck/checks/limits.py and prints them.

    PYTHONPATH=toolkit:tests python tests/benchmarks/simulate_limits.py [series per kind]

Clean series of every kind are measured exactly as the checks measure them. The spike limit is
the size that SPIKES periods in 1,000 go beyond; the step limit the size that STEPS jumps per
1,000 periods go beyond. Together they are a fifth of the one query in 1,000 periods that is
allowed, because the noise of real series has longer tails than these. The strengths are what a
decomposition of noise alone stays under in 19 of 20 series.
"""

from __future__ import annotations

import sys

import numpy as np

from checks.clean_series import KINDS, clean_series
from foredeck.checks.decomposition import strength, trend_and_season
from foredeck.checks.expectation import fit
from foredeck.checks.screening import step_range

SPIKES, STEPS = 0.10, 0.08
LENGTHS = {1: (12, 16, 24, 36, 60, 120), 4: (12, 16, 24, 36, 60, 120),
           12: (12, 18, 23, 24, 30, 36, 48, 60, 84, 120, 240),
           52: (26, 52, 103, 104, 130, 156, 208, 260, 320)}

STRENGTH_LENGTHS = {1: (5, 8, 12, 16, 24, 36, 60, 120), 4: (5, 7, 8, 12, 16, 24, 36, 60, 120),
                    12: (5, 12, 23, 24, 30, 36, 48, 60, 84, 120, 240),
                    52: (5, 26, 103, 104, 130, 156, 208, 260, 520)}


def limits(season_length: int, n: int, repeats: int, rng: np.random.Generator) -> tuple[float, float]:
    """Spike and step limit for one length."""
    none = np.array([], dtype=np.intp)
    spikes, steps = [], []
    kinds = [k for k in KINDS if season_length > 1 or "season" not in k]
    for kind in kinds:
        for _ in range(repeats):
            found = fit(clean_series(kind, n, season_length, rng), season_length, none, none)
            if found is None:
                continue
            spikes.append(np.abs(found.spike_t))
            steps.append(np.abs(found.step_t[step_range(n)]).max(initial=0.0))
    return (float(np.quantile(np.concatenate(spikes), 1.0 - SPIKES / 1000.0)),
            float(np.quantile(steps, 1.0 - STEPS * n / 1000.0)))


def strengths(season_length: int, n: int, repeats: int, rng: np.random.Generator) -> tuple[float, float]:
    """Trend and season strength that noise alone reaches in one series of 20."""
    found = []
    for _ in range(repeats):
        values = 100.0 + rng.normal(size=n)
        trend, season = trend_and_season(values, season_length)
        rest = values - trend - season
        found.append((strength(rest, trend), strength(rest, season)))
    high = np.quantile(found, 0.95, axis=0)
    return float(high[0]), float(high[1])


def print_strengths(repeats: int) -> None:
    """Print the table of strengths."""
    print("strengths")
    for season_length, lengths in STRENGTH_LENGTHS.items():
        print(f"    {season_length}: (")
        for n in lengths:
            trend, season = strengths(season_length, n, repeats, np.random.default_rng([season_length, n]))
            print(f"        ({n}, {trend:.2f}, {season:.2f}),", flush=True)
        print("    ),")


def print_queries(repeats: int) -> None:
    """Print the table of query limits.

    Once a season is fitted, a shorter history never has a lower limit than a longer one.
    """
    print("queries")
    for season_length, lengths in LENGTHS.items():
        few = repeats if season_length < 52 else max(repeats // 4, 50)
        found = [limits(season_length, n, few, np.random.default_rng([season_length, n])) for n in lengths]
        first = next(i for i, n in enumerate(lengths) if n >= 2 * season_length)
        never_lower = np.array(found)
        for part in (slice(0, first), slice(first, None)):
            never_lower[part] = np.maximum.accumulate(never_lower[part][::-1], axis=0)[::-1]
        print(f"    {season_length}: (")
        for n, (spike, step) in zip(lengths, never_lower, strict=True):
            print(f"        ({n}, {spike:.2f}, {step:.2f}),", flush=True)
        print("    ),")


if __name__ == "__main__":
    asked = int(sys.argv[1]) if len(sys.argv) > 1 else 600
    print_strengths(1000)
    print_queries(asked)
