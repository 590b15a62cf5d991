"""Recording a round and reading it back."""

from __future__ import annotations

import pickle

import numpy as np
import pandas as pd
import pytest

from foredeck.errors import LedgerError
from foredeck.ledger.store import open_ledger
from foredeck.studies import TABLES
from ledger.invented_rounds import NAMES, assert_reads_back, invented, record

HOSTILE = ("x'; DROP TABLE rounds; --", "../../etc/passwd", "<script>alert(1)</script>", "=1+1",
           "Größe/雪 ☃\n\"'",
           "all", " ", "a" * 5000)


@pytest.fixture
def ledger(tmp_path):
    return open_ledger(tmp_path / "ledger", create=True)


def test_a_round_reads_back_equal_from_another_opening(ledger):
    given = record(ledger, "2026-10")
    assert_reads_back(open_ledger(ledger.folder), given)


def test_a_record_says_which_round_it_is(ledger):
    record(ledger, "2026-10")
    held = ledger.round("2026-10")
    assert (held.name, held.revision, held.state, held.closing, held.frequency) == (
        "2026-10", 1, "draft", "2026-10", "monthly")
    assert (held.horizon, held.levels, held.late) == (3, (50, 90), False)
    assert held.agreed_by is None
    assert held.previous is None
    assert held.series_names == list(NAMES)
    assert pickle.loads(pickle.dumps(held)) == held


@pytest.mark.parametrize(("round", "frequency"), [
    ("2026", "yearly"), ("2026-Q3", "quarterly"), ("2026-W05", "weekly"), ("2026-10", "monthly")])
def test_the_name_of_a_round_tells_its_frequency(ledger, round, frequency):
    ledger.record(**{**invented(), "round": round})
    assert ledger.round(round).frequency == frequency


def test_a_study_holds_the_rows_of_its_series_and_what_was_said_before(ledger):
    before = record(ledger, "2026-09", seed=2)
    given = record(ledger, "2026-10")
    study = ledger.round("2026-10").study(NAMES[1])
    for name in ("actuals", "findings", "eligibility", "error_table", "members", "forecasts", "adjusted",
                 "adjustments", "reliability", "comparisons"):
        table = given["tables"][name]
        expected = table[table["series"] == NAMES[1]].reset_index(drop=True)
        pd.testing.assert_frame_equal(getattr(study, name), expected, check_dtype=not expected.empty,
                                      check_index_type=not expected.empty)
    assert list(study.totals["member"]) == [NAMES[1]]
    assert study.info["unit_value"] == 2.5
    assert study.info["n_periods"] == 24
    assert (study.unit, study.levels, study.state) == ("cases", (50, 90), "draft")
    assert study.previous is not None
    assert study.previous.round == "2026-09"
    then = before["tables"]["adjusted"]
    pd.testing.assert_frame_equal(study.previous.adjusted,
                                  then[then["series"] == NAMES[1]].reset_index(drop=True))
    assert study.made["title"] == "Hollin & Reeve"
    assert (study.made["revision"], study.made["agreed_by"]) == (1, None)


def test_a_view_holds_every_table(ledger):
    given = record(ledger, "2026-10")
    view = ledger.round("2026-10").view()
    assert tuple(view.tables) == TABLES
    assert view.title == "Hollin & Reeve"
    assert view.previous is None
    pd.testing.assert_frame_equal(view.tables["actuals"], given["tables"]["actuals"])


def test_recording_again_makes_a_new_revision_and_keeps_the_earlier_one(ledger):
    first = record(ledger, "2026-10", seed=1)
    second = record(ledger, "2026-10", seed=2)
    assert ledger.round("2026-10").revision == 2
    assert_reads_back(ledger, second)
    assert_reads_back(ledger, first, revision=1)
    assert list(ledger.rounds()["revision"]) == [1, 2]


def test_latest_is_the_last_to_close_not_the_last_recorded(ledger):
    assert ledger.latest() is None
    for round in ("2026-10", "2025-12", "2026-09"):
        record(ledger, round)
    assert ledger.latest().name == "2026-10"
    assert ledger.latest(before="2026-10").name == "2026-09"
    assert ledger.latest(before="2025-12") is None


def test_what_was_said_before_is_what_readers_were_told_not_a_later_draft(ledger):
    record(ledger, "2026-09", seed=1)
    ledger.issue("2026-09")
    record(ledger, "2026-09", seed=2)
    assert ledger.latest().revision == 2
    assert ledger.said_before("2026-10").revision == 1


