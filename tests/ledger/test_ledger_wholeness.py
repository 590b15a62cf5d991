"""The ledger's own check, and reading that never writes."""

from __future__ import annotations

import os
import shutil
import sqlite3
import stat
from contextlib import closing
from pathlib import Path

import pytest

from foredeck.errors import LedgerError
from foredeck.ledger import migrations, tables
from foredeck.ledger.store import open_ledger
from ledger.invented_rounds import assert_reads_back, record


@pytest.fixture
def ledger(tmp_path):
    made = open_ledger(tmp_path / "ledger", create=True)
    record(made, "2026-09", seed=2)
    record(made, "2026-10")
    return made


def _stored(ledger, table="forecasts"):
    stored = ledger.round("2026-10").stored[table]
    return ledger.folder / stored.path, stored


def test_a_whole_ledger_has_no_faults(ledger):
    assert ledger.check() == []


def test_a_missing_file_is_found(ledger):
    path, stored = _stored(ledger)
    path.unlink()
    assert ledger.check() == [f"round 2026-10 revision 1: {stored.path} is missing"]


def test_a_truncated_file_is_found(ledger):
    path, stored = _stored(ledger)
    path.write_bytes(path.read_bytes()[:-1])
    assert ledger.check() == [
        f"round 2026-10 revision 1: {stored.path} has {stored.bytes - 1} bytes instead of {stored.bytes}"]


