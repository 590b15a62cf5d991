"""Changes of the ledger's schema: named, recorded, each in one transaction.

A migration is frozen text: what made a ledger years ago must still make it, even
when `tables` has moved on. New migrations are added at the end.
"""

from __future__ import annotations

from datetime import UTC, datetime

import sqlalchemy as sa

from foredeck.errors import LedgerError
from foredeck.ledger import tables

_ROUNDS_FILES_PACKS = (
    """CREATE TABLE rounds (
        id INTEGER PRIMARY KEY, round TEXT NOT NULL, revision INTEGER NOT NULL,
        state TEXT NOT NULL CHECK (state IN ('draft', 'issued', 'agreed')),
        frequency TEXT NOT NULL, closing TEXT NOT NULL, closing_on TEXT NOT NULL,
        first_lead_ends TEXT NOT NULL, horizon INTEGER NOT NULL, levels TEXT NOT NULL,
        portfolio TEXT NOT NULL, made TEXT NOT NULL, settings_text TEXT NOT NULL, made_at TEXT NOT NULL,
        settings_fingerprint TEXT NOT NULL, data_fingerprint TEXT NOT NULL,
        previous_id INTEGER REFERENCES rounds (id), reason TEXT NOT NULL,
        agreed_by TEXT, agreed_at TEXT, late BOOLEAN NOT NULL, seal TEXT NOT NULL,
        UNIQUE (round, revision),
        CHECK ((state = 'agreed') = (agreed_by IS NOT NULL AND agreed_at IS NOT NULL)))""",
    """CREATE TABLE files (
        round_id INTEGER NOT NULL REFERENCES rounds (id), table_name TEXT NOT NULL, path TEXT NOT NULL,
        sha256 TEXT NOT NULL, bytes INTEGER NOT NULL, rows INTEGER NOT NULL,
        PRIMARY KEY (round_id, table_name))""",
    """CREATE TABLE packs (
        id INTEGER PRIMARY KEY, round_id INTEGER NOT NULL REFERENCES rounds (id), made_at TEXT NOT NULL)""",
    """CREATE TABLE pack_files (
        pack_id INTEGER NOT NULL REFERENCES packs (id), path TEXT NOT NULL, sha256 TEXT NOT NULL,
        bytes INTEGER NOT NULL, PRIMARY KEY (pack_id, path))""",
    # An agreed round never changes: refused by the database too, so that no other program can do it unawares.
    """CREATE TRIGGER agreed_round_update BEFORE UPDATE ON rounds WHEN OLD.state = 'agreed'
        BEGIN SELECT RAISE(ABORT, 'an agreed round never changes'); END""",
    """CREATE TRIGGER agreed_round_delete BEFORE DELETE ON rounds WHEN OLD.state = 'agreed'
        BEGIN SELECT RAISE(ABORT, 'an agreed round never changes'); END""",
    # INSERT OR REPLACE deletes without firing the trigger above: caught where it begins.
    """CREATE TRIGGER agreed_round_replace BEFORE INSERT ON rounds WHEN EXISTS (
            SELECT 1 FROM rounds WHERE state = 'agreed'
            AND (id = NEW.id OR (round = NEW.round AND revision = NEW.revision)))
        BEGIN SELECT RAISE(ABORT, 'an agreed round never changes'); END""",
    """CREATE TRIGGER agreed_round_superseded BEFORE INSERT ON rounds WHEN NEW.reason = '' AND EXISTS (
            SELECT 1 FROM rounds WHERE state = 'agreed' AND round = NEW.round)
        BEGIN SELECT RAISE(ABORT, 'an agreed round is superseded only with a reason'); END""",
    """CREATE TRIGGER round_begins_as_draft BEFORE INSERT ON rounds WHEN NEW.state <> 'draft'
        BEGIN SELECT RAISE(ABORT, 'a round begins as a draft'); END""",
    """CREATE TRIGGER round_state_forward BEFORE UPDATE OF state ON rounds
        WHEN OLD.state <> 'agreed' AND NOT (
            (OLD.state = 'draft' AND NEW.state = 'issued') OR (OLD.state = 'issued' AND NEW.state = 'agreed'))
        BEGIN SELECT RAISE(ABORT, 'states move from draft to issued to agreed'); END""",
    """CREATE TRIGGER round_content_update BEFORE UPDATE OF id, round, revision, frequency, closing,
            closing_on, first_lead_ends, horizon, levels, portfolio, made, settings_text, made_at,
            settings_fingerprint, data_fingerprint, previous_id, reason ON rounds
        WHEN OLD.state <> 'agreed'
        BEGIN SELECT RAISE(ABORT, 'what a round recorded never changes'); END""",
    """CREATE TRIGGER agreed_file_insert BEFORE INSERT ON files
        WHEN (SELECT state FROM rounds WHERE id = NEW.round_id) = 'agreed'
        BEGIN SELECT RAISE(ABORT, 'an agreed round never changes'); END""",
    """CREATE TRIGGER agreed_file_update BEFORE UPDATE ON files
        WHEN 'agreed' IN (SELECT state FROM rounds WHERE id IN (OLD.round_id, NEW.round_id))
        BEGIN SELECT RAISE(ABORT, 'an agreed round never changes'); END""",
    """CREATE TRIGGER agreed_file_delete BEFORE DELETE ON files
        WHEN (SELECT state FROM rounds WHERE id = OLD.round_id) = 'agreed'
        BEGIN SELECT RAISE(ABORT, 'an agreed round never changes'); END""",
    """CREATE TRIGGER pack_file_update BEFORE UPDATE ON pack_files
        BEGIN SELECT RAISE(ABORT, 'a pack that was sent never changes'); END""",
    """CREATE TRIGGER pack_file_delete BEFORE DELETE ON pack_files
        BEGIN SELECT RAISE(ABORT, 'a pack that was sent never changes'); END""",
)

