"""Counts in sentences, and findings said again without them."""

from __future__ import annotations

import re
import sys
from collections.abc import Mapping
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from oddsmodel.disclosure.findings import Withheld, disclosed_finding
from oddsmodel.disclosure.words import Unsaid, without_counts
from oddsmodel.findings import Finding
from oddsmodel.wording import finding, numbers, say


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("3 records have no age.", "fewer than 5 records have no age."),
        ("1 record has no age.", "fewer than 5 record has no age."),
        ("Four of 812 records (0.5%) are old.", "fewer than 5 of 812 records are old."),
        ("2 unlikely events, 12 records.", "fewer than 5 unlikely events, 12 records."),
        ("Records: 4; events: 12.", "Records: fewer than 5; events: 12."),
        ("At least 3 records are needed.", "At least 3 records are needed."),
        ("A spline with 3 knots and 5 records.", "A spline with 3 knots and 5 records."),
        ("The odds ratio is 3.2 for 40 records.", "The odds ratio is 3.2 for 40 records."),
        ("0 records left out.", "0 records left out."),
        ("1\u202f204 records and 3 patterns.", "1\u202f204 records and 3 patterns."),
    ],
)
def test_small_numbers_of_records_are_taken_out(text: str, expected: str) -> None:
    assert without_counts(text, 5) == expected


def test_larger_hidden_numbers_are_taken_out_however_they_are_written() -> None:
    for written in ("1\u202f204", "1,204", "1204"):
        assert without_counts(f"{written} records were kept.", 5, {1204}) == "a number not shown records were kept."
    assert without_counts("1205 records were kept.", 5, {1204}) == "1205 records were kept."


@settings(deadline=None, derandomize=True)
@given(number=st.integers(1, 4), words=st.lists(st.sampled_from(["old", "of", "the", "812"]), max_size=3))
def test_no_small_number_before_the_word_records_survives(number: int, words: list[str]) -> None:
    said = without_counts(" ".join(["There are", str(number), *words, "records."]), 5)
    assert not re.search(r"(?<!\d)[1-4](?!\d)", said)


def test_a_hidden_number_reads_as_words_and_cannot_be_computed_with() -> None:
    hidden = Unsaid("fewer than 5", 4)
    assert f"{hidden:,} {hidden}" == "fewer than 5 fewer than 5"
    assert numbers.plural(hidden, "record") == "fewer than 5 records"  # type: ignore[arg-type]
    assert hidden < 10
    assert hidden >= 1
    assert hidden != 1
    with pytest.raises(TypeError):
        hidden / 100  # type: ignore[operator]


@pytest.fixture
def sentences(monkeypatch: pytest.MonkeyPatch) -> dict[str, Any]:
    """Sentences of the tests' own, in the place of the package's."""

    def computed(facts: Mapping[str, Any]) -> str:
        share = 100 * facts["records"] / facts["of_records"]
        return f"{facts['records']} of {facts['of_records']} ({share:.1f}%) are old."

    invented = {
        "plain": "{records} records lie outside {column}.",
        "computed": computed,
        "worded": lambda facts: (
            f"{numbers.plural(facts['records'], 'record')} of {numbers.count(facts['of_records'])}."
        ),
    }
    found = {
        **invented,
        **{
            code: say_template(code)
            for code in ("fewer-than", "number-not-shown", "share-not-shown", "record-not-shown")
        },
    }
    monkeypatch.setattr(sys.modules["oddsmodel.wording.say"], "_sentences", lambda: found)
    return found


def say_template(code: str) -> str:
    from oddsmodel.wording.disclosure import SENTENCES

    text = SENTENCES[code]
    assert isinstance(text, str)
    return text


def made(code: str, **facts: Any) -> Finding:
    return Finding("note", code, say(code, **facts), facts)


def test_a_plain_sentence_is_made_again(sentences: dict[str, Any]) -> None:
    answer = disclosed_finding(made("plain", records=3, column="age"), Withheld(5))
    assert answer.message == "fewer than 5 records lie outside age."
    assert answer.facts == {"records": "fewer than 5", "column": "age"}


def test_a_sentence_of_words_is_made_again(sentences: dict[str, Any]) -> None:
    answer = disclosed_finding(made("worded", records=1, of_records=1204), Withheld(5))
    assert answer.message == "fewer than 5 records of 1\u202f204."


def test_a_sentence_that_computes_loses_what_it_computed(sentences: dict[str, Any]) -> None:
    answer = disclosed_finding(made("computed", records=3, of_records=812), Withheld(5))
    assert answer.message.startswith("fewer than 5 of 812")
    assert "0.4" not in answer.message
    assert answer.facts == {"records": "fewer than 5", "of_records": 812}


def test_an_unknown_code_keeps_its_sentence_without_numbers() -> None:
    finding = Finding("note", "nobody-knows", "Of 812, 3 (0.4%) and 809.", {"records": 3, "of_records": 812})
    message = disclosed_finding(finding, Withheld(5)).message
    assert message == "Of 812, fewer than 5 (a number not shown) and a number not shown."


def test_a_finding_without_small_counts_stays_as_it_is(sentences: dict[str, Any]) -> None:
    finding = made("plain", records=30, column="age")
    assert disclosed_finding(finding, Withheld(5)) == finding


def test_which_record_it_was_is_not_said() -> None:
    finding = Finding("note", "nobody-knows", "Rows 7 and 9 are odd.", {"rows": [7, 9], "records": 40})
    answer = disclosed_finding(finding, Withheld(5))
    assert answer.facts == {"rows": ["not shown", "not shown"], "records": 40}
    assert not re.search(r"[79]", answer.message)


def test_counts_in_lists_and_hidden_estimates() -> None:
    facts = {"records": [2, 40], "odds_ratio": 1.75, "levels": ["low: 3 records", "high"]}
    finding = Finding("note", "nobody-knows", "Levels with 2 and 40 records; 1.75.", facts)
    answer = disclosed_finding(finding, Withheld(5, estimates=frozenset({1.75})))
    assert answer.facts == {
        "records": ["fewer than 5", 40],
        "odds_ratio": "a number not shown",
        "levels": ["low: fewer than 5 records", "high"],
    }
    assert "1.75" not in answer.message
    assert say("fewer-than", threshold=7) == "fewer than 7"


def test_a_share_that_is_withheld_leaves_the_fixed_numbers_of_a_sentence_alone() -> None:
    told = finding("caution", "odds-ratio-overstates-risk-ratio", share=0.163, quantity="risk")
    message = disclosed_finding(told, Withheld(5, estimates=frozenset({0.163}))).message
    assert "further from 1 than the risk ratio" in message
    assert "16" not in message
