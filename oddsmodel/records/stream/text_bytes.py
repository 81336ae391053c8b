"""The bytes of a text file, looked through once in parts: checksum, encoding, NUL bytes."""

from __future__ import annotations

import codecs
import hashlib
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import BinaryIO

from oddsmodel.errors import InputFault
from oddsmodel.findings import Finding
from oddsmodel.records.encoding import UTF_16, UTF_32
from oddsmodel.records.faults import fault
from oddsmodel.wording import finding

PART = 1 << 23
UNDEFINED = (b"\x81", b"\x8d", b"\x8f", b"\x90", b"\x9d")
"""Bytes that Windows-1252 does not have."""


@dataclass(frozen=True, slots=True)
class TextBytes:
    """What is known of the bytes of a text file. start: where its text starts, after a byte-order mark."""

    path: Path
    sha256: str
    encoding: str
    start: int
    findings: tuple[Finding, ...] = ()

    @property
    def unit(self) -> int:
        """Bytes of the least character."""
        return 2 if self.encoding.startswith("utf-16") else 1

    def utf8(self, data: bytes) -> bytes:
        """Bytes of the file, of whole characters, in UTF-8."""
        return data if self.encoding == "utf-8" else data.decode(self.encoding).encode("utf-8")

    def parts(self, start: int | None = None) -> Iterator[bytes]:
        """The text in UTF-8, part by part, from the position of a character on."""
        decoder = codecs.getincrementaldecoder(self.encoding)()
        with self.path.open("rb") as file:
            file.seek(self.start if start is None else start)
            while data := file.read(PART):
                yield data if self.encoding == "utf-8" else decoder.decode(data).encode("utf-8")


def look_through(path: Path, source: str) -> TextBytes:
    """The checksum and the encoding of a text file.

    Raises: InputFault as `records.encoding.to_utf8` does.
    """
    with path.open("rb") as file:
        head = file.read(4)
        file.seek(0)
        if head.startswith(UTF_32):
            raise InputFault(fault("encoding-not-read", source, encoding="UTF-32"))
        if head.startswith(UTF_16):
            little = head.startswith(codecs.BOM_UTF16_LE)
            return _utf_16(file, path, source, "utf-16-le" if little else "utf-16-be")
        return _bytes_of_letters(file, path, source, len(codecs.BOM_UTF8) if head.startswith(codecs.BOM_UTF8) else 0)


def _utf_16(file: BinaryIO, path: Path, source: str, encoding: str) -> TextBytes:
    digest, decoder, lines = hashlib.sha256(), codecs.getincrementaldecoder(encoding)(), 1
    nul_at: int | None = None
    while True:
        data = file.read(PART)
        digest.update(data)
        try:
            text = decoder.decode(data, final=not data)
        except UnicodeDecodeError as error:
            raise InputFault(fault("encoding-not-read", source, encoding="damaged UTF-16")) from error
        at = text.find("\0")
        if nul_at is None and at >= 0:
            nul_at = lines + text.count("\n", 0, at)
        lines += text.count("\n")
        if not data:
            if nul_at is not None:
                raise InputFault(fault("nul-bytes", f"{source}, row {nul_at}"))
            told = finding("note", "encoding-converted", encoding="UTF-16")
            return TextBytes(path, digest.hexdigest(), encoding, 2, (told,))


def _bytes_of_letters(file: BinaryIO, path: Path, source: str, start: int) -> TextBytes:
    """UTF-8, or Windows-1252 where it is not and does not look like UTF-8 with damaged places."""
    digest, letters, position, undefined = hashlib.sha256(), _Letters(), 0, False
    digest.update(file.read(start))
    while True:
        data = file.read(PART)
        digest.update(data)
        nul = data.find(b"\0")
        if nul >= 0:
            raise InputFault(fault("nul-bytes", f"{source}, row {_row_at(path, start, position + nul)}"))
        letters.add(data)
        if letters.wrong is not None or not data.isascii():
            undefined = undefined or any(byte in data for byte in UNDEFINED)
        position += len(data)
        if not data:
            break
    if letters.wrong is None:
        return TextBytes(path, digest.hexdigest(), "utf-8", start)
    where = f"{source}, row {_row_at(path, start, letters.wrong)}"
    if letters.accented >= letters.damaged:
        raise InputFault(fault("encoding-mixed", where))
    if undefined:
        raise InputFault(fault("encoding-unknown", where))
    told = finding("note", "encoding-converted", encoding="Windows-1252")
    return TextBytes(path, digest.hexdigest(), "cp1252", start, (told,))


class _Letters:
    """Looks for bytes that are not UTF-8. wrong: position of the first; then accented letters and damaged places are
    counted."""

    def __init__(self) -> None:
        self.wrong: int | None = None
        self.accented = self.damaged = 0
        self._position = 0
        self._decoder = codecs.getincrementaldecoder("utf-8")()

    def add(self, data: bytes) -> None:
        """The next part; an empty one is the end."""
        pending = self._decoder.getstate()[0]
        if data.isascii() and not pending and data:
            self._position += len(data)
            return
        try:
            text = self._decoder.decode(data, final=not data)
        except UnicodeDecodeError as error:
            self.wrong = self._position - len(pending) + error.start
            self._decoder = codecs.getincrementaldecoder("utf-8")("replace")
            text = self._decoder.decode(pending + data, final=not data)
        damaged = text.count("\ufffd")
        self.damaged += damaged
        self.accented += len(text) - damaged - len(text.encode("ascii", errors="ignore"))
        self._position += len(data)


def _row_at(path: Path, start: int, position: int) -> int:
    """The number of the row at a position after the start."""
    row = 1
    with path.open("rb") as file:
        file.seek(start)
        while position > 0 and (data := file.read(min(PART, position))):
            row += data.count(b"\n")
            position -= len(data)
    return row
