import datetime as dt
import math

import openpyxl
import pytest
import xlsxwriter

from foredeck.errors import IntakeError
from foredeck.intake.cells import encode, read_cells, text_of


@pytest.fixture
def read(tmp_path):
    """Read bytes or a text as the cells of a file."""
    def made(content, name="a.csv", **options):
        path = tmp_path / name
        path.write_bytes(content if isinstance(content, bytes) else content.encode())
        return read_cells(path, **options)
    return made


@pytest.fixture
def refusal(read, tmp_path):
    def message(content, name="a.csv", **options):
        with pytest.raises(IntakeError) as caught:
            read(content, name, **options)
        return str(caught.value).replace(str(tmp_path) + "/", "")
    return message


@pytest.fixture
def workbook(tmp_path):
    """Save a workbook whose sheets hold the rows given, and read it."""
    def made(sheets, **options):
        book = openpyxl.Workbook()
        book.remove(book.active)
        for name, rows in sheets.items():
            sheet = book.create_sheet(name)
            for row in rows:
                sheet.append(row)
        book.save(tmp_path / "a.xlsx")
        return read_cells(tmp_path / "a.xlsx", **options)
    return made


def test_cells_stand_under_their_header_with_the_lines_they_begin_on(read):
    cells = read('\nseries,cases\n"a\nb",1\n\nc,2\n , \n"d ""e""",3\n')
    assert cells.header == ["series", "cases"]
    assert [list(column) for column in cells.columns] == [["a\nb", "c", 'd "e"'], ["1", "2", "3"]]
    assert list(cells.lines) == [3, 6, 8]
    assert cells.blank_rows == 3
    assert cells.place(0, "cases") == "a.csv line 3, column cases"


def test_lines_are_right_far_down_a_long_file_with_and_without_quotes(read):
    rows = [f"{k},1" for k in range(20_000)]
    assert list(read("\n".join(["a,b", *rows])).lines) == list(range(2, 20_002))
    rows[9_000] = '"x\ny",1'
    lines = list(read("\n".join(["a,b", *rows])).lines)
    assert lines[:9_001] == list(range(2, 9_003))
    assert lines[9_001:] == list(range(9_004, 20_003))


@pytest.mark.parametrize(("text", "words"), [
    ("a;b\n1,5;2\n", "CSV (UTF-8, semicolon)"), ("a\tb\n1,5\t2\n", "CSV (UTF-8, tab)"),
    ("a|b\n1,5|2\n", "CSV (UTF-8, bar)"), ('"x,y",b\n"1,5",2\n', "CSV (UTF-8, comma)")])
def test_the_delimiter_is_found_in_the_header(read, text, words):
    cells = read(text)
    assert cells.format == words
    assert [column[0] for column in cells.columns] == ["1,5", "2"]


def test_a_delimiter_can_be_pinned(read):
    assert read("a:b\n1:2\n", delimiter=":").format == "CSV (UTF-8, ':')"


@pytest.mark.parametrize(("codec", "words"), [
    ("utf-8", "CSV (UTF-8, comma)"), ("utf-8-sig", "CSV (UTF-8, comma)"), ("utf-16", "CSV (UTF-16, comma)")])
def test_marks_of_the_encoding_are_understood(read, codec, words):
    cells = read("größe,b\nä,1\n".encode(codec))
    assert (cells.header[0], cells.columns[0][0], cells.format) == ("größe", "ä", words)


def test_blank_cells_beyond_the_header_are_cut(read):
    assert [list(column) for column in read("a,b\n1,2,\n3,4, ,\n").columns] == [["1", "3"], ["2", "4"]]


@pytest.mark.parametrize(("row", "count"), [("1", 1), ("1,2,3", 3)])
def test_a_row_of_another_width_is_refused(refusal, row, count):
    assert refusal(f"a,b\n1,2\n{row}\n") == (
        f"the row has {count} cells, the header has 2\n"
        "  where: a.csv line 3\n"
        "  allowed: 2 cells in every row\n"
        "  next: put cells that hold the delimiter in double quotes, or name the delimiter")


def test_a_quote_that_is_not_closed_is_refused(refusal):
    assert refusal('a,b\n1,2\n"3,4\n5,6\n') == (
        "the line cannot be split into cells: unexpected end of data\n"
        "  where: a.csv line 3\n"
        '  allowed: cells in double quotes that are closed again, a quote inside written ""\n'
        "  next: correct the line or export the table again")


def test_bytes_that_are_not_utf_8_are_refused(refusal):
    assert refusal("a,b\n1,2\nMünchen,3\n".encode("latin-1")) == (
        "the text is not UTF-8: byte 0xfc at position 9\n"
        "  where: a.csv line 3\n"
        "  allowed: UTF-8, or UTF-16 with its mark\n"
        "  next: save the file as UTF-8 (in Excel: CSV UTF-8)")


def test_a_nul_character_is_refused(refusal):
    assert refusal("a,b\n1,2\n\0,3\n") == (
        "the text holds a NUL character\n"
        "  where: a.csv line 3\n"
        "  allowed: UTF-8, or UTF-16 with its mark\n"
        "  next: save the file as UTF-8 text")


