"""`foredeck explore`: a notebook about one series."""

from __future__ import annotations

from pathlib import Path

import typer

from foredeck.assets import notebook_path
from foredeck.intake.files import read_source
from foredeck.pack.file_names import file_name
from foredeck.reports.execute import run_notebook
from foredeck.settings.file import load_settings


def make_notebook(settings_path: Path, series: str) -> None:
    """Run the exploring notebook on one series of the settings' source and say how to open it."""
    settings = load_settings(settings_path)
    history = read_source(settings)
    name = history[series].name  # an unknown series is refused here, with the nearest names
    folder = settings_path.parent / "explore"
    folder.mkdir(exist_ok=True)
    path = folder / file_name(name, ".ipynb")
    run_notebook(notebook_path("explore_series"), path, {"settings": str(settings_path.resolve()), "series": name})
    typer.echo(f"To go on with it: jupyter lab '{path}'")
    typer.echo(str(path))
