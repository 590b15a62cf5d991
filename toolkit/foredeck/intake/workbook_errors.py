"""Cells of a workbook that hold an error of Excel, such as #DIV/0!.

The reader of workbooks gives them as blank. Where a blank means zero that would be a
wrong number that nobody sees, so they are looked up in the file itself.
"""

from __future__ import annotations

import re
import zipfile
from pathlib import Path
from xml.etree import ElementTree

_BOOK, _LINKS = "xl/workbook.xml", "xl/_rels/workbook.xml.rels"
_SHEETS = "{http://schemas.openxmlformats.org/spreadsheetml/2006/main}sheet"
_ID = "{http://schemas.openxmlformats.org/officeDocument/2006/relationships}id"
_ERROR_CELL = re.compile(rb'<c\s([^>]*\bt="e"[^>]*)>(?:<f[^>]*/>|<f[^>]*>[^<]*</f>)?<v>([^<]*)</v>')
_ADDRESS = re.compile(rb'\br="([A-Z]+)([0-9]+)"')


def error_cells(path: Path, sheet: str) -> dict[tuple[int, int], str]:
    """Find the error cells of a sheet.

    Parameters
    ----------
    path : Path
        A workbook; only .xlsx and .xlsm can be looked into.
    sheet : str
        Name of the sheet.

    Returns
    -------
    dict
        From the 0-based row and column to the error's text.
    """
    if path.suffix.lower() not in (".xlsx", ".xlsm") or not zipfile.is_zipfile(path):
        return {}
    with zipfile.ZipFile(path) as archive:
        if not {_BOOK, _LINKS} <= set(archive.namelist()):
            return {}  # another kind of workbook under this ending
        book, links = (ElementTree.fromstring(archive.read(part)) for part in (_BOOK, _LINKS))
        targets = {link.get("Id"): link.get("Target", "") for link in links}
        target = next((targets.get(s.get(_ID), "") for s in book.iter(_SHEETS) if s.get("name") == sheet), "")
        part = target.removeprefix("/") if target.startswith("/") else f"xl/{target}"
        content = archive.read(part) if part in archive.namelist() else b""
    found = {}
    for attributes, text in _ERROR_CELL.findall(content):
        if address := _ADDRESS.search(attributes):
            found[int(address[2]) - 1, _column(address[1].decode())] = text.decode("utf-8", "replace")
    return found


def _column(letters: str) -> int:
    """Return the 0-based column of "A", "B", ..., "AA"."""
    column = 0
    for letter in letters:
        column = 26 * column + ord(letter) - ord("A") + 1
    return column - 1
