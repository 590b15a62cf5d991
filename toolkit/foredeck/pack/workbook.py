"""The workbook of a round: every number of the pack in real Excel tables.

Names, notes and units come from other people's files. They are written as text
and nothing else: `=1+1` stays five letters, a web address stays an address.
"""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import xlsxwriter

from foredeck.pack.sheets import Sheet, sheets
from foredeck.reports.cover_record import cautions as standard_cautions
from foredeck.studies import RoundView

MOST_ROWS = 1_048_575
"""Rows of data on one sheet: Excel's limit of 1,048,576 less the heading; more go on to a further sheet."""
MOST_LETTERS = 32_767
"""Most letters in a cell (UTF-16 units, as Excel counts); longer text is cut and says so."""

_CUT = " [cut]"
_INK, _RULE = "#1B2230", "#6B7280"


def write_workbook(path: Path, view: RoundView, *, watch: pd.DataFrame,
                   cautions: Sequence[str] | None = None) -> Path:
    """Write the workbook of a round.

    The same round gives the same bytes: the creation date is that of the round, not of the writing.

    Parameters
    ----------
    path : Path
        File to write; an existing one is replaced.
    view : RoundView
        The round. Missing numbers become empty cells.
    watch : DataFrame
        The watch list, columns `rank`, `series`, `value_at_stake`, `reasons`, `ask`.
    cautions : sequence of str, optional
        Sentences for the sheet About; those that every pack carries when not given.

    Returns
    -------
    Path
        `path`.
    """
    options = {"strings_to_formulas": False, "strings_to_urls": False, "strings_to_numbers": False,
               "in_memory": True}
    with xlsxwriter.Workbook(str(path), options) as book:
        book.set_properties({"title": _text(view.title)[:255], "subject": f"Round {view.round}, {view.state}",
                             "created": _made_at(view)})
        formats = _Formats(book)
        warnings = standard_cautions(view.frequency) if cautions is None else cautions
        for sheet in sheets(view, watch, warnings):
            for number, part in enumerate(_parts(sheet.table), start=1):
                name = sheet.name if number == 1 else f"{sheet.name} {number}"
                _write_sheet(book, formats, name, sheet, part, f"Round {view.round}, {view.state}")
    return path


class _Formats:
    """The cell formats of a workbook, each made once."""

    def __init__(self, book: Any) -> None:
        base = {"font_name": "Calibri", "font_size": 11, "font_color": _INK, "valign": "top"}
        self.text = book.add_format(base)
        self.wrapped = book.add_format({**base, "text_wrap": True})
        self.share = book.add_format({**base, "num_format": "0%"})
        self.number = {places: book.add_format({**base, "num_format": pattern})
                       for places, pattern in enumerate(("#,##0", "#,##0.0", "#,##0.00"))}
        head = {**base, "bold": True, "bottom": 1, "border_color": _RULE, "text_wrap": True,
                "valign": "bottom"}
        self.head = {align: book.add_format({**head, "align": align}) for align in ("left", "right")}


def _parts(table: pd.DataFrame) -> list[pd.DataFrame]:
    """The table in pieces that a sheet can hold; an empty table is one piece."""
    return [table.iloc[start:start + MOST_ROWS] for start in range(0, max(len(table), 1), MOST_ROWS)]


