import calendar
import datetime as dt
from itertools import pairwise

import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from foredeck.errors import PeriodError
from foredeck.intake.dates import FORMATS, detect_frequency, read_dates, to_periods
from foredeck.periods import Frequency, make_period, period_name

untimed = settings(deadline=None)
ALLOWED = (
    "YYYY-MM (2024-01), YYYY/MM (2024/01), YYYYMM (202401), YYYYMnn (2024M01), Mon-YY (Jan-24), "
    "Mon YYYY (Jan 2024), YYYY-Qn (2024-Q3), YYYY-Wnn (2024-W05), YYYY (2024), YYYY-MM-DD (2024-01-31), "
    "YYYY/MM/DD (2024/01/31), DD/MM/YYYY (31/01/2024), MM/DD/YYYY (01/31/2024)")


def place(at):
    return f"a.csv line {at + 2}, column month"


def refusal(cells, **options):
    with pytest.raises(PeriodError) as caught:
        read_dates(cells, place, **options)
    return str(caught.value)


def as_periods(cells, frequency=None, **options):
    dates = read_dates(cells, place, **options)
    frequency = frequency or detect_frequency(dates, "a.csv, column month")
    return [period_name(p) for p in to_periods(dates, frequency, "a.csv, column month")]


WRITERS = {
    "YYYY-MM": lambda y, m, d: f"{y}-{m:02d}",
    "YYYY/MM": lambda y, m, d: f"{y}/{m}",
    "YYYYMM": lambda y, m, d: f"{y}{m:02d}",
    "YYYYMnn": lambda y, m, d: f"{y}M{m:02d}",
    "Mon-YY": lambda y, m, d: f"{calendar.month_abbr[m]}-{y % 100:02d}",
    "Mon YYYY": lambda y, m, d: f"{calendar.month_name[m]} {y}",
    "YYYY-MM-DD": lambda y, m, d: f"{y}-{m:02d}-{d:02d} 00:00:00",
    "YYYY/MM/DD": lambda y, m, d: f"{y}/{m}/{d}",
    "DD/MM/YYYY": lambda y, m, d: f"{d:02d}/{m:02d}/{y}",
    "MM/DD/YYYY": lambda y, m, d: f"{m}/{d}/{y}",
}


@untimed
@given(st.sampled_from(sorted(WRITERS)), st.sets(st.tuples(st.integers(1970, 2068), st.integers(1, 12)),
                                                min_size=1, max_size=30), st.integers(1, 28))
def test_months_written_in_each_format_come_back(name, months, day):
    ordered = sorted(months)
    cells = [WRITERS[name](y, m, day) for y, m in ordered]
    wanted = [f"{y}-{m:02d}" for y, m in ordered]
    assert as_periods(cells, Frequency.MONTHLY, date_format=name) == wanted


@untimed
@given(st.sampled_from(sorted(WRITERS)), st.sets(st.tuples(st.integers(1970, 2068), st.integers(1, 12)),
                                                min_size=1, max_size=30), st.integers(1, 28))
def test_without_a_pin_months_come_back_or_are_refused_as_ambiguous(name, months, day):
    ordered = sorted(months)
    cells = [WRITERS[name](y, m, day) for y, m in ordered]
    if name in ("DD/MM/YYYY", "MM/DD/YYYY") and day <= 12 and any(m != day for _, m in ordered):
        with pytest.raises(PeriodError, match="no cell of the column settles it"):
            as_periods(cells, Frequency.MONTHLY)
    else:
        assert as_periods(cells, Frequency.MONTHLY) == [f"{y}-{m:02d}" for y, m in ordered]


@untimed
@given(st.sets(st.tuples(st.integers(1901, 2199), st.integers(1, 53)), min_size=1, max_size=20))
def test_iso_weeks_come_back_also_in_years_of_53(weeks):
    real = sorted((y, w) for y, w in weeks if w <= dt.date(y, 12, 28).isocalendar().week)
    assume(real)
    assert as_periods([f"{y}-W{w:02d}" for y, w in real]) == [f"{y}-W{w:02d}" for y, w in real]


