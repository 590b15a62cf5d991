"""The command `foredeck`: parses and calls, nothing else.

What a command needs is imported when it runs, so that `foredeck --help` stays quick.

Exit codes: 0 done; 1 something unforeseen; 2 the command or the settings are wrong;
3 the data cannot be read; 4 done, but something needs a person (a fault in the data, a
series that failed); 5 the ledger is busy or refuses; 6 a report could not be made.
"""

from __future__ import annotations

import sys
from pathlib import Path
from typing import Annotated

import typer

from foredeck import __version__
from foredeck.errors import ForedeckError

EXIT_CODES = """Exit codes: 0 done; 1 something unforeseen; 2 the command or the settings are wrong;
3 the data cannot be read; 4 done, but something needs a person (a fault in the data, a series that failed);
5 the ledger is busy or refuses; 6 a report could not be made."""

app = typer.Typer(no_args_is_help=True, add_completion=False, pretty_exceptions_enable=False,
                  help="The monthly forecast round: check the data, forecast, give ranges, publish, keep for good.",
                  epilog=EXIT_CODES)

SettingsOption = Annotated[Path, typer.Option("--settings", "-s", help="The settings file.", show_default=True)]
DEFAULT_SETTINGS = Path("settings.toml")


def _version(asked: bool) -> None:
    if asked:
        typer.echo(f"foredeck {__version__}")
        raise typer.Exit


@app.callback()
def _root(version: Annotated[bool, typer.Option("--version", callback=_version, is_eager=True,
                                                help="Print the version and stop.")] = False) -> None:
    pass


@app.command()
def start(folder: Annotated[Path, typer.Argument(help="The folder to make; it must be new or empty.")]) -> None:
    """Make a working folder: settings to edit, and example data that run at once."""
    from foredeck.cli.start import make_folder

    make_folder(folder)


@app.command()
def check(settings: SettingsOption = DEFAULT_SETTINGS) -> None:
    """Read the data, say what was understood and what is wrong with it, worst first."""
    from foredeck.cli.check import print_findings

    raise typer.Exit(print_findings(settings))


@app.command("round")
def round_(settings: SettingsOption = DEFAULT_SETTINGS,
           period: Annotated[str, typer.Option(help="The last closed period, such as 2026-10; "
                                                    "found by the closing rule when not given.")] = "") -> None:
    """Run the round: forecast every series, record it in the ledger, publish the pack."""
    from foredeck.cli.round import run

    raise typer.Exit(run(settings, period))


@app.command()
def agree(name: Annotated[str, typer.Argument(metavar="ROUND", help="The round, such as 2026-10.")],
          by: Annotated[str, typer.Option(help="Who agrees; printed in the reports.")],
          settings: SettingsOption = DEFAULT_SETTINGS) -> None:
    """Agree on an issued round: from then on it never changes."""
    from foredeck.cli.agree import agree_on

    agree_on(settings, name, by)


@app.command()
def render(name: Annotated[str, typer.Argument(metavar="ROUND", help="The round, such as 2026-10.")],
           settings: SettingsOption = DEFAULT_SETTINGS) -> None:
    """Make the pack of a recorded round again, from the ledger."""
    from foredeck.cli.round import render_again

    raise typer.Exit(render_again(settings, name))


@app.command()
def explore(series: Annotated[str, typer.Argument(help="The series, such as north/compost.")],
            settings: SettingsOption = DEFAULT_SETTINGS) -> None:
    """Make a notebook about one series, filled in and ready to go on with in Jupyter."""
    from foredeck.cli.explore import make_notebook

    make_notebook(settings, series)


def main() -> None:
    """Run the command line; a known error is printed and becomes its exit code."""
    try:
        app()
    except ForedeckError as error:
        typer.echo(f"foredeck: {error}", err=True)
        sys.exit(error.exit_code)
    except KeyboardInterrupt:
        typer.echo("foredeck: stopped; what was recorded is whole, and the same command goes on", err=True)
        sys.exit(130)
