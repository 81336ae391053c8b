"""Spellings of one value."""

from __future__ import annotations

from decimal import Decimal

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from oddsmodel.records.same_value import absent_mask, matching, same_value_key, yes_or_no

PROPERTY = settings(deadline=None, derandomize=True, max_examples=200)


@pytest.mark.parametrize(
    "spellings",
    [
        ("1", 1, 1.0, True, "true", "TRUE", "1.0", "+1", " 1 ", Decimal("1.00"), np.int64(1), np.float32(1), np.True_),
        ("0", 0, -0.0, False, "False", "0.0", "-0", np.False_),
        ("0.5", 0.5, ".5", Decimal("0.50"), "+0.50"),
        ("-2", -2, -2.0, "-2.", np.int8(-2)),
        ("Liège", "Lie\u0300ge", " Liège"),
    ],
)
def test_spellings_of_one_value_share_a_key(spellings: tuple[object, ...]) -> None:
    assert len({same_value_key(spelling) for spelling in spellings}) == 1


@pytest.mark.parametrize(
    ("one", "other"), [("01", "1"), ("1E3", "1000"), ("1,5", "1.5"), ("yes", "1"), ("a", "A"), ("1 2", "12")]
)
def test_codes_and_texts_stay_apart(one: str, other: str) -> None:
    assert same_value_key(one) != same_value_key(other)


@PROPERTY
@given(st.integers(-(10**30), 10**30))
def test_whole_numbers_of_any_size_keep_every_digit(number: int) -> None:
    assert same_value_key(str(number)) == same_value_key(number) == str(number)


@PROPERTY
@given(st.floats(1e-200, 1e15).flatmap(lambda size: st.sampled_from([size, -size])))
def test_a_number_and_its_decimal_text_are_one_value(number: float) -> None:
    assert same_value_key(number) == same_value_key(f"{Decimal(repr(number)):f}")


@PROPERTY
@given(st.text(max_size=20))
def test_a_key_is_its_own_key(text: str) -> None:
    assert same_value_key(same_value_key(text)) == same_value_key(text)


def test_a_number_of_thousands_of_digits_is_only_a_text() -> None:
    assert same_value_key("9" * 10_000) == "9" * 10_000


@pytest.mark.parametrize(
    ("value", "answer"),
    [("Yes", "yes"), ("y", "yes"), (1.0, "yes"), (True, "yes"), ("N", "no"), ("false", "no"), ("0", "no"), ("2", None)],
)
def test_yes_and_no(value: object, answer: str | None) -> None:
    assert yes_or_no(value) == answer


@pytest.mark.parametrize(
    ("value", "candidates", "found"),
    [
        ("1", ("0.0", "1.0"), "1.0"),
        ("true", ("no", "yes"), "yes"),
        ("N", ("no", "yes"), "no"),
        ("yes", ("0", "1"), "1"),
        ("yes", ("maybe", "y"), None),
        ("alive", ("dead", "alive"), "alive"),
        ("Alive", ("dead", "alive"), None),
    ],
)
def test_matching(value: object, candidates: tuple[str, ...], found: str | None) -> None:
    assert matching(value, candidates) == found


def test_texts_that_mean_not_recorded() -> None:
    keys = {same_value_key(text) for text in ("NA", "999")}
    assert absent_mask(["NA", "na", "999.0", "999", "9", ""], keys).tolist() == [True, False, True, True, False, False]
    assert absent_mask(["NA", "1"], {"NA", "-"}).tolist() == [True, False]
