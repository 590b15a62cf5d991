"""Dates and periods: an explicit list of ways to write them, and the frequency they show.

All cells of a column must follow one way. Where two ways fit and say different
days, nothing is guessed.
"""

from __future__ import annotations

import datetime as dt
import difflib
import math
import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import TYPE_CHECKING, Any, Literal

from foredeck.errors import PeriodError
from foredeck.periods import FIRST_YEAR, LAST_YEAR, Frequency, make_period

if TYPE_CHECKING:
    import pandas as pd

Grain = Literal["day", "week", "month", "quarter", "year"]
Reading = tuple[int, int, int]
"""Year, then month and day, or the number of the part (week, month, quarter) and 1."""

_FULL = ("january", "february", "march", "april", "may", "june", "july", "august", "september", "october",
         "november", "december")
_MONTHS = {name[:length]: at for at, name in enumerate(_FULL, start=1) for length in (3, len(name))}


@dataclass(frozen=True)
class DateFormat:
    """One way to write dates.

    `read` turns the groups of the pattern into a reading, or None where they name no real date.
    """

    name: str
    example: str
    grain: Grain
    pattern: re.Pattern[str]
    read: Callable[[tuple[str, ...]], Reading | None]

    def reading(self, text: str) -> Reading | None:
        """Read a text; None where it is not written in this way."""
        match = self.pattern.fullmatch(text)
        return self.read(match.groups()) if match else None


def _day(year: str, month: str, day: str) -> Reading | None:
    try:
        date = dt.date(int(year), int(month), int(day))
    except ValueError:
        return None
    return date.year, date.month, date.day


def _part(highest: int) -> Callable[[tuple[str, ...]], Reading | None]:
    def read(groups: tuple[str, ...]) -> Reading | None:
        year, part = int(groups[0]), int(groups[1])
        return (year, part, 1) if 1 <= part <= highest else None
    return read


def _week(groups: tuple[str, ...]) -> Reading | None:
    try:
        dt.date.fromisocalendar(int(groups[0]), int(groups[1]), 1)
    except ValueError:
        return None
    return int(groups[0]), int(groups[1]), 1


def _named_month(groups: tuple[str, ...]) -> Reading | None:
    month = _MONTHS.get(groups[0].lower())
    year = int(groups[1])
    if len(groups[1]) == 2:
        year += 2000 if year < 69 else 1900  # the pivot of POSIX strptime
    return (year, month, 1) if month else None


_Y, _N = "([0-9]{4})", "([0-9]{1,2})"
_CLOCK = r"(?:[ T][0-9]{2}:[0-9]{2}(?::[0-9]{2}(?:\.[0-9]+)?)?)?"
_MIXED = r"([0-9]{1,2})([/.\-])([0-9]{1,2})\2([0-9]{4})"

FORMATS: dict[str, DateFormat] = {f.name: f for f in (
    DateFormat("YYYY-MM", "2024-01", "month", re.compile(f"{_Y}-{_N}"), _part(12)),
    DateFormat("YYYY/MM", "2024/01", "month", re.compile(f"{_Y}/{_N}"), _part(12)),
    DateFormat("YYYYMM", "202401", "month", re.compile("([0-9]{4})([0-9]{2})"), _part(12)),
    DateFormat("YYYYMnn", "2024M01", "month", re.compile(f"{_Y}-?[Mm]{_N}"), _part(12)),
    DateFormat("Mon-YY", "Jan-24", "month", re.compile("([A-Za-z]+)[- ]([0-9]{2})"), _named_month),
    DateFormat("Mon YYYY", "Jan 2024", "month", re.compile("([A-Za-z]+)[- ]([0-9]{4})"), _named_month),
    DateFormat("YYYY-Qn", "2024-Q3", "quarter", re.compile(f"{_Y}-?[Qq]([0-9])"), _part(4)),
    DateFormat("YYYY-Wnn", "2024-W05", "week", re.compile(f"{_Y}-?[Ww]{_N}"), _week),
    DateFormat("YYYY", "2024", "year", re.compile(_Y), lambda g: (int(g[0]), 1, 1)),
    DateFormat("YYYY-MM-DD", "2024-01-31", "day", re.compile(f"{_Y}-{_N}-{_N}{_CLOCK}"), lambda g: _day(*g)),
    DateFormat("YYYY/MM/DD", "2024/01/31", "day", re.compile(f"{_Y}/{_N}/{_N}"), lambda g: _day(*g)),
    DateFormat("DD/MM/YYYY", "31/01/2024", "day", re.compile(_MIXED), lambda g: _day(g[3], g[2], g[0])),
    DateFormat("MM/DD/YYYY", "01/31/2024", "day", re.compile(_MIXED), lambda g: _day(g[3], g[0], g[2])),
)}
"""Every way to write dates that is understood, by name; the names pin `date_format`."""

