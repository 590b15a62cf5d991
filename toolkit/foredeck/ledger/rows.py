"""Rows of the database in and out: every statement on rounds and their files."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Iterable, Mapping
from pathlib import Path
from typing import Any

import pandas as pd
import sqlalchemy as sa

from foredeck.ledger import vintages
from foredeck.ledger.files import StoredFile
from foredeck.ledger.round_record import RoundRecord
from foredeck.ledger.submission import frequency_and_period, last_day
from foredeck.ledger.tables import files, rounds

_LISTED = ("round", "revision", "state", "frequency", "closing", "made_at", "settings_fingerprint",
           "data_fingerprint", "agreed_by", "agreed_at", "late", "reason")


def newest(connection: sa.Connection, round: str, revision: int | None = None) -> Any:
    """The row of a round's newest revision, or of the one asked for; None if there is none."""
    asked = sa.select(rounds).where(rounds.c.round == round)
    if revision is not None:
        asked = asked.where(rounds.c.revision == revision)
    return connection.execute(asked.order_by(rounds.c.revision.desc()).limit(1)).first()


def latest(connection: sa.Connection, before: str | None) -> Any:
    """The row of the newest revision of the latest round, or of the latest before another."""
    asked = sa.select(rounds)
    if before is not None:
        frequency, period = frequency_and_period(before)
        asked = asked.where(rounds.c.closing_on < last_day(period), rounds.c.frequency == frequency)
    return connection.execute(
        asked.order_by(rounds.c.closing_on.desc(), rounds.c.revision.desc()).limit(1)).first()


def standing_before(connection: sa.Connection, closing_on: str, frequency: str) -> Any:
    """The row of what stands of the latest round that closed before a day.

    Agreed before issued before draft, and then the newest: a draft begun after a
    round was issued has told nobody anything.
    """
    rank = sa.case({"agreed": 0, "issued": 1}, value=rounds.c.state, else_=2)
    asked = sa.select(rounds).where(rounds.c.closing_on < closing_on, rounds.c.frequency == frequency)
    return connection.execute(
        asked.order_by(rounds.c.closing_on.desc(), rank, rounds.c.revision.desc()).limit(1)).first()


def known_names(connection: sa.Connection) -> str:
    """The ledger's rounds in words."""
    names = connection.scalars(sa.select(rounds.c.round).distinct().order_by(rounds.c.closing_on))
    return ", ".join(names) or "no round is recorded yet"


def listed(connection: sa.Connection) -> pd.DataFrame:
    """Every revision of every round, oldest first."""
    asked = sa.select(*(rounds.c[name] for name in _LISTED)).order_by(rounds.c.closing_on, rounds.c.revision)
    frame = pd.DataFrame(connection.execute(asked).all(), columns=list(_LISTED))
    texts = {name: "str" for name in _LISTED if name not in ("revision", "late")}
    return frame.astype({**texts, "revision": "int64", "late": "bool"})


def stored(connection: sa.Connection, round_id: int) -> dict[str, StoredFile]:
    """The files of a revision, by table."""
    asked = sa.select(files).where(files.c.round_id == round_id).order_by(files.c.table_name)
    return {row.table_name: StoredFile(row.table_name, row.path, row.sha256, row.bytes, row.rows)
            for row in connection.execute(asked)}


def vintage_chain(connection: sa.Connection, round_id: int | None) -> list[StoredFile]:
    """The vintages that lead to what a revision knew, oldest first."""
    chain: list[StoredFile] = []
    while round_id is not None:
        chain.append(stored(connection, round_id)[vintages.TABLE])
        round_id = connection.scalar(sa.select(rounds.c.previous_id).where(rounds.c.id == round_id))
    return chain[::-1]


def read(connection: sa.Connection, folder: Path, round_id: int, *,
         with_previous: bool = True) -> RoundRecord:
    """A revision as an object."""
    row = connection.execute(sa.select(rounds).where(rounds.c.id == round_id)).one()
    previous = None
    if with_previous and row.previous_id is not None:
        previous = read(connection, folder, row.previous_id, with_previous=False)
    return RoundRecord(
        folder=folder, name=row.round, revision=row.revision, state=row.state, frequency=row.frequency,
        closing=row.closing, horizon=row.horizon, levels=tuple(json.loads(row.levels)),
        portfolio=json.loads(row.portfolio), made=json.loads(row.made), settings_text=row.settings_text,
        reason=row.reason, agreed_by=row.agreed_by, agreed_at=row.agreed_at, late=row.late,
        stored=stored(connection, round_id), previous=previous)


def insert(connection: sa.Connection, row: Mapping[str, Any], written: Iterable[StoredFile]) -> None:
    """Enter a revision and its files."""
    content = list(written)
    sealed = {**row, "seal": seal(row, content)}
    round_id = connection.execute(rounds.insert().values(sealed)).inserted_primary_key
    assert round_id is not None
    connection.execute(files.insert(), [
        {"round_id": round_id[0], "table_name": each.table, "path": each.path, "sha256": each.sha256,
         "bytes": each.bytes, "rows": each.rows} for each in content])


def move(connection: sa.Connection, round_id: int, to: str, signed: Mapping[str, str]) -> None:
    """Move a revision to its next state; the seal moves with it."""
    row = connection.execute(sa.select(rounds).where(rounds.c.id == round_id)).mappings().one()
    late = bool(signed) and signed["agreed_at"] > row["first_lead_ends"]
    change = {"state": to, "late": late, **signed}
    change["seal"] = seal({**row, **change}, stored(connection, round_id).values())
    connection.execute(rounds.update().where(rounds.c.id == round_id).values(change))


def supersede(connection: sa.Connection, round_id: int, reason: str) -> None:
    """Enter a new draft that holds the same files as an agreed revision."""
    row = dict(connection.execute(sa.select(rounds).where(rounds.c.id == round_id)).mappings().one())
    row.update(revision=row["revision"] + 1, state="draft", reason=reason,
               agreed_by=None, agreed_at=None, late=False)
    del row["id"]
    insert(connection, row, stored(connection, round_id).values())


def seal(row: Mapping[str, Any], content: Iterable[StoredFile]) -> str:
    """The hash over a revision's whole entry and its files: a change by hand no longer fits it."""
    entry = {key: value for key, value in row.items() if key not in ("id", "seal")}
    held = sorted((each.table, each.path, each.sha256, each.bytes, each.rows) for each in content)
    text = json.dumps([entry, held], sort_keys=True, ensure_ascii=False)
    return hashlib.sha256(text.encode()).hexdigest()
