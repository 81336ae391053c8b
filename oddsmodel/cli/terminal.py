"""Lines on standard output and standard error: wrapped on a terminal, free of control characters everywhere."""

from __future__ import annotations

import io
import shutil
import sys
from textwrap import wrap
from typing import TextIO

from oddsmodel.wording.plain import plain

WIDEST = 100


def write(text: str = "", indent: int = 0) -> None:
    """A paragraph on standard output."""
    _write(sys.stdout, text, indent)


def tell(text: str = "", indent: int = 0) -> None:
    """A paragraph on standard error."""
    _write(sys.stderr, text, indent)


def write_as_is(text: str) -> None:
    """Text that must arrive as it is, such as a plan to be piped into a file."""
    _lenient(sys.stdout).write(text)
    sys.stdout.flush()


def _write(stream: TextIO | None, text: str, indent: int) -> None:
    if stream is None:  # closed by whoever started the program
        return
    line = plain(text)
    spaces = " " * indent
    lines = [spaces + line]
    if stream.isatty() and len(line) + indent >= WIDEST // 2:
        width = max(40, min(WIDEST, shutil.get_terminal_size().columns))
        own = len(line) - len(line.lstrip()) + indent
        lines = wrap(
            line,
            width,
            initial_indent=spaces,
            subsequent_indent=" " * own,
            break_long_words=False,
            break_on_hyphens=False,
            replace_whitespace=False,
            drop_whitespace=True,
        )
    _lenient(stream).write("\n".join(lines or [""]) + "\n")
    stream.flush()


def _lenient(stream: TextIO) -> TextIO:
    """A stream that writes "?" for what its encoding does not have."""
    if isinstance(stream, io.TextIOWrapper) and stream.errors == "strict":
        stream.reconfigure(errors="replace")
    return stream