DATE_CELLS = "date cells"
"""Name of the format of cells that are dates already, in a workbook or in Parquet."""

_ALLOWED = ", ".join(f"{f.name} ({f.example})" for f in FORMATS.values())


@dataclass(frozen=True)
class Dates:
    """Distinct cells of a column of dates, read: the format's name, what it tells, and a reading a cell."""

    format: str
    grain: Grain
    readings: tuple[Reading, ...]


def read_dates(cells: Sequence[Any], place: Callable[[int], str], date_format: str | None = None) -> Dates:
    """Read the distinct cells of a column of dates, all in one format.

    Parameters
    ----------
    cells : sequence
        Distinct cells: texts (without blanks around them), or dates.
    place : function of an index into `cells`
        Says where that cell stands, for errors.
    date_format : str, optional
        Name of the one format of texts; else the one that fits every cell. Cells that
        are dates already need none.

    Raises
    ------
    PeriodError
        if a cell is blank, is no date, follows another format than the others, or
        lies outside 1900..2200; or if two formats fit and say different days.
    """
    for at, cell in enumerate(cells):
        if cell == "":
            raise PeriodError("the row has no date", where=place(at), allowed=_ALLOWED,
                              do="fill in the date or take out the row", value="")
    dated = [isinstance(cell, dt.date) for cell in cells]
    if all(dated):
        dates = Dates(DATE_CELLS, "day", tuple((c.year, c.month, c.day) for c in cells))
    elif any(dated):
        at = dated.index(False)
        raise PeriodError(f"{str(cells[at])!r} is not a date cell, as others of the column are",
                          where=place(at), allowed="a column all of date cells or all of text",
                          do="give the whole column one type", value=str(cells[at]))
    else:
        form = _one_format(cells, place, date_format)
        dates = Dates(form.name, form.grain, tuple(r for r in map(form.reading, cells) if r))
    for at, (year, _, _) in enumerate(dates.readings):
        if not FIRST_YEAR <= year <= LAST_YEAR:
            raise PeriodError(f"{str(cells[at])!r} lies in the year {year}", where=place(at),
                              allowed=f"years from {FIRST_YEAR} to {LAST_YEAR}", do="correct the date",
                              value=str(cells[at]))
    return dates


def _one_format(texts: Sequence[str], place: Callable[[int], str], pinned: str | None) -> DateFormat:
    if pinned is not None and pinned not in FORMATS:
        near = difflib.get_close_matches(pinned, FORMATS, n=1)
        raise PeriodError(f"there is no date format {pinned!r}", where="date_format", allowed=_ALLOWED,
                          do=f"did you mean {near[0]!r}?" if near else "use one of these names", value=pinned)
    tried = [FORMATS[pinned]] if pinned else list(FORMATS.values())
    fitting = [form for form in tried if all(form.reading(text) for text in texts)]
    if not fitting:
        raise _no_format(texts, place, pinned, tried)
    for other in fitting[1:]:
        for at, text in enumerate(texts):
            one, two = fitting[0].reading(text), other.reading(text)
            if one is not None and two is not None and one != two:
                raise PeriodError(
                    f"{text!r} can be read as {_plain(one)} ({fitting[0].name}) or as {_plain(two)} "
                    f"({other.name}), and no cell of the column settles it",
                    where=place(at), allowed="dates that can be read in one way",
                    do=f'pin date_format = "{fitting[0].name}" or date_format = "{other.name}"',
                    value=text, readings=(_plain(one), _plain(two)))
    return fitting[0]


def _plain(reading: Reading) -> str:
    year, month, day = reading
    return f"{day} {_FULL[month - 1].capitalize()} {year}"


