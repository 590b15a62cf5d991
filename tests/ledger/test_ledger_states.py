"""Draft, issued, agreed: what may change, and what neither code nor database let change."""

from __future__ import annotations

import datetime as dt
import sqlite3
from contextlib import closing

import pytest

from foredeck.errors import RoundStateError
from foredeck.ledger.store import open_ledger
from ledger.invented_rounds import assert_reads_back, invented, record


@pytest.fixture
def ledger(tmp_path):
    return open_ledger(tmp_path / "ledger", create=True)


@pytest.fixture
def agreed(ledger):
    """A ledger with an agreed round, and what was recorded."""
    given = record(ledger, "2026-10")
    ledger.issue("2026-10")
    ledger.agree("2026-10", by="Asha Verrall", on=dt.date(2026, 11, 6))
    return ledger, given


def test_a_round_moves_from_draft_to_issued_to_agreed(ledger):
    record(ledger, "2026-10")
    assert ledger.issue("2026-10").state == "issued"
    held = ledger.agree("2026-10", by="  Asha Verrall ", on=dt.date(2026, 11, 6))
    assert (held.state, held.agreed_by, held.agreed_at, held.late) == ("agreed", "Asha Verrall",
                                                                         "2026-11-06", False)
    assert open_ledger(ledger.folder).round("2026-10") == held
    assert held.view().made["agreed_by"] == "Asha Verrall"


@pytest.mark.parametrize(("day", "late"), [(dt.date(2026, 11, 30), False), (dt.date(2026, 12, 1), True)])
def test_a_round_is_late_when_agreed_after_its_first_lead_has_closed(ledger, day, late):
    record(ledger, "2026-10")
    ledger.issue("2026-10")
    assert ledger.agree("2026-10", by="Asha Verrall", on=day).late is late


def test_a_draft_cannot_be_agreed(ledger):
    record(ledger, "2026-10")
    with pytest.raises(RoundStateError) as caught:
        ledger.agree("2026-10", by="Asha Verrall")
    assert str(caught.value) == (
        "round 2026-10 is draft and cannot become agreed\n"
        f"  where: {ledger.folder}, revision 1\n"
        "  allowed: draft -> issued -> agreed\n"
        "  next: issue it first")


def test_agreeing_needs_a_name(ledger):
    record(ledger, "2026-10")
    ledger.issue("2026-10")
    with pytest.raises(RoundStateError) as caught:
        ledger.agree("2026-10", by=" ")
    assert str(caught.value) == (
        "agreeing needs a name\n"
        "  where: round 2026-10\n"
        "  allowed: the name of who agreed\n"
        "  next: say who: ledger.agree('2026-10', by='...')")
    assert ledger.round("2026-10").state == "issued"


def test_an_agreed_round_is_not_recorded_again(agreed):
    ledger, given = agreed
    with pytest.raises(RoundStateError) as caught:
        ledger.record(**invented("2026-10", seed=9))
    assert str(caught.value) == (
        "round 2026-10 is agreed and never changes\n"
        f"  where: {ledger.folder}, revision 1\n"
        "  allowed: recording rounds that are draft or issued\n"
        "  next: open a revision with a reason first: ledger.revise('2026-10', reason)")
    assert_reads_back(ledger, given)
    for again in (ledger.issue, lambda name: ledger.agree(name, by="Tom Ridley")):
        with pytest.raises(RoundStateError, match="round 2026-10 is agreed and cannot become"):
            again("2026-10")


def test_an_agreed_round_is_superseded_with_a_reason_and_stays_readable(agreed):
    ledger, given = agreed
    draft = ledger.revise("2026-10", "the river depot was counted twice")
    assert (draft.revision, draft.state, draft.agreed_by) == (2, "draft", None)
    assert draft.reason == "the river depot was counted twice"
    assert_reads_back(ledger, given, revision=2)
    corrected = record(ledger, "2026-10", seed=5)
    assert ledger.round("2026-10").reason == "the river depot was counted twice"
    assert_reads_back(ledger, corrected)
    assert_reads_back(ledger, given, revision=1)
    ledger.issue("2026-10")
    ledger.agree("2026-10", by="Asha Verrall", on=dt.date(2026, 11, 9))
    assert list(ledger.rounds()["state"]) == ["agreed", "draft", "agreed"]
    assert ledger.said_before("2026-11").revision == 3
    assert ledger.check() == []


