"""The cells of a CSV file, a workbook or a Parquet file, as they stand, with the lines they stand on.

Nothing is interpreted here: an id keeps its zeros, "NA" stays text, a date of a
workbook stays a date. What a cell means is decided by `dates`, `numbers` and `layout`.
"""

from __future__ import annotations

import csv
import datetime as dt
import difflib
import io
import zipfile
import zlib
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import islice
from pathlib import Path
from typing import TYPE_CHECKING, Any
from xml.etree import ElementTree

import numpy as np
from numpy.typing import NDArray

from foredeck.errors import IntakeError
from foredeck.intake.workbook_errors import error_cells

if TYPE_CHECKING:
    from python_calamine import CalamineWorkbook

TEXT_ENDINGS = (".csv", ".txt", ".tsv")
WORKBOOK_ENDINGS = (".xlsx", ".xlsm", ".xls", ".ods")
DELIMITERS = {",": "comma", ";": "semicolon", "\t": "tab", "|": "bar"}


@dataclass(frozen=True)
class Cells:
    """A table as it stands in a file.

    Parameters
    ----------
    file : str
        Name of the file, with the sheet where there is one.
    format : str
        What kind of file it is, in words.
    header : list
        The cells of the first row that is not blank.
    columns : list of sequences
        The cells below, a sequence for each column.
    lines : sequence of int
        For each row, the line of the text or the row of the sheet that it begins on.
    line_word : str
        "line" or "row".
    blank_rows : int
        How many rows held nothing and were left out.
    """

    file: str
    format: str
    header: list[Any]
    columns: list[Sequence[Any]]
    lines: Sequence[int]
    line_word: str
    blank_rows: int

    def place(self, row: int, column: str = "") -> str:
        """Say where a cell stands: "actuals.csv line 12, column cases"."""
        return f"{self.file} {self.line_word} {self.lines[row]}" + (f", column {column}" if column else "")


def text_of(cell: Any) -> str:
    """Return a cell as text, without blanks around it; whole numbers without a decimal point."""
    if isinstance(cell, str):
        return cell.strip()
    if cell is None or cell != cell:  # not equal to itself: NaN
        return ""
    if isinstance(cell, float) and cell.is_integer():
        return str(int(cell))
    if isinstance(cell, dt.datetime) and cell.time() == dt.time():
        return cell.date().isoformat()
    return str(cell)


def read_cells(path: Path, *, sheet: str | None = None, delimiter: str | None = None) -> Cells:
    """Read the cells of a file; its ending says which kind it is.

    Raises
    ------
    IntakeError
        if the file is missing, empty, of another kind, or cannot be read as what it claims to be.
    """
    ending = path.suffix.lower()
    if ending not in (*TEXT_ENDINGS, *WORKBOOK_ENDINGS, ".parquet"):
        raise IntakeError(f"foredeck does not read files that end in {ending!r}", where=str(path),
                          allowed=", ".join((*TEXT_ENDINGS, *WORKBOOK_ENDINGS, ".parquet")),
                          do="save the table as one of these", value=ending)
    if not path.is_file():
        raise _missing(path)
    if path.stat().st_size == 0:
        raise IntakeError("the file is empty", where=str(path), allowed="a header and rows below it",
                          do="export the table again")
    if sheet is not None and ending not in WORKBOOK_ENDINGS:
        raise IntakeError(f"a sheet {sheet!r} is asked for, but the file is not a workbook", where=str(path),
                          allowed=", ".join(WORKBOOK_ENDINGS), do="leave out the sheet", value=sheet)
    if ending in WORKBOOK_ENDINGS:
        return _workbook_cells(path, sheet)
    return _parquet_cells(path) if ending == ".parquet" else _text_cells(path, delimiter)


def _missing(path: Path) -> IntakeError:
    folder = path.absolute().parent
    there = sorted(p.name for p in folder.iterdir() if p.is_file()) if folder.is_dir() else []
    near = difflib.get_close_matches(path.name, there, n=1)
    return IntakeError("there is no such file", where=str(path), allowed="a CSV, Excel or Parquet file",
                       do=f"did you mean {near[0]!r}?" if near else "correct the path", value=str(path))


