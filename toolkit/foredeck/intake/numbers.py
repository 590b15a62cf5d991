"""What a cell of the value column says: a number, nothing, or something that is no number.

Only plain numbers count. A thousands mark, a currency sign or a decimal comma that
was not announced makes a fault, never another number.
"""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from enum import IntEnum
from typing import Any

import numpy as np
from numpy.typing import NDArray

_PLAIN = {mark: re.compile(rf"[+-]?(?:[0-9]+(?:[{mark}][0-9]*)?|[{mark}][0-9]+)(?:[eE][+-]?[0-9]{{1,3}})?")
          for mark in ".,"}


class Kind(IntEnum):
    """What stands in a cell."""

    NUMBER = 0
    BLANK = 1
    """Nothing, or "-"."""
    NOT_KNOWN = 2
    """"n/a": somebody says that there is no value."""
    NO_NUMBER = 3
    """Anything else: a fault."""


def read_numbers(cells: Sequence[Any], decimal: str = ".") -> tuple[NDArray[np.float64], NDArray[np.int8]]:
    """Read cells as numbers.

    Parameters
    ----------
    cells : sequence, length n
        Texts, or the typed cells of a workbook or of Parquet.
    decimal : "." or ","
        The mark before the decimals in texts; numbers that are typed do not need it.

    Returns
    -------
    values : array, shape (n,)
        NaN where there is no number.
    kinds : array, shape (n,)
        A `Kind` for each cell.
    """
    if set(map(type, cells)) <= {str}:
        read = {cell: _number_of_text(cell.strip(), decimal) for cell in dict.fromkeys(cells)}
        numbers = {cell: value for cell, (value, _) in read.items()}
        values = np.fromiter(map(numbers.__getitem__, cells), dtype=float, count=len(cells))
        kinds = np.zeros(len(cells), dtype=np.int8)
        for at in map(int, np.flatnonzero(np.isnan(values))):
            kinds[at] = read[cells[at]][1]
        return values, kinds
    mixed = [_number_of_text(cell.strip(), decimal) if isinstance(cell, str) else _number_of_typed(cell)
             for cell in cells]
    return np.array([value for value, _ in mixed]), np.array([kind for _, kind in mixed], dtype=np.int8)


def _number_of_text(text: str, decimal: str) -> tuple[float, Kind]:
    if _PLAIN[decimal].fullmatch(text):
        value = float(text.replace(",", "."))
        return (value, Kind.NUMBER) if math.isfinite(value) else (math.nan, Kind.NO_NUMBER)
    if text in ("", "-"):
        return math.nan, Kind.BLANK
    return math.nan, Kind.NOT_KNOWN if text.lower() == "n/a" else Kind.NO_NUMBER


def _number_of_typed(cell: Any) -> tuple[float, Kind]:
    if cell is None:
        return math.nan, Kind.BLANK
    if isinstance(cell, bool):
        return math.nan, Kind.NO_NUMBER
    try:
        value = float(cell)
    except (TypeError, ValueError, OverflowError):  # a date, a list: no number
        return math.nan, Kind.NO_NUMBER
    if math.isnan(value):
        return math.nan, Kind.BLANK
    return (value, Kind.NUMBER) if math.isfinite(value) else (math.nan, Kind.NO_NUMBER)
