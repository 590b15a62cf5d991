"""SIGKILL at any moment leaves the ledger whole."""

from __future__ import annotations

import os
import random
import signal
import sys
import time
import warnings
from collections.abc import Callable
from pathlib import Path

import pytest

from foredeck.ledger.store import open_ledger
from ledger.invented_rounds import assert_reads_back, invented, periods, record

ROUNDS = periods("2039-12", 240)
STATES = ("draft", "issued", "agreed")


def _forked(work: Callable[[], None]) -> int:
    """Do the work in a child process; returns its number at once."""
    with warnings.catch_warnings():
        # Later Pythons warn that a fork beside threads may hang; this child touches none of them.
        warnings.simplefilter("ignore", DeprecationWarning)
        child = os.fork()
    if child == 0:
        try:
            work()
        finally:
            os._exit(0)
    return child


def _write_in_a_loop(folder: Path, first: int, say: int) -> None:
    """Record rounds one after another; every completed step is said on the pipe."""
    ledger = open_ledger(folder, create=True)
    for seed in range(first, len(ROUNDS)):
        ledger.record(**invented(ROUNDS[seed], seed=seed))
        os.write(say, f"{seed} draft\n".encode())
        if seed % 3 == 0:
            ledger.issue(ROUNDS[seed])
            os.write(say, f"{seed} issued\n".encode())
        if seed % 6 == 0:
            ledger.agree(ROUNDS[seed], by="Asha Verrall")
            os.write(say, f"{seed} agreed\n".encode())


def _killed_after(seconds: float, folder: Path, first: int) -> dict[int, str]:
    """Let a writer run from its first completed step for so long, then SIGKILL; what it had completed."""
    read, say = os.pipe()
    child = _forked(lambda: _write_in_a_loop(folder, first, say))
    os.close(say)
    said = os.read(read, 100)
    time.sleep(seconds)
    os.kill(child, signal.SIGKILL)
    assert os.WIFSIGNALED(os.waitpid(child, 0)[1])
    while more := os.read(read, 4096):
        said += more
    os.close(read)
    return {int(line.split()[0]): line.split()[1] for line in said.decode().splitlines()}


def test_a_writer_killed_at_ten_random_moments_leaves_the_ledger_whole(tmp_path):
    chance, folder, done, first = random.Random(11), tmp_path / "ledger", {}, 0
    for _ in range(10):
        completed = _killed_after(chance.uniform(0.0, 0.3), folder, first)
        done.update(completed)
        last = max(completed)
        ledger = open_ledger(folder)
        assert ledger.check() == []
        assert_reads_back(ledger, invented(ROUNDS[last], seed=last))
        assert STATES.index(ledger.round(ROUNDS[last]).state) >= STATES.index(completed[last])
        # A step may be committed just before it is said: one round more than said, but never less.
        held = set(ledger.rounds()["round"])
        assert {ROUNDS[seed] for seed in done} <= held <= {ROUNDS[seed] for seed in range(last + 2)}
        first = len(held)
    assert_reads_back(open_ledger(folder), invented(ROUNDS[0], seed=0))
    assert len(done) >= 10


_STEPS = ("open", "os.rename", "os.mkdir", "os.remove", "sqlite3.connect")


def _killed_at(step: int, folder: Path, work: Callable[[], None]) -> bool:
    """Do the work in a child that kills itself at its step-th call on the folder; False if it ended."""

    def counted() -> None:
        left = step

        def count(event: str, arguments: tuple[object, ...]) -> None:
            nonlocal left
            if event in _STEPS and str(folder) in str(arguments[0]):
                if left == 0:
                    os.kill(os.getpid(), signal.SIGKILL)
                left -= 1

        sys.addaudithook(count)
        work()

    return os.WIFSIGNALED(os.waitpid(_forked(counted), 0)[1])


@pytest.mark.parametrize("first", [0, 1, 2, 3])
def test_a_writer_killed_at_each_of_its_steps_leaves_the_ledger_whole(tmp_path, first):
    ledger = open_ledger(tmp_path / "ledger", create=True)
    before, after = record(ledger, "2026-09", seed=2), invented("2026-10")
    step = first
    while _killed_at(step, ledger.folder, lambda: ledger.record(**after)):
        assert ledger.check() == []
        step += 4
    assert step > 60  # every file of the round was opened, renamed and flushed in between
    assert_reads_back(ledger, before)
    for revision in ledger.rounds().query("round == '2026-10'")["revision"]:
        assert_reads_back(ledger, after, revision)
    there = {path.relative_to(ledger.folder).as_posix() for path in (ledger.folder / "rounds").rglob("*.*")}
    registered = {stored.path for round,
                  revision in ledger.rounds()[["round", "revision"]].itertuples(index=False)
                  for stored in ledger.round(round, revision).stored.values()}
    assert there == registered  # the last writer swept what the killed ones had left
