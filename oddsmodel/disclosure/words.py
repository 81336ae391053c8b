"""Numbers of records taken out of text, and stand-ins that a sentence can be made with in their place."""

from __future__ import annotations

import re
from collections.abc import Collection
from typing import Any

from oddsmodel.wording import say
from oddsmodel.wording.numbers import NARROW_SPACE

NOUNS = r"(?:records?|events?|cases?|controls?|patients?|people|persons?|participants?|rows?)"
SPELT = {word: k + 1 for k, word in enumerate(("one", "two", "three", "four", "five", "six", "seven", "eight", "nine"))}
_NUMBER = rf"\d{{1,3}}(?:[,{NARROW_SPACE}]\d{{3}})+|\d+|{'|'.join(SPELT)}"
_BETWEEN = r"(?:\s+(?!or\b|and\b)(?:[^\s.;:()]+)){0,4}?"
_BEFORE_NOUN = re.compile(rf"(?<![\w.,\u2212-])({_NUMBER})(?![\w.,%]*\d|%)(?={_BETWEEN}\s+{NOUNS}\b)", re.IGNORECASE)
_AFTER_NOUN = re.compile(rf"(\b{NOUNS}\s*[:=]\s*)({_NUMBER})\b(?![.,]\d|%)", re.IGNORECASE)
_LIMIT = re.compile(r"(?:than|under|below|above|least|most|over)\s*$", re.IGNORECASE)
_SHARE = re.compile(r"\s*\([^()]*%[^()]*\)")
ANY_NUMBER = re.compile(rf"(?<![\w.])(?:\d{{1,3}}(?:[,{NARROW_SPACE}]\d{{3}})+|\d+)(?:\.\d+)?%?(?!\w)")


def plain_number(text: str) -> int:
    """ "4 012", "4,012" or "three" as a whole number."""
    return SPELT[text.lower()] if text.lower() in SPELT else int(text.replace(",", "").replace(NARROW_SPACE, ""))


def without_counts(text: str, threshold: int, hidden: Collection[int] = ()) -> str:
    """The text with small numbers of records, and with hidden larger ones, said without the number.

    A number is one of records where a word for records follows it in the same breath or stands before it with a colon.
    Limits ("at least 3 records") stay. A share in brackets goes with its count.
    """
    found = False

    def replaced(number: str, whole: str, before: str) -> str:
        nonlocal found
        value = plain_number(number)
        if _LIMIT.search(before) or not (0 < value < threshold or value in hidden):
            return whole
        found = True
        return _instead(value, threshold)

    text = _BEFORE_NOUN.sub(lambda match: replaced(match[1], match[0], text[: match.start()]), text)
    after = text
    text = _AFTER_NOUN.sub(lambda match: match[1] + replaced(match[2], match[2], after[: match.start()]), text)
    return _SHARE.sub("", text) if found else text


def _instead(value: int, threshold: int) -> str:
    return say("fewer-than", threshold=threshold) if value < threshold else say("number-not-shown")


class Unsaid:
    """Stands for a hidden number while a sentence is made: it reads as its words and compares as `bound` would.

    Arithmetic with it is a TypeError: a sentence that computes from a hidden number cannot be made from it.
    """

    __hash__ = None  # type: ignore[assignment]

    def __init__(self, words: str, bound: int) -> None:
        self.words = words
        self.bound = bound

    def __format__(self, specification: str) -> str:
        return self.words

    def __str__(self) -> str:
        return self.words

    def __bool__(self) -> bool:
        return True

    def __eq__(self, other: object) -> bool:
        return bool(self.bound == other)

    def __lt__(self, other: Any) -> bool:
        return bool(self.bound < other)

    def __le__(self, other: Any) -> bool:
        return bool(self.bound <= other)

    def __gt__(self, other: Any) -> bool:
        return bool(self.bound > other)

    def __ge__(self, other: Any) -> bool:
        return bool(self.bound >= other)
