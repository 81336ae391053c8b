"""The bytes of a text file as UTF-8, with what had to be done to get there."""

from __future__ import annotations

import codecs

from oddsmodel.errors import InputFault
from oddsmodel.findings import Finding
from oddsmodel.records.faults import fault
from oddsmodel.wording import finding

CHUNK = 1 << 24
UTF_32 = (codecs.BOM_UTF32_LE, codecs.BOM_UTF32_BE)
UTF_16 = (codecs.BOM_UTF16_LE, codecs.BOM_UTF16_BE)


def to_utf8(data: bytes, source: str) -> tuple[bytes, tuple[Finding, ...]]:
    """The text in UTF-8 without a byte-order mark.

    UTF-8 passes unchanged, UTF-16 with its mark and Windows-1252 are converted with a note.

    Raises: InputFault when the bytes are in no encoding that can be told, or hold NUL.
    """
    if data.startswith(UTF_32):
        raise InputFault(fault("encoding-not-read", source, encoding="UTF-32"))
    if data.startswith(UTF_16):
        try:
            text = data.decode("utf-16")
        except UnicodeDecodeError as error:
            raise InputFault(fault("encoding-not-read", source, encoding="damaged UTF-16")) from error
        converted = text.encode("utf-8")
        _refuse_nul(converted, source)
        return converted, (finding("note", "encoding-converted", encoding="UTF-16"),)
    content = data.removeprefix(codecs.BOM_UTF8)
    _refuse_nul(content, source)
    wrong = _first_not_utf8(content)
    if wrong is None:
        return content, ()
    return _from_windows_1252(content, wrong, source)


def _refuse_nul(content: bytes, source: str) -> None:
    position = content.find(b"\0")
    if position >= 0:
        raise InputFault(fault("nul-bytes", f"{source}, row {_row_at(content, position)}"))


def _first_not_utf8(content: bytes) -> int | None:
    """Position of the first byte that is not UTF-8, reading in chunks so that memory stays bounded."""
    if content.isascii():
        return None
    decoder = codecs.getincrementaldecoder("utf-8")()
    view = memoryview(content)
    for start in range(0, len(content), CHUNK):
        pending = len(decoder.getstate()[0])
        try:
            decoder.decode(view[start : start + CHUNK], final=start + CHUNK >= len(content))
        except UnicodeDecodeError as error:
            return start - pending + error.start
    return None


def _from_windows_1252(content: bytes, wrong: int, source: str) -> tuple[bytes, tuple[Finding, ...]]:
    """Windows-1252 text as UTF-8; refused where the file is rather UTF-8 with damaged places."""
    where = f"{source}, row {_row_at(content, wrong)}"
    as_utf8 = content.decode("utf-8", errors="replace")
    damaged = as_utf8.count("\ufffd")
    accented = len(as_utf8) - damaged - len(as_utf8.encode("ascii", errors="ignore"))
    if accented >= damaged:
        raise InputFault(fault("encoding-mixed", where))
    try:
        text = content.decode("cp1252")
    except UnicodeDecodeError as error:
        raise InputFault(fault("encoding-unknown", where)) from error
    return text.encode("utf-8"), (finding("note", "encoding-converted", encoding="Windows-1252"),)


def _row_at(content: bytes, position: int) -> int:
    return content.count(b"\n", 0, position) + 1
