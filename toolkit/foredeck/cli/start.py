"""`foredeck start`: a working folder."""

from __future__ import annotations

import shutil
from pathlib import Path

import typer

from foredeck.assets import example_folder
from foredeck.errors import SettingsError

TAKEN = ("settings.toml", "actuals.csv", "budget.csv", "adjustments.csv", "earlier_forecasts.csv")


def make_folder(folder: Path) -> None:
    """Copy settings and example data into a new or empty folder.

    Raises
    ------
    SettingsError
        if the folder holds anything: nothing of the user's is ever overwritten.
    """
    if folder.exists() and (not folder.is_dir() or any(folder.iterdir())):
        raise SettingsError(f"{folder} is not empty", allowed="a new or an empty folder",
                            do="name another folder; nothing was written")
    folder.mkdir(parents=True, exist_ok=True)
    for name in TAKEN:
        shutil.copyfile(example_folder() / name, folder / name)
    typer.echo(f"{folder} is ready. It holds example data; put your own actuals in its place and edit settings.toml.")
    typer.echo(f"Next: foredeck check --settings {folder / 'settings.toml'}")