@pytest.mark.parametrize("year", [2020, 2026])
def test_mondays_of_a_year_of_53_iso_weeks_are_53_weeks(year):
    # ISO 8601: 2020 and 2026 have 53 weeks
    first = dt.date.fromisocalendar(year, 1, 1)
    cells = [(first + dt.timedelta(weeks=k)).isoformat() for k in range(54)]
    assert as_periods(cells) == [f"{year}-W{w:02d}" for w in range(1, 54)] + [f"{year + 1}-W01"]


def test_week_53_of_a_year_of_52_weeks_is_no_date():
    assert refusal(["2024-W52", "2024-W53"]) == (
        "'2024-W53' is not written as the other dates of the column are\n"
        "  where: a.csv line 3, column month\n"
        "  allowed: YYYY-Wnn (2024-W05), which fits 1 of 2 different dates\n"
        "  next: correct the cell, or pin date_format")


@pytest.mark.parametrize(("cells", "periods"), [
    (["2024-Q1", "2024Q2", "2024-q4"], ["2024-Q1", "2024-Q2", "2024-Q4"]),
    (["2019", "2021"], ["2019", "2021"]),
    (["Jan-24", "Feb-24"], ["2024-01", "2024-02"]),
    (["May 2024", "June 2024", "AUG-2024"], ["2024-05", "2024-06", "2024-08"]),
    (["2024M9", "2024M10"], ["2024-09", "2024-10"]),
])
def test_further_ways_to_write_periods(cells, periods):
    assert as_periods(cells) == periods


def test_two_digits_of_a_year_turn_at_69_as_in_posix():
    assert as_periods(["Dec-68", "Jan-69"], Frequency.MONTHLY) == ["2068-12", "1969-01"]


def test_day_and_month_that_no_cell_settles_are_refused_with_both_readings():
    assert refusal(["01/02/2024", "01/03/2024"]) == (
        "'01/02/2024' can be read as 1 February 2024 (DD/MM/YYYY) or as 2 January 2024 (MM/DD/YYYY), "
        "and no cell of the column settles it\n"
        "  where: a.csv line 2, column month\n"
        "  allowed: dates that can be read in one way\n"
        '  next: pin date_format = "DD/MM/YYYY" or date_format = "MM/DD/YYYY"')


def test_one_cell_settles_day_and_month_for_the_whole_column():
    assert as_periods(["01/02/2024", "31/03/2024"]) == ["2024-02", "2024-03"]
    assert as_periods(["02/01/2024", "03/31/2024"]) == ["2024-02", "2024-03"]


def test_a_pin_settles_day_and_month():
    cells = ["01/02/2024", "01/03/2024"]
    assert as_periods(cells, date_format="DD/MM/YYYY") == ["2024-02", "2024-03"]
    assert as_periods(cells, Frequency.WEEKLY, date_format="MM/DD/YYYY") == ["2024-W01", "2024-W01"]


def test_dates_that_say_the_same_in_both_readings_are_read():
    assert as_periods(["01/01/2022", "01/01/2023", "01/01/2024"]) == ["2022", "2023", "2024"]


def test_cells_that_settle_day_and_month_in_opposite_ways_are_refused():
    assert refusal(["31/01/2024", "28/02/2024", "03/31/2024"]) == (
        "'03/31/2024' is not written as the other dates of the column are\n"
        "  where: a.csv line 4, column month\n"
        "  allowed: DD/MM/YYYY (31/01/2024), which fits 2 of 3 different dates\n"
        "  next: correct the cell, or pin date_format")


@pytest.mark.parametrize("cell", ["sum", "2024-13", "2024-02-30", "45292", "Foo-24", "1/2/24", "２０２４-01"])
def test_what_is_no_date_is_refused(cell):
    assert refusal([cell]) == (
        f"{cell!r} is not a date\n"
        "  where: a.csv line 2, column month\n"
        f"  allowed: {ALLOWED}\n"
        "  next: correct the cell, or pin date_format")


def test_a_cell_that_does_not_follow_the_pinned_format_is_refused():
    assert refusal(["2024-01", "2024-02-01"], date_format="YYYY-MM") == (
        "'2024-02-01' is not a date written as 2024-01\n"
        "  where: a.csv line 3, column month\n"
        "  allowed: YYYY-MM (2024-01)\n"
        "  next: correct the cell, or pin date_format")


