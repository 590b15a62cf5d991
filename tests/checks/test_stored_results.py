"""The checks still say what they said when the limits were simulated.

The results stand in `screening_results.json`, made by `make_screening_results.py` beside it.
"""

from __future__ import annotations

import json

import numpy as np
import pytest

from checks.make_screening_results import FILE, results
from foredeck.checks.eligibility import pattern, shows_season
from foredeck.checks.repairs import repaired

STORED = json.loads(FILE.read_text())["series"]


def values_of(stored: dict) -> np.ndarray:
    return np.array([np.nan if v is None else v for v in stored["values"]])


@pytest.mark.parametrize("stored", STORED, ids=lambda s: f"{s['season_length']}-{len(s['values'])}")
def test_findings_repairs_pattern_and_advice_are_those_stored(stored: dict) -> None:
    """Positions, codes, flags and words exactly; repairs and sizes to 1e-9, strengths to 1e-12.

    Test statistics to 1e-7: that of Dickey and Fuller squares the condition of its regression.
    """
    told = results(values_of(stored), stored["season_length"])
    for name in ("judged", "pattern", "words", "difference"):
        assert told[name] == stored[name]
    for name in ("repairs", "standouts", "tests"):
        assert [row[:2] for row in told[name]] == [row[:2] for row in stored[name]]
        for row, before in zip(told[name], stored[name], strict=True):
            assert row[2] == pytest.approx(before[2], rel=1e-7 if name == "tests" else 1e-9, abs=1e-12)
            assert row[3:] == (pytest.approx(before[3:], rel=1e-9) if name == "standouts" else before[3:])
    for strength, before in zip(told["strengths"], stored["strengths"], strict=True):
        assert strength == (None if before is None else pytest.approx(before, rel=0, abs=1e-12))


def test_the_stored_series_hold_every_kind_of_repair_and_standout_at_every_season_length() -> None:
    assert {s["season_length"] for s in STORED} == {1, 4, 12, 52}
    assert {r[1] for s in STORED for r in s["repairs"]} == {"gap", "impossible_sign", "outlier", "change_of_unit"}
    assert {s[1] for entry in STORED for s in entry["standouts"]} == {"outlier", "change_of_unit", "level_shift"}
    assert sum(not s["repairs"] for s in STORED) > 15


@pytest.mark.parametrize("stored", STORED, ids=lambda s: f"{s['season_length']}-{len(s['values'])}")
def test_a_season_alone_is_told_as_in_the_whole_pattern(stored: dict) -> None:
    season_length = stored["season_length"]
    used = repaired(values_of(stored), season_length)
    assert shows_season(used, season_length) == pattern(used, season_length, used=used).season


def test_what_is_handed_out_may_be_changed_without_changing_the_next_answer() -> None:
    values = values_of(STORED[-3])
    first = repaired(values, STORED[-3]["season_length"])
    kept = first.copy()
    first[:] = -1.0
    assert np.array_equal(repaired(values, STORED[-3]["season_length"]), kept)
