"""A plan's text read as TOML, its syntax errors told by line and column in plain words."""

from __future__ import annotations

import re
import tomllib
from typing import Any

from oddsmodel.errors import Fault, InputFault
from oddsmodel.plan.faults import fault
from oddsmodel.wording.plain import plain, quoted

MOST_DOTS_IN_A_LINE = 300
"""A dotted key nests a section a dot, and reading it takes time with the square of their number."""

_PLACE = re.compile(r"\s*\(at (?:line (\d+), column (\d+)|end of document)\)$")
_CURLY_QUOTES = re.compile("[“”„«»]")

_CODES = {
    "Invalid value": "toml-value",
    "Invalid date": "toml-date",
    "Cannot overwrite": "toml-twice",
    "Cannot declare": "toml-twice",
    "Cannot mutate": "toml-twice",
    "Cannot redefine": "toml-twice",
    "Duplicate inline": "toml-twice",
    "Expected '='": "toml-equals",
    "Expected newline": "toml-line-end",
    "Invalid statement": "toml-statement",
    "Invalid initial character": "toml-name",
    "Unclosed array": "toml-list",
    "Unclosed inline table": "toml-braces",
    "Expected ']": "toml-heading",
    "Unescaped '\\'": "toml-backslash",
    "Invalid hex value": "toml-backslash",
    "Escaped character": "toml-backslash",
    "Unterminated string": "toml-text",
    "Expected \"'": "toml-text",
    "Expected '\"": "toml-text",
    "Illegal character": "toml-text",
    "Found invalid character": "toml-text",
}
"""How the parser's message begins → the code of our sentence."""


def parse(text: str, name: str) -> dict[str, Any]:
    """The TOML of a plan as plain values. `name` is the plan's file name, for messages.

    Raises InputFault with line and column where the text is not TOML or is nested beyond all use.
    """
    for number, line in enumerate(text.split("\n"), start=1):
        if line.count(".") > MOST_DOTS_IN_A_LINE:
            raise InputFault(fault("plan-nested-too-deeply", f"{name}, line {number}"))
    try:
        return tomllib.loads(text)
    except RecursionError:
        raise InputFault(fault("plan-nested-too-deeply", name)) from None
    except ValueError as error:
        raise InputFault(_syntax_fault(str(error), text, name)) from None


def _syntax_fault(message: str, text: str, name: str) -> Fault:
    """The parser's message in our words; whatever is no TOML error is a number too long to read."""
    code = next((code for beginning, code in _CODES.items() if message.startswith(beginning)), "toml-other")
    place = _PLACE.search(message)
    if place is None:
        return fault("toml-value", name, line="")

    lines = text.replace("\r\n", "\n").split("\n")
    if place.group(1) is None:
        return fault(code, f"{name}, line {len(lines)}, column {len(lines[-1]) + 1} (the end)", line="")
    line, column = int(place.group(1)), int(place.group(2))
    written = lines[line - 1].strip()
    if code in ("toml-value", "toml-statement", "toml-line-end") and _CURLY_QUOTES.search(written):
        code = "toml-curly-quotes"
    return fault(code, f"{name}, line {line}, column {column}", line=f": {quoted(written)}" if plain(written) else "")
