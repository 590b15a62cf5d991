import datetime as dt

import numpy as np
import openpyxl
import pandas as pd
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

import foredeck as fd
from foredeck.assets import example_folder
from foredeck.errors import IntakeError, PeriodError, SettingsError
from foredeck.intake.files import read_source
from foredeck.periods import period_names
from foredeck.settings.file import load_settings

LONG = {"series": "series", "period": "month", "value": "cases"}

# Everything a key may hold but surrogates, NUL and lines that a text file cannot tell apart.
KEYS = st.text(st.characters(exclude_categories=("Cs", "Cc")), min_size=1, max_size=12).filter(
    lambda text: text == text.strip() and text)
TABLES = st.dictionaries(
    KEYS, st.dictionaries(st.integers(0, 30), st.floats(-1e12, 1e12), min_size=1, max_size=8),
    min_size=1, max_size=4)
property_test = settings(deadline=None, max_examples=40, suppress_health_check=[HealthCheck.function_scoped_fixture])


def as_month(step):
    return f"{2020 + step // 12}-{step % 12 + 1:02d}"


def frame_of(table):
    return pd.DataFrame([(name, as_month(step), value) for name, values in table.items()
                         for step, value in values.items()], columns=["series", "month", "cases"])


def values_of(history):
    known = history.actuals.dropna(subset="value")
    found = {}
    for name, month, value in zip(known["series"], period_names(known["period"]), known["value"], strict=True):
        found.setdefault(name, {})[month] = value
    return found


def expected(table):
    return {name: {as_month(step): value for step, value in values.items()} for name, values in table.items()}


@property_test
@given(TABLES, st.sampled_from([",", ";", "\t", "|"]), st.sampled_from(["utf-8", "utf-8-sig", "utf-16"]),
       st.sampled_from(["\n", "\r\n"]))
def test_what_is_written_as_csv_comes_back(tmp_path, table, delimiter, encoding, line_end):
    path = tmp_path / "a.csv"
    frame_of(table).to_csv(path, index=False, sep=delimiter, encoding=encoding, lineterminator=line_end)
    assert values_of(fd.read(path, **LONG, frequency="monthly")) == expected(table)


@property_test
@given(TABLES)
def test_what_is_written_as_parquet_comes_back(tmp_path, table):
    path = tmp_path / "a.parquet"
    frame_of(table).to_parquet(path)
    assert values_of(fd.read(path, **LONG, frequency="monthly")) == expected(table)


