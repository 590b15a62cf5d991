import datetime as dt

import numpy as np
import openpyxl
import pytest

import foredeck as fd
from foredeck.errors import IntakeError, PeriodError

LONG = {"series": ["depot", "family"], "period": "month", "value": "cases", "frequency": "monthly"}


@pytest.fixture
def read(tmp_path):
    def made(*rows, name="a.csv", **options):
        (tmp_path / name).write_text("\n".join(rows) + "\n")
        return fd.read(tmp_path / name, **options)
    return made


@pytest.fixture
def refusal(read):
    def message(*rows, **options):
        with pytest.raises(IntakeError) as caught:
            read(*rows, **options)
        return str(caught.value)
    return message


def test_a_missing_column_is_refused_with_the_nearest(refusal):
    assert refusal("depot,familly,month,cases", "n,x,2024-01,1", **LONG) == (
        "there is no column 'family'\n"
        "  where: a.csv\n"
        "  allowed: 'depot', 'familly', 'month', 'cases'\n"
        "  next: did you mean 'familly'?")
    assert refusal("depot:code:month:cases", "n:x:2024-01:1", **LONG) == (
        "there is no column 'depot'\n"
        "  where: a.csv\n"
        "  allowed: 'depot:code:month:cases'\n"
        "  next: use one of these names, or give the delimiter if they run together")


def test_a_column_that_is_there_twice_is_refused(refusal):
    assert refusal("depot,family,month,cases,cases", "n,x,2024-01,1,2", **LONG) == (
        "2 columns are headed 'cases'\n"
        "  where: a.csv\n"
        "  allowed: one column of that name\n"
        "  next: rename the others")


def test_a_row_without_a_key_is_refused(refusal):
    assert refusal("depot,family,month,cases", "n,x,2024-01,1", "n,,2024-01,1", **LONG) == (
        "the row does not say which series it belongs to\n"
        "  where: a.csv line 3, column family\n"
        "  allowed: a text in every key column\n"
        "  next: fill in the key or take out the row")


def test_keys_that_make_one_name_of_two_series_are_refused(refusal):
    assert refusal("depot,family,month,cases", "n/x,y,2024-01,1", "n,x/y,2024-01,1", **LONG) == (
        "two series are named 'n/x/y': ('n/x', 'y') and ('n', 'x/y')\n"
        "  where: a.csv line 3\n"
        '  allowed: keys that stay apart when joined by "/"\n'
        '  next: take the "/" out of the keys')


def test_a_series_in_two_groups_is_refused(refusal):
    assert refusal("depot,family,month,cases,region", "n,x,2024-01,1,east", "n,x,2024-02,1,west",
                   **LONG, groups=["region"]) == (
        "a series is in two groups of region: 'east' and 'west'\n"
        "  where: a.csv line 2 and a.csv line 3\n"
        "  allowed: the same group in every row of a series\n"
        "  next: correct the group, or make it part of the series")


def test_a_group_that_would_hide_a_column_of_the_round_is_refused(refusal):
    assert refusal("depot,family,month,cases,unit", "n,x,2024-01,1,u", **LONG, groups=["unit"]) == (
        "a kind of group cannot be named 'unit'\n"
        "  where: a.csv\n"
        "  allowed: any name but series, unit, unit_value\n"
        "  next: rename the column")


def test_a_unit_value_that_is_no_number_is_refused(refusal):
    assert refusal("depot,family,month,cases,price", "n,x,2024-01,1,", "n,x,2024-02,1,£4", **LONG,
                   unit_value="price") == (
        "the unit value '£4' is not a number\n"
        "  where: a.csv line 3, column price\n"
        "  allowed: a plain number, or nothing\n"
        "  next: correct the unit value")


def test_the_latest_unit_value_of_a_series_holds_whatever_the_order_of_the_file(read):
    history = read("depot,family,month,cases,price", "n,x,2024-02,1,5", "n,x,2024-03,1,", "n,x,2024-01,1,4",
                   **LONG, unit_value="price")
    assert history["n/x"].unit_value == 5


