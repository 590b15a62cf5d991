"""The ledger's tables in SQLite, as SQLAlchemy Core.

The text of `migrations` makes them; a test holds the two against each other.
Days and moments are ISO text, which sorts as it should in SQL.
"""

from __future__ import annotations

from sqlalchemy import Boolean, Column, ForeignKey, Integer, MetaData, Table, Text, UniqueConstraint

metadata = MetaData()

migrations = Table(
    "migrations", metadata,
    Column("name", Text, primary_key=True),
    Column("applied_at", Text, nullable=False),
)

rounds = Table(
    "rounds", metadata,
    Column("id", Integer, primary_key=True),
    Column("round", Text, nullable=False),
    Column("revision", Integer, nullable=False),
    Column("state", Text, nullable=False),
    Column("frequency", Text, nullable=False),
    Column("closing", Text, nullable=False),
    Column("closing_on", Text, nullable=False),
    Column("first_lead_ends", Text, nullable=False),
    Column("horizon", Integer, nullable=False),
    Column("levels", Text, nullable=False),
    Column("portfolio", Text, nullable=False),
    Column("made", Text, nullable=False),
    Column("settings_text", Text, nullable=False),
    Column("made_at", Text, nullable=False),
    Column("settings_fingerprint", Text, nullable=False),
    Column("data_fingerprint", Text, nullable=False),
    Column("previous_id", Integer, ForeignKey("rounds.id")),
    Column("reason", Text, nullable=False),
    Column("agreed_by", Text),
    Column("agreed_at", Text),
    Column("late", Boolean, nullable=False),
    Column("seal", Text, nullable=False),
    UniqueConstraint("round", "revision"),
)

files = Table(
    "files", metadata,
    Column("round_id", Integer, ForeignKey("rounds.id"), primary_key=True),
    Column("table_name", Text, primary_key=True),
    Column("path", Text, nullable=False),
    Column("sha256", Text, nullable=False),
    Column("bytes", Integer, nullable=False),
    Column("rows", Integer, nullable=False),
)

packs = Table(
    "packs", metadata,
    Column("id", Integer, primary_key=True),
    Column("round_id", Integer, ForeignKey("rounds.id"), nullable=False),
    Column("made_at", Text, nullable=False),
)

pack_files = Table(
    "pack_files", metadata,
    Column("pack_id", Integer, ForeignKey("packs.id"), primary_key=True),
    Column("path", Text, primary_key=True),
    Column("sha256", Text, nullable=False),
    Column("bytes", Integer, nullable=False),
)
