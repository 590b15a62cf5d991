"""Where compiled code is kept, and that two processes never compile the same thing."""

from __future__ import annotations

import json
import os
import shutil
import stat
import subprocess
import sys
from pathlib import Path

import pytest

import foredeck

PROGRAM = """
import json, sys, numpy as np
from foredeck.compiled.compiler import cache_folder
from foredeck.compiled.recursions import croston, tsb
print("ready", flush=True)
input()
y, state, one_step = np.array([0.0, 3.0, 0.0, 2.0]), np.zeros(2), np.empty(4)
croston(y, 0.2, 1.0, state, one_step)
tsb(y, 0.2, 0.1, state, one_step)
counted = [[sum(found.values()) for found in (kernel.stats.cache_hits, kernel.stats.cache_misses)]
           for kernel in (croston, tsb)]
print(json.dumps({"folder": str(cache_folder()), "counted": counted, "state": state.tolist()}))
"""


@pytest.fixture
def package(tmp_path):
    """A copy of the package whose folder for compiled code cannot be written to, not even by root."""
    copy = tmp_path / "copy"
    here = Path(foredeck.__file__).parent
    shutil.copytree(here, copy / "foredeck", ignore=shutil.ignore_patterns("__pycache__"))
    (copy / "foredeck" / "compiled" / "__pycache__").write_text("in the way", encoding="utf-8")
    return copy


def start(package, **environment):
    """Start the program up to its first call."""
    kept = {key: value for key, value in os.environ.items() if key not in ("NUMBA_CACHE_DIR", "XDG_CACHE_HOME")}
    kept |= {"PYTHONPATH": str(package)} if package else {}
    return subprocess.Popen(
        [sys.executable, "-c", PROGRAM], stdin=subprocess.PIPE, stdout=subprocess.PIPE, stderr=subprocess.PIPE,
        text=True, env={**kept, **{key: str(value) for key, value in environment.items()}},
    )


def end(process):
    """Let the program go on, and return what it found."""
    said, wrong = process.communicate("\n")
    assert process.returncode == 0, wrong
    return json.loads(said.splitlines()[-1])


def test_of_two_processes_started_at_once_on_an_empty_cache_one_compiles_and_the_other_loads(tmp_path):
    both = [start(None, NUMBA_CACHE_DIR=tmp_path / "cache") for _ in range(2)]
    for process in both:
        assert process.stdout.readline() == "ready\n"
    for process in both:  # only now do both go on, side by side
        process.stdin.write("\n")
        process.stdin.flush()
    found = [end(process) for process in both]
    assert found[0]["state"] == found[1]["state"]
    for kernel in range(2):
        assert sorted(one["counted"][kernel] for one in found) == [[0, 1], [1, 0]]  # hits and misses
    folder = Path(found[0]["folder"])
    assert len(list(folder.rglob("*.nbi"))) == len(list(folder.rglob("*.nbc"))) == 2


def test_a_package_that_cannot_be_written_to_keeps_compiled_code_in_the_home_of_its_user(package, tmp_path):
    home = tmp_path / "home"
    home.mkdir()
    first, second = (end(start(package, HOME=home)) for _ in range(2))
    assert Path(first["folder"]).parent == home / ".cache" / "foredeck"
    assert first["counted"] == [[0, 1], [0, 1]]
    assert second["counted"] == [[1, 0], [1, 0]]
    assert second["state"] == first["state"]


def test_without_a_writable_home_it_is_kept_in_a_closed_folder_among_the_temporary_files(package, tmp_path):
    home, temporary = tmp_path / "home", tmp_path / "temporary"
    home.write_text("a home that is no folder", encoding="utf-8")
    temporary.mkdir()
    first, second = (end(start(package, HOME=home, TMPDIR=temporary)) for _ in range(2))
    own = Path(first["folder"]).parent
    assert own == temporary / f"foredeck-{os.getuid()}"
    assert stat.S_IMODE(own.stat().st_mode) == 0o700
    assert second["counted"] == [[1, 0], [1, 0]]


def test_a_temporary_folder_open_to_others_is_refused_and_the_code_compiled_without_being_kept(package, tmp_path):
    home, temporary = tmp_path / "home", tmp_path / "temporary"
    home.write_text("a home that is no folder", encoding="utf-8")
    own = temporary / f"foredeck-{os.getuid()}"
    own.mkdir(parents=True)
    own.chmod(0o777)
    found = end(start(package, HOME=home, TMPDIR=temporary))
    assert found["folder"] == "None"
    assert list(own.iterdir()) == []
    assert found["state"][0] > 0


def test_after_an_edit_of_any_compiled_file_nothing_compiled_before_is_found(package, tmp_path):
    home = tmp_path / "home"
    home.mkdir()
    before = end(start(package, HOME=home))
    edited = package / "foredeck" / "compiled" / "search.py"
    edited.write_text(edited.read_text(encoding="utf-8") + "\n# edited\n", encoding="utf-8")
    after = end(start(package, HOME=home))
    assert after["folder"] != before["folder"]
    assert after["counted"] == [[0, 1], [0, 1]]


def test_beside_the_modules_what_an_earlier_version_left_is_cleared_away(package, tmp_path):
    beside = package / "foredeck" / "compiled" / "__pycache__"
    beside.unlink()
    older = beside / f"compiled-{sys.implementation.cache_tag}-0123456789abcdef"
    older.mkdir(parents=True)
    found = end(start(package, HOME=tmp_path))
    assert Path(found["folder"]).parent == beside
    assert [path for path in beside.iterdir() if path.is_dir()] == [Path(found["folder"])]


def test_a_process_whose_folder_was_cleared_away_meanwhile_goes_on(package, tmp_path):
    home = tmp_path / "home"
    home.mkdir()
    process = start(package, HOME=home)
    assert process.stdout.readline() == "ready\n"
    shutil.rmtree(home / ".cache")
    assert end(process)["state"][0] > 0