def test_what_a_round_compares_itself_with_does_not_change_afterwards(ledger):
    record(ledger, "2026-09", seed=1)
    record(ledger, "2026-10")
    record(ledger, "2026-09", seed=2)
    assert ledger.round("2026-10").previous.revision == 1


def test_rounds_are_listed_with_what_is_known_of_them(ledger):
    given = record(ledger, "2026-10")
    listed = ledger.rounds()
    assert list(listed.columns) == ["round", "revision", "state", "frequency", "closing", "made_at",
                                    "settings_fingerprint", "data_fingerprint", "agreed_by", "agreed_at",
                                    "late", "reason"]
    row = listed.iloc[0]
    assert row["settings_fingerprint"] == given["made"]["settings_fingerprint"]
    assert row["data_fingerprint"] == given["made"]["data_fingerprint"]
    assert row["made_at"] == "2026-11-04T09:12:00+00:00"
    assert pd.isna(row["agreed_by"])


def test_hostile_names_of_series_are_text_and_nothing_else(ledger):
    given = record(ledger, "2026-10", names=HOSTILE)
    assert_reads_back(ledger, given)
    held = ledger.round("2026-10")
    for name in HOSTILE:
        study = held.study(name)
        assert study.name == name
        assert set(study.actuals["series"]) == {name}
        assert list(study.totals["member"]) == [name]
    inside = {path.relative_to(ledger.folder).parts[0] for path in ledger.folder.rglob("*")}
    assert inside == {"ledger.sqlite", "rounds", "writer.lock"}
    assert ledger.check() == []


@pytest.mark.parametrize("name", ["../2026-10", "2026-13", "2026-10/x", "", "october", "2026-W54"])
def test_a_round_that_is_no_period_is_refused(ledger, name):
    with pytest.raises(LedgerError) as caught:
        ledger.record(**{**invented(), "round": name})
    assert str(caught.value) == (
        f"{name!r} is no name of a round\n"
        "  where: the round's name\n"
        "  allowed: the last closed period: 2026, 2026-Q3, 2026-10, 2026-W05\n"
        "  next: name the round by its last closed period")
    assert not (ledger.folder / "rounds").exists()


def test_an_unknown_round_is_answered_with_the_known_ones(ledger):
    record(ledger, "2026-09")
    record(ledger, "2026-10")
    with pytest.raises(LedgerError) as caught:
        ledger.round("2026-11")
    assert str(caught.value) == (
        "the ledger has no round '2026-11'\n"
        f"  where: {ledger.folder}\n"
        "  allowed: 2026-09, 2026-10\n"
        "  next: ask for one of these")
    with pytest.raises(LedgerError, match="no revision 2 of round '2026-10'"):
        ledger.round("2026-10", revision=2)


def test_an_unknown_series_is_answered_with_the_nearest_name(ledger):
    record(ledger, "2026-10")
    with pytest.raises(LedgerError) as caught:
        ledger.round("2026-10").study("north/compots")
    assert str(caught.value) == (
        "round 2026-10 has no series 'north/compots'\n"
        f"  where: {ledger.folder}\n"
        "  allowed: the series of the round\n"
        "  next: did you mean 'north/compost'?")


def test_an_unknown_table_is_refused(ledger):
    record(ledger, "2026-10")
    with pytest.raises(LedgerError) as caught:
        ledger.round("2026-10").table("forecast")
    assert str(caught.value) == (
        "a round has no table 'forecast'\n"
        "  where: round 2026-10\n"
        f"  allowed: {', '.join(TABLES)}\n"
        "  next: did you mean 'forecasts'?")


def _without(given, table):
    return {**given, "tables": {name: frame for name, frame in given["tables"].items() if name != table}}


def test_a_missing_or_unknown_table_is_refused_by_name(ledger):
    given = _without(invented(), "findings")
    given["tables"]["finding"] = invented()["tables"]["findings"]
    with pytest.raises(LedgerError) as caught:
        ledger.record(**given)
    assert str(caught.value) == (
        "a round cannot be recorded without 'findings' and with unknown 'finding'\n"
        "  where: tables\n"
        f"  allowed: {', '.join(TABLES)}\n"
        "  next: hand in every table, an empty one where there is nothing")


