"""Adjustments: dated, signed, reasoned changes to the baseline.

The stated order. In each period a series' figure begins as its baseline; then

    1. rows for the series itself:  value, then percent, then amount
    2. rows for groups:             value, then percent, then amount

Who knows one series sets its figure; what is decided for a group comes on top, so
that a group's total comes out as decided. A value sets the figure (of a group: its
total); a percent scales the figure reached so far; an amount is added in every
period of the row. A group's amount, or the difference its value makes, is spread in
proportion to the baselines. Two values for the same figure are refused, and so is a
row given twice (same scope, kind and reason in a common period): so the order of the rows
in the file never matters.

Ranges move with the figure, and for counts not below zero.
"""

from __future__ import annotations

import difflib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
import pandas as pd

from foredeck.errors import AdjustmentError
from foredeck.periods import frequency_of_text
from foredeck.review.adjustment_file import KINDS, checked_rows, read_adjustments
from foredeck.review.sentences import number

__all__ = ["ADJUSTMENT_COLUMNS", "apply_adjustments", "read_adjustments"]

ADJUSTMENT_COLUMNS = ("series", "period", "lead", "baseline", "adjustment", "adjusted", "kind", "size",
                      "reason", "name", "made_on", "scope", "where")
"""Columns of the table of adjustments."""

_EVERYTHING = "all"


def apply_adjustments(forecasts: pd.DataFrame, series_table: pd.DataFrame, rows: pd.DataFrame, *,
                      nonnegative: bool = True) -> tuple[pd.DataFrame, pd.DataFrame]:
    """Apply adjustments to the baseline, in the stated order.

    Parameters
    ----------
    forecasts : DataFrame[series, period, lead, baseline, lower_.., upper_..]
        The baseline and its ranges; the unit of each series.
    series_table : DataFrame[series, <group columns>, ...]
        Every series of the round; the columns between series and unit are the groups that
        a scope may name.
    rows : DataFrame
        As `read_adjustments` gives them; made by hand, they are checked in the same way.
    nonnegative : bool
        The series count something: a figure below zero is refused, ranges stop at zero.

    Returns
    -------
    adjustments : DataFrame
        One row a series, period and adjustment (`ADJUSTMENT_COLUMNS`), in the order applied.
        `adjustment` is what this row added; `adjusted` is the figure after it.
    adjusted : DataFrame[series, period, lead, baseline, adjustment, adjusted, lower_.., upper_..]
        The rows of `forecasts`, in their order; equal to them where nothing was adjusted.

    Raises
    ------
    AdjustmentError
        naming the row: unknown series or group, periods not forecast, duplicates, a figure
        below zero, a group without a baseline to spread over.
    """
    reach = _Reach(forecasts, series_table)
    steps = _in_order(checked_rows(rows), reach)
    _refuse_duplicates(steps)
    base = forecasts["baseline"].to_numpy(dtype=float)
    running, parts = base.copy(), []
    for step in steps:
        change = _change(step, base, running, reach)
        running[step.cells] += change
        parts.append(_listed(step, forecasts, change, running))
    if nonnegative:
        _refuse_negative(forecasts, base, running, parts, steps)
    return _together(parts, forecasts), _moved(forecasts, running, nonnegative)


@dataclass(frozen=True)
class _Step:
    """An adjustment with the cells (rows of `forecasts`) that it touches."""

    row: Mapping[str, Any]
    group: bool
    cells: np.ndarray

    @property
    def where(self) -> str:
        return str(self.row["where"])

    @property
    def rank(self) -> tuple[bool, int]:
        return self.group, KINDS.index(self.row["kind"])


