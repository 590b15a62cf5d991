"""A round from files to an issued pack, and again from where it was cut off.

Computing ends in the ledger before anything is rendered. A command that was killed
is given again: a draft that rests on the same data, settings and code is not
computed twice, and reports that are finished are not made twice.
"""

from __future__ import annotations

import datetime as dt
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import pandas as pd

from foredeck.errors import RoundStateError
from foredeck.intake.files import read_source
from foredeck.intake.history import History
from foredeck.ledger.round_record import RoundRecord
from foredeck.ledger.store import Ledger, open_ledger
from foredeck.periods import period_name
from foredeck.rounds.compute import Progress, compute_round, data_fingerprint, made_with
from foredeck.rounds.publish import Published, publish, reports_wanted
from foredeck.rounds.source import closing_of
from foredeck.settings.model import Settings
from foredeck.studies import versions

NEEDS_A_PERSON = 4
REPORT_FAILED = 6


@dataclass(frozen=True)
class Outcome:
    """What a command tells at its end: lines to print, the cover, and the exit code."""

    cover: Path
    lines: tuple[str, ...] = field(default=())
    exit_code: int = 0


def run_round(settings: Settings, period: str, progress: Progress) -> Outcome:
    """Compute a round, record it, issue it and publish its pack.

    Raises
    ------
    RoundStateError
        if the round is agreed and the data, settings or code have changed since.
    """
    history = read_source(settings)
    closing = closing_of(history, settings, period)
    reports_wanted(history.names, settings)  # a wrong name is told before anything is computed
    ledger = open_ledger(settings.ledger.folder, create=True)
    with ledger.writing():
        record = _recorded(ledger, history, closing, settings, progress)
        if record.state == "draft":
            record = ledger.issue(record.name)
        published = publish(ledger, record, settings, progress)
    return _outcome(record, published)


def render_round(settings: Settings, name: str, progress: Progress) -> Outcome:
    """Make the pack of a recorded round again from what the ledger holds."""
    ledger = open_ledger(settings.ledger.folder)
    with ledger.writing():
        record = ledger.round(name)
        if record.state == "draft":
            raise RoundStateError(f"round {name} is a draft and has no pack yet", allowed="issued or agreed rounds",
                                  do=f"finish it with: foredeck round --period {name}")
        published = publish(ledger, record, settings, progress, again=True)
    return _outcome(record, published)


def _recorded(ledger: Ledger, history: History, closing: pd.Period, settings: Settings,
              progress: Progress) -> RoundRecord:
    name = period_name(closing)
    wanted = {"settings_fingerprint": settings.fingerprint,
              "data_fingerprint": data_fingerprint(history, closing, settings), "versions": versions()}
    known = set(ledger.rounds()["round"])
    newest = ledger.round(name) if name in known else None
    if newest is not None and _same(newest.made, wanted) and not newest.reason:
        progress("series already computed", len(newest.series_names), len(newest.series_names))
        return newest
    if newest is not None and newest.state == "agreed":
        changed = [key for key in wanted if newest.made.get(key) != wanted[key]]
        raise RoundStateError(f"round {name} is agreed and never changes; since then other {', '.join(changed)}",
                              where=str(settings.ledger.folder), do="begin the next round")
    computed = compute_round(history, closing, settings, progress)
    made: dict[str, Any] = {"made_at": dt.datetime.now().astimezone().isoformat(timespec="seconds"),
                            "title": settings.pack.title, **wanted, **made_with(history)}
    return ledger.record(name, computed.tables, computed.portfolio, made, settings.text)


def _same(made: Mapping[str, Any], wanted: Mapping[str, Any]) -> bool:
    return all(made.get(key) == value for key, value in wanted.items())


def _outcome(record: RoundRecord, published: Published) -> Outcome:
    status = record.table("series")["status"].value_counts()
    forecast, failed = int(status.get("forecast", 0)), int(status.get("failed", 0))
    without = int(status.sum()) - forecast
    lines = [f"Round {record.name}, revision {record.revision}, {record.state}: {forecast} series forecast"
             + (f", {without} not (listed on the cover with the reason)." if without else ".")]
    lines += [f"The report of {name} could not be made: {reason}" for name, reason in published.failed.items()]
    code = REPORT_FAILED if published.failed else NEEDS_A_PERSON if failed else 0
    return Outcome(published.cover, tuple(lines), code)
