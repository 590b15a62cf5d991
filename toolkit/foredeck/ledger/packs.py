"""Packs as they were sent: which files, with which hashes."""

from __future__ import annotations

import datetime as dt
import re
from typing import Any

import pandas as pd
import sqlalchemy as sa

from foredeck.errors import LedgerError
from foredeck.ledger.tables import pack_files, packs, rounds

_COLUMNS = ["path", "sha256", "bytes"]


def checked(round: str, pack: pd.DataFrame) -> list[dict[str, Any]]:
    """The rows to enter.

    Raises
    ------
    LedgerError
        if a column is lacking, a path comes twice, or a hash is none.
    """
    absent = [name for name in _COLUMNS if name not in pack.columns]
    if absent:
        raise LedgerError(f"the list of a pack's files has no column {', '.join(map(repr, absent))}",
                          where=f"pack of round {round}", allowed=", ".join(_COLUMNS), do="add the column")
    found = []
    for path, sha256, size in pack[_COLUMNS].itertuples(index=False):
        if not re.fullmatch(r"[0-9a-f]{64}", str(sha256)):
            raise LedgerError(f"{sha256!r} is no SHA-256", where=f"pack of round {round}, file {path!r}",
                              allowed="64 hexadecimal digits in small letters",
                              do="hash the file as it was sent")
        found.append({"path": str(path), "sha256": str(sha256), "bytes": int(size)})
    twice = pack["path"][pack["path"].duplicated()]
    if len(twice):
        raise LedgerError(f"the pack lists {twice.iloc[0]!r} twice", where=f"pack of round {round}",
                          allowed="each file once", do="list each file once")
    return found


def insert(connection: sa.Connection, round_id: int, listed_files: list[dict[str, Any]]) -> None:
    """Enter a pack of a revision."""
    moment = dt.datetime.now(dt.UTC).isoformat(timespec="seconds")
    key = connection.execute(packs.insert().values(round_id=round_id, made_at=moment)).inserted_primary_key
    assert key is not None
    if listed_files:
        connection.execute(pack_files.insert(), [{"pack_id": key[0], **each} for each in listed_files])


def listed(connection: sa.Connection, round: str) -> pd.DataFrame:
    """The files of the pack last entered for a round, by path."""
    last = (sa.select(sa.func.max(packs.c.id)).join(rounds, rounds.c.id == packs.c.round_id)
            .where(rounds.c.round == round).scalar_subquery())
    found = connection.execute(
        sa.select(*(pack_files.c[name] for name in _COLUMNS)).where(pack_files.c.pack_id == last)
        .order_by(pack_files.c.path)).all()
    return pd.DataFrame(found, columns=_COLUMNS).astype({"path": "str", "sha256": "str", "bytes": "int64"})