@dataclass
class _Reach:
    """Which rows of `forecasts` a scope and a span of periods touch."""

    forecasts: pd.DataFrame
    series_table: pd.DataFrame
    known: list[str] = field(init=False)
    groups: dict[str, pd.Series] = field(init=False)

    def __post_init__(self) -> None:
        self.known = [str(name) for name in self.series_table["series"]]
        columns = [str(name) for name in self.series_table.columns]
        self.groups = {name: self.series_table[name] for name in columns[1:columns.index("unit")]}
        self.periods = self.forecasts["period"].astype(str).to_numpy(dtype=object)
        self.of_series = self.forecasts.groupby("series", sort=False).indices

    def step(self, row: Mapping[str, Any]) -> _Step:
        group, members = self._members(row)
        cells = [self.of_series[name] for name in members if name in self.of_series]
        if not cells:
            raise self._not_forecast(row, group)
        every = np.sort(np.concatenate(cells))
        span = self.periods[every]
        inside = every[(span >= row["first"]) & (span <= row["last"])]
        self._check_periods(row, span)
        return _Step(row, group, inside)

    def _members(self, row: Mapping[str, Any]) -> tuple[bool, list[str]]:
        """Is the scope a group, and which series does it hold? A series' own name goes first."""
        scope = row["scope"]
        if scope in self.known:
            return False, [scope]
        if scope == _EVERYTHING:
            return True, self.known
        column, sign, value = scope.partition("=")
        if not sign:
            raise self._unknown(row, f"there is no series {scope!r}", scope, self.known,
                                "the name of a series, a group such as depot=north, or all")
        if column not in self.groups:
            raise self._unknown(row, f"there is no group column {column!r}", column, list(self.groups),
                                ", ".join(self.groups) or "no group columns are known")
        inside = self.groups[column] == value
        if not inside.any():
            values = sorted(str(each) for each in self.groups[column].dropna().unique())
            raise self._unknown(row, f"no series has {column} {value!r}", value, values, ", ".join(values))
        return True, [str(name) for name in self.series_table["series"][inside]]

    def _unknown(self, row: Mapping[str, Any], what: str, given: str, known: Sequence[str],
                 allowed: str) -> AdjustmentError:
        near = difflib.get_close_matches(given, known, n=1, cutoff=0.5)
        return AdjustmentError(what, where=row["where"], allowed=allowed, column="scope",
                               do=f"did you mean {near[0]!r}?" if near else "correct the scope")

    def _not_forecast(self, row: Mapping[str, Any], group: bool) -> AdjustmentError:
        said = f"no series of {row['scope']!r} is" if group else f"the series {row['scope']!r} is not"
        return AdjustmentError(f"{said} forecast in this round", where=row["where"], column="scope",
                               allowed="series that are forecast", do="remove the row for this round")

    def _check_periods(self, row: Mapping[str, Any], span: np.ndarray) -> None:
        first, last = str(min(span)), str(max(span))
        alike = frequency_of_text(row["first"]) is frequency_of_text(first)
        if row["ends"] and alike:  # a standing adjustment may have begun in the past, and reach further
            return
        for period in (row["first"], row["last"]):
            if period not in span:
                passed = alike and period < first
                raise AdjustmentError(
                    f"{period} is {'past: it' if passed else 'a period that'} is not forecast in this round",
                    where=row["where"], allowed=f"periods from {first} to {last}", period=period,
                    do="remove or shorten the row; for a standing adjustment give ends instead of last")


def _in_order(rows: pd.DataFrame, reach: _Reach) -> list[_Step]:
    steps = [reach.step({str(key): value for key, value in row.items()}) for row in rows.to_dict("records")]
    return sorted(steps, key=lambda step: step.rank)


def _refuse_duplicates(steps: Sequence[_Step]) -> None:
    given: dict[tuple[Any, ...], _Step] = {}
    valued: dict[tuple[bool, int], _Step] = {}
    for step in steps:
        if step.row["kind"] == "value":
            for cell in step.cells:
                other = valued.setdefault((step.group, int(cell)), step)
                if other is not step:
                    raise _twice(step, other, "sets a figure that is set already", "one value for a figure")
        key = (step.row["scope"], step.row["kind"], step.row["reason"].casefold())
        other = given.setdefault(key, step)
        if other is not step and np.intersect1d(step.cells, other.cells).size:
            raise _twice(step, other, "repeats an adjustment", "each adjustment once in a period")


def _twice(step: _Step, other: _Step, what: str, allowed: str) -> AdjustmentError:
    return AdjustmentError(f"the row {what}: see {other.where}", where=step.where, allowed=allowed,
                           do="remove one of the two, or give another reason if both are meant"
                           if "repeats" in what else "remove one of the two", other=other.where)


