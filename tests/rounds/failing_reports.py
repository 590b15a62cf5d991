"""A maker of reports that fails on one series; workers import it by name."""

from __future__ import annotations

from pathlib import Path

from foredeck.rounds import publish

BROKEN = "river/twine"


def make_report(ledger: str, round: str, series: str, path: Path) -> str:
    return "the kernel died: planted" if series == BROKEN else publish.make_report(ledger, round, series, path)
