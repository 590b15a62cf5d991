"""The forecasts of a round as files for programs: Parquet and CSV."""

from __future__ import annotations

import csv
from collections.abc import Sequence
from pathlib import Path

import pandas as pd
import pyarrow as pa
import pyarrow.parquet as pq

from foredeck.errors import SettingsError
from foredeck.pack.sheets import forecast_table
from foredeck.studies import RoundView

FORMATS = ("parquet", "csv")


def write_forecasts(folder: Path, view: RoundView, formats: Sequence[str] = FORMATS) -> list[Path]:
    """Write `forecasts.parquet` and `forecasts.csv`.

    Both hold one row a series and period: `round`, `series`, the group columns, `unit`, `period`, `lead`,
    `baseline`, `adjustment`, `adjusted` and the edges of the ranges. Numbers are not rounded; missing ones
    are null in Parquet and empty in CSV. The files are for programs: names stand exactly as in the source,
    so a name that begins with `=` is a formula to a spreadsheet that opens the CSV. The workbook is the file
    for people.

    Parameters
    ----------
    folder : Path
        Existing folder; files of the same names are replaced.
    view : RoundView
        The round.
    formats : sequence of str
        Any of `FORMATS`.

    Returns
    -------
    list of Path
        The files written.

    Raises
    ------
    SettingsError
        for a format that is not among `FORMATS`.
    """
    wrong = [kind for kind in formats if kind not in FORMATS]
    if wrong:
        raise SettingsError(f"forecasts cannot be written as {wrong[0]!r}", allowed=", ".join(FORMATS),
                            do="name one of these")
    table = forecast_table(view)
    table.insert(0, "round", view.round)
    writers = {"parquet": _write_parquet, "csv": _write_csv}
    written = []
    for kind in dict.fromkeys(formats):
        path = folder / f"forecasts.{kind}"
        writers[kind](path, table, view)
        written.append(path)
    return written


def _write_parquet(path: Path, table: pd.DataFrame, view: RoundView) -> None:
    arrow = pa.Table.from_pandas(table, preserve_index=False)
    facts = {"round": view.round, "state": view.state, "closing": view.closing, "frequency": view.frequency,
             **{key: str(view.made[key]) for key in ("made_at", "settings_fingerprint", "data_fingerprint")
                if key in view.made}}
    metadata = {**(arrow.schema.metadata or {}), **{f"foredeck.{key}": text for key, text in facts.items()}}
    pq.write_table(arrow.replace_schema_metadata(metadata), path)


def _write_csv(path: Path, table: pd.DataFrame, view: RoundView) -> None:
    table.to_csv(path, index=False, quoting=csv.QUOTE_NONNUMERIC, lineterminator="\n", encoding="utf-8")
