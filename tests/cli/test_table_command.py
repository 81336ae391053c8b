"""`table`: published tables, tables with empty cells, and counts that are none."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest

Command = Callable[..., Any]


def test_cases_and_controls(command: Command) -> None:
    # Breslow & Day 1980, chapter 4: oesophageal cancer and alcohol, crude odds ratio 5.640.
    ended = command("table", "--cases", "96/200", "--controls", "109/775")
    assert ended.status == 0
    lines = ended.out.splitlines()
    assert lines[0].split() == ["cases", "controls", "all"]
    assert lines[1].split() == ["exposed", "96", "109", "205"]
    assert lines[2].split() == ["unexposed", "104", "666", "770"]
    assert lines[3].split() == ["all", "200", "775", "975"]
    assert "Odds ratio: 5.64" in ended.out
    assert "Risk" not in ended.out
    assert ended.err == ""


def test_exposed_and_unexposed(command: Command) -> None:
    # Agresti 2002, sections 2.2 and 3.1: odds ratio 1.832 (1.440, 2.331); risk ratio 0.0171/0.0094 = 1.82 by hand.
    ended = command("table", "--exposed", "189/11034", "--unexposed", "104/11037")
    assert "Odds ratio: 1.83" in ended.out
    assert "95% interval, Woolf: 1.44 to 2.33" in ended.out
    assert "Risk ratio (95% interval, Katz): 1.82" in ended.out
    assert "mid-P" in ended.out
    assert "Risk difference" in ended.out


def test_the_level_is_told_and_used(command: Command) -> None:
    wide = command("table", "--cases", "96/200", "--controls", "109/775", "--level", "0.99").out
    assert "99% interval, Woolf: 3.5" in wide
    assert "95%" not in wide


def test_what_does_not_exist_is_told_in_words(command: Command) -> None:
    ended = command("table", "--exposed", "0/10", "--unexposed", "5/10")
    assert ended.status == 0
    assert "95% interval, exact: no lower limit, up to" in ended.out
    assert "nan" not in ended.out.lower()
    assert "inf " not in ended.out
    ended = command("table", "--exposed", "0/10", "--unexposed", "0/10")
    assert "nobody has the event" in ended.out
    ended = command("table", "--exposed", "0/0", "--unexposed", "1/10")
    assert ended.status == 0
    assert "nobody is exposed" in ended.out


@pytest.mark.parametrize(
    ("words", "told"),
    [
        (("--exposed", "5/3", "--unexposed", "1/2"), "5 is more than the total of 3"),
        (("--exposed", "-1/2", "--unexposed", "1/2"), "“-1/2” is not a number out of a total"),
        (("--exposed", "a/b", "--unexposed", "1/2"), "“a/b” is not"),
        (("--exposed", "1.5/3", "--unexposed", "1/2"), "“1.5/3” is not"),
        (("--exposed", "7", "--unexposed", "1/2"), "“7” is not"),
        (("--exposed", "", "--unexposed", "1/2"), "“” is not"),
        (("--exposed", "1/" + "9" * 400, "--unexposed", "1/2"), "is not a number out of a total"),
        (("--exposed", "١/٢", "--unexposed", "1/2"), "is not a number out of a total"),
        (("--exposed", "1/2"), "needs either"),
        (("--exposed", "1/2", "--controls", "1/2"), "needs either"),
        ((), "needs either"),
        (("--cases", "1/2", "--controls", "1/2", "--level", "95"), "--level 0.95"),
        (("--cases", "1/2", "--controls", "1/2", "--level", "nan"), "nan is outside"),
        (("--cases", "1/2", "--controls", "1/2", "--level", "0.2"), "0.2 is outside"),
        (("--exposed", "\x1b[31m", "--unexposed", "1/2"), "“[31m” is not"),
    ],
)
def test_counts_that_cannot_be_used(command: Command, words: tuple[str, ...], told: str) -> None:
    ended = command("table", *words)
    assert ended.status == 2
    assert told in ended.err
    assert "Traceback" not in ended.err
    assert ended.out == ""


def test_both_options_at_fault_are_told_together(command: Command) -> None:
    ended = command("table", "--cases", "x", "--controls", "9/1")
    assert "2 things to put right" in ended.err
    assert ended.err.index("--cases") < ended.err.index("--controls")


def test_great_counts_take_no_time(command: Command) -> None:
    ended = command("table", "--exposed", "200000/90000000", "--unexposed", "100000/90000000")
    assert ended.status == 0
    assert "Odds ratio: 2.00" in ended.out
