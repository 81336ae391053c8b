"""Different values counted a part at a time, against counting them all at once with numpy and Python."""

from __future__ import annotations

from collections import Counter

import numpy as np
import pyarrow as pa
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from oddsmodel.records.same_value import same_value_key
from oddsmodel.records.stream import tally
from oddsmodel.records.stream.tally import NumberTally, TextTally, WrittenNumberTally
from oddsmodel.records.suspected_codes import suspected_codes

PARTS = st.lists(st.lists(st.sampled_from(["a", "b", "c", "d", "e", None]), max_size=8), min_size=1, max_size=6)


@settings(deadline=None, derandomize=True)
@given(parts=PARTS, coded=st.booleans(), small=st.booleans())
def test_texts_in_the_order_in_which_they_are_met(parts: list[list[str | None]], coded: bool, small: bool) -> None:
    with pytest.MonkeyPatch.context() as patch:
        if small:
            patch.setattr(tally, "SMALL", 1)
        found = TextTally()
        for part in parts:
            array = pa.array(part, pa.string())
            found.add(pa.chunked_array([array.dictionary_encode() if coded else array]))
        values, counts = found.different()
    cells = [cell for part in parts for cell in part]
    expected = Counter(cell for cell in cells if cell is not None)
    assert dict(zip(values.to_pylist(), counts.tolist(), strict=True)) == expected
    assert values.to_pylist() == list(dict.fromkeys(cell for cell in cells if cell is not None))
    assert (found.rows, found.missing) == (len(cells), cells.count(None))


def test_a_dictionary_of_the_column_keeps_its_order_and_what_nobody_has() -> None:
    found = TextTally(by_dictionary=True)
    levels = pa.array(["low", "mid", "high"])
    for codes in ([2, 2], [0, None]):
        found.add(pa.chunked_array([pa.DictionaryArray.from_arrays(pa.array(codes, pa.int8()), levels)]))
    values, counts = found.different()
    assert values.to_pylist() == ["low", "mid", "high"]
    assert counts.tolist() == [1, 0, 2]


@settings(deadline=None, derandomize=True)
@given(
    parts=st.lists(st.lists(st.floats(-3e5, 3e5) | st.integers(0, 30), max_size=30), min_size=1, max_size=6),
    every_value=st.booleans(),
)
def test_numbers_against_numpy(parts: list[list[float]], every_value: bool) -> None:
    found = NumberTally(keep_all=every_value)
    for part in parts:
        found.add_numbers(np.asarray([*part, np.nan], dtype=np.float64))
    numbers = np.asarray([number for part in parts for number in part], dtype=np.float64)
    values, counts = np.unique(numbers, return_counts=True)
    np.testing.assert_array_equal(found.all()[0], values)
    np.testing.assert_array_equal(found.all()[1], counts)
    assert (found.rows, found.missing) == (len(numbers) + len(parts), len(parts))
    assert found.whole == bool(np.all(numbers == np.trunc(numbers)))
    if len(numbers):
        assert (found.lowest, found.highest) == (numbers.min(), numbers.max())


@pytest.mark.parametrize("seed", range(5))
def test_of_many_numbers_both_ends_are_kept_with_their_counts(seed: int, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(tally, "MOST_NUMBERS", 200)
    rng = np.random.default_rng(seed)
    numbers = rng.integers(0, 3000, 20_000) / 7.0
    found = NumberTally()
    for part in np.array_split(numbers, 23):
        found.add_numbers(part)
    values, counts = np.unique(numbers, return_counts=True)
    ends = np.r_[: tally.EDGE, len(values) - tally.EDGE : len(values)]
    np.testing.assert_array_equal(found.all()[0], values[ends])
    np.testing.assert_array_equal(found.all()[1], counts[ends])
    assert found.different is not None
    assert 200 < found.different <= len(values)


@pytest.mark.parametrize("codes", [(), (999.0,), (-1.0,), (99.0, 999.0), (-1.0, 999.0)])
def test_codes_are_suspected_from_both_ends_of_many_numbers(codes: tuple[float, ...]) -> None:
    numbers = np.random.default_rng(3).uniform(20.0, 90.0, 100_000)
    numbers = np.concatenate([numbers, *([code] * 40 for code in codes)])
    found = NumberTally()
    found.add_numbers(numbers)
    assert found.different is not None
    assert suspected_codes(*found.all(), found.different) == suspected_codes(*np.unique(numbers, return_counts=True))
    assert suspected_codes(*found.all(), found.different) == sorted(codes)


def test_written_numbers_and_other_texts() -> None:
    found = WrittenNumberTally()
    cells = ["41", "41.0", "+5", "x", " 7", "007", "1e3", "9007199254740993", ".5", None, "x", "41"]
    for part in (cells[:5], cells[5:]):
        found.add(pa.chunked_array([pa.array(part, pa.string())]))
    numbers, counts = found.numbers.all()
    assert dict(zip(numbers.tolist(), counts.tolist(), strict=True)) == {41.0: 3, 5.0: 1, 0.5: 1}
    texts, rows = found.texts.different()
    assert dict(zip(texts.to_pylist(), rows.tolist(), strict=True)) == {
        "x": 2,
        " 7": 1,
        "007": 1,
        "1e3": 1,
        "9007199254740993": 1,
    }
    assert (found.rows, found.missing) == (12, 1)
    assert set(found.different()[0].to_pylist()) == {*texts.to_pylist(), *(same_value_key(one) for one in numbers)}
