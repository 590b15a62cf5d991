import datetime as dt

import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from foredeck.errors import PeriodError
from foredeck.periods import (
    FinancialYear,
    Frequency,
    frequency_of,
    frequency_of_text,
    make_period,
    parse_period,
    period_name,
    period_names,
    season_position,
)

untimed = settings(deadline=None)
DAYS = st.dates(dt.date(1900, 1, 1), dt.date(2200, 12, 24))


@untimed
@given(DAYS, st.sampled_from(list(Frequency)))
def test_the_name_of_a_period_reads_back_as_the_same_period(day, frequency):
    period = pd.Period(day, freq=frequency.pandas_code)
    assert parse_period(period_name(period), frequency) == period
    assert frequency_of(period) is frequency


@untimed
@given(DAYS)
def test_weeks_carry_the_iso_year_and_week_of_the_standard_library(day):
    year, week, _ = day.isocalendar()
    assert period_name(pd.Period(day, freq="W-SUN")) == f"{year}-W{week:02d}"


def test_names_are_written_as_the_words_of_the_design_show_them():
    day = dt.date(2026, 10, 31)
    assert [period_name(pd.Period(day, freq=f.pandas_code)) for f in Frequency] == [
        "2026", "2026-Q4", "2026-10", "2026-W44"]


def test_many_names_are_written_at_once_and_a_missing_period_is_empty():
    assert period_names([pd.Period("2024-01", "M"), pd.NaT, pd.Period("2024-01", "M")]) == [
        "2024-01", "", "2024-01"]


@pytest.mark.parametrize("year", [2015, 2020, 2026, 2032])
def test_years_of_53_iso_weeks_have_a_week_53(year):
    # ISO 8601; the years agree with dt.date(year, 12, 28).isocalendar()
    last = make_period(Frequency.WEEKLY, year, 53)
    assert period_name(last) == f"{year}-W53"
    assert period_name(last + 1) == f"{year + 1}-W01"


def test_week_53_of_a_year_of_52_weeks_is_refused():
    with pytest.raises(PeriodError) as caught:
        parse_period("2024-W53", Frequency.WEEKLY)
    assert str(caught.value) == (
        "the year 2024 has no week 53\n"
        "  allowed: weeks such as 2026-W05\n"
        "  next: correct the period")


@pytest.mark.parametrize("text", ["2024-1", "2024-13", "2024-00", "2024-01-01", " 2024-01", "", "2024-01\n",
                                  "２０２４-01"])
def test_a_month_written_in_any_other_way_is_refused(text):
    with pytest.raises(PeriodError) as caught:
        parse_period(text, Frequency.MONTHLY)
    assert str(caught.value) == (
        f"{text!r} is not a month\n"
        "  allowed: months written as 2026-10\n"
        "  next: write the period in this form")


@pytest.mark.parametrize("text", ["1899-12", "2201-01"])
def test_years_outside_1900_to_2200_are_refused(text):
    with pytest.raises(PeriodError) as caught:
        parse_period(text, Frequency.MONTHLY)
    assert str(caught.value) == (
        f"the year {text[:4]} is not taken for a real one\n"
        "  allowed: years from 1900 to 2200\n"
        "  next: correct the date")


def test_a_frequency_that_is_none_of_ours_is_refused():
    with pytest.raises(PeriodError) as caught:
        period_name(pd.Period("2024-01-06", freq="W-SAT"))
    assert str(caught.value) == (
        "the frequency 'W-SAT' is not one that foredeck works with\n"
        "  allowed: Y-DEC (yearly), Q-DEC (quarterly), M (monthly), W-SUN (weekly)\n"
        "  next: convert the index with .asfreq(...) or sum the values to one of these frequencies")


@pytest.mark.parametrize(("text", "frequency", "place"), [
    ("2020-W53", Frequency.WEEKLY, 51), ("2020-W52", Frequency.WEEKLY, 51), ("2020-W01", Frequency.WEEKLY, 0),
    ("2026-12", Frequency.MONTHLY, 11), ("2026-Q4", Frequency.QUARTERLY, 3), ("2026", Frequency.YEARLY, 0)])
def test_the_place_in_the_season_indexes_an_array_of_the_season_length(text, frequency, place):
    assert season_position(parse_period(text, frequency)) == place < frequency.season_length


@untimed
@given(DAYS.filter(lambda d: 1901 < d.year < 2199), st.sampled_from([Frequency.MONTHLY, Frequency.WEEKLY]),
       st.integers(1, 12))
def test_a_financial_year_holds_its_period_and_meets_the_next(day, frequency, first_month):
    year = FinancialYear(first_month)
    period = pd.Period(day, freq=frequency.pandas_code)
    first, last = year.containing(period)
    assert first <= period <= last
    assert year.containing(first) == year.containing(last) == (first, last)
    assert year.containing(last + 1)[0] == last + 1
    thursday = pd.Timedelta(days=3 if frequency is Frequency.WEEKLY else 0)
    assert (first.start_time + thursday).month == first_month
    assert (last - first).n in ({51, 52} if frequency is Frequency.WEEKLY else {11})


def test_the_calendar_year_of_weeks_is_the_iso_year():
    first, last = FinancialYear(1).containing(parse_period("2020-W53", Frequency.WEEKLY))
    assert (period_name(first), period_name(last)) == ("2020-W01", "2020-W53")


def test_an_april_year_of_months_and_quarters():
    year = FinancialYear(4)
    months = year.containing(parse_period("2027-03", Frequency.MONTHLY))
    quarters = year.containing(parse_period("2026-Q2", Frequency.QUARTERLY))
    assert [period_name(p) for p in (*months, *quarters)] == ["2026-04", "2027-03", "2026-Q2", "2027-Q1"]


def test_a_financial_year_that_cuts_quarters_is_refused():
    with pytest.raises(PeriodError) as caught:
        FinancialYear(2).containing(parse_period("2026-Q2", Frequency.QUARTERLY))
    assert str(caught.value) == (
        "a financial year that begins with month 2 cuts calendar quarters in two\n"
        "  allowed: 1, 4, 7 or 10 with quarterly series\n"
        "  next: correct first_month, or use monthly series")


def test_a_financial_year_from_a_month_that_does_not_exist_is_refused():
    with pytest.raises(PeriodError) as caught:
        FinancialYear(13)
    assert str(caught.value) == (
        "a financial year cannot begin with month 13\n"
        "  allowed: 1 (January) to 12 (December)\n"
        "  next: correct first_month")


@pytest.mark.parametrize("frequency", list(Frequency))
def test_the_form_of_a_period_tells_its_frequency(frequency):
    assert frequency_of_text(frequency.example) is frequency


def test_a_text_that_is_no_period_of_any_frequency_is_refused():
    with pytest.raises(PeriodError) as refused:
        frequency_of_text("2026-13")
    assert str(refused.value) == ("'2026-13' is no period\n  allowed: 2026, 2026-Q3, 2026-10, 2026-W05\n"
                                  "  next: write the period in one of these forms")
