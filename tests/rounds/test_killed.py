"""A round killed at random moments, and the same command given again."""

from __future__ import annotations

import contextlib
import signal
import subprocess
import sys
import time
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from small_round import SERIES, write_folder

from foredeck.ledger.store import open_ledger
from foredeck.pack.file_names import file_name
from foredeck.pack.manifest import verify
from foredeck.studies import TABLES

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


@pytest.fixture(scope="module")
def calm(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, float]:
    """Settings of an undisturbed round, and how long it took."""
    settings = folder_with_one_report(tmp_path_factory.mktemp("calm"))
    began = time.monotonic()
    finish(settings)
    return settings, time.monotonic() - began


@pytest.mark.parametrize("moment", np.random.default_rng(20261031).uniform(0.1, 0.9, size=KILLS).round(3).tolist())
def test_a_round_killed_at_a_random_moment_ends_as_an_undisturbed_one(moment: float, calm: tuple[Path, float],
                                                                      tmp_path: Path) -> None:
    settings, lasts = calm
    shaken = folder_with_one_report(tmp_path)
    process = subprocess.Popen([*COMMAND, str(shaken)], stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
    with contextlib.suppress(subprocess.TimeoutExpired):
        process.wait(timeout=moment * lasts)
    process.send_signal(signal.SIGKILL)
    process.wait()
    if (shaken.parent / "ledger" / "ledger.sqlite").exists():
        assert open_ledger(shaken.parent / "ledger", create=True).check() == []
    finish(shaken)
    one, other = (open_ledger(path.parent / "ledger").round("2027-06") for path in (settings, shaken))
    assert other.state == "issued"
    for name in TABLES:
        pd.testing.assert_frame_equal(one.table(name), other.table(name), check_exact=True)
    assert one.portfolio == other.portfolio
    packs = [path.parent / "pack" / "2027-06" for path in (settings, shaken)]
    assert [verify(pack) for pack in packs] == [[], []]
    listed = [sorted(p.relative_to(pack).as_posix() for p in pack.rglob("*") if p.is_file()) for pack in packs]
    assert listed[0] == listed[1]
    assert f"reports/{file_name(SERIES[0], '.html')}" in listed[0]
    assert not list((shaken.parent / "pack").glob(".*")), "what the killed run left is used up"