def _write_sheet(book: Any, formats: _Formats, name: str, sheet: Sheet, table: pd.DataFrame,
                 foot: str) -> None:
    page = book.add_worksheet(name)
    page.freeze_panes(1, sheet.keys)
    page.hide_gridlines(2)
    page.set_landscape()
    page.set_paper(9)
    page.fit_to_pages(1, 0)
    page.repeat_rows(0)
    page.set_footer(f"&L{foot}: {name}&R&P of &N")
    columns = []
    for position, (head, column) in enumerate(zip(_heads(table.columns), table.columns, strict=True)):
        values = table.iloc[:, position]
        numeric = pd.api.types.is_numeric_dtype(values) and not pd.api.types.is_bool_dtype(values)
        if numeric:
            style = formats.share if column in sheet.shares else formats.number[_places(values)]
            _write_numbers(page, position, values, style)
            width = _number_width(head, values)
        else:
            texts = [_text(value) for value in values]
            width = _text_width(head, texts)
            _write_texts(page, position, texts, formats.wrapped if width == _WIDEST else formats.text)
        page.set_column(position, position, width)
        columns.append({"header": head, "header_format": formats.head["right" if numeric else "left"]})
    page.add_table(0, 0, max(len(table), 1), len(table.columns) - 1,
                   {"name": re.sub(r"\W", "_", f"foredeck_{name}"), "columns": columns, "style": None,
                    "banded_rows": False})
    page.set_row(0, 32)


def _write_numbers(page: Any, position: int, values: pd.Series, style: Any) -> None:
    for row, value in enumerate(values.to_numpy(dtype=float, na_value=np.nan), start=1):
        if math.isfinite(value):
            page.write_number(row, position, value, style)
        else:
            page.write_blank(row, position, None, style)


def _write_texts(page: Any, position: int, texts: Sequence[str], style: Any) -> None:
    for row, text in enumerate(texts, start=1):
        if text:
            page.write_string(row, position, text, style)
        else:
            page.write_blank(row, position, None, style)


def _heads(columns: Sequence[str] | pd.Index) -> list[str]:
    """Headings that Excel accepts: one line, at most 255 letters, none empty, none twice (in any case)."""
    heads: list[str] = []
    taken: set[str] = set()
    for column in columns:
        base = " ".join(re.sub(r"[\x00-\x1f\x7f]", " ", _text(column)).split())[:240] or "column"
        head, number = base, 1
        while head.casefold() in taken:
            number += 1
            head = f"{base} ({number})"
        taken.add(head.casefold())
        heads.append(head)
    return heads


def _text(value: object) -> str:
    """The text of a cell: yes and no for truth, nothing for missing, cut to what a cell can hold."""
    if isinstance(value, bool | np.bool_):
        return "yes" if value else "no"
    if value is None or value is pd.NA or (isinstance(value, float) and math.isnan(value)):
        return ""
    units = str(value).encode("utf-16-le", "replace")
    if len(units) <= 2 * MOST_LETTERS:
        return units.decode("utf-16-le")
    return units[:2 * (MOST_LETTERS - len(_CUT))].decode("utf-16-le", "ignore") + _CUT


def _places(values: pd.Series) -> int:
    """Decimals to show: none for whole numbers or sizes of 100 and more, else one or two."""
    known = values.dropna().to_numpy(dtype=float)
    known = known[np.isfinite(known)]
    if not known.size or (known == np.round(known)).all():
        return 0
    size = float(np.median(np.abs(known)))
    return 0 if size >= 100 else 1 if size >= 10 else 2


_WIDEST = 60.0
_NARROWEST = 9.0


def _text_width(head: str, texts: Sequence[str]) -> float:
    longest = max((len(text) for text in texts), default=0)
    return min(_WIDEST, max(_NARROWEST, longest + 2.0, min(len(head), 12) + 4.0))


def _number_width(head: str, values: pd.Series) -> float:
    largest = float(values.abs().max()) if values.notna().any() else 0.0
    digits = len(f"{largest:,.0f}") + 4 if math.isfinite(largest) else 0
    return max(11.0, float(digits), max((len(word) for word in head.split()), default=0) + 4.0)


def _made_at(view: RoundView) -> datetime:
    """When the round was made; the epoch of spreadsheets where the round does not say."""
    try:
        made = datetime.fromisoformat(str(view.made["made_at"]))
    except (KeyError, ValueError):
        return datetime(1980, 1, 1)
    return made.astimezone(UTC).replace(tzinfo=None) if made.tzinfo else made
