"""The first sheet of a spreadsheet (.xlsx) as columns of Python values."""

from __future__ import annotations

import io
import re
import zipfile
from typing import Any

import numpy as np
from numpy.typing import NDArray

from oddsmodel.errors import InputFault
from oddsmodel.findings import Finding
from oddsmodel.records.faults import fault
from oddsmodel.records.header import vetted_names
from oddsmodel.records.python_values import spelling
from oddsmodel.wording import finding
from oddsmodel.wording.plain import quoted

LARGEST = 1 << 31
FORMULA_WITHOUT_VALUE = re.compile(rb"(?:</f>|<f\b[^<>]*/>)\s*(?:<v\s*/>|<v>\s*</v>)?\s*</c>")


def read_spreadsheet(data: bytes, source: str) -> tuple[dict[str, NDArray[Any]], tuple[Finding, ...]]:
    """The columns of the first sheet (name to values (n,), None for an empty cell), and which sheet it was.

    Of a cell with a formula the value is taken that was saved with it; nothing is computed.

    Raises: InputFault when openpyxl is missing, the file is damaged or too large, a formula was saved without its
        value, the names are faulty, a row is longer than the row of names, or there are no rows.
    """
    try:
        import openpyxl
    except ImportError as error:
        raise InputFault(fault("spreadsheet-needs-openpyxl", source)) from error
    _refuse_oversized(data, source)
    try:
        book = openpyxl.load_workbook(io.BytesIO(data), read_only=True, data_only=True)
        sheet = book.worksheets[0]
        rows = [list(row) for row in sheet.iter_rows(values_only=True)]
        titles = [other.title for other in book.worksheets]
        without_value = _formulas_without_value(data, sheet._worksheet_path)
        book.close()
    except Exception as error:  # a damaged file can fail anywhere in the reader
        raise InputFault(fault("spreadsheet-not-readable", source)) from error
    where = f"{source}, sheet {quoted(titles[0])}"
    if without_value:
        raise InputFault(fault("formula-without-value", where, cells=without_value))
    columns = _columns(rows, where)
    if len(titles) == 1:
        return columns, ()
    return columns, (finding("note", "sheet-used", sheet=titles[0], others=titles[1:]),)


def _refuse_oversized(data: bytes, source: str) -> None:
    try:
        with zipfile.ZipFile(io.BytesIO(data)) as package:
            size = sum(part.file_size for part in package.infolist())
    except (zipfile.BadZipFile, OSError) as error:
        raise InputFault(fault("spreadsheet-not-readable", source)) from error
    if size > LARGEST:
        raise InputFault(fault("spreadsheet-too-large", source, gigabytes=LARGEST >> 30))


def _formulas_without_value(data: bytes, part: str) -> int:
    """Number of cells of a sheet whose formula was saved without the value it had."""
    with zipfile.ZipFile(io.BytesIO(data)) as package:
        content = package.read(part.lstrip("/"))
    return len(FORMULA_WITHOUT_VALUE.findall(content)) if b"<f" in content else 0


def _columns(rows: list[list[Any]], where: str) -> dict[str, NDArray[Any]]:
    while rows and all(cell is None for cell in rows[-1]):
        rows.pop()
    if not rows:
        raise InputFault(fault("file-empty", where))
    width = max(len(row) for row in rows)
    used = width
    while used and all(len(row) < used or row[used - 1] is None for row in rows):
        used -= 1
    head = rows[0][:used] + [None] * (used - len(rows[0][:used]))
    names = vetted_names(["" if cell is None else spelling(cell) for cell in head], where)
    if len(rows) == 1:
        raise InputFault(fault("no-rows", where))
    cells = np.full((len(rows) - 1, used), None, dtype=object)
    for position, row in enumerate(rows[1:]):
        cells[position, : min(len(row), used)] = row[:used]
    return {name: cells[:, position] for position, name in enumerate(names)}
