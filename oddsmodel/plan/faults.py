"""Faults of a plan: their words from the wording floor, their place as a key path."""

from __future__ import annotations

import re
from collections.abc import Sequence
from datetime import date, datetime, time
from typing import Any

from oddsmodel.errors import Fault
from oddsmodel.wording.plain import as_code, quoted
from oddsmodel.wording.say import say

NAMED_SECTIONS = ("columns", "derived")
"""Sections that have a section of its own for each column."""
BARE_KEY = re.compile(r"[A-Za-z0-9_-]+")


def fault(code: str, where: str, **facts: Any) -> Fault:
    """The fault of `code`: its sentence and its remedy with the facts filled in."""
    return Fault(what=say(code, **facts), where=where, remedy=say(f"{code}-remedy", **facts))


def shown_key(key: str) -> str:
    """A key as it is written in TOML: bare where it can be, in quotes otherwise."""
    return key if BARE_KEY.fullmatch(key) and len(key) <= 60 else as_code(key)


def heading(section: str, column: str | None = None) -> str:
    """The line that opens a section: [study], [[models]], [columns.age]."""
    if section == "models":
        return "[[models]]"
    return f"[{section}]" if column is None else f"[{section}.{shown_key(column)}]"


def key_path(location: Sequence[str | int], data: Any) -> str:
    """Where a value stands, in words: `[columns.age] per`, `[[models]] number 2 (“main”) exposures, item 1`."""
    if not location:
        return "the whole plan"
    section, rest = str(location[0]), list(location[1:])

    opening = heading(section) if section in _SECTION_NAMES else shown_key(section)
    if section in NAMED_SECTIONS and rest:
        opening = heading(section, str(rest.pop(0)))
    elif section == "models" and rest and isinstance(rest[0], int):
        number = rest.pop(0)
        opening = f"{opening} number {int(number) + 1}{_model_name(data, int(number))}"

    parts = [f"item {part + 1}" if isinstance(part, int) else shown_key(part) for part in rest]
    return f"{opening} {', '.join(parts)}" if parts else opening


def described(value: Any) -> str:
    """What was found, in words that follow "This is ..."."""
    if isinstance(value, bool):
        return f"the value {'true' if value else 'false'}"
    if isinstance(value, int | float):
        return shown_number(value)
    if isinstance(value, str):
        return f"the text {quoted(value)}"
    if isinstance(value, list | tuple):
        return "a list"
    if isinstance(value, dict):
        return "a section of its own"
    if isinstance(value, datetime | date):
        return "a date"
    return "a time of day" if isinstance(value, time) else "something else"


def shown_number(value: int | float) -> str:
    """ "the number 5"; one of very many digits is not written out."""
    if isinstance(value, int) and abs(value) >= 10**30:
        return "a number of more than 30 digits"
    return f"the number {value}"


_SECTION_NAMES = ("study", "records", "columns", "derived", "outcome", "models", "report", "checks", "run")


def _model_name(data: Any, number: int) -> str:
    """The name of a model as (“ ... ”) where it has one, to find it by."""
    models = data.get("models") if isinstance(data, dict) else None
    if not isinstance(models, list | tuple) or number >= len(models) or not isinstance(models[number], dict):
        return ""
    name = models[number].get("name")
    return f" ({quoted(name, 40)})" if isinstance(name, str) and name.strip() else ""
