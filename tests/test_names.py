"""The names that people type after `import foredeck as fd`."""

from __future__ import annotations

import subprocess
import sys

import pytest

import foredeck as fd


def test_every_public_name_is_there_and_documented() -> None:
    for name in fd.__all__:
        if name != "__version__":
            assert getattr(fd, name).__doc__, name


def test_functions_stay_functions_after_their_rooms_were_imported() -> None:
    # a room named like a function would take its place on the package at the first import
    code = ("import foredeck as fd; names = [n for n in fd.__all__ if n not in ('__version__', 'charts')]; "
            "[getattr(fd, n) for n in names]; import foredeck.rounds.states; "
            "print([n for n in names if not callable(getattr(fd, n))])")
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"
    assert not set(fd.__all__) & {"backtests", "studies"}


def test_a_wrong_name_is_told_with_the_right_ones() -> None:
    with pytest.raises(AttributeError, match=r"no attribute 'forecast'; it offers .*read, decompose"):
        _ = fd.forecast