@pytest.mark.parametrize(("content", "what", "allowed"), [
    ("", "the file is empty", "a header and rows below it"),
    ("\n , \n", "the file holds no cell with anything in it", "a header and rows below it"),
    ("a,b\n\n", "there is a header, but no row below it", "at least one row")])
def test_a_file_without_rows_is_refused(refusal, content, what, allowed):
    assert refusal(content) == f"{what}\n  where: a.csv\n  allowed: {allowed}\n  next: export the table again"


def test_a_missing_file_is_refused_with_the_nearest_name(read, tmp_path):
    read("a,b\n1,2\n", "actuals.csv")
    with pytest.raises(IntakeError) as caught:
        read_cells(tmp_path / "actual.csv")
    assert str(caught.value) == (
        "there is no such file\n"
        f"  where: {tmp_path / 'actual.csv'}\n"
        "  allowed: a CSV, Excel or Parquet file\n"
        "  next: did you mean 'actuals.csv'?")


def test_another_kind_of_file_is_refused(refusal):
    assert refusal("x", "a.pdf") == (
        "foredeck does not read files that end in '.pdf'\n"
        "  where: a.pdf\n"
        "  allowed: .csv, .txt, .tsv, .xlsx, .xlsm, .xls, .ods, .parquet\n"
        "  next: save the table as one of these")


def test_a_workbook_keeps_its_types_and_the_rows_that_excel_shows(workbook):
    cells = workbook({"one": [[], ["code", "when", "cases"], ["007", dt.date(2024, 1, 31), 5], [],
                              [None, None, 1.5]]})
    assert (cells.format, cells.file) == ("Excel", "a.xlsx sheet 'one'")
    assert cells.header == ["code", "when", "cases"]
    assert [list(column) for column in cells.columns] == [
        ["007", ""], [dt.date(2024, 1, 31), ""], [5.0, 1.5]]
    assert cells.lines == [3, 5]
    assert cells.blank_rows == 2
    assert cells.place(1, "cases") == "a.xlsx sheet 'one' row 5, column cases"


def test_the_first_sheet_is_taken_and_said_or_the_one_asked_for(workbook):
    sheets = {"one": [["a"], [1]], "two": [["b"], [2]]}
    assert workbook(sheets).format == "Excel, the first of 2 sheets"
    assert workbook(sheets).header == ["a"]
    assert workbook(sheets, sheet="two").header == ["b"]


def test_errors_of_excel_are_cells_with_their_text_and_not_blank(tmp_path):
    book = xlsxwriter.Workbook(tmp_path / "a.xlsx")
    book.add_worksheet("first").write_formula("A1", "=1/0", None, "#N/A")
    sheet = book.add_worksheet("a & b")
    sheet.write_row("Z1", ["x", "y"])
    sheet.write_row("Z2", ["a", 1])
    sheet.write_formula("AA3", "=1/0", None, "#DIV/0!")
    book.close()
    cells = read_cells(tmp_path / "a.xlsx", sheet="a & b")
    assert [list(column) for column in cells.columns[25:]] == [["a", ""], [1.0, "#DIV/0!"]]


def test_an_unknown_sheet_is_refused_with_the_sheets_there_are(workbook, tmp_path):
    with pytest.raises(IntakeError) as caught:
        workbook({"cases": [["a"], [1]], "notes": [["b"], [2]]}, sheet="case")
    assert str(caught.value) == (
        "there is no sheet 'case'\n"
        f"  where: {tmp_path / 'a.xlsx'}\n"
        "  allowed: 'cases', 'notes'\n"
        "  next: did you mean 'cases'?")


def test_a_sheet_of_a_file_that_has_none_is_refused(refusal):
    assert refusal("a,b\n1,2\n", sheet="one") == (
        "a sheet 'one' is asked for, but the file is not a workbook\n"
        "  where: a.csv\n"
        "  allowed: .xlsx, .xlsm, .xls, .ods\n"
        "  next: leave out the sheet")


def test_files_that_are_not_what_their_ending_says_are_refused(refusal):
    assert refusal("a,b\n1,2\n", "a.parquet") == (
        "the file cannot be read as Parquet\n"
        "  where: a.parquet\n"
        "  allowed: a Parquet file\n"
        "  next: export the table again")
    first, *rest = refusal("a,b\n1,2\n", "a.xlsx").split("\n")
    assert first.startswith("the workbook cannot be opened: ")
    assert rest == ["  where: a.xlsx", "  allowed: .xlsx, .xlsm, .xls, .ods",
                    "  next: open it in Excel and save it again"]


@pytest.mark.parametrize(("cell", "text"), [
    (" a ", "a"), (None, ""), (math.nan, ""), (7.0, "7"), (7.5, "7.5"), (7, "7"), (True, "True"),
    (dt.datetime(2024, 1, 31), "2024-01-31"), (dt.datetime(2024, 1, 31, 12), "2024-01-31 12:00:00")])
def test_the_text_of_a_cell(cell, text):
    assert text_of(cell) == text


def test_true_and_1_are_two_texts_though_they_are_equal():
    codes, texts = encode([1, True, 1.0, "1 "])
    assert (codes.tolist(), texts) == ([0, 1, 0, 0], ["1", "True"])
