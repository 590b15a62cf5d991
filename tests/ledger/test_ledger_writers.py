"""One writer at a time, with a clear message to the second."""

from __future__ import annotations

import errno
import os
import signal
import subprocess
import sys
import threading

import pytest

from foredeck.errors import LedgerBusyError, LedgerError
from foredeck.ledger import locking
from foredeck.ledger.locking import refuse_share_without_locks
from foredeck.ledger.store import open_ledger
from ledger.invented_rounds import assert_reads_back, invented, record


@pytest.fixture
def ledger(tmp_path):
    return open_ledger(tmp_path / "ledger", create=True)


_HOLDING = """
import sys, time
from pathlib import Path
from foredeck.ledger.locking import Owner, this_owner, writer_lock
with writer_lock(Path(sys.argv[1]), this_owner("Tom Ridley")):
    print("held", flush=True)
    time.sleep(60)
"""


@pytest.fixture
def other_writer(ledger):
    """Another process that holds the writer's lock."""
    process = subprocess.Popen([sys.executable, "-c", _HOLDING, str(ledger.folder)], stdout=subprocess.PIPE,
                               text=True,
                               env={**os.environ, "PYTHONPATH": os.pathsep.join(sys.path)})
    with process:
        assert process.stdout is not None
        assert process.stdout.readline() == "held\n"
        yield process
        process.kill()


def test_the_second_writer_is_told_who_is_writing_and_changes_nothing(ledger, other_writer):
    with pytest.raises(LedgerBusyError) as caught:
        record(ledger, "2026-10")
    owner = caught.value.data["owner"]
    assert (owner["name"], owner["process"]) == ("Tom Ridley", other_writer.pid)
    assert str(caught.value) == (
        f"the ledger is being written by Tom Ridley (process {other_writer.pid} on {owner['host']}, "
        f"since {owner['since']})\n"
        f"  where: {ledger.folder}\n"
        "  allowed: one writer at a time; reading is always possible\n"
        "  next: try again when that process has ended; its lock falls by itself")
    assert ledger.rounds().empty


def test_reading_goes_on_while_another_writes(ledger, request):
    given = record(ledger, "2026-10")
    request.getfixturevalue("other_writer")
    assert_reads_back(open_ledger(ledger.folder), given)
    assert ledger.check() == []


def test_the_lock_of_a_killed_writer_falls_by_itself(ledger, other_writer):
    other_writer.send_signal(signal.SIGKILL)
    other_writer.wait()
    assert_reads_back(ledger, record(ledger, "2026-10"))


def test_another_object_or_thread_of_the_same_process_is_a_second_writer_too(ledger):
    said = []

    def second():
        try:
            ledger.issue("2026-10")
        except LedgerBusyError as fault:
            said.append(fault.what)

    record(ledger, "2026-10")
    with ledger.writing("Asha Verrall"):
        with pytest.raises(LedgerBusyError, match="being written by Asha Verrall"):
            open_ledger(ledger.folder).issue("2026-10")
        thread = threading.Thread(target=second)
        thread.start()
        thread.join()
        assert len(said) == 1
        assert ledger.issue("2026-10").state == "issued"  # the writer itself goes on, lock in hand
        with pytest.raises(LedgerBusyError, match="being written by Asha Verrall"):
            open_ledger(ledger.folder).agree("2026-10", by="Tom Ridley")
    assert open_ledger(ledger.folder).agree("2026-10", by="Tom Ridley").state == "agreed"


def test_the_next_writer_sweeps_what_a_killed_one_left_and_nothing_else(ledger):
    given = record(ledger, "2026-10")
    place = ledger.folder / "rounds/2026-10/2"
    place.mkdir()
    orphans = [place / "actuals-0123456789ab.parquet", place / ".actuals-0123456789ab.parquet.writing"]
    kept = [place / "notes.txt", place / "mine.parquet", ledger.folder / "actuals-0123456789ab.parquet"]
    for path in orphans + kept:
        path.write_bytes(b"x")
    assert ledger.check() == []
    with ledger.writing():
        pass
    assert [path.exists() for path in orphans + kept] == [False, False, True, True, True]
    assert_reads_back(ledger, given)


def test_a_share_that_cannot_lock_is_refused_with_advice(ledger, monkeypatch):
    def refuses(handle):
        raise OSError(errno.ENOLCK, "No locks available")

    monkeypatch.setattr(locking, "_lock", refuses)
    with pytest.raises(LedgerError) as caught:
        ledger.record(**invented())
    assert str(caught.value) == (
        "the ledger lies on a share that cannot lock files ([Errno 37] No locks available)\n"
        f"  where: {ledger.folder}\n"
        "  allowed: a local disk, or a network share mounted with locks\n"
        "  next: move the ledger's folder to a local disk, or mount the share with locks "
        "(nfs without nolock or local_lock, cifs without nobrl)")
    assert not isinstance(caught.value, LedgerBusyError)


_MOUNTS = ("/dev/sda1 / ext4 rw 0 0\nhost:/pool {at} {kind} {options} 0 0\n"
           "tmpfs /somewhere/else tmpfs rw,nolock 0 0\n")


@pytest.mark.parametrize(("kind", "options", "refused"), [
    ("nfs", "rw,nolock,vers=3", "nfs mounted at {at} with nolock"),
    ("nfs4", "rw,local_lock=all", "nfs4 mounted at {at} with local_lock=all"),
    ("cifs", "rw,nobrl", "cifs mounted at {at} with nobrl"),
    ("fuse.sshfs", "rw", "sshfs mounted at {at}"),
    ("nfs4", "rw,local_lock=none", ""), ("cifs", "rw", ""), ("ext4", "rw,nolock", ""),
])
def test_mounts_whose_locks_do_not_reach_other_machines_are_refused(tmp_path, kind, options, refused):
    mounts = _MOUNTS.format(at=tmp_path, kind=kind, options=options)
    if not refused:
        refuse_share_without_locks(tmp_path / "ledger", mounts)
        return
    with pytest.raises(LedgerError) as caught:
        refuse_share_without_locks(tmp_path / "ledger", mounts)
    assert caught.value.what == (
        f"the ledger lies on a share that cannot lock files ({refused.format(at=tmp_path)})")