@settings(property_test, max_examples=15)
@given(TABLES)
def test_what_is_written_as_a_wide_workbook_with_real_dates_comes_back(tmp_path, table):
    path = tmp_path / "a.xlsx"
    # A workbook keeps 15 or 16 digits of a number.
    table = {name: {k: float(f"{v:.12g}") for k, v in values.items()} for name, values in table.items()}
    steps = sorted({step for values in table.values() for step in values})
    book = openpyxl.Workbook()
    sheet = book.active
    sheet.append(["series", *(dt.date(2020 + k // 12, k % 12 + 1, 1) for k in steps)])
    for row, (name, values) in enumerate(table.items(), start=2):
        sheet.cell(row, 1).value = name
        sheet.cell(row, 1).data_type = "s"  # as a text also where it begins with "="
        for column, step in enumerate(steps, start=2):
            sheet.cell(row, column).value = values.get(step)
    book.save(path)
    history = fd.read(path, series="series", layout="wide", frequency="monthly")
    assert values_of(history) == expected(table)
    assert history.understood.date_format == "date cells"


@pytest.mark.parametrize("source", ["actuals.csv", "actuals.xlsx", "actuals.parquet"])
def test_the_three_files_of_the_example_tell_the_same(source):
    wide = source.endswith(".xlsx")
    options = {} if wide else {"period": "month", "value": "cases"}
    history = fd.read(example_folder() / source, series=["depot", "family"], unit="cases",
                      unit_value="unit_value", layout="wide" if wide else "long", **options)
    planned = read_source(load_settings(example_folder() / "settings.toml"))
    pd.testing.assert_frame_equal(history.actuals, planned.actuals)
    pd.testing.assert_frame_equal(history.series, planned.series)
    assert history.group_columns == ["depot", "family"]
    assert len(history) == 24


def test_ids_stay_text_with_their_zeros_and_na_is_an_id(tmp_path):
    path = tmp_path / "a.csv"
    path.write_text("series,month,cases\n007,2024-01,1\n7,2024-01,2\nNA,2024-01,3\nnull,2024-01,4\n=1+1,2024-01,5\n"
                    "../x,2024-01,6\n<script>,2024-01,7\n")
    history = fd.read(path, **LONG)
    assert history.names == ["../x", "007", "7", "<script>", "=1+1", "NA", "null"]
    assert [history[name].values[0] for name in history.names] == [6, 1, 2, 7, 5, 3, 4]


def test_whole_numbers_as_ids_of_a_workbook_have_no_decimal_point(tmp_path):
    path = tmp_path / "a.xlsx"
    pd.DataFrame({"series": [7, 12], "month": [202401, 202401], "cases": [1, 2]}).to_excel(
        path, index=False, engine="xlsxwriter")
    history = fd.read(path, **LONG)
    assert history.names == ["12", "7"]
    assert history.understood.date_format == "YYYYMM (202401)"


def test_what_was_understood_is_told_in_full(tmp_path):
    path = tmp_path / "a.csv"
    path.write_text("depot;family;month;cases\nn;x;31.01.2024;1,5\n\nn;x;29.02.2024;-\nn;x;31.03.2024;2\n"
                    "s;y;31.01.2024;\n;;;\n")
    history = fd.read(path, series=["depot", "family"], period="month", value="cases", decimal=",")
    assert history.understood.lines() == [
        "a.csv: CSV (UTF-8, semicolon), long layout, 4 rows read",
        "dates written as DD/MM/YYYY (31/01/2024); monthly, 2024-01 to 2024-03",
        "1 series",
        "ignored: 2 blank rows",
        "ignored: 1 series without any value: s/y",
        "2 cells without a value",
        "frequency detected from the dates"]
    np.testing.assert_array_equal(history["n/x"].values, [1.5, np.nan, 2])
    assert history["n/x"].groups == {"depot": "n", "family": "x"}


def test_periods_stored_by_pandas_in_parquet_are_read_as_periods(tmp_path):
    # Stored, a period is a counted step: week 1905 would pass for the year 1905.
    path = tmp_path / "a.parquet"
    weeks = pd.period_range("2006-07-03", periods=3, freq="W-SUN")
    pd.DataFrame({"series": "a", "month": weeks, "cases": [1.0, np.nan, 3.0]}).to_parquet(path)
    history = fd.read(path, **LONG)
    assert (history.frequency, history.understood.first) == ("weekly", "2006-W27")
    np.testing.assert_array_equal(history["a"].values, [1, np.nan, 3])


def test_timestamps_and_categories_of_parquet_are_read(tmp_path):
    path = tmp_path / "a.parquet"
    pd.DataFrame({"series": pd.Categorical(["a", "a"]), "month": pd.to_datetime(["2024-01-31", "2024-02-29"]),
                  "cases": pd.array([1, None], dtype="Int64")}).to_parquet(path)
    history = fd.read(path, **LONG)
    assert (history.frequency, history.understood.last) == ("monthly", "2024-01")
    np.testing.assert_array_equal(history["a"].values, [1])


def test_daily_rows_are_summed_when_asked(tmp_path):
    path = tmp_path / "a.csv"
    days = pd.date_range("2024-01-01", "2024-03-31")
    pd.DataFrame({"series": "a", "month": days.astype(str), "cases": 1}).to_csv(path, index=False)
    history = fd.read(path, **LONG, frequency="monthly", sum_rows=True)
    np.testing.assert_array_equal(history["a"].values, [31, 29, 31])
    assert len(history.faults) == 0
    with pytest.raises(PeriodError) as caught:
        fd.read(path, **LONG, frequency="monthly")
    assert str(caught.value) == (
        "series 'a' has several dates in 2024-01: 2024-01-01 and 2024-01-02\n"
        "  where: a.csv line 2, column cases and a.csv line 3, column cases\n"
        "  allowed: one date for each series and period\n"
        "  next: set sum_rows = true to add the rows up")
    with pytest.raises(PeriodError, match="the dates are neither weekly nor monthly"):
        fd.read(path, **LONG, sum_rows=True)


def test_the_settings_say_how_to_read(tmp_path):
    (tmp_path / "a.csv").write_text("code;when;qty;cost\n1;01/02/2024;2,5;10\n1;01/04/2024;3;11\n1;01/04/2024;4;12\n")
    (tmp_path / "settings.toml").write_text("""
        [source]
        file = "a.csv"
        sum_rows = true
        delimiter = ";"
        decimal = ","
        date_format = "DD/MM/YYYY"
        [columns]
        series = "code"
        period = "when"
        value = "qty"
        unit_value = "cost"
        [series]
        unit = "boxes"
        frequency = "monthly"
        gaps = "zero"
        """)
    one = read_source(load_settings(tmp_path / "settings.toml"))["1"]
    np.testing.assert_array_equal(one.values, [2.5, 0, 7])
    assert (one.unit, one.unit_value, one.groups) == ("boxes", 12.0, {})


@pytest.mark.parametrize(("options", "message"), [
    ({"layout": "tidy"},
     "layout = 'tidy' is not allowed\n  where: layout\n  allowed: 'long', 'wide'\n  next: use one of these"),
    ({"gaps": "zeros"},
     "gaps = 'zeros' is not allowed\n  where: gaps\n  allowed: 'missing', 'zero'\n  next: did you mean 'zero'?"),
    ({"frequency": "montly"},
     "frequency = 'montly' is not allowed\n  where: frequency\n"
     "  allowed: 'yearly', 'quarterly', 'monthly', 'weekly'\n  next: did you mean 'monthly'?"),
    ({"value": None},
     "the long layout needs the column of the value\n  where: {path}\n"
     "  allowed: the name of a column\n  next: give value"),
])
def test_wrong_arguments_are_refused(tmp_path, options, message):
    path = tmp_path / "a.csv"
    path.write_text("series,month,cases\na,2024-01,1\n")
    with pytest.raises(SettingsError) as caught:
        fd.read(path, **{**LONG, **options})
    assert str(caught.value) == message.format(path=path)


def test_a_file_without_one_number_is_refused(tmp_path):
    path = tmp_path / "a.csv"
    path.write_text('series,month,cases\na,2024-01,"1,5"\na,2024-02,"2,5"\n')
    with pytest.raises(IntakeError) as caught:
        fd.read(path, **LONG)
    assert str(caught.value) == (
        "not one value is a number, the first is '1,5'\n"
        "  where: a.csv line 2, column cases\n"
        '  allowed: plain numbers with decimal mark "."\n'
        '  next: set decimal = "," if decimals are written so, or choose another column')
    path.write_text("series,month,cases\na,2024-01,-\na,2024-02,\n")
    with pytest.raises(IntakeError) as caught:
        fd.read(path, **LONG)
    assert str(caught.value) == (
        "the file holds no value\n"
        "  where: a.csv line 2, column cases\n"
        "  allowed: a number in at least one cell\n"
        "  next: check which column holds the values")


def test_damaged_files_are_read_or_refused_with_an_error_of_ours(tmp_path):
    rng = np.random.default_rng(11)
    whole = "series,month,cases\n" + "".join(
        f'"{name}",2024-{m:02d},{m}.5\n' for name in ("x", "y z", "007") for m in range(1, 13))
    bits = [b"\n", b"\r", b'"', b",", b";", b"\0", b"\xff", b"-", b"9", b"/", b" ", b"e", b"n/a", b"\xd9\xa3", b""]
    outcomes = []
    for _ in range(300):
        damaged = bytearray(whole.encode())
        for at in rng.integers(len(damaged), size=rng.integers(1, 4)):
            damaged[at:at + int(rng.integers(0, 3))] = bits[rng.integers(len(bits))]
        (tmp_path / "a.csv").write_bytes(bytes(damaged))
        try:
            history = fd.read(tmp_path / "a.csv", **LONG)
        except IntakeError:
            outcomes.append("refused")
        else:
            outcomes.append("read")
            assert np.isfinite(history.actuals["value"]).sum() > 0
    assert set(outcomes) == {"read", "refused"}
