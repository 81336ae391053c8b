"""TOML that cannot be read: told by line and column, in plain words, however hostile."""

from __future__ import annotations

import time

import pytest

from oddsmodel.errors import Fault, InputFault
from oddsmodel.plan.syntax import parse


def the_fault(text: str) -> Fault:
    with pytest.raises(InputFault) as caught:
        parse(text, "plan.toml")
    (fault,) = caught.value.faults
    return fault


@pytest.mark.parametrize(
    ("text", "place", "what"),
    [
        ("a = 1\nb = = 2", "line 2, column 5", "not a value"),
        ("a = yes", "line 1, column 5", "not a value"),
        ("a = 1,5", "line 1, column 6", "where the value has ended"),
        ("a = “x”", "line 1, column 5", "Curly quotation marks"),
        ("body mass = 1", "line 1, column 6", "equals sign"),
        ("[study]\n[study]\n", "line 2", "written twice"),
        ("a = 1\na = 2\nb = 3", "line 2", "written twice"),
        ("a = [1,\n2", "line 2, column 2 (the end)", "list is not closed"),
        ('a = "x', "(the end)", "text in quotes is not closed"),
        ("a = '''x\ny", "(the end)", "text in quotes is not closed"),
        ("[[models]", "line 1, column 9", "heading is not closed"),
        ('a = "C:\\data\\x"', "line 1, column 10", "backslash"),
        ("a = 2026-02-30", "line 1, column 5", "date does not exist"),
        ("# a\0b", "line 1, column 4", "control character"),
        ("\0", "line 1, column 1", "neither a key"),
    ],
)
def test_the_place_and_the_words(text: str, place: str, what: str) -> None:
    fault = the_fault(text)
    assert place in fault.where
    assert what in fault.what
    assert fault.remedy


@pytest.mark.parametrize(
    "text",
    ["a = " + "[" * 100_000, "a = " + "{a=" * 100_000, ".".join(["a"] * 200_000) + " = 1", "[" + "a." * 200_000 + "a]"],
)
def test_endless_nesting_is_refused_at_once(text: str) -> None:
    begun = time.monotonic()
    assert "nested far deeper" in the_fault(text).what
    assert time.monotonic() - begun < 2


def test_a_number_of_very_many_digits_is_a_fault() -> None:
    assert "not a value" in the_fault("a = " + "1" * 5000).what


def test_the_line_at_fault_is_shown_without_control_characters() -> None:
    fault = the_fault("a = \x1b[31mred")
    assert "\x1b" not in str(fault)
