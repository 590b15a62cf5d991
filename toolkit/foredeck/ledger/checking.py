"""Is the ledger whole? Everything that can be told from the folder alone."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import sqlalchemy as sa

from foredeck.errors import LedgerBusyError, LedgerError
from foredeck.ledger import files, migrations, rows
from foredeck.ledger.connection import reading
from foredeck.ledger.tables import rounds


def faults(folder: Path) -> list[str]:
    """Faults of the ledger in words; empty when it is whole.

    Raises
    ------
    LedgerBusyError
        if another program holds the database locked: then nothing can be said.
    """
    found: list[str] = []
    try:
        with reading(folder) as connection:
            found += _database_faults(connection, folder)
            if not found:
                found += _guard_faults(connection)
                found += _entry_faults(connection, folder)
    except LedgerBusyError:
        raise
    except LedgerError as fault:
        found.append(fault.what)
    return found


def _database_faults(connection: sa.Connection, folder: Path) -> Iterator[str]:
    said = list(connection.scalars(sa.text("PRAGMA integrity_check")))
    if said != ["ok"]:
        yield from (f"ledger.sqlite is damaged: {line}" for line in said)
        return
    for table, row, parent, _ in connection.exec_driver_sql("PRAGMA foreign_key_check"):
        yield f"row {row} of {table} belongs to a row of {parent} that is not there"
    for name in migrations.pending(connection, str(folder)):
        yield f"migration {name} is not applied"


def _guard_faults(connection: sa.Connection) -> Iterator[str]:
    asked = "SELECT name, sql FROM sqlite_master WHERE type = 'trigger'"
    there = {str(name): str(written) for name, written in connection.exec_driver_sql(asked)}
    for name, statement in migrations.guards().items():
        if there.get(name) != statement:
            yield f"the guard {name} against change is {'not as written' if name in there else 'gone'}"


def _entry_faults(connection: sa.Connection, folder: Path) -> Iterator[str]:
    seen: dict[str, str] = {}
    for row in connection.execute(sa.select(rounds).order_by(rounds.c.id)).mappings().all():
        named = f"round {row['round']} revision {row['revision']}"
        content = rows.stored(connection, row["id"])
        if row["seal"] != rows.seal(dict(row), content.values()):
            yield f"{named}: its entry was changed by hand"
        for each in content.values():
            if each.path not in seen:  # a revision begins with the files of what it supersedes
                seen[each.path] = files.fault_of(folder, each)
            if seen[each.path]:
                yield f"{named}: {seen[each.path]}"
