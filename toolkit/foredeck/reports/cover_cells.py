"""Cells of the cover's tables: links to reports, drawings, and the figures of one series."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from html import escape
from typing import Any
from urllib.parse import quote

import pandas as pd

from foredeck.tables.html import Cell


@dataclass(frozen=True)
class LinkCell(Cell):
    """Text that leads to another page of the pack; plain text without an address.

    `before` is plain text in front of the link, such as a rank.
    """

    href: str = ""
    before: str = ""

    def html(self) -> str:
        """Return the cell's content."""
        inner = super().html()
        if self.href:
            inner = f'<a href="{address(self.href)}">{inner}</a>'
        return f'<span class="rk n">{escape(self.before)}</span>{inner}' if self.before else inner


@dataclass(frozen=True)
class DrawnCell(Cell):
    """A drawing made by foredeck (not escaped), beside text for those who cannot see it."""

    drawing: str = ""

    def html(self) -> str:
        """Return the cell's content."""
        spoken = f'<span class="vh">{escape(self.text)}</span>' if self.text else ""
        return spoken + self.drawing


LONG = 28
"""Names with more letters may be broken; shorter ones stay on one line."""


LONGEST = 90
"""Most letters of a name on the page; the workbook and the data files hold it whole."""


def shown_name(name: str) -> str:
    """A name as the page shows it: on one line, and cut in its middle where it is very long."""
    plain = " ".join("".join(c if c.isprintable() else " " for c in name).split())
    return plain if len(plain) <= LONGEST else f"{plain[:LONGEST - 30]}…{plain[-29:]}"


def name_css(name: str) -> str:
    """Class of the cell of a name: long ones may be broken anywhere."""
    return "long" if len(name) > LONG else ""


def address(href: str) -> str:
    """Write an address inside the pack: signs that could leave the host or name a scheme are encoded."""
    return escape(quote(href.lstrip("/"), safe="/#._-~"))


def frame_of(rows: Sequence[Mapping[str, Any]], columns: Sequence[str]) -> pd.DataFrame:
    """Make a frame of cells, with its columns even where there are no rows."""
    return pd.DataFrame({name: pd.Series([row[name] for row in rows], dtype=object) for name in columns})


def as_is(value: Any) -> str | Cell:
    """Write a cell that was made before the table."""
    return value if isinstance(value, Cell) else str(value)


def marked(row: Mapping[str, Any], css: str) -> dict[str, Cell]:
    """The same row with a class on each of its cells."""
    cells = {name: value if isinstance(value, Cell) else Cell(str(value)) for name, value in row.items()}
    return {name: replace(cell, css=f"{cell.css} {css}".strip()) for name, cell in cells.items()}


def two_digits(value: float) -> float:
    """Round to two significant digits: a value at stake is an order of size, not a sum of money."""
    if not math.isfinite(value) or value == 0:
        return value
    power = 10.0 ** (math.floor(math.log10(abs(value))) - 1)
    return round(value / power) * power
