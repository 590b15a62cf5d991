"""What was known when: each round stores what was new or had changed."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from foredeck.errors import LedgerError
from foredeck.ledger.store import open_ledger
from foredeck.ledger.vintages import known_actuals, laid_together, vintage
from ledger.invented_rounds import invented, record


@pytest.fixture
def ledger(tmp_path):
    return open_ledger(tmp_path / "ledger", create=True)


def _actuals(cells):
    frame = pd.DataFrame([(series, period, value) for (series, period), value in cells.items()],
                         columns=["series", "period", "raw"])
    return frame.assign(used=frame["raw"], repaired=False)


def _record(ledger, round, cells):
    given = invented(round)
    given["tables"]["actuals"] = _actuals(cells)
    ledger.record(**given)


FIRST = {("a", "2026-06"): 10.0, ("a", "2026-07"): np.nan, ("a", "2026-08"): 12.0, ("b", "2026-07"): 5.0,
         ("b", "2026-08"): 6.0}
SECOND = {("a", "2026-06"): 10.0, ("a", "2026-07"): 11.0, ("a", "2026-08"): 12.5, ("a", "2026-09"): 13.0,
          ("a", "2026-05"): 9.0, ("b", "2026-08"): 6.0, ("b", "2026-09"): np.nan, ("c", "2026-08"): 1.0,
          ("c", "2026-09"): 2.0}


def test_a_vintage_holds_only_what_is_new_changed_or_gone(ledger):
    _record(ledger, "2026-08", FIRST)
    _record(ledger, "2026-09", SECOND)
    assert ledger.round("2026-08").stored["vintage"].rows == 5
    assert ledger.round("2026-09").stored["vintage"].rows == 8  # all but a 2026-06 and b 2026-08


def test_as_of_gives_the_actuals_known_at_each_round(ledger):
    _record(ledger, "2026-08", FIRST)
    _record(ledger, "2026-09", SECOND)
    for period, cells in (("2026-08", FIRST), ("2026-09", SECOND), ("2027-03", SECOND)):
        pd.testing.assert_frame_equal(ledger.as_of(period), known_actuals(_actuals(cells)))


def test_restated_history_is_listed_and_new_periods_and_series_are_not(ledger):
    _record(ledger, "2026-08", FIRST)
    _record(ledger, "2026-09", SECOND)
    expected = pd.DataFrame(
        [("a", "2026-05", np.nan, 9.0, "late"), ("a", "2026-07", np.nan, 11.0, "changed"),
         ("a", "2026-08", 12.0, 12.5, "changed"), ("b", "2026-07", 5.0, np.nan, "removed")],
        columns=["series", "period", "before", "after", "what"])
    pd.testing.assert_frame_equal(ledger.restated("2026-09"), expected)
    assert ledger.restated("2026-08").empty
    assert list(ledger.restated("2026-08").columns) == list(expected.columns)


def test_a_draft_recorded_again_is_compared_with_the_round_before_not_with_the_earlier_draft(ledger):
    _record(ledger, "2026-08", FIRST)
    _record(ledger, "2026-09", {**SECOND, ("a", "2026-09"): 99.0})
    _record(ledger, "2026-09", SECOND)
    pd.testing.assert_frame_equal(ledger.as_of("2026-09"), known_actuals(_actuals(SECOND)))
    assert ledger.round("2026-09").stored["vintage"].rows == 8


def test_as_of_before_the_first_round_is_refused(ledger):
    record(ledger, "2026-08")
    with pytest.raises(LedgerError) as caught:
        ledger.as_of("2026-07")
    assert str(caught.value) == (
        "nothing is recorded of what was known when 2026-07 closed\n"
        f"  where: {ledger.folder}\n"
        "  allowed: 2026-08\n"
        "  next: ask for the period of a round, or a later one")


def test_vintages_laid_together_give_back_any_sequence_of_histories():
    chance = np.random.default_rng(8)
    known, layers = laid_together([]), []
    for _ in range(12):
        periods = [f"20{year}-{month:02}" for year in (24, 25) for month in range(1, 13)]
        cells = {(series, period): (np.nan if chance.random() < 0.1 else float(chance.integers(0, 3)))
                 for series in ("a", "'; DROP", "../ü") for period in periods if chance.random() < 0.8}
        now = known_actuals(_actuals(cells))
        layers.append(vintage(known, now))
        known = laid_together(layers)
        pd.testing.assert_frame_equal(known, now)