def test_an_unknown_format_is_refused_with_the_nearest():
    assert refusal(["2024-01"], date_format="DD/MM/YYY") == (
        "there is no date format 'DD/MM/YYY'\n"
        "  where: date_format\n"
        f"  allowed: {ALLOWED}\n"
        "  next: did you mean 'DD/MM/YYYY'?")


def test_a_row_without_a_date_is_refused():
    assert refusal(["2024-01", ""]) == (
        "the row has no date\n"
        "  where: a.csv line 3, column month\n"
        f"  allowed: {ALLOWED}\n"
        "  next: fill in the date or take out the row")


@pytest.mark.parametrize("cell", ["1899-12", "2201-01", "0001-01-01", dt.date(1899, 12, 30)])
def test_years_outside_1900_to_2200_are_refused(cell):
    assert refusal([cell]) == (
        f"{str(cell)!r} lies in the year {int(str(cell)[:4])}\n"
        "  where: a.csv line 2, column month\n"
        "  allowed: years from 1900 to 2200\n"
        "  next: correct the date")


def test_date_cells_need_no_format_and_do_not_mix_with_text():
    assert as_periods([dt.date(2024, 1, 31), dt.date(2024, 2, 29)], date_format="YYYY-MM") == [
        "2024-01", "2024-02"]
    assert refusal([dt.date(2024, 1, 31), "2024-02"]) == (
        "'2024-02' is not a date cell, as others of the column are\n"
        "  where: a.csv line 3, column month\n"
        "  allowed: a column all of date cells or all of text\n"
        "  next: give the whole column one type")


@untimed
@given(st.sampled_from(list(Frequency)), st.integers(0, 50), st.sets(st.integers(0, 60), min_size=6))
def test_the_frequency_is_found_from_dates_with_gaps(frequency, start, steps):
    ordered = sorted(steps)
    assume(1 in [b - a for a, b in pairwise(ordered)])
    first = make_period(frequency, 1960) + start
    cells = [(first + k).end_time.date().isoformat() for k in ordered]
    dates = read_dates(cells, place)
    assert detect_frequency(dates, "a.csv") is frequency


def test_months_three_or_twelve_apart_are_quarters_or_years():
    assert as_periods(["2024-03", "2024-06", "2024-12"]) == ["2024-Q1", "2024-Q2", "2024-Q4"]
    assert as_periods(["2022-06", "2023-06", "2024-06"]) == ["2022", "2023", "2024"]


def test_working_days_at_ends_of_months_are_months():
    cells = ["2024-05-31", "2024-06-28", "2024-07-31", "2024-08-30"]
    assert as_periods(cells) == ["2024-05", "2024-06", "2024-07", "2024-08"]


@pytest.mark.parametrize(("cells", "message"), [
    (["2024-01-01", "2024-01-02", "2024-01-03"],
     "the dates are neither weekly nor monthly: the closest two are 1 day apart\n"
     "  where: a.csv, column month\n"
     "  allowed: one date a week (always the same weekday), month, quarter or year\n"
     "  next: give the frequency, and sum_rows = true if rows are to be added up"),
    (["2024-01-31"],
     "one date does not show a frequency\n"
     "  where: a.csv, column month\n"
     "  allowed: yearly, quarterly, monthly, weekly\n"
     "  next: give the frequency"),
    (["2024-01", "2024-04"],
     "2 different dates, 3 months apart or a multiple of that, show no frequency\n"
     "  where: a.csv, column month\n"
     "  allowed: yearly, quarterly, monthly, weekly\n"
     "  next: give the frequency"),
])
def test_dates_that_show_no_frequency_are_refused(cells, message):
    with pytest.raises(PeriodError) as caught:
        as_periods(cells)
    assert str(caught.value) == message


def test_two_weeks_that_lie_in_two_months_are_not_taken_for_months():
    assert as_periods(["2024-01-29", "2024-02-05"]) == ["2024-W05", "2024-W06"]


def test_dates_coarser_than_the_frequency_are_refused():
    with pytest.raises(PeriodError) as caught:
        as_periods(["2024-01"], Frequency.WEEKLY)
    assert str(caught.value) == (
        "dates that name a month do not make weekly periods\n"
        "  where: a.csv, column month\n"
        "  allowed: monthly, quarterly, yearly\n"
        "  next: correct the frequency")


def test_every_format_reads_its_own_example():
    for form in FORMATS.values():
        assert form.reading(form.example) is not None
