"""From a table in long or wide layout to rows: a series, a date and a value each."""

from __future__ import annotations

import datetime as dt
import difflib
import re
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from foredeck.errors import IntakeError, PeriodError
from foredeck.intake.cells import Cells, encode, text_of
from foredeck.intake.numbers import Kind, read_numbers

Codes = NDArray[np.intp]

RESERVED = ("series", "unit", "unit_value")
"""Names that a kind of group cannot have: a round's tables hold something else there."""


@dataclass(frozen=True)
class Rows:
    """Values in the order of the file, one for each series and date.

    Parameters
    ----------
    file : str
        Name of the file.
    names : list of str
        Distinct names of series, in the order of the file.
    series : array of int, shape (n,)
        For each value, the position of its series in `names`.
    date_cells : list
        Distinct cells of dates: texts, or dates.
    dates : array of int, shape (n,)
        For each value, the position of its date in `date_cells`.
    values : sequence, length n
        Cells of values as they stand.
    groups : mapping of str to list of str
        For each kind of group, the group of each series of `names`.
    unit_values : array, shape (n,)
        Money for one unit; NaN where none is given.
    place, date_place : functions of int
        Where the value of a row, or a distinct date, stands in the file.
    notes, ignored
        What else was understood, and what was left out.
    """

    file: str
    names: list[str]
    series: Codes
    date_cells: list[Any]
    dates: Codes
    values: Sequence[Any]
    groups: Mapping[str, list[str]]
    unit_values: NDArray[np.float64]
    place: Callable[[int], str]
    date_place: Callable[[int], str]
    notes: tuple[str, ...] = ()
    ignored: tuple[tuple[int, str], ...] = ()


def long_rows(cells: Cells, series: Sequence[str], period: str, value: str, groups: Sequence[str],
              unit_value: str | None, decimal: str) -> Rows:
    """Take rows from a table with one row a series and period.

    Raises
    ------
    IntakeError
        if a column is missing or there twice, a key is blank, a series has two groups of
        one kind, or a unit value is no number.
    """
    columns = _find_columns(cells, [*series, *groups, period, value, *([unit_value] if unit_value else [])])
    names, codes = _series_of_rows(cells, series, columns)
    dates, date_cells = _encode_dates(columns[period])
    _, first = np.unique(dates, return_index=True)
    return Rows(
        cells.file, names, codes, date_cells, dates, columns[value], _groups(cells, groups, columns, codes),
        _unit_values(cells, columns, unit_value, decimal),
        place=lambda row: cells.place(row, value), date_place=lambda at: cells.place(int(first[at]), period))