def _change(step: _Step, base: np.ndarray, running: np.ndarray, reach: _Reach) -> np.ndarray:
    """What a step adds to each of its cells."""
    kind, size, cells = step.row["kind"], float(step.row["size"]), step.cells
    if kind == "percent":
        return np.asarray(running[cells] * size / 100)
    if not step.group:
        return np.asarray(size - running[cells]) if kind == "value" else np.full(len(cells), size)
    change = np.empty(len(cells))
    for period in dict.fromkeys(reach.periods[cells]):
        here = reach.periods[cells] == period
        weight = base[cells[here]]
        total = weight.sum()
        if not total > 0 or (weight < 0).any():
            raise AdjustmentError(
                f"the baselines of {step.row['scope']!r} in {period} cannot carry a share each: "
                f"they add up to {number(total)}", where=step.where, period=period,
                allowed="a group whose baselines are not negative, nor all zero",
                do="adjust the series one by one")
        wanted = size - running[cells[here]].sum() if kind == "value" else size
        change[here] = wanted * weight / total
    return change


def _listed(step: _Step, forecasts: pd.DataFrame, change: np.ndarray, running: np.ndarray) -> pd.DataFrame:
    part = forecasts.iloc[step.cells][["series", "period", "lead", "baseline"]].reset_index(drop=True)
    told = {name: step.row[name] for name in ("kind", "size", "reason", "name", "made_on", "scope", "where")}
    return part.assign(adjustment=change, adjusted=running[step.cells], **told)


def _refuse_negative(forecasts: pd.DataFrame, base: np.ndarray, running: np.ndarray,
                     parts: Sequence[pd.DataFrame], steps: Sequence[_Step]) -> None:
    """Refuse a figure that an adjustment took below zero, naming the row that took the most away."""
    below = np.flatnonzero((running < -1e-9 * np.maximum(1.0, np.abs(base))) & (running != base))
    if not below.size:
        return
    cell = int(below[0])
    taken = [(float(part["adjustment"].to_numpy()[step.cells == cell][0]), at)
             for at, (part, step) in enumerate(zip(parts, steps, strict=True)) if cell in step.cells]
    worst = steps[min(taken)[1]]
    series, period = forecasts.iloc[cell][["series", "period"]]
    raise AdjustmentError(
        f"{series!r} would come to {number(running[cell])} in {period}", where=worst.where,
        allowed="figures that are not below zero", do="take away less, or set the figure by kind value",
        series=str(series), period=str(period))


def _together(parts: Sequence[pd.DataFrame], forecasts: pd.DataFrame) -> pd.DataFrame:
    columns = list(ADJUSTMENT_COLUMNS)
    kinds = dict.fromkeys(columns, "str")
    kinds.update(baseline="float64", adjustment="float64", adjusted="float64", size="float64", lead="int64")
    if not parts:
        return pd.DataFrame(columns=columns).astype(kinds)
    # One series' rows stand together, by period, and within a period in the order applied.
    place = {name: at for at, name in enumerate(dict.fromkeys(forecasts["series"]))}
    every = pd.concat(parts, ignore_index=True)
    placed = every.assign(_place=every["series"].map(place))
    order = placed.sort_values(["_place", "period"], kind="stable").index
    return every.loc[order, columns].reset_index(drop=True).astype(kinds)


def _moved(forecasts: pd.DataFrame, running: np.ndarray, nonnegative: bool) -> pd.DataFrame:
    """The adjusted figures, and ranges that moved with them."""
    base = forecasts["baseline"].to_numpy(dtype=float)
    running = np.maximum(running, 0.0) if nonnegative and (base >= 0).all() else running
    change = running - base
    moved = forecasts[["series", "period", "lead", "baseline"]].copy()
    moved["adjustment"], moved["adjusted"] = change, running
    for name in forecasts.columns:
        if str(name).startswith(("lower_", "upper_")):
            limit = forecasts[name].to_numpy(dtype=float)
            shifted = limit + change
            moved[name] = np.where(change == 0, limit, np.maximum(shifted, 0.0) if nonnegative else shifted)
    return moved.reset_index(drop=True)