def encode(column: Sequence[Any]) -> tuple[NDArray[np.intp], list[str]]:
    """Return, for each cell, the position of its text among the distinct texts; and these."""
    if not set(map(type, column)) <= {str}:
        column = [text_of(cell) for cell in column]  # before comparing: True equals 1, their texts differ
    seen: dict[str, int] = {}
    at = {cell: seen.setdefault(text_of(cell), len(seen)) for cell in dict.fromkeys(column)}
    return np.fromiter(map(at.__getitem__, column), dtype=np.intp, count=len(column)), list(seen)


def _check_body(file: str, header: list[Any] | None, n_rows: int) -> list[Any]:
    if header is None:
        raise IntakeError("the file holds no cell with anything in it", where=file,
                          allowed="a header and rows below it", do="export the table again")
    if not n_rows:
        raise IntakeError("there is a header, but no row below it", where=file,
                          allowed="at least one row", do="export the table again")
    return header


def _text_cells(path: Path, delimiter: str | None) -> Cells:
    text, encoding = _decoded(path)
    if delimiter is None:
        first = next((line for line in text.splitlines() if line.strip()), "")
        counts = {mark: len(next(csv.reader([first], delimiter=mark))) for mark in DELIMITERS}
        delimiter = max(counts, key=lambda mark: counts[mark])
    header: list[str] | None = None
    columns: list[Sequence[str]] = []
    lines: list[int] = []
    blank = 0
    for rows, begins in _blocks(path.name, text, delimiter):
        kept = [at for at, row in enumerate(rows) if any(map(str.strip, row))]
        blank += len(rows) - len(kept)
        if header is None and kept:
            header = rows[kept.pop(0)]
            columns = [[] for _ in header]
        body = [rows[at] for at in kept]
        lines += [begins[at] for at in kept]
        if header is not None and {len(row) for row in body} != {len(header)}:
            _fit_widths(path.name, body, lines[len(lines) - len(body):], len(header))
        for column, cells in zip(columns, zip(*body, strict=True), strict=False):
            column += cells  # type: ignore[operator]  # a list here, a sequence to readers
    header = _check_body(path.name, header, len(lines))
    kind = f"CSV ({encoding}, {DELIMITERS.get(delimiter, repr(delimiter))})"
    return Cells(path.name, kind, header, columns, lines, "line", blank)


def _blocks(file: str, text: str, delimiter: str) -> Iterator[tuple[list[list[str]], Sequence[int]]]:
    """Split a text into rows, some thousands at a time, with the line each begins on."""
    reader = csv.reader(io.StringIO(text, newline=""), delimiter=delimiter, strict=True)
    quoted = '"' in text  # only a quoted cell can hold a line break; without quotes rows are lines
    line = 1
    try:
        while rows := list(islice(reader, 1 if quoted else 8192)):
            begins = [*range(line, line + len(rows))]
            line = reader.line_num + 1
            for row in islice(reader, 8191 if quoted else 0):
                rows.append(row)
                begins.append(line)
                line = reader.line_num + 1
            yield rows, begins
    except csv.Error as error:
        raise IntakeError(f"the line cannot be split into cells: {error}",
                          where=f"{file} line {line if quoted else reader.line_num}",
                          allowed='cells in double quotes that are closed again, a quote inside written ""',
                          do="correct the line or export the table again") from error


def _fit_widths(file: str, rows: list[list[str]], lines: Sequence[int], width: int) -> None:
    """Cut blank cells beyond the header; refuse rows with more or fewer cells than it has."""
    for at, row in enumerate(rows):
        if len(row) > width and not any(map(str.strip, row[width:])):
            del row[width:]
        if len(row) != width:
            raise IntakeError(f"the row has {len(row)} cells, the header has {width}",
                              where=f"{file} line {lines[at]}", allowed=f"{width} cells in every row",
                              do="put cells that hold the delimiter in double quotes, or name the delimiter",
                              value=len(row))


