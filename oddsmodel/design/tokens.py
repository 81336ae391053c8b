"""A formula cut into tokens by hand: only the characters and shapes that the formula language has get through."""

from __future__ import annotations

import re
import unicodedata
from dataclasses import dataclass
from typing import Literal

from oddsmodel.design.faults import formula_fault, piece

LONGEST_FORMULA = 5000
LONGEST_NUMBER = 30
LARGEST_CONSTANT = 1e12

NUMBER = re.compile(r"(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]+)?")
OPERATORS = ("**", "+", "-", "*", "/", ":", "~", "(", ")", "[", "]", ",", "=", ".")
SPACE = " \t\n\r"
TEXT_PREFIXES = frozenset({"f", "r", "b", "u", "fr", "rf", "br", "rb", "t"})

REFUSED = {
    ":=": "walrus",
    "==": "comparison",
    "!=": "comparison",
    "<": "comparison",
    ">": "comparison",
    "//": "floor-division",
    "->": "arrow",
    "...": "ellipsis",
    "%in%": "nesting-word",
    "%": "remainder",
    "^": "caret",
    "&": "bit",
    "|": "bar",
    "@": "at",
    "!": "exclamation",
    "?": "question",
    "$": "dollar",
    ";": "semicolon",
    "#": "comment",
    "`": "backtick",
    "{": "braces",
    "}": "braces",
    "\\": "backslash",
    "“": "curly-quote",
    "”": "curly-quote",
    "„": "curly-quote",
    "‘": "curly-quote",
    "’": "curly-quote",
    "–": "dash",
    "—": "dash",
    "−": "dash",
    "×": "times",
    "·": "times",
    "∗": "times",
    "\x00": "null",
}
"""Spellings that are refused by name, the longest of each kind first."""


@dataclass(frozen=True, slots=True)
class Token:
    """One token; `at` is its first character. value: the text of a text, the number of a number."""

    kind: Literal["name", "text", "number", "operator", "end"]
    text: str
    at: int
    value: str | float | None = None

    @property
    def end(self) -> int:
        return self.at + len(self.text)


def tokenize(text: str, where: str) -> list[Token]:
    """The tokens of a formula, with one of kind "end" at the end.

    InputFault for a formula longer than 5,000 characters and for anything that the formula language does not have.
    """
    if len(text) > LONGEST_FORMULA:
        raise formula_fault("formula-too-long", where, None, length=len(text), longest=LONGEST_FORMULA)
    tokens: list[Token] = []
    at = 0
    while at < len(text):
        if text[at] in SPACE:
            at += 1
            continue
        token = _token(text, at, where)
        tokens.append(token)
        at = token.end
    return [*tokens, Token("end", "", len(text))]


def _token(text: str, at: int, where: str) -> Token:
    character = text[at]
    if character in "\"'":
        return _text(text, at, where)
    if character.isidentifier():
        return _name(text, at, where)
    found = NUMBER.match(text, at)
    if found:
        return _number(text, at, found.group(), where)
    for spelling, construct in REFUSED.items():
        if text.startswith(spelling, at):
            raise formula_fault("formula-refused", where, at, construct=construct, written=piece(spelling))
    for operator in OPERATORS:
        if text.startswith(operator, at):
            return Token("operator", operator, at)
    raise formula_fault(
        "formula-character", where, at, name=unicodedata.name(character, "no name"), number=f"{ord(character):04X}"
    )


def _name(text: str, at: int, where: str) -> Token:
    end = at + 1
    while end < len(text) and f"a{text[end]}".isidentifier():
        end += 1
    name = text[at:end]
    if name.lower() in TEXT_PREFIXES and text[end : end + 1] in ("'", '"'):
        raise formula_fault("formula-refused", where, at, construct="text-prefix", written=name)
    return Token("name", name, at)


def _number(text: str, at: int, written: str, where: str) -> Token:
    end = at + len(written)
    if text[end : end + 1] and f"a{text[end]}".isidentifier():
        raise formula_fault("formula-number", where, at, written=piece(text[at : end + 20]))
    value = float(written) if len(written) <= LONGEST_NUMBER else float("inf")
    if value > LARGEST_CONSTANT:
        raise formula_fault("formula-number-too-large", where, at, written=piece(written), largest=LARGEST_CONSTANT)
    return Token("number", written, at, value)


def _text(text: str, at: int, where: str) -> Token:
    quote, value, end = text[at], [], at + 1
    while end < len(text) and text[end] != quote and text[end] not in "\n\r":
        if text[end] == "\\":
            end += 1
            if text[end : end + 1] not in ("\\", '"', "'"):
                raise formula_fault("formula-backslash-in-text", where, end - 1)
        value.append(text[end])
        end += 1
    if text[end : end + 1] != quote:
        raise formula_fault("formula-text-not-closed", where, at)
    return Token("text", text[at : end + 1], at, "".join(value))
