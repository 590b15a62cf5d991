"""Figures to hold a forecast against: a budget or target from a file."""

from __future__ import annotations

import csv
import math
from collections.abc import Iterator, Sequence
from pathlib import Path

import pandas as pd

from foredeck.errors import IntakeError, PeriodError
from foredeck.periods import frequency_of_text

_COLUMNS = ["name", "series", "period", "value"]


def read_comparison(path: str | Path, name: str, *, series: str | Sequence[str] = "series",
                    period: str = "period", value: str = "value") -> pd.DataFrame:
    """Read named figures, such as a budget, from a CSV file.

    Parameters
    ----------
    path : str or Path
        UTF-8, with a heading row. Columns that are not asked for are left alone.
    name : str
        What the figures are called on pages: "budget".
    series : str or list of str
        The column that names the series, or several whose texts are joined by "/".
    period, value : str
        Their columns; periods as text such as 2026-10, values as plain numbers.

    Returns
    -------
    DataFrame[name, series, period, value]
        sorted by series and period.

    Raises
    ------
    IntakeError
        naming the line: a column that is lacking, a value that is no number, a period that
        is none or of another frequency, a figure given twice.
    """
    place = Path(path)
    keys = [series] if isinstance(series, str) else list(series)
    rows: dict[tuple[str, str], tuple[float, str]] = {}
    frequency = None
    for where, row in _lines(place, [*keys, period, value]):
        named, at = "/".join(row[key] for key in keys), row[period]
        try:
            found = frequency_of_text(at)
        except PeriodError as fault:
            raise IntakeError(fault.what, where=where, allowed=fault.allowed, do=fault.do) from fault
        frequency = frequency or found
        if found is not frequency:
            raise IntakeError(f"the period {at!r} is {found.value}, those before are {frequency.value}",
                              where=where, allowed="one frequency in a file", do="correct the period")
        if (named, at) in rows:
            raise IntakeError(f"{named!r} has a second figure for {at}; the first is in {rows[named, at][1]}",
                              where=where, allowed="one figure a series and period",
                              do="remove one of the two")
        rows[named, at] = _number(row[value], where), where
    figures = [(name, named, at, figure) for (named, at), (figure, _) in rows.items()]
    frame = pd.DataFrame(figures, columns=_COLUMNS)
    frame = frame.astype({"name": "str", "series": "str", "period": "str", "value": "float64"})
    return frame.sort_values(["series", "period"], ignore_index=True)


def _lines(place: Path, needed: Sequence[str]) -> Iterator[tuple[str, dict[str, str]]]:
    try:
        with place.open(encoding="utf-8-sig", newline="") as handle:
            reader = csv.DictReader(handle)
            heading = list(reader.fieldnames or [])
            for column in needed:
                if column not in heading:
                    raise IntakeError(f"{place.name} has no column {column!r}", where=f"{place.name} line 1",
                                      allowed=", ".join(heading) or "a heading row",
                                      do="correct the column's name")
            for row in reader:
                if None in row:  # an unquoted comma for thousands would silently cut the value short
                    raise IntakeError("the row has more fields than the heading",
                                      where=f"{place.name} line {reader.line_num}",
                                      allowed="one field a column",
                                      do="write 1250, not 1,250; put quotation marks around text with commas")
                fields = {key: (row[key] or "").strip() for key in needed}
                yield f"{place.name} line {reader.line_num}", fields
    except FileNotFoundError as fault:
        raise IntakeError(f"there is no file {place.name}", where=str(place), allowed="a CSV file",
                          do="correct the path, or leave the setting out") from fault
    except UnicodeDecodeError as fault:
        raise IntakeError(f"{place.name} is not UTF-8 text", where=f"{place}, byte {fault.start}",
                          allowed="CSV in UTF-8", do="save the file as CSV in UTF-8") from fault


def _number(text: str, where: str) -> float:
    try:
        figure = float(text)
    except ValueError:
        figure = math.nan
    if not math.isfinite(figure):
        raise IntakeError(f"{text!r} is no number", where=where,
                          allowed="a plain number such as 1250 or 17.5",
                          do="correct the value, or remove the row")
    return figure