def _no_format(texts: Sequence[str], place: Callable[[int], str], pinned: str | None,
               tried: list[DateFormat]) -> PeriodError:
    unread = {form.name: [at for at, text in enumerate(texts) if not form.reading(text)] for form in tried}
    best = min(unread, key=lambda name: len(unread[name]))
    at, fits = unread[best][0], len(texts) - len(unread[best])
    if pinned or not fits:
        what = f"{texts[at]!r} is not a date" + (f" written as {FORMATS[pinned].example}" if pinned else "")
        allowed = f"{pinned} ({FORMATS[pinned].example})" if pinned else _ALLOWED
    else:
        what = f"{texts[at]!r} is not written as the other dates of the column are"
        allowed = f"{best} ({FORMATS[best].example}), which fits {fits} of {len(texts)} different dates"
    return PeriodError(what, where=place(at), allowed=allowed, do="correct the cell, or pin date_format",
                       value=texts[at])


def detect_frequency(dates: Dates, where: str) -> Frequency:
    """Tell the frequency from the distinct dates of a whole column; gaps are allowed.

    Parameters
    ----------
    dates : Dates
        Distinct dates that were read.
    where : str
        File and column, for errors.

    Returns
    -------
    Frequency
        Weeks where days stand a multiple of seven apart. Months where no month has
        two dates; quarters or years where all steps between months are multiples of
        three or twelve, which takes at least three dates to tell.

    Raises
    ------
    PeriodError
        if the dates are daily or irregular, or too few to tell.
    """
    if dates.grain == "week":
        return Frequency.WEEKLY
    if dates.grain == "year":
        return Frequency.YEARLY
    width = 3 if dates.grain == "quarter" else 1
    months = sorted({12 * year + width * part for year, part, _ in dates.readings})
    if dates.grain == "day":
        days = sorted({dt.date(*reading).toordinal() for reading in dates.readings})
        steps = [b - a for a, b in pairwise(days)]
        # Ends of months that are working days can stand 25 days apart, never less.
        if len(months) < len(days) or min(steps, default=31) < 25:
            if math.gcd(*steps) == 7:
                return Frequency.WEEKLY
            raise PeriodError(f"the dates are neither weekly nor monthly: the closest two are {min(steps)} "
                              f"{'day' if min(steps) == 1 else 'days'} apart", where=where,
                              allowed="one date a week (always the same weekday), month, quarter or year",
                              do="give the frequency, and sum_rows = true if rows are to be added up")
    return _frequency_of_months(months, dates.grain, where)


def _frequency_of_months(months: list[int], grain: Grain, where: str) -> Frequency:
    step = math.gcd(*(b - a for a, b in pairwise(months)))
    finest = Frequency.QUARTERLY if grain == "quarter" else Frequency.MONTHLY
    if step in (0, {Frequency.QUARTERLY: 3, Frequency.MONTHLY: 1}[finest]):
        if step == 0 and grain == "day":
            raise PeriodError("one date does not show a frequency", where=where,
                              allowed="yearly, quarterly, monthly, weekly", do="give the frequency")
        return finest
    if len(months) > 2 and step % 12 == 0:
        return Frequency.YEARLY
    if len(months) > 2 and step == 3:
        return Frequency.QUARTERLY
    raise PeriodError(f"{len(months)} different dates, {step} months apart or a multiple of that, show no "
                      "frequency", where=where, allowed="yearly, quarterly, monthly, weekly",
                      do="give the frequency")


_HOLDS: dict[Grain, tuple[Frequency, ...]] = {
    "day": tuple(Frequency),
    "week": (Frequency.WEEKLY,),
    "month": (Frequency.MONTHLY, Frequency.QUARTERLY, Frequency.YEARLY),
    "quarter": (Frequency.QUARTERLY, Frequency.YEARLY),
    "year": (Frequency.YEARLY,),
}


def to_periods(dates: Dates, frequency: Frequency, where: str) -> list[pd.Period]:
    """Return the period that each reading lies in.

    Raises
    ------
    PeriodError
        if the dates are too coarse for the frequency, or weeks are to become months.
    """
    import pandas as pd

    if frequency not in _HOLDS[dates.grain]:
        raise PeriodError(f"dates that name a {dates.grain} do not make {frequency.value} periods",
                          where=where, allowed=", ".join(f.value for f in _HOLDS[dates.grain]),
                          do="correct the frequency", value=frequency.value)
    if dates.grain == "day":
        return [pd.Period(dt.date(*reading), freq=frequency.pandas_code) for reading in dates.readings]
    own = {"week": Frequency.WEEKLY, "month": Frequency.MONTHLY, "quarter": Frequency.QUARTERLY,
           "year": Frequency.YEARLY}[dates.grain]
    named = [make_period(own, year, part) for year, part, _ in dates.readings]
    return named if own is frequency else [p.asfreq(frequency.pandas_code) for p in named]
