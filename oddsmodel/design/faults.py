"""Faults of a formula, with the character at which they stand, and of the records that it meets."""

from __future__ import annotations

from typing import Any

from oddsmodel.errors import InputFault
from oddsmodel.plan.faults import fault
from oddsmodel.wording.plain import plain

LONGEST_PIECE = 60


def formula_fault(code: str, where: str, at: int | None, **facts: Any) -> InputFault:
    """The fault of `code` at character `at` (from 0) of the formula; None for the formula as a whole."""
    place = where if at is None else f"{where}, character {at + 1}"
    return InputFault(fault(code, place, **facts))


def piece(text: str) -> str:
    """A piece of a formula or a value of the records, fit to stand in a message."""
    return plain(text, LONGEST_PIECE)