def wide_rows(cells: Cells, series: Sequence[str], groups: Sequence[str], unit_value: str | None,
              decimal: str) -> Rows:
    """Take rows from a table with one row a series and one column a period.

    Every column that was not asked for and whose heading holds a digit is a period;
    headings without any digit are left out and named.

    Raises
    ------
    IntakeError
        as for `long_rows`, and if no column is a period.
    """
    columns = _find_columns(cells, [*series, *groups, *([unit_value] if unit_value else [])])
    names, codes = _series_of_rows(cells, series, columns)
    heads = [_date_cell(cell) for cell in cells.header]
    free = [at for at, head in enumerate(heads) if head not in columns]
    spans = [at for at in free if isinstance(heads[at], dt.date) or re.search("[0-9]", heads[at])]
    others = [repr(heads[at]) if heads[at] else "without a heading" for at in free if at not in spans]
    if not spans:
        raise PeriodError("no column is headed by a period", where=cells.file,
                          allowed="headings such as 2024-01", value=others,
                          do='check the headings, or read with layout = "long"')
    width, height = len(spans), len(codes)
    noun = "column that is no period" if len(others) == 1 else "columns that are no periods"
    dates, date_cells = _encode_dates([heads[at] for at in spans])
    values = [cell for row in zip(*(cells.columns[at] for at in spans), strict=True) for cell in row]
    first = {int(code): at for at, code in reversed(list(enumerate(dates)))}
    return Rows(
        cells.file, names, np.repeat(codes, width), date_cells, np.tile(dates, height), values,
        _groups(cells, groups, columns, codes),
        np.repeat(_unit_values(cells, columns, unit_value, decimal), width),
        place=lambda row: cells.place(row // width, text_of(heads[spans[row % width]])),
        date_place=lambda at: f"{cells.file} header, column {spans[first[at]] + 1}",
        notes=(f"{width:,} columns of periods",),
        ignored=((len(others), f"{noun}: {', '.join(others)}"),) if others else ())


def _date_cell(cell: Any) -> Any:
    """Leave dates as they are, without their time of day; everything else becomes text."""
    if isinstance(cell, dt.datetime):
        return cell.date()
    return cell if isinstance(cell, dt.date) else text_of(cell)


def _encode_dates(column: Sequence[Any]) -> tuple[Codes, list[Any]]:
    if not any(isinstance(cell, dt.date) for cell in column):
        return encode(column)
    seen: dict[Any, int] = {}
    return np.array([seen.setdefault(_date_cell(cell), len(seen)) for cell in column]), list(seen)


def _find_columns(cells: Cells, wanted: Sequence[str]) -> dict[str, Sequence[Any]]:
    heads = [text_of(head) for head in cells.header]
    for name in wanted:
        if name not in heads:
            near = difflib.get_close_matches(name, heads, n=1)
            raise IntakeError(f"there is no column {name!r}", where=cells.file,
                              allowed=", ".join(repr(head) for head in heads[:20] if head),
                              do=f"did you mean {near[0]!r}?" if near else
                              "use one of these names, or give the delimiter if they run together",
                              value=name, nearest=near)
        if heads.count(name) > 1:
            raise IntakeError(f"{heads.count(name)} columns are headed {name!r}", where=cells.file,
                              allowed="one column of that name", do="rename the others", value=name)
    return {name: cells.columns[heads.index(name)] for name in wanted}


def _series_of_rows(cells: Cells, series: Sequence[str],
                    columns: Mapping[str, Sequence[Any]]) -> tuple[list[str], Codes]:
    """Name the series of each row: the texts of its key columns, joined by "/"."""
    encoded = [encode(columns[name]) for name in series]
    for name, (codes, texts) in zip(series, encoded, strict=True):
        if "" in texts:
            raise IntakeError("the row does not say which series it belongs to",
                              where=cells.place(int(np.argmax(codes == texts.index(""))), name),
                              allowed="a text in every key column", do="fill in the key or take out the row")
    whole = np.zeros(len(cells.lines), dtype=np.int64)
    for codes, texts in encoded:
        # Numbered anew after each column, so that the product of many columns cannot overflow.
        _, whole = np.unique(whole * len(texts) + codes, return_inverse=True)
    _, first, whole = np.unique(whole, return_index=True, return_inverse=True)
    rank = np.empty(len(first), dtype=np.intp)
    rank[np.argsort(first)] = np.arange(len(first))
    parts_of: dict[str, tuple[str, ...]] = {}
    for row in sorted(int(at) for at in first):
        parts = tuple(texts[codes[row]] for codes, texts in encoded)
        name = "/".join(parts)
        if parts_of.setdefault(name, parts) != parts:
            raise IntakeError(f"two series are named {name!r}: {parts_of[name]} and {parts}",
                              where=cells.place(row), allowed='keys that stay apart when joined by "/"',
                              do='take the "/" out of the keys', value=name)
    return list(parts_of), rank[whole]


def _groups(cells: Cells, groups: Sequence[str], columns: Mapping[str, Sequence[Any]],
            codes: Codes) -> dict[str, list[str]]:
    found: dict[str, list[str]] = {}
    _, first = np.unique(codes, return_index=True)
    for column in groups:
        if column in RESERVED:
            raise IntakeError(f"a kind of group cannot be named {column!r}", where=cells.file,
                              allowed=f"any name but {', '.join(RESERVED)}", do="rename the column",
                              value=column)
        group, texts = encode(columns[column])
        differs = group != group[first][codes]
        if differs.any():
            at = int(np.argmax(differs))
            before = int(first[codes[at]])
            raise IntakeError(f"a series is in two groups of {column}: {texts[group[before]]!r} and "
                              f"{texts[group[at]]!r}", where=f"{cells.place(before)} and {cells.place(at)}",
                              allowed="the same group in every row of a series",
                              do="correct the group, or make it part of the series")
        found[column] = [texts[code] for code in group[first]]
    return found


def _unit_values(cells: Cells, columns: Mapping[str, Sequence[Any]], name: str | None,
                 decimal: str) -> NDArray[np.float64]:
    if name is None:
        return np.full(len(cells.lines), np.nan)
    values, kinds = read_numbers(columns[name], decimal)
    wrong = np.flatnonzero(kinds == Kind.NO_NUMBER)
    if len(wrong):
        at = int(wrong[0])
        raise IntakeError(f"the unit value {text_of(columns[name][at])!r} is not a number",
                          where=cells.place(at, name), allowed="a plain number, or nothing",
                          do="correct the unit value")
    return values
