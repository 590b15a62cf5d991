"""From rows to the history: one value a series and period, gaps filled as asked, faults noted."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from foredeck.errors import IntakeError, PeriodError
from foredeck.intake.cells import text_of
from foredeck.intake.dates import Dates
from foredeck.intake.history import FAULT_COLUMNS, no_faults
from foredeck.intake.layout import Rows
from foredeck.intake.numbers import Kind, read_numbers
from foredeck.periods import Frequency, period_name

Integers = NDArray[np.int64]


@dataclass(frozen=True)
class Assembled:
    """The tables of a history, and the series that hold no value at all."""

    actuals: pd.DataFrame
    series: pd.DataFrame
    faults: pd.DataFrame
    without_value: list[str]
    blank: int


@dataclass(frozen=True)
class _Grid:
    """One cell for each series and period that has rows, sorted; `rows` lists rows by cell."""

    series: Integers
    steps: Integers
    starts: Integers
    rows: Integers

    def rows_of(self, cell: int) -> Integers:
        stop = self.starts[cell + 1] if cell + 1 < len(self.starts) else len(self.rows)
        return self.rows[self.starts[cell]:stop]


def assemble(rows: Rows, dates: Dates, periods: Sequence[pd.Period], frequency: Frequency, *, unit: str,
             gaps: Literal["missing", "zero"], sum_rows: bool, decimal: str) -> Assembled:
    """Put rows into order, a value for every period from a series' first value to its last.

    A blank before the first or after the last value of a series is no value: a series
    ends where it was last reported, also when gaps are zero, so that a depot that did
    not send its month is missed and not taken for nought.

    Parameters
    ----------
    rows : Rows
    dates : Dates
        The readings of `rows.date_cells`.
    periods : sequence of pandas.Period
        The period of each reading.
    frequency : Frequency
    unit : str
    gaps : "missing" or "zero"
        What a period without a row, or with a blank or "-", means between two values.
        A cell that says "n/a", or holds no number, is missing in both cases.
    sum_rows : bool
        Add up rows of one series and period; a sum with a part that is no number is missing.
    decimal : "." or ","

    Raises
    ------
    IntakeError
        if no cell holds a number.
    PeriodError
        if a series has several dates in one period and rows are not summed.
    """
    values, kinds = read_numbers(rows.values, decimal)
    if not (kinds == Kind.NUMBER).any():
        raise _nothing_read(rows, kinds, decimal)
    date_steps = np.array([period.ordinal for period in periods], dtype=np.int64)
    grid = _sorted(rows, date_steps)
    if not sum_rows:
        _check_one_date(rows, dates, periods, grid)
    cell_values, cell_kinds, duplicates = _one_value(grid, values, kinds, sum_rows)
    names = pd.Index(rows.names)
    order = np.argsort(names.to_numpy(dtype=object))
    actuals, missing = _complete(grid, cell_values, cell_kinds, rows.names, order, frequency, gaps)
    faults = [_not_a_number(rows, periods, int(row)) for row in np.flatnonzero(kinds == Kind.NO_NUMBER)]
    faults += [_duplicate(rows, periods, grid, cell, values, kinds) for cell in duplicates]
    table = pd.DataFrame(faults, columns=list(FAULT_COLUMNS), dtype="str") if faults else no_faults()
    series = _series_table(rows, grid, unit).iloc[order]
    return Assembled(actuals, series[~series.index.isin(missing)],
                     table.sort_values(["series", "period"], kind="stable", ignore_index=True), missing,
                     int((kinds == Kind.BLANK).sum() + (kinds == Kind.NOT_KNOWN).sum()))


def _sorted(rows: Rows, date_steps: Integers) -> _Grid:
    steps = date_steps[rows.dates]
    order = np.lexsort((steps, rows.series))  # stable: rows of one cell stay in the order of the file
    series, steps = rows.series[order].astype(np.int64), steps[order]
    begins = np.ones(len(order), dtype=bool)
    begins[1:] = (np.diff(series) != 0) | (np.diff(steps) != 0)
    starts = np.flatnonzero(begins)
    return _Grid(series[starts], steps[starts], starts, order)


def _check_one_date(rows: Rows, dates: Dates, periods: Sequence[pd.Period], grid: _Grid) -> None:
    """Refuse daily rows that nobody said to add up: keeping the last would lose the others unseen."""
    _, reading = np.unique(np.array(dates.readings), axis=0, return_inverse=True)
    read = reading.ravel()[rows.dates][grid.rows]
    least, most = np.minimum.reduceat(read, grid.starts), np.maximum.reduceat(read, grid.starts)
    if (least != most).any():
        cell = int(np.argmax(least != most))
        here = grid.rows_of(cell)
        other = next(row for row in here if reading.ravel()[rows.dates[row]] != read[grid.starts[cell]])
        period = periods[rows.dates[other]]
        raise PeriodError(
            f"series {rows.names[grid.series[cell]]!r} has several dates in {period_name(period)}: "
            f"{rows.date_cells[rows.dates[here[0]]]} and {rows.date_cells[rows.dates[other]]}",
            where=f"{rows.place(int(here[0]))} and {rows.place(int(other))}",
            allowed="one date for each series and period", do="set sum_rows = true to add the rows up")


def _one_value(grid: _Grid, values: NDArray[np.float64], kinds: NDArray[np.int8],
               sum_rows: bool) -> tuple[NDArray[np.float64], NDArray[np.int8], list[int]]:
    """Make one value of the rows of each cell: their sum, or the last that is not blank."""
    cell_values, cell_kinds = values[grid.rows[grid.starts]], kinds[grid.rows[grid.starts]]
    counts = np.diff(grid.starts, append=len(grid.rows))
    duplicates = []
    for cell in np.flatnonzero(counts > 1):
        here = grid.rows_of(int(cell))
        filled = here[kinds[here] != Kind.BLANK]
        if not sum_rows and len(filled) > 1:
            duplicates.append(int(cell))
        if not len(filled):
            continue
        if sum_rows:
            cell_values[cell], cell_kinds[cell] = values[filled].sum(), kinds[filled].max()
        else:
            cell_values[cell], cell_kinds[cell] = values[filled[-1]], kinds[filled[-1]]
    return cell_values, cell_kinds, duplicates


def _complete(grid: _Grid, values: NDArray[np.float64], kinds: NDArray[np.int8], names: list[str],
              order: NDArray[np.intp], frequency: Frequency,
              gaps: Literal["missing", "zero"]) -> tuple[pd.DataFrame, list[str]]:
    """Lay the cells of each series on every period from its first to its last that says something."""
    rank = np.empty_like(order)
    rank[order] = np.arange(len(order))
    says = (kinds == Kind.NUMBER) | (kinds == Kind.NO_NUMBER)
    first = np.full(len(names), np.iinfo(np.int64).max)
    last = np.full(len(names), np.iinfo(np.int64).min)
    np.minimum.at(first, rank[grid.series[says]], grid.steps[says])
    np.maximum.at(last, rank[grid.series[says]], grid.steps[says])
    begun = last >= first
    lengths = np.where(begun, last - first + 1, 0)
    offsets = np.cumsum(lengths) - lengths
    total = int(lengths.sum())
    steps = np.arange(total) - np.repeat(offsets - first * begun, lengths)
    filled = np.full(total, 0.0 if gaps == "zero" else np.nan)
    ranks = rank[grid.series]
    kept = (kinds != Kind.BLANK) & (grid.steps >= first[ranks]) & (grid.steps <= last[ranks])
    filled[(offsets[ranks] + grid.steps - first[ranks])[kept]] = values[kept]
    by_rank = np.array(names, dtype=object)[order]
    actuals = pd.DataFrame({
        "series": pd.Series(np.repeat(by_rank, lengths), dtype="str"),
        "period": pd.PeriodIndex.from_ordinals(  # type: ignore[attr-defined]  # missing in the stubs
            steps, freq=frequency.pandas_code),
        "value": filled})
    return actuals, [str(name) for name in by_rank[~begun]]


def _series_table(rows: Rows, grid: _Grid, unit: str) -> pd.DataFrame:
    unit_values = np.full(len(rows.names), np.nan)
    given = grid.rows[np.isfinite(rows.unit_values[grid.rows])]
    unit_values[rows.series[given]] = rows.unit_values[given]  # sorted by period: the last one stays
    table = pd.DataFrame({column: pd.Series(groups, dtype="str") for column, groups in rows.groups.items()},
                         index=range(len(rows.names)))
    table["unit"], table["unit_value"] = pd.Series([unit] * len(rows.names), dtype="str"), unit_values
    return table.set_index(pd.Index(rows.names, name="series", dtype="str"))


def _nothing_read(rows: Rows, kinds: NDArray[np.int8], decimal: str) -> IntakeError:
    wrong = np.flatnonzero(kinds == Kind.NO_NUMBER)
    if not len(wrong):
        return IntakeError("the file holds no value", where=rows.place(0),
                           allowed="a number in at least one cell", do="check which column holds the values")
    at = int(wrong[0])
    other = "," if decimal == "." else "."
    return IntakeError(f"not one value is a number, the first is {text_of(rows.values[at])!r}",
                       where=rows.place(at), allowed=f'plain numbers with decimal mark "{decimal}"',
                       do=f'set decimal = "{other}" if decimals are written so, or choose another column',
                       value=text_of(rows.values[at]))


def _not_a_number(rows: Rows, periods: Sequence[pd.Period], row: int) -> tuple[str, ...]:
    raw = text_of(rows.values[row])
    return (rows.names[rows.series[row]], period_name(periods[rows.dates[row]]), "not_a_number", raw,
            rows.place(row), f"{raw!r} is not a number.",
            "Correct the cell; leave it blank if nothing is known.")


def _duplicate(rows: Rows, periods: Sequence[pd.Period], grid: _Grid, cell: int,
               values: NDArray[np.float64], kinds: NDArray[np.int8]) -> tuple[str, ...]:
    here = [int(row) for row in grid.rows_of(cell) if kinds[row] != Kind.BLANK]
    raws = [text_of(rows.values[row]) for row in here]
    places = [rows.place(row) for row in here]
    where = " and ".join([places[0], *(place.removeprefix(rows.file + " ") for place in places[1:])])
    same = len({values[row] if kinds[row] == Kind.NUMBER else raw
                for row, raw in zip(here, raws, strict=True)}) == 1
    evidence = f"{len(here)} rows hold {' and '.join(raws)}; " + (
        "they agree and count once." if same else "the last one is used.")
    return (rows.names[rows.series[here[0]]], period_name(periods[rows.dates[here[0]]]), "duplicate",
            " and ".join(raws), where, evidence, "Take out the wrong rows, or set sum_rows if they add up.")
