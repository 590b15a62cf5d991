"""Accessible HTML tables from data frames: every cell escaped, every head with its scope."""

from __future__ import annotations

from collections.abc import Callable, Collection, Sequence
from dataclasses import dataclass
from html import escape
from typing import Any

import pandas as pd

from foredeck.errors import ShapeError


@dataclass(frozen=True)
class Cell:
    """Text with a form.

    Parameters
    ----------
    text : str
        Plain text; a line feed becomes a line break.
    narrow : str
        What a phone shows instead; empty for the same text.
    css : str
        Class of the cell, beside its column's.
    tag : str
        "up", "down" or "box": the text becomes a marked word. Empty for plain text.
    mark : str
        A sign set after the text, outside the column's alignment, such as "□".
    """

    text: str
    narrow: str = ""
    css: str = ""
    tag: str = ""
    mark: str = ""

    def html(self) -> str:
        """Return the cell's content."""
        inner = escape(self.text).replace("\n", "<br>")
        if self.narrow and self.narrow != self.text:
            inner = f'<span class="ww">{inner}</span><span class="nw">{escape(self.narrow)}</span>'
        if self.tag:
            inner = f'<span class="tag {escape(self.tag)}">{inner}</span>'
        return inner + (f'<span class="mk">{escape(self.mark)}</span>' if self.mark else "")


def as_it_is(value: Any) -> str | Cell:
    """Write a value that is text or a cell already."""
    return value if isinstance(value, Cell) else str(value)


@dataclass(frozen=True)
class Column:
    """One column of a table.

    Parameters
    ----------
    name : str
        Column of the frame.
    head : str
        Its head; a line feed becomes a line break.
    write : function of a value, returning str or Cell
        How a value is written; missing values are passed to it too.
    css : str
        "n" for numbers (right-aligned), "txt" for words, "close" for the column after the close line,
        "f" for forecasts, "was" for what was said before.
    """

    name: str
    head: str
    write: Callable[[Any], str | Cell] = as_it_is
    css: str = ""

    @property
    def plain_head(self) -> str:
        """The head on one line, for the records that phones show."""
        return self.head.replace("\n", " ")


def table(frame: pd.DataFrame, columns: Sequence[Column], *, lead: str, rest: str = "", sums: Collection[int] = (),
          stack: bool = False) -> str:
    """Write a table.

    Parameters
    ----------
    frame : DataFrame
        One row of the table a row; an empty frame gives a table without rows.
    columns : sequence of Column
        The first one heads the rows.
    lead, rest : str
        The caption: its first words in bold, and the rest; plain text.
    sums : row numbers
        Rows set off as totals.
    stack : bool
        True for tables of words: on a phone every row becomes a record, one field a line.

    Returns
    -------
    str
        HTML: the table in a region that can be focused and scrolled.

    Raises
    ------
    ShapeError
        if the frame lacks a column.
    """
    lacking = [c.name for c in columns if c.name not in frame.columns]
    if lacking:
        raise ShapeError(f"the table {lead!r} lacks {', '.join(lacking)}", allowed=", ".join(map(str, frame.columns)),
                         do="give the frame these columns", columns=lacking)
    role = _named_role if stack else _no_role
    heads = "".join(f'<th scope="col"{role("columnheader")}{_class(c.css)}>{Cell(c.head).html()}</th>'
                    for c in columns)
    values = frame[[c.name for c in columns]].to_dict("split", index=False)["data"]
    rows = "".join(_row(row, columns, role, total=k in sums, stack=stack) for k, row in enumerate(values))
    caption = f"<b>{escape(lead)}</b> {escape(rest)}".strip()
    form = ' class="stack" role="table"' if stack else ""
    return (f'<div class="wrap" role="region" tabindex="0" aria-label="{escape(lead)}"><table{form}>'
            f'<caption>{caption}</caption><thead{role("rowgroup")}><tr{role("row")}>{heads}</tr></thead>'
            f'<tbody{role("rowgroup")}>{rows}</tbody></table></div>')


def _named_role(name: str) -> str:
    """A table whose parts are displayed as blocks loses its roles unless they are written out."""
    return f' role="{name}"'


def _no_role(name: str) -> str:
    return ""


def _row(row: Sequence[Any], columns: Sequence[Column], role: Callable[[str], str], total: bool, stack: bool) -> str:
    cells = []
    for k, (value, column) in enumerate(zip(row, columns, strict=True)):
        written = column.write(value)
        cell = written if isinstance(written, Cell) else Cell(written)
        inner, css = cell.html(), _class(f"{column.css} {cell.css}".strip())
        if k == 0:
            cells.append(f'<th scope="row"{role("rowheader")}{css}>{inner}</th>')
        elif stack:
            inner = f"<span>{inner}</span>" if inner else ""
            cells.append(f'<td{role("cell")} data-l="{escape(column.plain_head)}"{css}>{inner}</td>')
        else:
            cells.append(f"<td{css}>{inner}</td>")
    return f'<tr{role("row")}{_class("sum") if total else ""}>{"".join(cells)}</tr>'


def _class(css: str) -> str:
    return f' class="{escape(css)}"' if css else ""


def pairs(items: Sequence[tuple[str, str]]) -> str:
    """Write names and what belongs to them, as a list of descriptions."""
    return '<dl class="pairs">' + "".join(
        f"<dt>{escape(name)}</dt><dd>{escape(text)}</dd>" for name, text in items) + "</dl>"