def test_a_table_without_its_columns_is_refused(ledger):
    given = invented()
    given["tables"]["failures"] = pd.DataFrame()
    with pytest.raises(LedgerError) as caught:
        ledger.record(**given)
    assert str(caught.value) == (
        "table 'failures' has no column 'series'\n"
        "  where: table 'failures'\n"
        "  allowed: series and any others\n"
        "  next: hand in the table with its columns, even when it has no rows")


def test_an_actual_given_twice_is_refused(ledger):
    given = invented()
    table = given["tables"]["actuals"]
    given["tables"]["actuals"] = pd.concat([table, table.iloc[[5]]])
    with pytest.raises(LedgerError) as caught:
        ledger.record(**given)
    assert str(caught.value) == (
        f"table 'actuals' holds 'north/compost {table['period'][5]}' twice\n"
        "  where: table 'actuals'\n"
        "  allowed: each series and period once\n"
        "  next: settle duplicates before recording")


@pytest.mark.parametrize(("part", "key"), [
    ("portfolio", "horizon"), ("portfolio", "levels"), ("made", "settings_fingerprint"),
    ("made", "data_fingerprint")])
def test_a_missing_entry_is_refused_by_name(ledger, part, key):
    given = invented()
    del given[part][key]
    with pytest.raises(LedgerError) as caught:
        ledger.record(**given)
    assert str(caught.value) == (
        f"{part!r} lacks {key!r}\n"
        f"  where: {part}\n"
        f"  allowed: an entry {key!r}\n"
        "  next: add it before recording")


def test_numpy_numbers_in_the_portfolio_are_stored_as_plain_ones(ledger):
    given = invented()
    given["portfolio"].update(coverage=np.float64(0.9), profile=np.array([1.0, 1.5]), n=np.int64(3))
    ledger.record(**given)
    held = ledger.round("2026-10").portfolio
    assert (held["coverage"], held["profile"], held["n"]) == (0.9, [1.0, 1.5], 3)


def test_an_entry_that_is_no_json_is_refused(ledger):
    given = invented()
    given["made"]["when"] = object()
    with pytest.raises(LedgerError) as caught:
        ledger.record(**given)
    assert str(caught.value) == (
        "'made' cannot be stored: object is no JSON\n"
        "  where: made\n"
        "  allowed: texts, numbers, truth values, lists and dictionaries keyed by text\n"
        "  next: turn the entry into one of these")


def test_no_ledger_is_made_by_opening_one_for_reading(tmp_path):
    with pytest.raises(LedgerError) as caught:
        open_ledger(tmp_path / "nowhere")
    assert str(caught.value) == (
        f"there is no ledger in {tmp_path / 'nowhere'}\n"
        f"  where: {tmp_path / 'nowhere' / 'ledger.sqlite'}\n"
        "  allowed: a folder that holds ledger.sqlite\n"
        "  next: run a round first, or open it with create=True")
    assert list(tmp_path.iterdir()) == []


def test_the_files_of_a_pack_are_kept_as_sent(ledger):
    record(ledger, "2026-10")
    first = pd.DataFrame({"path": ["index.html", "reports/a.html"], "sha256": ["a" * 64, "b" * 64],
                          "bytes": [10, 20]})
    assert ledger.pack_files("2026-10").empty
    ledger.register_pack("2026-10", first)
    pd.testing.assert_frame_equal(ledger.pack_files("2026-10"), first)
    second = first.assign(sha256=["c" * 64, "d" * 64])
    ledger.register_pack("2026-10", second)
    pd.testing.assert_frame_equal(ledger.pack_files("2026-10"), second)


def test_a_pack_with_a_false_hash_or_a_file_twice_is_refused(ledger):
    record(ledger, "2026-10")
    with pytest.raises(LedgerError) as caught:
        ledger.register_pack("2026-10", pd.DataFrame({"path": ["x"], "sha256": ["abc"], "bytes": [1]}))
    assert str(caught.value) == (
        "'abc' is no SHA-256\n"
        "  where: pack of round 2026-10, file 'x'\n"
        "  allowed: 64 hexadecimal digits in small letters\n"
        "  next: hash the file as it was sent")
    with pytest.raises(LedgerError, match="the pack lists 'x' twice"):
        ledger.register_pack("2026-10", pd.DataFrame({"path": ["x", "x"], "sha256": ["a" * 64] * 2,
                                                      "bytes": 1}))
