"""The history: all actuals of a portfolio as known on a day, in one tidy table."""

from __future__ import annotations

import difflib
import math
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field, replace
from functools import cached_property
from html import escape
from typing import Literal

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from foredeck.errors import IntakeError, PeriodError
from foredeck.periods import Frequency, parse_period, period_name

FAULT_COLUMNS = ("series", "period", "code", "raw", "where", "evidence", "remedy")
"""Columns of a table of reading faults; every one is text, periods as `period_name` writes them."""

EXPECTED_WITHIN = 3
"""A series is expected in a period when it reported in one of so many periods before."""


def no_faults() -> pd.DataFrame:
    """Return an empty table of reading faults."""
    return pd.DataFrame({column: pd.Series(dtype="str") for column in FAULT_COLUMNS})


@dataclass(frozen=True, eq=False)
class SeriesHistory:
    """The actuals of one series.

    Parameters
    ----------
    name : str
        Name of the series; untrusted text.
    frequency : Frequency
        How long one period lasts.
    periods : pandas.PeriodIndex, shape (n,)
        Every period from the first to the last, without holes.
    values : array, shape (n,); the series' unit
        NaN where no value is known.
    unit : str
        What the values count.
    unit_value : float
        Money for one unit; NaN when not given.
    groups : mapping of str to str
        The group that the series belongs to, by kind of group.
    faults : DataFrame
        Faults found while reading, with columns `FAULT_COLUMNS`.
    """

    name: str
    frequency: Frequency
    periods: pd.PeriodIndex
    values: NDArray[np.float64]
    unit: str = "units"
    unit_value: float = math.nan
    groups: Mapping[str, str] = field(default_factory=dict)
    faults: pd.DataFrame = field(default_factory=no_faults)

    @property
    def season_length(self) -> int:
        """Periods in one year."""
        return self.frequency.season_length

    def __len__(self) -> int:
        """Return the number of periods."""
        return len(self.values)

    def to_series(self) -> pd.Series[float]:
        """Return the values as a pandas Series over a PeriodIndex; NaN where no value is known."""
        return pd.Series(self.values.copy(), index=self.periods, name=self.name)

    def up_to(self, period: pd.Period) -> SeriesHistory:
        """Return the series as far as a period, that period included."""
        count = int((self.periods <= period).sum())
        return replace(self, periods=self.periods[:count], values=self.values[:count].copy(),
                       faults=_faults_up_to(self.faults, period, self.frequency))

    def _repr_html_(self) -> str:
        known = int(np.isfinite(self.values).sum())
        ends = [period_name(p) for p in (*self.periods[:1], *self.periods[-1:])]
        lines = [f"{' to '.join(ends) or 'no period'}, {self.frequency.value}, in {self.unit}",
                 f"{known} of {len(self)} {self.frequency.plural} with a value"]
        return _card(self.name, [*lines, *_fault_lines(self.faults)])


@dataclass(frozen=True)
class Understood:
    """How a source was read, for the reader to confirm or to pin otherwise.

    `ignored` pairs a number of rows or columns with the reason; `notes` holds further sentences.
    """

    file: str
    format: str
    layout: str
    date_format: str
    frequency: Frequency
    first: str
    last: str
    n_series: int
    rows_read: int
    ignored: tuple[tuple[int, str], ...] = ()
    notes: tuple[str, ...] = ()

    def lines(self) -> list[str]:
        """Return what was understood, a sentence a line."""
        rows = "row" if self.rows_read == 1 else "rows"
        return [
            f"{self.file}: {self.format}, {self.layout} layout, {self.rows_read:,} {rows} read",
            f"dates written as {self.date_format}; {self.frequency.value}, {self.first} to {self.last}",
            f"{self.n_series:,} series",
            *(f"ignored: {count:,} {reason}" for count, reason in self.ignored),
            *self.notes,
        ]