def test_a_revision_needs_a_reason_and_an_agreed_round(agreed):
    ledger, _ = agreed
    with pytest.raises(RoundStateError) as caught:
        ledger.revise("2026-10", "")
    assert str(caught.value) == (
        "superseding an agreed round needs a reason\n"
        "  where: round 2026-10\n"
        "  allowed: a sentence on what was found wrong\n"
        "  next: give the reason")
    record(ledger, "2026-11")
    with pytest.raises(RoundStateError) as caught:
        ledger.revise("2026-11", "a typing error")
    assert str(caught.value) == (
        "round 2026-11 is draft; only an agreed round is superseded by a revision\n"
        f"  where: {ledger.folder}, revision 1\n"
        "  allowed: revising agreed rounds\n"
        "  next: record the round again: that makes a new revision of the draft")


NEVER = "an agreed round never changes"
_COPY = ("SELECT {id}, '{round}', {revision}, 'draft', frequency, closing, closing_on, first_lead_ends, "
         "horizon, levels, portfolio, made, settings_text, made_at, settings_fingerprint, data_fingerprint, "
         "previous_id, '{reason}', NULL, NULL, 0, seal FROM rounds WHERE id = 1")


@pytest.mark.parametrize(("statement", "said"), [
    ("UPDATE rounds SET agreed_by = 'Mallory'", NEVER),
    ("UPDATE rounds SET state = 'draft', agreed_by = NULL, agreed_at = NULL", NEVER),
    ("UPDATE rounds SET portfolio = '{}'", NEVER),
    ("UPDATE OR REPLACE rounds SET late = 1", NEVER),
    ("DELETE FROM rounds", NEVER),
    ("REPLACE INTO rounds " + _COPY.format(id=1, round="2026-09", revision=1, reason=""), NEVER),
    ("REPLACE INTO rounds " + _COPY.format(id=9, round="2026-10", revision=1, reason="x"), NEVER),
    ("INSERT INTO rounds " + _COPY.format(id=9, round="2026-10", revision=2, reason=""),
     "an agreed round is superseded only with a reason"),
    ("UPDATE files SET sha256 = '0'", NEVER),
    ("DELETE FROM files", NEVER),
    ("REPLACE INTO files VALUES (1, 'forecasts', 'x', '0', 0, 0)", NEVER),
    ("INSERT INTO files VALUES (1, 'more', 'x', '0', 0, 0)", NEVER),
])
def test_the_database_itself_refuses_to_change_an_agreed_round(agreed, statement, said):
    ledger, given = agreed
    with closing(sqlite3.connect(ledger.folder / "ledger.sqlite")) as raw, \
            pytest.raises(sqlite3.IntegrityError, match=said), raw:
        raw.execute(statement)
    assert_reads_back(ledger, given)
    assert ledger.check() == []


@pytest.mark.parametrize(("statement", "said"), [
    ("UPDATE rounds SET state = 'agreed', agreed_by = 'x', agreed_at = '2026-11-06'",
     "states move from draft to issued to agreed"),
    ("UPDATE rounds SET portfolio = '{}'", "what a round recorded never changes"),
    ("UPDATE rounds SET state = 'final'", "states move from draft to issued to agreed"),
    ("INSERT INTO rounds "
     + _COPY.replace("'draft'", "'issued'").format(id=9, round="2026-09", revision=1, reason=""),
     "a round begins as a draft"),
])
def test_the_database_itself_refuses_false_steps_of_a_draft(ledger, statement, said):
    record(ledger, "2026-10")
    with closing(sqlite3.connect(ledger.folder / "ledger.sqlite")) as raw, \
            pytest.raises(sqlite3.IntegrityError, match=said), raw:
        raw.execute(statement)
    assert ledger.check() == []


def test_the_list_of_a_pack_that_was_sent_is_not_changed_in_the_database(agreed):
    import pandas as pd

    ledger, _ = agreed
    ledger.register_pack("2026-10", pd.DataFrame({"path": ["a"], "sha256": ["a" * 64], "bytes": [1]}))
    for statement in ("UPDATE pack_files SET bytes = 2", "DELETE FROM pack_files"):
        with closing(sqlite3.connect(ledger.folder / "ledger.sqlite")) as raw, \
                pytest.raises(sqlite3.IntegrityError, match="a pack that was sent never changes"), raw:
            raw.execute(statement)
