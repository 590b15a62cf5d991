"""What is wrong or odd in a series: faults and queries, with evidence and remedy in plain words."""

from __future__ import annotations

import contextlib
from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING

import numpy as np
import pandas as pd

from foredeck.checks import sentences
from foredeck.checks.expectation import Array
from foredeck.checks.repairs import Repair, repairs_and_screening
from foredeck.checks.runs import constant_runs, zero_runs
from foredeck.checks.screening import Standout
from foredeck.periods import period_name

if TYPE_CHECKING:
    from foredeck.intake.history import SeriesHistory

FINDING_COLUMNS = ["series", "period", "code", "kind", "raw", "used", "evidence", "remedy"]
"""Columns that every table of findings begins with; `raw_text` follows: the raw value as it was written."""

FAULT_CODES = ("duplicate", "not_a_number", "gap", "impossible_sign", "incomplete_last_period", "stale")
"""Certainly wrong."""

QUERY_CODES = ("outlier", "level_shift", "change_of_unit", "zero_run", "repeated_constant")
"""Needs a person."""

_NUMBERS = ("raw", "used")
# A closing period at seven tenths of what was expected, or above, is low but may well be complete.
_COMPLETE = 0.7


@dataclass
class _Place:
    """The series under examination, up to its last value."""

    series: SeriesHistory
    values: Array
    used: Array
    repairs: dict[int, Repair]
    seasonal: bool

    def when(self, position: int) -> str:
        return sentences.spoken(self.series.periods[position])

    def row(self, position: int, code: str, words: tuple[str, str], raw: float | None = None,
            used: float | None = None) -> dict[str, object]:
        raw = float(self.values[position]) if raw is None else raw
        return {"series": self.series.name, "period": period_name(self.series.periods[position]),
                "code": code, "kind": "fault" if code in FAULT_CODES else "query", "raw": raw,
                "used": float(self.used[position]) if used is None else used, "evidence": words[0],
                "remedy": words[1], "raw_text": "" if np.isnan(raw) else f"{raw:.10g}"}


def find(series: SeriesHistory, closing: pd.Period, nonnegative: bool = True) -> pd.DataFrame:
    """Find the faults and queries of one series, as known at the closing period.

    Limits are simulated so that clean series raise at most one query in 1,000 periods.

    Parameters
    ----------
    series : SeriesHistory
        Periods after `closing` are not looked at.
    closing : pandas.Period
        The last closed period of the round.
    nonnegative : bool
        Whether a value below zero is impossible.

    Returns
    -------
    DataFrame
        Columns `FINDING_COLUMNS` and raw_text, faults first, then by period. A run or a shift
        is one row at its first period. `used` is the value methods are fitted to. Reading
        faults of the series are included as they were handed in.
    """
    if not series.faults.empty or (len(series) and series.periods[-1] > closing):
        series = series.up_to(closing)
    known = np.flatnonzero(np.isfinite(series.values))
    end = int(known[-1]) + 1 if known.size else 0
    values = series.values[:end]
    used, repairs, screening = repairs_and_screening(values, series.season_length, nonnegative)
    place = _Place(series, values, used, {r.position: r for r in repairs},
                   series.season_length > 1 and end >= 2 * series.season_length)
    read = _reading_faults(place)
    unread = {str(r["period"]) for r in read if r["code"] == "not_a_number"}
    rows = [*read, *_missing_and_signs(place, unread), *_runs(place, nonnegative)]
    rows += [_standout(place, s, closing) for s in screening.standouts]
    rows += _stale(place, closing, unread)
    return _table(sorted(rows, key=lambda row: (str(row["kind"]), str(row["period"]))))


@lru_cache(maxsize=1)
def _no_findings() -> pd.DataFrame:
    columns = [*FINDING_COLUMNS, "raw_text"]
    return pd.DataFrame({c: pd.Series(dtype=float if c in _NUMBERS else "str") for c in columns})