@dataclass(frozen=True, eq=False)
class History:
    """All actuals of a portfolio as known on a day.

    Parameters
    ----------
    frequency : Frequency
        The one frequency of all its series.
    actuals : DataFrame
        Columns series (text), period (pandas period) and value (float, NaN where
        none is known), sorted by series and period; each series is complete from its
        first to its last period.
    series : DataFrame
        Indexed by name, sorted; a column for each kind of group, then `unit` and `unit_value`.
    faults : DataFrame
        Faults found while reading, with columns `FAULT_COLUMNS`.
    understood : Understood
        How the source was read.
    """

    frequency: Frequency
    actuals: pd.DataFrame
    series: pd.DataFrame
    faults: pd.DataFrame
    understood: Understood

    @property
    def names(self) -> list[str]:
        """Names of the series, sorted."""
        return [str(name) for name in self.series.index]

    @property
    def group_columns(self) -> list[str]:
        """Kinds of group, such as depot and family."""
        return [str(c) for c in self.series.columns if c not in ("unit", "unit_value")]

    @property
    def last_period(self) -> pd.Period:
        """The last period in which any series has a row."""
        last: pd.Period = self.actuals["period"].max()
        return last

    @cached_property
    def _bounds(self) -> dict[str, tuple[int, int]]:
        """Rows of each series in `actuals`, found once: a portfolio is walked series by series."""
        codes, names = pd.factorize(self.actuals["series"])
        starts = np.flatnonzero(np.diff(codes, prepend=-1))
        stops = np.append(starts[1:], len(codes))
        return {str(n): (int(a), int(b)) for n, a, b in zip(names, starts, stops, strict=True)}

    @cached_property
    def _columns(self) -> tuple[pd.PeriodIndex, NDArray[np.float64]]:
        return pd.PeriodIndex(self.actuals["period"]).rename(None), self.actuals["value"].to_numpy(dtype=float)

    @cached_property
    def _faults_by_series(self) -> dict[str, pd.DataFrame]:
        return {str(name): rows.reset_index(drop=True) for name, rows in self.faults.groupby("series")}

    @cached_property
    def _no_faults(self) -> pd.DataFrame:
        return self.faults.iloc[:0].reset_index(drop=True)

    @cached_property
    def _about(self) -> dict[str, dict[str, object]]:
        rows = self.series.to_dict("records")
        return {name: {str(key): value for key, value in row.items()}
                for name, row in zip(self.names, rows, strict=True)}

    def __len__(self) -> int:
        """Return the number of series."""
        return len(self.series)

    def __iter__(self) -> Iterator[SeriesHistory]:
        """Walk through the series in the order of their names."""
        return (self[name] for name in self.names)

    def __contains__(self, name: object) -> bool:
        """Tell whether there is a series of this name."""
        return name in self.series.index

    def __getitem__(self, name: str) -> SeriesHistory:
        """Return one series.

        Raises
        ------
        IntakeError
            if there is no series of this name; the nearest names are offered.
        """
        if name not in self._bounds:
            near = difflib.get_close_matches(str(name), self.names, n=3)
            raise IntakeError(
                f"there is no series named {name!r}",
                where=self.understood.file,
                allowed=", ".join(near) if near else f"{len(self)} names, beginning with {self.names[0]!r}",
                do="use a name as it stands in .names",
                value=name, nearest=near,
            )
        start, stop = self._bounds[name]
        periods, values = self._columns
        about = self._about[name]
        return SeriesHistory(
            name=name, frequency=self.frequency, periods=periods[start:stop],
            values=values[start:stop].copy(), unit=str(about["unit"]),
            unit_value=float(str(about["unit_value"])),
            groups={column: str(about[column]) for column in self.group_columns},
            faults=self._faults_by_series.get(name, self._no_faults),
        )

    def up_to(self, period: pd.Period) -> History:
        """Return the history as far as a period, that period included; series that begin later drop out."""
        actuals = self.actuals[self.actuals["period"] <= period].reset_index(drop=True)
        series = self.series.loc[self.series.index.isin(actuals["series"])]
        return replace(self, actuals=actuals, series=series,
                       faults=_faults_up_to(self.faults, period, self.frequency))

    def _repr_html_(self) -> str:
        return _card(f"{len(self):,} series", [*self.understood.lines(), *_fault_lines(self.faults)])


def closing_period(history: History, rule: Literal["all", "share"] = "all", share: float = 1.0) -> pd.Period:
    """Find the last closed period: the last that enough series have reported.

    A series is expected in a period when it reported in one of the three periods
    before: one that ended long ago holds nothing up, and a newcomer is not missed
    before it begins. A value of any size counts as reported; a missing one does not.

    Parameters
    ----------
    history : History
        The portfolio's actuals.
    rule : "all" or "share"
        Whether all expected series must have reported, or a share of them.
    share : float
        Above 0 up to 1; used by the rule "share".

    Returns
    -------
    pandas.Period

    Raises
    ------
    PeriodError
        if no period is closed by this rule.
    """
    known = history.actuals[history.actuals["value"].notna()]
    needed = 1.0 if rule == "all" else share
    if len(known):
        periods = pd.PeriodIndex(known["period"])
        first, steps = periods.min(), periods.asi8 - periods.asi8.min()
        codes, _ = pd.factorize(known["series"])
        reported = np.zeros((codes.max() + 1, steps.max() + 1), dtype=bool)
        reported[codes, steps] = True
        for step in range(reported.shape[1] - 1, 0, -1):
            expected = reported[:, max(0, step - EXPECTED_WITHIN):step].any(axis=1)
            # A tolerance, so that 9 of 10 meet a share of 0.9 whatever the last binary digit says.
            if expected.any() and reported[expected, step].mean() >= needed - 1e-9:
                closed: pd.Period = first + step
                return closed
        if reported.shape[1] == 1:
            only: pd.Period = first
            return only
    raise PeriodError(
        f"no {history.frequency.noun} is closed: the rule {rule!r} asks for {needed:.0%} of the series",
        where=history.understood.file,
        allowed='rule = "all", or rule = "share" with a share that is met',
        do="lower [closing] share in the settings, or complete the source",
    )


def _faults_up_to(faults: pd.DataFrame, period: pd.Period, frequency: Frequency) -> pd.DataFrame:
    if faults.empty:
        return faults
    kept = {text: parse_period(text, frequency) <= period for text in faults["period"].unique()}
    return faults[faults["period"].map(kept).astype(bool)].reset_index(drop=True)


def _fault_lines(faults: pd.DataFrame) -> list[str]:
    words = {"duplicate": "duplicate", "not_a_number": "not a number"}
    return [f"fault: {words.get(str(code), str(code))}, {count:,} times" if count > 1 else
            f"fault: {words.get(str(code), str(code))}, once"
            for code, count in faults["code"].value_counts().items()]


def _card(title: str, lines: list[str]) -> str:
    rows = "".join(f"<li>{escape(line)}</li>" for line in lines)
    return (f'<section style="max-width:44rem"><strong>{escape(title)}</strong>'
            f'<ul style="margin:.3em 0">{rows}</ul></section>')
