"""The names of the columns: read from the first row, and vetted."""

from __future__ import annotations

import csv
import io
import re
import unicodedata
from collections import Counter
from collections.abc import Sequence

from oddsmodel.errors import Fault, InputFault
from oddsmodel.records.faults import fault
from oddsmodel.records.same_value import PLAIN_NUMBER
from oddsmodel.wording.plain import quoted

MOST_COLUMNS = 10_000
LONGEST_NAME = 500
CONTROL = re.compile(r"[\x00-\x1f\x7f-\x9f\u00ad\u061c\u200b\u200e\u200f\u202a-\u202e\u2060-\u2064\u2066-\u2069\ufeff]")


def header_end(content: bytes) -> int:
    """Position after the first line of the table, its line end included."""
    ends = [at for at in (content.find(b"\n"), content.find(b"\r")) if at >= 0]
    if not ends:
        return len(content)
    return min(ends) + (2 if content[min(ends) : min(ends) + 2] == b"\r\n" else 1)


def header_names(line: bytes, delimiter: str, source: str) -> list[str]:
    """The column names in the first row of a text table. Raises InputFault as `vetted_names` does."""
    text = line.decode("utf-8").rstrip("\r\n")
    if text.count('"') % 2 == 1:
        raise InputFault(fault("header-not-readable", f"{source}, row 1"))
    try:
        cells = next(csv.reader(io.StringIO(text, newline=""), delimiter=delimiter))
    except csv.Error as error:
        raise InputFault(fault("header-not-readable", f"{source}, row 1")) from error
    return vetted_names(cells, source)


def vetted_names(cells: Sequence[str], source: str) -> list[str]:
    """The names without spaces around them.

    Raises: InputFault with every name that is empty, given twice, too long, or holds characters that cannot be
        shown; and when every name is a number, which says that the file has no row of names.
    """
    where = f"{source}, row 1"
    if len(cells) > MOST_COLUMNS:
        raise InputFault(fault("too-many-columns", where, columns=len(cells), most=MOST_COLUMNS))
    names = [unicodedata.normalize("NFC", cell).strip() for cell in cells]
    faults: list[Fault] = []
    empty = [position + 1 for position, name in enumerate(names) if not name]
    if empty:
        faults.append(fault("name-empty", where, positions=empty[:10]))
    for name, times in Counter(name for name in names if name).items():
        if times > 1:
            positions = [position + 1 for position, other in enumerate(names) if other == name]
            faults.append(fault("name-twice", where, name=quoted(name), positions=positions[:10]))
        if CONTROL.search(name) or len(name) > LONGEST_NAME:
            place = f"{where}, column {names.index(name) + 1}"
            faults.append(fault("name-not-usable", place, name=quoted(name), longest=LONGEST_NAME))
    if names and all(PLAIN_NUMBER.fullmatch(name) for name in names):
        faults.append(fault("no-row-of-names", where, names=[quoted(name) for name in names[:5]]))
    if faults:
        raise InputFault(faults)
    return names
