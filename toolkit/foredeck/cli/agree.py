"""`foredeck agree`."""

from __future__ import annotations

from pathlib import Path

import typer

from foredeck.ledger.store import open_ledger
from foredeck.settings.file import load_settings


def agree_on(settings_path: Path, name: str, by: str) -> None:
    """Agree on an issued round and say whether that was in time."""
    ledger = open_ledger(load_settings(settings_path).ledger.folder)
    record = ledger.agree(name, by=by)
    typer.echo(f"Round {record.name} is agreed by {record.agreed_by}; it will not change any more.")
    if record.late:
        typer.echo("Its first period had closed already, so it is marked late and will not be scored there.")