def _decoded(path: Path) -> tuple[str, str]:
    raw = path.read_bytes()
    codec, name = ("utf-16", "UTF-16") if raw[:2] in (b"\xff\xfe", b"\xfe\xff") else ("utf-8-sig", "UTF-8")
    try:
        text = raw.decode(codec)
    except UnicodeDecodeError as error:
        line = raw[:error.start].count(b"\n") + 1
        byte = f"byte 0x{raw[error.start]:02x} at position {error.start}"
        raise IntakeError(f"the text is not {name}: {byte}",
                          where=f"{path.name} line {line}", allowed="UTF-8, or UTF-16 with its mark",
                          do="save the file as UTF-8 (in Excel: CSV UTF-8)",
                          value=raw[error.start]) from error
    if "\0" in text:
        line = text[:text.index("\0")].count("\n") + 1
        raise IntakeError("the text holds a NUL character", where=f"{path.name} line {line}",
                          allowed="UTF-8, or UTF-16 with its mark", do="save the file as UTF-8 text")
    return text, name


def _workbook_cells(path: Path, sheet: str | None) -> Cells:
    import python_calamine

    try:
        return _sheet_cells(path, python_calamine.CalamineWorkbook.from_path(path), sheet)
    except (python_calamine.CalamineError, zipfile.BadZipFile, zlib.error, ElementTree.ParseError) as error:
        raise IntakeError(f"the workbook cannot be opened: {error}", where=str(path),
                          allowed=", ".join(WORKBOOK_ENDINGS),
                          do="open it in Excel and save it again") from error


def _sheet_cells(path: Path, workbook: CalamineWorkbook, sheet: str | None) -> Cells:
    names = workbook.sheet_names
    if sheet is not None and sheet not in names:
        near = difflib.get_close_matches(sheet, names, n=1)
        raise IntakeError(f"there is no sheet {sheet!r}", where=str(path),
                          allowed=", ".join(map(repr, names)),
                          do=f"did you mean {near[0]!r}?" if near else "use one of these names", value=sheet)
    if not names:
        _check_body(path.name, None, 0)
    taken = names[0] if sheet is None else sheet
    # With the empty area kept, the rows counted here are the rows that Excel shows.
    rows: list[list[Any]] = workbook.get_sheet_by_name(taken).to_python(skip_empty_area=False)
    for (row, column), text in error_cells(path, taken).items():
        if row < len(rows) and column < len(rows[row]):
            rows[row][column] = text
    kind = f"Excel, the first of {len(names)} sheets" if sheet is None and len(names) > 1 else "Excel"
    file = f"{path.name} sheet {taken!r}"
    kept = [at for at, row in enumerate(rows) if any(text_of(cell) for cell in row)]
    header = _check_body(file, list(rows[kept[0]]) if kept else None, len(kept) - 1)
    columns: list[Sequence[Any]] = [*zip(*(rows[at] for at in kept[1:]), strict=True)]
    return Cells(file, kind, header, columns, [at + 1 for at in kept[1:]], "row", len(rows) - len(kept))


def _parquet_cells(path: Path) -> Cells:
    import pyarrow as pa
    import pyarrow.parquet as pq

    try:
        table = pq.read_table(path)
    except (pa.ArrowException, OSError) as error:
        raise IntakeError("the file cannot be read as Parquet", where=str(path), allowed="a Parquet file",
                          do="export the table again", cause=str(error)) from error
    if not table.num_rows or not table.num_columns:
        raise IntakeError("there is a header, but no row below it", where=path.name,
                          allowed="at least one row", do="export the table again")
    columns = [_arrow_cells(column) for column in table.columns]
    lines = range(1, table.num_rows + 1)
    return Cells(path.name, "Parquet", list(table.column_names), columns, lines, "row", 0)


def _arrow_cells(column: Any) -> Sequence[Any]:
    import pyarrow as pa

    from foredeck.periods import period_names

    if isinstance(column.type, pa.BaseExtensionType):
        # Periods of pandas are stored as counted steps; taken for numbers they would pass as years.
        cells = column.to_pandas()
        return period_names(cells) if str(cells.dtype).startswith("period") else cells.astype(str).tolist()
    cells = column.to_pylist()
    return [str(cell) for cell in cells] if pa.types.is_nested(column.type) else list(cells)
