"""Makers of reports that fail on one series; workers import them by name."""

from __future__ import annotations

import os
from pathlib import Path

from foredeck.rounds import publish

BROKEN = "river/twine"


def make_report(ledger: str, round: str, series: str, path: Path) -> str:
    return "the kernel died: planted" if series == BROKEN else publish.make_report(ledger, round, series, path)


def die_once(ledger: str, round: str, series: str, path: Path) -> str:
    """Kill the worker the first time; a mark beside the pack remembers it."""
    mark = path.parents[2] / "died"
    if series == BROKEN and not mark.exists():
        mark.touch()
        os._exit(9)
    return publish.make_report(ledger, round, series, path)


def die_always(ledger: str, round: str, series: str, path: Path) -> str:
    os._exit(9)