MIGRATIONS: tuple[tuple[str, tuple[str, ...]], ...] = (
    ("0001_rounds_files_packs", _ROUNDS_FILES_PACKS),
)
"""Name and statements of every migration, oldest first."""


def applied(connection: sa.Connection) -> list[str]:
    """Names of the migrations a ledger has, oldest first; none for an empty database."""
    if not sa.inspect(connection).has_table("migrations"):
        return []
    return list(connection.scalars(sa.select(tables.migrations.c.name).order_by(tables.migrations.c.name)))


def pending(connection: sa.Connection, where: str) -> list[str]:
    """Names of the migrations a ledger lacks.

    Raises
    ------
    LedgerError
        when the ledger has one that this program does not know.
    """
    known = [name for name, _ in MIGRATIONS]
    had = applied(connection)
    strange = [name for name in had if name not in known]
    if strange:
        raise LedgerError(
            f"the ledger was written by a newer foredeck (it has {', '.join(strange)})", where=where,
            allowed=f"ledgers up to {known[-1]}", do="install the version of foredeck that wrote it")
    return [name for name in known if name not in had]


def migrate(connection: sa.Connection, where: str) -> list[str]:
    """Apply what is lacking, within the caller's transaction; returns the names applied."""
    lacking = pending(connection, where)
    if lacking:
        tables.migrations.create(connection, checkfirst=True)
    for name, statements in MIGRATIONS:
        if name not in lacking:
            continue
        for statement in statements:
            connection.exec_driver_sql(statement)
        connection.execute(tables.migrations.insert().values(
            name=name, applied_at=datetime.now(UTC).isoformat(timespec="seconds")))
    return lacking


def guards() -> dict[str, str]:
    """Every trigger the ledger must have, by name, as written."""
    found = {}
    for _, statements in MIGRATIONS:
        for statement in statements:
            if statement.startswith("CREATE TRIGGER "):
                found[statement.split()[2]] = statement
    return found
