"""The words of a `keep` condition: names, numbers, quoted texts and signs, each with its place."""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import Literal

from oddsmodel.errors import Fault, InputFault
from oddsmodel.records.faults import fault
from oddsmodel.wording.plain import quoted

LONGEST = 2000
MOST_TOKENS = 1000
WORDS = ("and", "or", "not", "in", "is", "recorded")
TokenKind = Literal["name", "word", "number", "text", "sign", "end"]
_PATTERN = re.compile(
    r"""\s*(?:
      (?P<number>(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]{1,3})?(?![\w.]))
    | (?P<name>[^\W\d]\w*)
    | `(?P<backticked>[^`]+)`
    | "(?P<double>(?:[^"\\]|\\.)*)"
    | '(?P<single>(?:[^'\\]|\\.)*)'
    | (?P<sign>==|!=|<=|>=|[<>()\[\],-])
    )""",
    re.VERBOSE,
)


@dataclass(frozen=True, slots=True)
class Token:
    """`text` is a name, a word, digits, a text without its quotation marks or a sign; `at` counts from 1."""

    kind: TokenKind
    text: str
    at: int


def tokens(text: str, where: str) -> list[Token]:
    """The tokens of a condition, closed by one of kind "end".

    Raises: InputFault for a text beyond 2,000 characters or 1,000 tokens, and for what is no token.
    """
    if len(text) > LONGEST:
        raise InputFault(fault("condition-too-long", where, longest=LONGEST))
    found: list[Token] = []
    at = 0
    end = len(text.rstrip())
    while at < end:
        match = _PATTERN.match(text, at)
        if match is None:
            raise InputFault(_unknown(text, at, where))
        found.append(_token(match))
        if len(found) > MOST_TOKENS:
            raise InputFault(fault("condition-too-long", where, longest=LONGEST))
        at = match.end()
    return [*found, Token("end", "", end + 1)]


def _token(match: re.Match[str]) -> Token:
    kind = match.lastgroup or ""
    text = match.group(kind)
    at = match.start(kind) + 1
    if kind == "name":
        return Token("word" if text in WORDS else "name", text, at)
    if kind == "backticked":
        return Token("name", text, at - 1)
    if kind in ("double", "single"):
        return Token("text", re.sub(r"\\(.)", r"\1", text), at - 1)
    return Token("number" if kind == "number" else "sign", text, at)


def _unknown(text: str, at: int, where: str) -> Fault:
    at += len(text[at:]) - len(text[at:].lstrip())
    sign = text[at]
    place = f"{where}, character {at + 1}"
    if sign == "=":
        return fault("condition-single-equals", place)
    if sign in "\"'`":
        return fault("condition-quote-not-closed", place)
    if sign in "&|!":
        return fault("condition-word-for-sign", place, sign=sign, word={"&": "and", "|": "or", "!": "not"}[sign])
    return fault("condition-sign", place, sign=quoted(sign))