def test_groups_are_the_parts_of_the_name_unless_said_otherwise(read):
    rows = ("depot,family,month,cases,region", "n,x,2024-01,1,east")
    assert read(*rows, **LONG)["n/x"].groups == {"depot": "n", "family": "x"}
    assert read(*rows, **LONG, groups=["region"])["n/x"].groups == {"region": "east"}
    assert read(*rows, **LONG, groups=[])["n/x"].groups == {}


def test_a_wide_table_is_one_column_a_period(read):
    history = read("code,region,total,2024-01,2024-02,2024-03,", "007,east,9,,5,4,", "NA,west,1,1,-,n/a,",
                   series="code", groups=["region"], layout="wide")
    assert history.names == ["007", "NA"]
    np.testing.assert_array_equal(history["007"].values, [5, 4])
    np.testing.assert_array_equal(history["NA"].values, [1])
    assert history["NA"].groups == {"region": "west"}
    assert history.understood.lines() == [
        "a.csv: CSV (UTF-8, comma), wide layout, 2 rows read",
        "dates written as YYYY-MM (2024-01); monthly, 2024-01 to 2024-03",
        "2 series",
        "ignored: 2 columns that are no periods: 'total', without a heading",
        "3 columns of periods",
        "3 cells without a value",
        "frequency detected from the dates"]


def test_a_fault_in_a_wide_table_names_row_and_period(read):
    faults = read("code,2024-01,2024-02", "a,1,2", "b,?,3", series="code", layout="wide").faults
    assert faults.to_dict("records") == [{
        "series": "b", "period": "2024-01", "code": "not_a_number", "raw": "?",
        "where": "a.csv line 3, column 2024-01", "evidence": "'?' is not a number.",
        "remedy": "Correct the cell; leave it blank if nothing is known."}]


def test_a_heading_with_digits_that_is_no_period_is_refused_not_dropped(refusal):
    message = refusal("code,2024-01,2024-O2,2024-03", "a,1,2,3", series="code", layout="wide")
    assert message == (
        "'2024-O2' is not written as the other dates of the column are\n"
        "  where: a.csv header, column 3\n"
        "  allowed: YYYY-MM (2024-01), which fits 2 of 3 different dates\n"
        "  next: correct the cell, or pin date_format")


def test_a_wide_table_without_periods_is_refused(read):
    with pytest.raises(PeriodError) as caught:
        read("code,month,cases", "a,2024-01,1", series="code", layout="wide")
    assert str(caught.value) == (
        "no column is headed by a period\n"
        "  where: a.csv\n"
        "  allowed: headings such as 2024-01\n"
        '  next: check the headings, or read with layout = "long"')


def test_a_wide_workbook_with_real_dates_as_headings_names_its_cells(tmp_path):
    book = openpyxl.Workbook()
    book.active.title = "cases"
    book.active.append(["code", dt.datetime(2024, 1, 31), dt.datetime(2024, 2, 29), dt.datetime(2024, 3, 31)])
    book.active.append(["a", 1, None, 3])
    book.active.append(["b", 5, "#DIV/0!", 2])
    book.save(tmp_path / "a.xlsx")
    history = fd.read(tmp_path / "a.xlsx", series="code", layout="wide", gaps="zero")
    assert history.understood.lines()[:2] == [
        "a.xlsx sheet 'cases': Excel, wide layout, 2 rows read",
        "dates written as date cells; monthly, 2024-01 to 2024-03"]
    np.testing.assert_array_equal(history["a"].values, [1, 0, 3])
    np.testing.assert_array_equal(history["b"].values, [5, np.nan, 2])
    assert history.faults[["raw", "where"]].to_numpy().tolist() == [
        ["#DIV/0!", "a.xlsx sheet 'cases' row 3, column 2024-02-29"]]
