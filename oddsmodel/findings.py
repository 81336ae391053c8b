"""A finding: something the analyst should know, with a code and the facts it rests on."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any, Literal

Severity = Literal["note", "caution", "stop"]


@dataclass(frozen=True, slots=True)
class Finding:
    """`message` is the sentence that `wording.finding` made from `code` and `facts`.

    `facts` hold only text, numbers, booleans and lists of them, so that they can be written to JSON;
    facts that are counts of records have names ending in `records` or `events` (disclosure reads this).
    """

    severity: Severity
    code: str
    message: str
    facts: Mapping[str, Any] = field(default_factory=dict)
