"""Frequencies, the names of periods, places in the season, and financial years.

pandas is imported inside the functions that make periods: the settings need only
`Frequency`, and the command line must start quickly.
"""

from __future__ import annotations

import datetime as dt
import re
from collections.abc import Iterable
from dataclasses import dataclass
from enum import StrEnum
from typing import TYPE_CHECKING, Any

from foredeck.errors import PeriodError

if TYPE_CHECKING:
    import pandas as pd

FIRST_YEAR, LAST_YEAR = 1900, 2200
"""Years outside are refused: they are typing errors or misread numbers, not history."""


class Frequency(StrEnum):
    """How long one period lasts."""

    YEARLY = "yearly"
    QUARTERLY = "quarterly"
    MONTHLY = "monthly"
    WEEKLY = "weekly"

    @property
    def season_length(self) -> int:
        """Periods in one year: 1, 4, 12 or 52 (a 53rd ISO week shares the place of the 52nd)."""
        return {"yearly": 1, "quarterly": 4, "monthly": 12, "weekly": 52}[self.value]

    @property
    def pandas_code(self) -> str:
        """The frequency string of `pandas.Period`; weeks run Monday to Sunday (ISO 8601)."""
        return {"yearly": "Y-DEC", "quarterly": "Q-DEC", "monthly": "M", "weekly": "W-SUN"}[self.value]

    @property
    def noun(self) -> str:
        """One period in words: "year", "quarter", "month", "week"."""
        return {"yearly": "year", "quarterly": "quarter", "monthly": "month", "weekly": "week"}[self.value]

    @property
    def plural(self) -> str:
        """Several periods in words: "years", "quarters", "months", "weeks"."""
        return self.noun + "s"

    @property
    def example(self) -> str:
        """How a period of this frequency is written."""
        written = {"yearly": "2026", "quarterly": "2026-Q3", "monthly": "2026-10", "weekly": "2026-W05"}
        return written[self.value]


_WRITTEN = {
    Frequency.YEARLY: re.compile(r"([0-9]{4})"),
    Frequency.QUARTERLY: re.compile(r"([0-9]{4})-Q([1-4])"),
    Frequency.MONTHLY: re.compile(r"([0-9]{4})-(0[1-9]|1[0-2])"),
    Frequency.WEEKLY: re.compile(r"([0-9]{4})-W([0-9]{2})"),
}


def frequency_of(periods: pd.Period | pd.PeriodIndex) -> Frequency:
    """Return the frequency of a period or an index of periods.

    Raises
    ------
    PeriodError
        if it is none of ours, for example weeks that end on a Saturday.
    """
    for frequency in Frequency:
        if periods.freqstr == frequency.pandas_code:
            return frequency
    raise PeriodError(
        f"the frequency {periods.freqstr!r} is not one that foredeck works with",
        allowed=", ".join(f"{f.pandas_code} ({f.value})" for f in Frequency),
        do="convert the index with .asfreq(...) or sum the values to one of these frequencies",
        value=periods.freqstr,
    )


def period_name(period: pd.Period) -> str:
    """Write a period: "2026", "2026-Q3", "2026-10", "2026-W05" (ISO year and week)."""
    frequency = frequency_of(period)
    if frequency is Frequency.WEEKLY:
        year, week, _ = period.start_time.isocalendar()
        return f"{year:04d}-W{week:02d}"
    if frequency is Frequency.QUARTERLY:
        return f"{period.year:04d}-Q{period.quarter}"
    return f"{period.year:04d}" if frequency is Frequency.YEARLY else f"{period.year:04d}-{period.month:02d}"


def period_names(periods: Iterable[Any]) -> list[str]:
    """Write many periods, each distinct one once; a missing period becomes ""."""
    import pandas as pd

    index = pd.PeriodIndex(periods)  # type: ignore[arg-type]
    codes, distinct = pd.factorize(index)
    names = [period_name(p) for p in distinct]
    return [names[code] if code >= 0 else "" for code in codes]


