"""The file of adjustments: read, and every row checked for what can be told without a forecast.

One row is one adjustment:

    scope    a series, a group as "depot=north", or "all"
    first    the first period it touches
    last     the last one; empty when it touches only the first
    kind     "amount" (so many more or fewer in each period), "percent" (of the figure) or "value"
             (the figure itself)
    size     a number: 40, -12, 380
    reason, name, made_on   why, who, and the day it was written down (2026-11-03)
    ends     instead of `last`: a standing adjustment, in force in every forecast period from `first` to here;
             it is carried from round to round, and those of its periods that have passed do no harm
"""

from __future__ import annotations

import csv
import datetime as dt
import difflib
import math
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

import pandas as pd

from foredeck.errors import AdjustmentError, PeriodError
from foredeck.periods import frequency_of_text

KINDS = ("value", "percent", "amount")
"""The kinds, in the order in which they are applied."""

NEEDED = ("scope", "first", "kind", "size", "reason", "name", "made_on")
COLUMNS = ("scope", "first", "last", "kind", "size", "reason", "name", "made_on", "ends", "where")


def read_adjustments(path: str | Path) -> pd.DataFrame:
    """Read a CSV file of adjustments.

    Parameters
    ----------
    path : str or Path
        UTF-8, with a heading row; columns in any order, `last` and `ends` may be absent.

    Returns
    -------
    DataFrame[scope, first, last, kind, size, reason, name, made_on, ends, where]
        One row an adjustment, all text but size; `last` is filled in, `ends` is empty
        unless the adjustment is standing; `where` is the place in the file.

    Raises
    ------
    AdjustmentError
        for the first row that cannot be understood; it is named.
    """
    place = Path(path)
    try:
        with place.open(encoding="utf-8-sig", newline="") as handle:
            reader = csv.DictReader(handle, restkey="_more")
            heading = [name.strip() for name in reader.fieldnames or []]
            _check_heading(heading, place.name)
            reader.fieldnames = heading
            rows = [{**row, "where": f"{place.name} line {reader.line_num}"} for row in reader]
    except FileNotFoundError as fault:
        raise AdjustmentError(f"there is no file {place.name}", where=str(place),
                              allowed="a CSV file of adjustments",
                              do="correct the path, or leave the setting out") from fault
    except UnicodeDecodeError as fault:
        raise AdjustmentError(f"{place.name} is not UTF-8 text", where=f"{place}, byte {fault.start}",
                              allowed="CSV in UTF-8", do="save the file as CSV in UTF-8") from fault
    return checked_rows(rows)


def _check_heading(heading: Sequence[str], file: str) -> None:
    known = [name for name in COLUMNS if name != "where"]
    for name in NEEDED:
        if name not in heading:
            raise AdjustmentError(f"{file} has no column {name!r}", where=f"{file} line 1",
                                  allowed=", ".join(known), column=name,
                                  do="add the column to the heading row")
    for name in heading:
        if name not in known:
            near = difflib.get_close_matches(name, known, n=1)
            raise AdjustmentError(f"{file} has an unknown column {name!r}", where=f"{file} line 1",
                                  allowed=", ".join(known), column=name,
                                  do=f"did you mean {near[0]!r}?" if near else "remove the column")


def checked_rows(rows: pd.DataFrame | Sequence[Mapping[str, Any]]) -> pd.DataFrame:
    """Adjustments in their standard form, each row checked by itself; see `read_adjustments`."""
    given: Sequence[Mapping[Any, Any]] = rows.to_dict("records") if isinstance(rows, pd.DataFrame) else rows
    found = [_checked({str(key): value for key, value in row.items()}, number)
             for number, row in enumerate(given, start=1)]
    frame = pd.DataFrame(found, columns=list(COLUMNS))
    return frame.astype({**dict.fromkeys(COLUMNS, "str"), "size": "float64"})


def _checked(row: Mapping[str, Any], number: int) -> dict[str, Any]:
    text = {key: "" if value is None or value != value else str(value).strip()
            for key, value in row.items()}
    where = text.get("where") or f"row {number}"
    if row.get("_more"):
        raise AdjustmentError("the row has more fields than the heading", where=where,
                              allowed="one field a column", do="put quotation marks around text with commas")
    for name in NEEDED:
        if not text.get(name):
            raise AdjustmentError(f"the adjustment has no {name}", where=where,
                                  allowed=f"a {name} in every row", column=name,
                                  do="fill it in: an adjustment is dated, signed and has a reason")
    if text["kind"] not in KINDS:
        near = difflib.get_close_matches(text["kind"].lower(), KINDS, n=1)
        raise AdjustmentError(f"{text['kind']!r} is no kind of adjustment", where=where,
                              allowed=", ".join(KINDS), column="kind",
                              do=f"did you mean {near[0]!r}?" if near else "choose one of these")
    first, last, ends = _span(text, where)
    return {"scope": text["scope"], "first": first, "last": last, "kind": text["kind"],
            "size": _size(text, where), "reason": text["reason"], "name": text["name"],
            "made_on": _day(text["made_on"], where), "ends": ends, "where": where}


def _span(text: Mapping[str, str], where: str) -> tuple[str, str, str]:
    first, last, ends = text["first"], text.get("last", ""), text.get("ends", "")
    if ends and last not in ("", ends):
        raise AdjustmentError("the adjustment has both a last period and an end", where=where,
                              allowed="last for certain periods, or ends for a standing adjustment",
                              do="keep one of the two", column="ends")
    last = last or ends or first
    frequencies = []
    for period in (first, last):
        try:
            frequencies.append(frequency_of_text(period))
        except PeriodError as fault:
            raise AdjustmentError(fault.what, where=where, allowed=fault.allowed, do=fault.do,
                                  value=period) from fault
    if frequencies[0] != frequencies[1] or last < first:
        raise AdjustmentError(f"the adjustment runs from {first} to {last}", where=where,
                              allowed="a last period that is not before the first, written the same way",
                              do="correct first or last")
    return first, last, ends


def _size(text: Mapping[str, str], where: str) -> float:
    try:
        size = float(text["size"])
    except ValueError:
        size = math.nan
    if not math.isfinite(size):
        raise AdjustmentError(f"the size {text['size']!r} is no number", where=where,
                              allowed="a number such as 40, -12.5 or 1250, without % or commas",
                              do="write the number alone; the kind says what it means", column="size")
    if text["kind"] == "percent" and size < -100:
        raise AdjustmentError(f"{size:g} percent would take away more than there is", where=where,
                              allowed="-100 or more", do="correct the size, or use kind amount",
                              column="size")
    return size


def _day(text: str, where: str) -> str:
    try:
        return dt.date.fromisoformat(text[:10] if text[10:11] in (" ", "T") else text).isoformat()
    except ValueError as fault:
        raise AdjustmentError(f"{text!r} is no day", where=where, allowed="a day written as 2026-11-03",
                              do="correct made_on", column="made_on") from fault
