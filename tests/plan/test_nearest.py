"""The nearest word: near enough, the first of equals, in no time."""

from __future__ import annotations

import time

from oddsmodel.plan.nearest import nearest


def test_slips_of_the_pen() -> None:
    assert nearest("smokr", ["age", "smoker", "sex"]) == "smoker"
    assert nearest("cross sectional", ["cohort", "cross-sectional"]) == "cross-sectional"
    assert nearest("Age", ["sex", "age"]) == "age"
    assert nearest("hidecountsbelow", ["audience", "hide_counts_below"]) == "hide_counts_below"


def test_nothing_near() -> None:
    assert nearest("ward", ["age", "sex"]) is None
    assert nearest("", ["age"]) is None
    assert nearest("age", []) is None


def test_the_same_word_wins_and_then_the_first() -> None:
    assert nearest("b", ["B", "b"]) == "b"
    assert nearest("abcx", ["abcd", "abce"]) == "abcd"


def test_long_words_take_no_time() -> None:
    begun = time.monotonic()
    nearest("a" * 1_000_000, ["b" * 1_000_000] * 1000)
    assert time.monotonic() - begun < 2
