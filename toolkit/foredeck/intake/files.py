"""Reading a portfolio's actuals from a file."""

from __future__ import annotations

import difflib
from collections.abc import Sequence
from pathlib import Path
from typing import Any, Literal

from foredeck.errors import SettingsError
from foredeck.intake.assembly import Assembled, assemble
from foredeck.intake.cells import Cells, read_cells
from foredeck.intake.dates import DATE_CELLS, FORMATS, Dates, detect_frequency, read_dates, to_periods
from foredeck.intake.history import History, Understood
from foredeck.intake.layout import Rows, long_rows, wide_rows
from foredeck.periods import Frequency, period_name
from foredeck.settings.model import Settings


def read(
    source: str | Path,
    *,
    series: str | Sequence[str],
    period: str | None = None,
    value: str | None = None,
    layout: Literal["long", "wide"] = "long",
    groups: Sequence[str] | None = None,
    unit: str = "units",
    unit_value: str | None = None,
    frequency: Frequency | str | None = None,
    date_format: str | None = None,
    sheet: str | None = None,
    gaps: Literal["missing", "zero"] = "missing",
    sum_rows: bool = False,
    delimiter: str | None = None,
    decimal: Literal[".", ","] = ".",
) -> History:
    """Read the actuals of a portfolio.

    Keys are read as text: leading zeros stay, and "NA" is an id. A blank, "-" and "n/a"
    say that there is no value; anything else that is no plain number is missing and
    noted as a fault with its line.

    Parameters
    ----------
    source : str or Path
        A CSV, Excel or Parquet file.
    series : str or list of str
        The column that names a series, or several whose texts are joined by "/".
    period, value : str
        Columns of the date and the value; for the long layout only.
    layout : "long" or "wide"
        One row a series and period, or one row a series and one column a period.
    groups : list of str, optional
        Columns of groups to add series up by; without it, the columns that together
        name a series. Give an empty list for none.
    unit : str
        What the values count.
    unit_value : str, optional
        Column with the money for one unit; the latest of a series holds.
    frequency : Frequency or str, optional
        Detected from the dates when not given.
    date_format : str, optional
        One of the names in `dates.FORMATS`, for dates that could be read in two ways.
    sheet : str, optional
        Sheet of a workbook; the first when not given.
    gaps : "missing" or "zero"
        What a period without a row means between two values of a series.
    sum_rows : bool
        Add up the rows of a series and period, for daily rows and transactions.
    delimiter : str, optional
        Of a CSV file; found in its header when not given.
    decimal : "." or ","
        The decimal mark of numbers that are text.

    Returns
    -------
    History
        With `understood`, which says how the file was read, and `faults`.

    Raises
    ------
    IntakeError
        if the file cannot be read, or a column is missing.
    PeriodError
        if a date is wrong or can be read in two ways, or the frequency cannot be told.
    SettingsError
        if an argument is not one of those allowed.
    """
    _check_choices(layout=layout, gaps=gaps, decimal=decimal, frequency=frequency)
    path = Path(source)
    keys = [series] if isinstance(series, str) else list(series)
    kinds_of_group = list(groups) if groups is not None else (keys if len(keys) > 1 else [])
    cells = read_cells(path, sheet=sheet, delimiter=delimiter)
    if layout == "long":
        for name, column in (("period", period), ("value", value)):
            if column is None:
                raise SettingsError(f"the long layout needs the column of the {name}", where=str(path),
                                    allowed="the name of a column", do=f"give {name}", key=name)
        rows = long_rows(cells, keys, str(period), str(value), kinds_of_group, unit_value, decimal)
    else:
        rows = wide_rows(cells, keys, kinds_of_group, unit_value, decimal)
    dates = read_dates(rows.date_cells, rows.date_place, date_format)
    where = f"{cells.file}, column {period}" if layout == "long" else f"{cells.file} header"
    rhythm = Frequency(frequency) if frequency else detect_frequency(dates, where)
    periods = to_periods(dates, rhythm, where)
    made = assemble(rows, dates, periods, rhythm, unit=unit, gaps=gaps, sum_rows=sum_rows, decimal=decimal)
    understood = _understood(cells, layout, dates, rhythm, rows, made, pinned=frequency is not None)
    return History(rhythm, made.actuals, made.series, made.faults, understood)


def read_source(settings: Settings) -> History:
    """Read the actuals that the settings name.

    Raises
    ------
    IntakeError, PeriodError
        as `read` does.
    """
    source, columns, rules = settings.source, settings.columns, settings.series
    return read(source.file, series=columns.series, period=columns.period, value=columns.value,
                layout=source.layout, groups=columns.groups, unit=rules.unit, unit_value=columns.unit_value,
                frequency=rules.frequency, date_format=source.date_format, sheet=source.sheet,
                gaps=rules.gaps, sum_rows=source.sum_rows, delimiter=source.delimiter, decimal=source.decimal)


def _check_choices(**given: Any) -> None:
    choices = {"layout": ("long", "wide"), "gaps": ("missing", "zero"), "decimal": (".", ","),
               "frequency": (None, *(f.value for f in Frequency))}
    for name, value in given.items():
        if value not in choices[name]:
            texts = [choice for choice in choices[name] if choice is not None]
            near = difflib.get_close_matches(str(value), texts, n=1)
            raise SettingsError(f"{name} = {value!r} is not allowed", where=name,
                                allowed=", ".join(map(repr, texts)),
                                do=f"did you mean {near[0]!r}?" if near else "use one of these", value=value)


def _understood(cells: Cells, layout: str, dates: Dates, frequency: Frequency, rows: Rows,
                made: Assembled, *, pinned: bool) -> Understood:
    ignored = list(rows.ignored)
    if cells.blank_rows:
        ignored.append((cells.blank_rows, "blank row" if cells.blank_rows == 1 else "blank rows"))
    if made.without_value:
        ignored.append((len(made.without_value),
                        f"series without any value: {', '.join(made.without_value)}"))
    notes = list(rows.notes)
    if made.blank:
        notes.append(f"{made.blank:,} {'cell' if made.blank == 1 else 'cells'} without a value")
    notes.append("frequency as given" if pinned else "frequency detected from the dates")
    example = "" if dates.format == DATE_CELLS else f" ({FORMATS[dates.format].example})"
    return Understood(
        file=cells.file, format=cells.format, layout=layout, date_format=dates.format + example,
        frequency=frequency, first=period_name(made.actuals["period"].min()),
        last=period_name(made.actuals["period"].max()), n_series=len(made.series), rows_read=len(cells.lines),
        ignored=tuple(ignored), notes=tuple(notes))
