"""Findings said again without small counts."""

from __future__ import annotations

from collections.abc import Collection, Mapping
from dataclasses import dataclass, replace
from typing import Any

from oddsmodel.disclosure.words import ANY_NUMBER, Unsaid, without_counts
from oddsmodel.findings import Finding
from oddsmodel.wording import say

COUNTS = ("records", "events", "cases", "controls")
SHARES = ("share", "percent", "proportion", "rate", "per_100")
WHO = ("row", "rows", "identifier", "identifiers", "first_rows")
"""Endings of the names of facts that hold a count of records, a share of them, or say which record it was."""


@dataclass(frozen=True, slots=True)
class Withheld:
    """What must not be said: counts between 0 and `threshold`, these other `counts`, and these `estimates`."""

    threshold: int
    counts: frozenset[int] = frozenset()
    estimates: frozenset[float] = frozenset()

    def is_count(self, value: object) -> bool:
        return isinstance(value, int) and not isinstance(value, bool) and self._hides(value)

    def _hides(self, value: int) -> bool:
        return 0 < value < self.threshold or value in self.counts

    def text(self, text: str) -> str:
        return without_counts(text, self.threshold, self.counts)


def ends_with(key: str, endings: Collection[str]) -> bool:
    return any(key == ending or key.endswith(f"_{ending}") for ending in endings)


def disclosed_finding(finding: Finding, withheld: Withheld) -> Finding:
    """The finding with its hidden facts in words, and its sentence made again from them.

    A fact is hidden where its name says that it counts records and its number is withheld, where it is an estimate
    that is, where it is a share and a count of the same finding is hidden, and where it says which record it was.
    A sentence that computes from a hidden number cannot be made again: the one of its code with "-withheld" is said,
    or, where there is none, the old one without its numbers, but for those that are facts which stay.
    """
    facts = {key: _stand_in(key, value, withheld) for key, value in finding.facts.items()}
    hides = any(_is_hidden(value) for value in facts.values())
    if any(_is_hidden(value) and ends_with(key, COUNTS) for key, value in facts.items()):
        facts |= {
            key: Unsaid(say("share-not-shown"), 0)
            for key, value in finding.facts.items()
            if isinstance(value, float) and ends_with(key, SHARES)
        }
    message = finding.message
    if hides:
        try:
            message = say(finding.code, **facts)
        except (ArithmeticError, AttributeError, LookupError, TypeError, ValueError):
            message = _said_otherwise(finding, facts, withheld)
    plain = {key: withheld.text(value) if isinstance(value, str) else _plain(value) for key, value in facts.items()}
    return replace(finding, message=withheld.text(message), facts=plain)


def _said_otherwise(finding: Finding, facts: Mapping[str, Any], withheld: Withheld) -> str:
    try:
        return say(f"{finding.code}-withheld")
    except KeyError:
        return _without_numbers(finding.message, finding.facts, facts, withheld)


def _stand_in(key: str, value: Any, withheld: Withheld) -> Any:
    if value is None:
        return None
    if isinstance(value, list | tuple):
        return [_stand_in(key, one, withheld) for one in value]
    if isinstance(value, str):
        return withheld.text(value) if not ends_with(key, WHO) else Unsaid(say("record-not-shown"), 0)
    if ends_with(key, WHO):
        return Unsaid(say("record-not-shown"), 0)
    if ends_with(key, COUNTS) and withheld.is_count(value):
        if value < withheld.threshold:
            return Unsaid(say("fewer-than", threshold=withheld.threshold), withheld.threshold - 1)
        return Unsaid(say("number-not-shown"), value)
    if isinstance(value, float) and value in withheld.estimates:
        return Unsaid(say("number-not-shown"), 1)
    return value


def _is_hidden(value: Any) -> bool:
    return isinstance(value, Unsaid) or (isinstance(value, list) and any(map(_is_hidden, value)))


def _plain(value: Any) -> Any:
    if isinstance(value, list):
        return [_plain(one) for one in value]
    return str(value) if isinstance(value, Unsaid) else value


def _without_numbers(message: str, before: Mapping[str, Any], after: Mapping[str, Any], withheld: Withheld) -> str:
    stays = {
        text
        for key, value in before.items()
        if not _is_hidden(after[key])
        for text in ([str(value), f"{value:,}"] if isinstance(value, int) else ANY_NUMBER.findall(str(value)))
    }
    small = {str(value) for key, value in before.items() if _is_hidden(after[key]) and withheld.is_count(value)}

    def instead(number: str) -> str:
        if number in small and int(number) < withheld.threshold:
            return say("fewer-than", threshold=withheld.threshold)
        return number if number in stays - small else say("number-not-shown")

    return ANY_NUMBER.sub(lambda match: instead(match[0]), message)
