"""Short transactions on the ledger's SQLite file, and its faults in plain words.

Reading opens the file read-only and never writes, with one exception: when a
writer was cut off in the middle of a transaction, SQLite must first take the
half-done change back, which needs a folder that can be written.
"""

from __future__ import annotations

import sqlite3
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from urllib.parse import quote

import sqlalchemy as sa
from sqlalchemy.pool import NullPool

from foredeck.errors import LedgerBusyError, LedgerError

DATABASE = "ledger.sqlite"
_WAIT_SECONDS = 30


def _engine(path: Path, mode: str, begin: str) -> sa.Engine:
    address = f"file:{quote(str(path.resolve()))}?mode={mode}"

    def connect() -> sqlite3.Connection:
        connection = sqlite3.connect(address, uri=True, timeout=_WAIT_SECONDS, isolation_level=None)
        connection.execute("PRAGMA foreign_keys = ON")
        if mode != "ro":
            connection.execute("PRAGMA synchronous = EXTRA")
        return connection

    engine = sa.create_engine("sqlite://", creator=connect, poolclass=NullPool)

    # The driver's own transactions leave schema changes outside; ours hold everything.
    @sa.event.listens_for(engine, "begin")
    def _(connection: sa.Connection) -> None:
        connection.exec_driver_sql(begin)

    return engine


@contextmanager
def reading(folder: Path) -> Iterator[sa.Connection]:
    """A read-only transaction."""
    path = folder / DATABASE
    with plainly(path):
        if (folder / f"{DATABASE}-journal").exists():
            _take_back_half_done(path)
        with _engine(path, "ro", "BEGIN").begin() as connection:
            yield connection


@contextmanager
def changing(folder: Path, *, create: bool = False) -> Iterator[sa.Connection]:
    """A transaction that changes the ledger; the caller holds the writer lock."""
    path = folder / DATABASE
    with plainly(path), _engine(path, "rwc" if create else "rw", "BEGIN IMMEDIATE").begin() as connection:
        yield connection


def _take_back_half_done(path: Path) -> None:
    """Let SQLite roll back what a killed writer left; harmless when a living one is at work."""
    try:
        with _engine(path, "ro", "BEGIN").begin() as connection:
            connection.exec_driver_sql("SELECT count(*) FROM sqlite_master")
        return
    except sa.exc.OperationalError as fault:
        if "readonly" not in str(fault.orig):
            raise
    try:
        with _engine(path, "rw", "BEGIN").begin() as connection:
            connection.exec_driver_sql("SELECT count(*) FROM sqlite_master")
    except sa.exc.OperationalError as fault:
        raise LedgerError(
            "the last writer was cut off, and in a read-only folder its change cannot be taken back",
            where=str(path),
            do="open the ledger once where it can be written, then copy it again") from fault


@contextmanager
def plainly(path: Path) -> Iterator[None]:
    """Turn the database's faults into errors of foredeck."""
    try:
        yield
    except sa.exc.DBAPIError as fault:
        said = str(fault.orig)
        if "locked" in said:
            raise LedgerBusyError(
                f"the ledger is locked by another program ({said})", where=str(path),
                allowed="one writer at a time", do="close that program, or try again in a minute") from fault
        raise LedgerError(
            f"the ledger's database refused: {said}", where=str(path),
            do="run the ledger's check; if the file is damaged, bring the folder back from a copy") from fault