def make_period(frequency: Frequency, year: int, part: int = 1) -> pd.Period:
    """Make the `part`-th quarter, month or ISO week of a year (1-based; ignored for years).

    Raises
    ------
    PeriodError
        if the year has no such part (week 53 of a year with 52) or lies outside 1900..2200.
    """
    import pandas as pd

    if not FIRST_YEAR <= year <= LAST_YEAR:
        raise PeriodError(
            f"the year {year} is not taken for a real one",
            allowed=f"years from {FIRST_YEAR} to {LAST_YEAR}",
            do="correct the date",
            value=year,
        )
    try:
        if frequency is Frequency.WEEKLY:
            return pd.Period(dt.date.fromisocalendar(year, part, 1), freq="W-SUN")
        month = {Frequency.YEARLY: 1, Frequency.QUARTERLY: 3 * part - 2}.get(frequency, part)
        return pd.Period(dt.date(year, month, 1), freq=frequency.pandas_code)
    except ValueError as error:
        raise PeriodError(
            f"the year {year} has no {frequency.noun} {part}",
            allowed=f"{frequency.plural} such as {frequency.example}",
            do="correct the period",
            value=part,
        ) from error


def parse_period(text: str, frequency: Frequency) -> pd.Period:
    """Read a period as `period_name` writes it; the exact inverse.

    Raises
    ------
    PeriodError
        if the text is not written in this way, or names a period that does not exist.
    """
    match = _WRITTEN[Frequency(frequency)].fullmatch(text)
    if match is None:
        raise PeriodError(
            f"{text!r} is not a {frequency.noun}",
            allowed=f"{frequency.plural} written as {frequency.example}",
            do="write the period in this form",
            value=text,
        )
    return make_period(frequency, *(int(part) for part in match.groups()))


def frequency_of_text(text: str) -> Frequency:
    """Return the frequency that the form of a period's text tells.

    Raises
    ------
    PeriodError
        if the text is no period.
    """
    for frequency in Frequency:
        try:
            parse_period(text, frequency)
        except PeriodError:
            continue
        return frequency
    raise PeriodError(f"{text!r} is no period", allowed=", ".join(each.example for each in Frequency),
                      do="write the period in one of these forms", value=text)


def season_position(period: pd.Period) -> int:
    """Return the 0-based place of a period in its year.

    ISO week 53 shares place 51 with week 52, so that a place always indexes an
    array of `season_length` values.
    """
    frequency = frequency_of(period)
    if frequency is Frequency.YEARLY:
        return 0
    if frequency is Frequency.QUARTERLY:
        return int(period.quarter) - 1
    if frequency is Frequency.MONTHLY:
        return int(period.month) - 1
    return min(int(period.start_time.isocalendar().week), 52) - 1


@dataclass(frozen=True)
class FinancialYear:
    """A year of accounts that begins with a given month.

    Parameters
    ----------
    first_month : int
        1 to 12; 1 makes it the calendar year.

    Raises
    ------
    PeriodError
        if the month does not exist.
    """

    first_month: int = 1

    def __post_init__(self) -> None:
        """Refuse a month that does not exist."""
        if not 1 <= self.first_month <= 12:
            raise PeriodError(
                f"a financial year cannot begin with month {self.first_month}",
                allowed="1 (January) to 12 (December)",
                do="correct first_month",
                value=self.first_month,
            )

    def containing(self, period: pd.Period) -> tuple[pd.Period, pd.Period]:
        """Return the first and last period of the financial year that a period lies in.

        A week belongs to the year that holds its Thursday (as in ISO 8601). A
        calendar year as period is its own financial year.

        Raises
        ------
        PeriodError
            if quarters are used and the year does not begin with a calendar quarter.
        """
        import pandas as pd

        frequency = frequency_of(period)
        if frequency is Frequency.YEARLY:
            return period, period
        if frequency is Frequency.QUARTERLY and self.first_month % 3 != 1:
            raise PeriodError(
                f"a financial year that begins with month {self.first_month} cuts calendar quarters in two",
                allowed="1, 4, 7 or 10 with quarterly series",
                do="correct first_month, or use monthly series",
                value=self.first_month,
            )
        day = period.start_time.date()
        if frequency is Frequency.WEEKLY:
            day += dt.timedelta(days=3)
        year = day.year if day.month >= self.first_month else day.year - 1
        begins, next_begins = dt.date(year, self.first_month, 1), dt.date(year + 1, self.first_month, 1)
        if frequency is Frequency.WEEKLY:
            return _week_with_thursday_from(begins), _week_with_thursday_from(next_begins) - 1
        code = frequency.pandas_code
        return pd.Period(begins, freq=code), pd.Period(next_begins, freq=code) - 1


def _week_with_thursday_from(day: dt.date) -> pd.Period:
    """Return the first week whose Thursday falls on the day or later."""
    import pandas as pd

    return pd.Period(day + dt.timedelta(days=(3 - day.weekday()) % 7), freq="W-SUN")