def test_a_changed_file_is_found(ledger):
    path, stored = _stored(ledger)
    content = bytearray(path.read_bytes())
    content[len(content) // 2] ^= 1
    path.write_bytes(content)
    assert ledger.check() == [
        f"round 2026-10 revision 1: {stored.path} is not what was written: its hash differs"]


def _by_hand(ledger, *statements):
    with closing(sqlite3.connect(ledger.folder / "ledger.sqlite")) as raw, raw:
        for statement in statements:
            raw.execute(statement)


def test_an_entry_changed_by_hand_is_found_even_when_its_guards_were_taken_off_and_put_back(ledger):
    guard = migrations.guards()["round_content_update"]
    _by_hand(ledger, "DROP TRIGGER round_content_update",
             "UPDATE rounds SET portfolio = '{}' WHERE round = '2026-10'",
             guard)
    assert ledger.check() == ["round 2026-10 revision 1: its entry was changed by hand"]


def test_a_file_taken_out_of_the_register_is_found(ledger):
    _by_hand(ledger, "DELETE FROM files WHERE table_name = 'members' AND round_id = 2")
    assert ledger.check() == ["round 2026-10 revision 1: its entry was changed by hand"]


def test_a_guard_that_is_gone_or_weakened_is_found(ledger):
    _by_hand(ledger, "DROP TRIGGER agreed_round_delete", "DROP TRIGGER agreed_file_delete",
             "CREATE TRIGGER agreed_file_delete BEFORE DELETE ON files WHEN 0 BEGIN SELECT 1; END")
    assert ledger.check() == ["the guard agreed_round_delete against change is gone",
                              "the guard agreed_file_delete against change is not as written"]


def test_a_row_without_its_round_is_found(ledger):
    _by_hand(ledger, "PRAGMA foreign_keys = OFF", "DELETE FROM rounds WHERE round = '2026-09'")
    assert "belongs to a row of rounds that is not there" in ledger.check()[0]


def test_a_damaged_database_is_found_and_said(ledger):
    path = ledger.folder / "ledger.sqlite"
    content = bytearray(path.read_bytes())
    content[4096:8192] = b"\xff" * 4096
    path.write_bytes(content)
    faults = ledger.check()
    assert faults
    assert all(fault.startswith(("ledger.sqlite is damaged: ", "the ledger's database refused: "))
               for fault in faults)


def test_a_truncated_database_is_found_and_said(ledger):
    path = ledger.folder / "ledger.sqlite"
    path.write_bytes(path.read_bytes()[:5000])
    assert ledger.check() == ["the ledger's database refused: database disk image is malformed"]


def test_a_file_that_is_no_database_is_refused(tmp_path):
    (tmp_path / "ledger.sqlite").write_text("not a database, but long enough to be taken for one " * 100)
    with pytest.raises(LedgerError) as caught:
        open_ledger(tmp_path)
    assert str(caught.value) == (
        "the ledger's database refused: file is not a database\n"
        f"  where: {tmp_path / 'ledger.sqlite'}\n"
        "  next: run the ledger's check; if the file is damaged, bring the folder back from a copy")


def test_a_ledger_of_a_newer_version_is_refused_and_left_alone(ledger):
    _by_hand(ledger, "INSERT INTO migrations VALUES ('0999_later', '2031-01-01')")
    before = (ledger.folder / "ledger.sqlite").read_bytes()
    for create in (False, True):
        with pytest.raises(LedgerError) as caught:
            open_ledger(ledger.folder, create=create)
        assert str(caught.value) == (
            "the ledger was written by a newer foredeck (it has 0999_later)\n"
            f"  where: {ledger.folder}\n"
            "  allowed: ledgers up to 0001_rounds_files_packs\n"
            "  next: install the version of foredeck that wrote it")
    assert (ledger.folder / "ledger.sqlite").read_bytes() == before


def test_a_ledger_whose_making_was_cut_off_is_completed(tmp_path):
    (tmp_path / "ledger.sqlite").touch()
    with pytest.raises(LedgerError) as caught:
        open_ledger(tmp_path)
    assert str(caught.value) == (
        f"the ledger in {tmp_path} is not made up to this version\n"
        f"  where: {tmp_path / 'ledger.sqlite'}\n"
        "  next: open it once with create=True where its folder can be written")
    assert open_ledger(tmp_path, create=True).check() == []


def test_the_migrations_make_exactly_the_tables_that_the_code_asks_for(ledger):
    with closing(sqlite3.connect(ledger.folder / "ledger.sqlite")) as raw:
        for name, table in tables.metadata.tables.items():
            made = {row[1]: (row[2].upper(), bool(row[3]) or bool(row[5]), bool(row[5]))
                    for row in raw.execute(f"PRAGMA table_info({name})")}
            asked = {column.name: (str(column.type).upper(), not column.nullable, column.primary_key)
                     for column in table.columns}
            assert made == asked, name
            keys = {(row[3], row[2], row[4]) for row in raw.execute(f"PRAGMA foreign_key_list({name})")}
            assert keys == {(key.parent.name, key.column.table.name,
                             key.column.name) for key in table.foreign_keys}


def _contents(folder: Path) -> dict[str, tuple[int, int, bytes]]:
    return {str(path.relative_to(folder)): (path.stat().st_mtime_ns, path.stat().st_size, path.read_bytes())
            for path in folder.rglob("*") if path.is_file()}


def _read_everything(folder: Path) -> None:
    opened = open_ledger(folder)
    opened.rounds()
    opened.latest().view()
    opened.round("2026-10").study("north/seeds")
    opened.as_of("2026-09")
    opened.restated("2026-10")
    opened.pack_files("2026-10")
    assert opened.check() == []


def test_reading_writes_nothing(ledger):
    before = _contents(ledger.folder)
    _read_everything(ledger.folder)
    open_ledger(ledger.folder, create=True)
    assert _contents(ledger.folder) == before


@pytest.fixture
def as_a_reader(ledger):
    """The ledger where this process may read but not write; who runs as root becomes nobody for it."""
    import tempfile

    place = Path(tempfile.mkdtemp(prefix="foredeck-read-only-"))
    shutil.copytree(ledger.folder, place / "ledger")
    for path in [place, *place.rglob("*")]:
        path.chmod(stat.S_IRUSR | stat.S_IRGRP | stat.S_IROTH | (0o111 if path.is_dir() else 0))
    root = os.geteuid() == 0
    if root:
        os.seteuid(65534)
    try:
        yield place / "ledger"
    finally:
        if root:
            os.seteuid(0)
        for path in [place, *place.rglob("*")]:
            path.chmod(0o700)
        shutil.rmtree(place)


def test_a_read_only_folder_can_be_read(as_a_reader):
    _read_everything(as_a_reader)


def test_writing_to_a_read_only_folder_is_refused_plainly(as_a_reader):
    with pytest.raises(LedgerError) as caught:
        open_ledger(as_a_reader).issue("2026-10")
    assert str(caught.value) == (
        "the ledger's folder cannot be written: Permission denied\n"
        f"  where: {as_a_reader}\n"
        "  allowed: reading\n"
        "  next: ask for the right to write there, or work on a copy")


def _cut_off_in_the_middle(ledger, to: Path) -> Path:
    """A copy of the ledger as a killed writer leaves it: pages half written, and a journal beside them."""
    shutil.copytree(ledger.folder, to)
    database = to / "ledger.sqlite"
    halfway = to.with_name("halfway")
    with closing(sqlite3.connect(database, isolation_level=None)) as raw:
        raw.execute("PRAGMA cache_size = 1")
        raw.execute("BEGIN IMMEDIATE")
        raw.execute("CREATE TABLE half (done TEXT)")
        raw.executemany("INSERT INTO half VALUES (?)", [("x" * 3000,) for _ in range(200)])
        shutil.copytree(to, halfway)
        raw.execute("ROLLBACK")
    assert (halfway / "ledger.sqlite-journal").stat().st_size > 0
    assert (halfway / "ledger.sqlite").read_bytes() != database.read_bytes()
    return halfway


def test_a_transaction_that_was_cut_off_is_taken_back_at_the_next_opening(ledger, tmp_path):
    halfway = _cut_off_in_the_middle(ledger, tmp_path / "copy")
    opened = open_ledger(halfway)
    assert opened.check() == []
    assert not (halfway / "ledger.sqlite-journal").exists()
    assert (halfway / "ledger.sqlite").read_bytes() == (ledger.folder / "ledger.sqlite").read_bytes()
    assert_reads_back(opened, record(opened, "2026-11"))


def test_a_reader_may_come_first_after_a_cut_off_while_the_object_is_open(ledger):
    halfway = _cut_off_in_the_middle(ledger, ledger.folder.parent / "copy")
    for name in ("ledger.sqlite", "ledger.sqlite-journal"):
        shutil.copy(halfway / name, ledger.folder / name)
    assert list(ledger.rounds()["round"]) == ["2026-09", "2026-10"]
