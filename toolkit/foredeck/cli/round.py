"""`foredeck round` and `foredeck render`."""

from __future__ import annotations

from pathlib import Path

import typer

from foredeck.cli.progress import progress
from foredeck.rounds.states import Outcome, render_round, run_round
from foredeck.settings.file import load_settings
from foredeck.smoothing.catalogue import METHODS


def run(settings_path: Path, period: str) -> int:
    """Run a round; the last line printed is the path of the pack's cover."""
    settings = load_settings(settings_path, methods=METHODS)
    with progress() as tell:
        outcome = run_round(settings, period, tell)
    return _told(outcome)


def render_again(settings_path: Path, name: str) -> int:
    """Make a recorded round's pack again."""
    settings = load_settings(settings_path, methods=METHODS)
    with progress() as tell:
        outcome = render_round(settings, name, tell)
    return _told(outcome)


def _told(outcome: Outcome) -> int:
    for line in outcome.lines:
        typer.echo(line)
    typer.echo(str(outcome.cover))
    return outcome.exit_code