def _table(rows: list[dict[str, object]]) -> pd.DataFrame:
    """Rows as a table; most series have none, so that the empty table is made once."""
    empty = _no_findings()
    if not rows:
        return empty.copy()
    # Column by column: a table made of rows would have to look at every cell for its type.
    kinds = {str(c): float if c in _NUMBERS else object for c in empty.columns}
    return pd.DataFrame({c: np.array([row[c] for row in rows], dtype=kind) for c, kind in kinds.items()})


def _reading_faults(place: _Place) -> list[dict[str, object]]:
    """Faults found while reading, with the value that is used for the period."""
    rows: list[dict[str, object]] = []
    if place.series.faults.empty:
        return rows
    position = {period_name(p): i for i, p in enumerate(place.series.periods)}
    for fault in place.series.faults.to_dict("records"):
        i = position.get(str(fault["period"]), len(place.used))
        raw = np.nan
        with contextlib.suppress(ValueError):
            raw = float(str(fault["raw"]))
        rows.append({"series": place.series.name, "period": str(fault["period"]), "code": str(fault["code"]),
                     "kind": "fault", "raw": raw,
                     "used": float(place.used[i]) if i < len(place.used) else np.nan,
                     "evidence": f"{str(fault['evidence']).removesuffix('.')} ({fault['where']}).",
                     "remedy": str(fault["remedy"]),
                     "raw_text": str(fault["raw"])})
    return rows


def _missing_and_signs(place: _Place, unread: set[str]) -> list[dict[str, object]]:
    rows = []
    for p, repair in place.repairs.items():
        if repair.code == "impossible_sign":
            rows.append(place.row(p, "impossible_sign",
                                  sentences.impossible_sign(place.when(p), repair.raw, repair.used)))
        elif repair.code == "gap" and period_name(place.series.periods[p]) not in unread:
            rows.append(place.row(p, "gap", sentences.gap(place.when(p), repair.used)))
    return rows


def _runs(place: _Place, nonnegative: bool) -> list[dict[str, object]]:
    plural = place.series.frequency.plural
    possible = np.where(nonnegative & (place.values < 0), np.nan, place.values)
    rows = []
    for run in zero_runs(possible, place.series.season_length):
        typical = float(np.nanmedian(np.where(possible == 0.0, np.nan, possible)))
        words = sentences.zero_run(run, place.when(run.first), place.when(run.last), plural, typical)
        rows.append(place.row(run.first, "zero_run", words))
    for run in constant_runs(possible):
        words = sentences.constant_run(run, place.when(run.first), place.when(run.last), plural)
        rows.append(place.row(run.first, "repeated_constant", words))
    return rows


def _standout(place: _Place, s: Standout, closing: pd.Period) -> dict[str, object]:
    noun, plural = place.series.frequency.noun, place.series.frequency.plural
    when = place.when(s.position)
    used = place.repairs[s.position].used if s.position in place.repairs else None
    if s.code == "level_shift":
        return place.row(s.position, s.code, sentences.level_shift(s, when, noun))
    closes = place.series.periods[s.position] == closing
    if closes and s.size < 0 and 0.0 <= s.raw < _COMPLETE * s.expected:
        words = sentences.incomplete(s, when, noun, place.seasonal)
        return place.row(s.position, "incomplete_last_period", words)
    if s.code == "change_of_unit":
        return place.row(s.position, s.code, sentences.unit_slip(s, when, noun, place.seasonal, used))
    return place.row(s.position, s.code, sentences.outlier(s, when, noun, plural, place.seasonal, used))


def _stale(place: _Place, closing: pd.Period, unread: set[str]) -> list[dict[str, object]]:
    """One row when values are missing between the last one and the closing period."""
    if place.values.size == 0:
        return []
    last = place.series.periods[place.values.size - 1]
    if last >= closing:
        return []
    missing = [p for p in pd.period_range(last + 1, closing) if period_name(p) not in unread]
    if not missing:
        return []
    words = sentences.stale(sentences.spoken(last), sentences.spoken(closing))
    return [{"series": place.series.name, "period": period_name(missing[0]), "code": "stale", "kind": "fault",
             "raw": np.nan, "used": np.nan, "evidence": words[0], "remedy": words[1], "raw_text": ""}]
