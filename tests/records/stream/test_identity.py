"""Whether an identifier repeats, by hashes of its values, against sets of the values themselves."""

from __future__ import annotations

import hashlib

import numpy as np
import pyarrow as pa
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from oddsmodel.records.same_value import same_value_key
from oddsmodel.records.stream import identity
from oddsmodel.records.stream.identity import IdentityTally

WORDS = st.sampled_from(["a", "b", " a", "ab", "", "NA", "true", "1", "1.0", "01", "caf\u00e9", "cafe\u0301", None])
LONG = st.integers(0, 3).map(lambda number: "x" * 70 + str(number))


def clean(text: str) -> str:
    import unicodedata

    return unicodedata.normalize("NFC", text.strip())


@settings(deadline=None, derandomize=True)
@given(parts=st.lists(st.lists(WORDS | LONG, max_size=9), min_size=1, max_size=5), absent=st.sets(WORDS, max_size=2))
def test_texts(parts: list[list[str | None]], absent: set[str | None]) -> None:
    keys = frozenset(same_value_key(text) for text in absent if text is not None)
    found = IdentityTally(keys)
    columns = [pa.chunked_array([pa.array(part, pa.string())]) for part in parts]
    for column in columns:
        found.add(column)
    cells = [clean(cell) for part in parts for cell in part if cell is not None]
    recorded = [cell for cell in cells if cell and same_value_key(cell) not in keys]
    assert found.records == len(recorded)
    assert found.check(iter(columns)) == len(set(recorded))


@settings(deadline=None, derandomize=True)
@given(parts=st.lists(st.lists(st.integers(-3, 12) | st.none(), max_size=9), min_size=1, max_size=5))
def test_numbers(parts: list[list[int | None]]) -> None:
    found = IdentityTally(frozenset({"9"}))
    columns = [pa.chunked_array([pa.array(part, pa.int64())]) for part in parts]
    for column in columns:
        found.add(column)
    recorded = [cell for part in parts for cell in part if cell not in (None, 9)]
    assert (found.records, found.check(iter(columns))) == (len(recorded), len(set(recorded)))


def test_texts_that_share_a_hash_are_told_apart_where_few_seem_to_repeat(monkeypatch: pytest.MonkeyPatch) -> None:
    def weak(texts: pa.Array) -> np.ndarray:
        return np.asarray([len(text) for text in texts.to_pylist()], dtype=np.uint64)

    monkeypatch.setattr(identity, "_hashes", weak)
    column = pa.chunked_array([pa.array(["a", "b", "cc", "ddd", "ddd", "eeee"])])
    found = IdentityTally(frozenset())
    found.add(column)
    assert found.different == 4
    assert found.check([column]) == 5


def test_hashes_differ_by_every_byte_and_the_length() -> None:
    texts = [f"P{number}" for number in range(20_000)] + ["", *("a" * length for length in range(1, 200))]
    texts += [hashlib.sha256(text.encode()).hexdigest() * 2 for text in texts[:500]]
    assert len(set(identity._hashes(pa.array(texts)).tolist())) == len(texts)
    sliced = pa.array(["x", *texts])[1:]
    np.testing.assert_array_equal(identity._hashes(sliced), identity._hashes(pa.array(texts)))
