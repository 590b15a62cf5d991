"""What is handed in to be recorded, checked before anything is written."""

from __future__ import annotations

import datetime as dt
import json
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd

from foredeck.errors import LedgerError, PeriodError
from foredeck.periods import frequency_of_text, parse_period
from foredeck.studies import TABLES

_NEEDED_COLUMNS = {"actuals": ("series", "period", "raw"), "totals": ("scope", "member")}


@dataclass(frozen=True)
class Submission:
    """A round that can be recorded."""

    round: str
    frequency: str
    closing_on: str
    first_lead_ends: str
    horizon: int
    levels: list[int]
    tables: Mapping[str, pd.DataFrame]
    portfolio: str
    made: str
    settings_text: str
    made_at: str
    settings_fingerprint: str
    data_fingerprint: str

    def row(self, revision: int, previous_id: int | None, reason: str) -> dict[str, Any]:
        """The entry of this round in the database, without id and seal."""
        return {
            "round": self.round, "revision": revision, "state": "draft", "frequency": self.frequency,
            "closing": self.round, "closing_on": self.closing_on, "first_lead_ends": self.first_lead_ends,
            "horizon": self.horizon, "levels": json.dumps(self.levels), "portfolio": self.portfolio,
            "made": self.made, "settings_text": self.settings_text, "made_at": self.made_at,
            "settings_fingerprint": self.settings_fingerprint, "data_fingerprint": self.data_fingerprint,
            "previous_id": previous_id, "reason": reason, "agreed_by": None, "agreed_at": None, "late": False}


def frequency_and_period(name: str) -> tuple[str, pd.Period]:
    """The frequency that a round's name tells, and its period.

    Raises
    ------
    LedgerError
        if the name is no period.
    """
    try:
        frequency = frequency_of_text(name)
    except PeriodError as fault:
        raise LedgerError(f"{name!r} is no name of a round", where="the round's name",
                          allowed=f"the last closed period: {fault.allowed}",
                          do="name the round by its last closed period", round=name) from fault
    return frequency.value, parse_period(name, frequency)


def last_day(period: pd.Period) -> str:
    """The last day of a period, as ISO text."""
    return str(period.end_time.date().isoformat())


def checked(round: str, tables: Mapping[str, pd.DataFrame], portfolio: Mapping[str, Any],
            made: Mapping[str, Any], settings_text: str) -> Submission:
    """Check what is handed in.

    Raises
    ------
    LedgerError
        naming the table, column or entry that is lacking or strange.
    """
    frequency, period = frequency_and_period(round)
    _check_tables(tables)
    horizon = _needed(portfolio, "horizon", "portfolio")
    levels = _needed(portfolio, "levels", "portfolio")
    made_at = str(made.get("made_at") or dt.datetime.now(dt.UTC).isoformat(timespec="seconds"))
    return Submission(
        round=round, frequency=frequency, closing_on=last_day(period), first_lead_ends=last_day(period + 1),
        horizon=int(horizon), levels=[int(level) for level in levels],
        tables={name: tables[name] for name in TABLES}, portfolio=_json(portfolio, "portfolio"),
        made=_json(made, "made"), settings_text=settings_text, made_at=made_at,
        settings_fingerprint=str(_needed(made, "settings_fingerprint", "made")),
        data_fingerprint=str(_needed(made, "data_fingerprint", "made")))


def _check_tables(tables: Mapping[str, pd.DataFrame]) -> None:
    lacking = [name for name in TABLES if name not in tables]
    strange = [name for name in tables if name not in TABLES]
    if lacking or strange:
        said = [f"without {', '.join(map(repr, lacking))}"] if lacking else []
        said += [f"with unknown {', '.join(map(repr, strange))}"] if strange else []
        raise LedgerError(f"a round cannot be recorded {' and '.join(said)}", where="tables",
                          allowed=", ".join(TABLES),
                          do="hand in every table, an empty one where there is nothing")
    for name, frame in tables.items():
        absent = [column for column in _NEEDED_COLUMNS.get(name, ("series",)) if column not in frame.columns]
        if absent:
            raise LedgerError(f"table {name!r} has no column {', '.join(map(repr, absent))}",
                              where=f"table {name!r}",
                              allowed=", ".join(_NEEDED_COLUMNS.get(name, ("series",))) + " and any others",
                              do="hand in the table with its columns, even when it has no rows")
    _check_once(tables["series"], ["series"], "series")
    _check_once(tables["actuals"], ["series", "period"], "actuals")


def _check_once(frame: pd.DataFrame, key: list[str], table: str) -> None:
    again = frame[frame.duplicated(key)]
    if not again.empty:
        named = " ".join(str(again.iloc[0][column]) for column in key)
        raise LedgerError(f"table {table!r} holds {named!r} twice", where=f"table {table!r}",
                          allowed=f"each {' and '.join(key)} once", do="settle duplicates before recording")


def _needed(given: Mapping[str, Any], key: str, what: str) -> Any:
    if given.get(key) is None:
        raise LedgerError(f"{what!r} lacks {key!r}", where=what, allowed=f"an entry {key!r}",
                          do="add it before recording")
    return given[key]


def _json(given: Mapping[str, Any], what: str) -> str:
    def plain(value: object) -> object:
        if isinstance(value, np.generic):
            return value.item()
        if isinstance(value, np.ndarray):
            return value.tolist()
        raise TypeError(f"{type(value).__name__} is no JSON")

    try:
        return json.dumps(given, default=plain, ensure_ascii=False)
    except (TypeError, ValueError) as fault:
        raise LedgerError(f"{what!r} cannot be stored: {fault}", where=what,
                          allowed="texts, numbers, truth values, lists and dictionaries keyed by text",
                          do="turn the entry into one of these") from fault
