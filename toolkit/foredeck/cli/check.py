"""`foredeck check`: what was understood of the data, and what is wrong with them."""

from __future__ import annotations

from pathlib import Path

import pandas as pd
import typer

from foredeck.checks.findings import find
from foredeck.intake.files import read_source
from foredeck.intake.history import History
from foredeck.periods import period_name
from foredeck.rounds.source import closing_of
from foredeck.settings.file import load_settings
from foredeck.smoothing.catalogue import METHODS

NEEDS_A_PERSON = 4


def print_findings(settings_path: Path) -> int:
    """Print findings, worst first: faults before queries, by value of the series.

    Returns
    -------
    int
        0 when there is no fault, 4 when there is one.
    """
    settings = load_settings(settings_path, methods=METHODS)
    history = read_source(settings)
    closing = closing_of(history, settings)
    for line in history.understood.lines():
        typer.echo(line)
    table = worst_first(history, closing, settings.forecast.nonnegative)
    faults = int((table["kind"] == "fault").sum())
    queries = len(table) - faults
    typer.echo(f"\nClosed up to {period_name(closing)}: {faults} fault{'' if faults == 1 else 's'}, "
               f"{queries} quer{'y' if queries == 1 else 'ies'} in {len(history)} series.")
    for row in table.itertuples():
        typer.echo(f"\n{row.kind:<6} {row.series}  {row.period}  {str(row.code).replace('_', ' ')}")
        typer.echo(f"       {row.evidence}\n       {row.remedy}")
    return NEEDS_A_PERSON if faults else 0


def worst_first(history: History, closing: pd.Period, nonnegative: bool) -> pd.DataFrame:
    """Findings of all series, faults first, then by the value of a mean period of the series."""
    known = history.up_to(closing)
    tables = []
    for series in known:
        found = find(series, closing, nonnegative=nonnegative)
        price = series.unit_value if pd.notna(series.unit_value) else 1.0
        size = float(pd.Series(series.values).abs().mean())
        tables.append(found.assign(stake=size * price))
    filled = [t for t in tables if len(t)] or tables[:1]
    table = pd.concat(filled, ignore_index=True)
    return table.sort_values(["kind", "stake", "series", "period"], ascending=[True, False, True, True],
                             ignore_index=True)

