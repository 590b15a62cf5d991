"""A round killed at random moments, and the same command given again."""

from __future__ import annotations

import signal
import subprocess
import sys
import time
from pathlib import Path

import numpy as np
import pandas as pd
from small_round import SERIES, write_folder

from foredeck.ledger.store import open_ledger
from foredeck.pack.file_names import file_name
from foredeck.pack.manifest import verify
from foredeck.study import TABLES

KILLS = 10
COMMAND = [sys.executable, "-c", "from foredeck.cli.app import main; main()", "round", "--settings"]


def folder_with_one_report(folder: Path) -> Path:
    path = write_folder(folder)
    text = path.read_text().replace("workers = 1", f'workers = 1\nreports = ["{SERIES[0]}"]')
    path.write_text(text)
    return path


def finish(settings: Path) -> None:
    done = subprocess.run([*COMMAND, str(settings)], capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr
    assert done.stdout.splitlines()[-1] == str(settings.parent / "pack" / "2027-06" / "cover.html")


def test_a_round_killed_ten_times_ends_as_an_undisturbed_one(tmp_path: Path) -> None:
    calm, shaken = folder_with_one_report(tmp_path / "calm"), folder_with_one_report(tmp_path / "shaken")
    began = time.monotonic()
    finish(calm)
    lasts = time.monotonic() - began
    kills = 0
    for moment in np.random.default_rng(20261031).uniform(0.1, 0.95, size=KILLS):
        process = subprocess.Popen([*COMMAND, str(shaken)], stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
        try:
            process.wait(timeout=moment * lasts)
        except subprocess.TimeoutExpired:
            process.send_signal(signal.SIGKILL)
            process.wait()
            kills += 1
        if (shaken.parent / "ledger" / "ledger.sqlite").exists():
            assert open_ledger(shaken.parent / "ledger", create=True).check() == []
    # a run that finds its work done ends before its moment; most must have been cut off in the middle
    assert kills >= KILLS // 2
    finish(shaken)
    one, other = (open_ledger(path.parent / "ledger").round("2027-06") for path in (calm, shaken))
    assert other.state == "issued"
    for name in TABLES:
        pd.testing.assert_frame_equal(one.table(name), other.table(name), check_exact=True)
    assert one.portfolio == other.portfolio
    packs = [path.parent / "pack" / "2027-06" for path in (calm, shaken)]
    assert [verify(pack) for pack in packs] == [[], []]
    listed = [sorted(p.relative_to(pack).as_posix() for p in pack.rglob("*") if p.is_file()) for pack in packs]
    assert listed[0] == listed[1]
    assert f"reports/{file_name(SERIES[0], '.html')}" in listed[0]
    assert not list((shaken.parent / "pack").glob(".*")), "what a killed run left is used up"
