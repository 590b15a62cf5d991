"""Writes screening_results.json: what the checks say of seeded series, to compare later versions with.

    python tests/checks/make_screening_results.py

The limits in `foredeck.checks.limits` were simulated with these very results. Run it again only when
the model, and with it the limits, change on purpose.
"""

from __future__ import annotations

import json
import platform
import sys
from datetime import date
from importlib.metadata import version
from pathlib import Path

import numpy as np

FILE = Path(__file__).with_name("screening_results.json")
LENGTHS = {1: (9, 30, 60), 4: (7, 23, 48, 96), 12: (10, 23, 25, 40, 61, 84, 121), 52: (60, 130, 330)}


def with_faults(kind: str, n: int, season_length: int, seed: int) -> np.ndarray:
    """One series, to the hundredth, with what `seed` says: nothing, odd values, gaps, a jump, a run, few demands."""
    from checks.clean_series import clean_series

    rng = np.random.default_rng([seed, n, season_length])
    values = clean_series(kind, n, season_length, rng)
    fault = seed % 6
    if fault in (1, 5):
        values[rng.integers(0, n, size=3)] *= rng.choice([0.0, 0.1, 2.5, 10.0], size=3)
    if fault in (2, 5):
        values[rng.integers(0, n, size=3)] = np.nan
        values[-2] = -values[-1]
    if fault in (3, 5):
        values[n // 2:] *= 1.6
    if fault == 4:
        values[n // 3:n // 3 + 6] = 0.0 if seed % 12 == 4 else values[n // 3]
    if seed % 17 == 16:
        values *= rng.uniform(size=n) < 0.4
    return np.round(values, 2)


def results(values: np.ndarray, season_length: int) -> dict[str, object]:
    """Everything the checks say of the values that a later version must say too."""
    from foredeck.checks.differencing import difference
    from foredeck.checks.eligibility import pattern
    from foredeck.checks.repairs import repairs_and_screening

    _, repairs, screening = repairs_and_screening(values, season_length)
    told, advice = pattern(values, season_length), difference(values, season_length)
    return {
        "repairs": [[r.position, r.code, r.used] for r in repairs],
        "standouts": [[s.position, s.code, s.expected, s.size] for s in screening.standouts],
        "judged": screening.judged,
        "pattern": [told.trend, told.season, told.intermittent, told.demand_class],
        "strengths": [None if np.isnan(s) else s for s in (told.trend_strength, told.season_strength)],
        "words": [told.words, advice.words],
        "difference": [advice.ordinary, advice.seasonal],
        "tests": [[row.test, row.of, row.statistic, row.says] for row in advice.tests.itertuples()],
    }


def main() -> None:
    from checks.clean_series import KINDS

    entries, seed = [], 0
    for season_length, lengths in LENGTHS.items():
        for n in lengths * 3:
            values = with_faults(KINDS[(seed * 5) % len(KINDS)], n, season_length, seed)
            told = results(np.array(values), season_length)
            entries.append({"season_length": season_length, **told,
                            "values": [None if np.isnan(v) else v for v in values.tolist()]})
            seed += 1
    made = ", ".join([date.today().isoformat(), f"Python {platform.python_version()}",
                      *(f"{name} {version(name)}" for name in ("numpy", "scipy", "statsmodels"))])
    lines = ",\n".join(json.dumps(entry) for entry in entries)
    FILE.write_text(f'{{"made": "{made}: python tests/checks/make_screening_results.py",\n'
                    f'"series": [\n{lines}\n]}}\n')


if __name__ == "__main__":
    sys.path.insert(0, str(Path(__file__).parents[1]))
    main()
