"""Where rows of delimited text end, against reading it letter by letter, and against what the parser makes of it."""

from __future__ import annotations

import numpy as np
import pyarrow as pa
import pyarrow.csv as pa_csv
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from oddsmodel.records.text_rows import blank_lines, row_ends, text_of_rows

PIECES = st.sampled_from([b"a", b"b ", b",", b",", b"\n", b"\r\n", b"\r", b'"', b'""', b'"x,y"', b'"x\ny"'])
TEXTS = st.lists(PIECES, max_size=30).map(b"".join)


def letter_by_letter(data: bytes) -> list[int]:
    """The ends of rows by the parser's rules: a quotation mark opens at the start of a field alone."""
    ends, at, quoted, start_of_field = [], 0, False, True
    while at < len(data):
        letter = data[at : at + 1]
        if quoted:
            if letter == b'"' and data[at + 1 : at + 2] == b'"':
                at += 1
            elif letter == b'"':
                quoted = False
        elif letter == b'"' and start_of_field:
            quoted, start_of_field = True, False
        elif letter in b"\r\n":
            at += letter == b"\r" and data[at + 1 : at + 2] == b"\n"
            ends.append(at + 1)
            start_of_field = True
        else:
            start_of_field = letter == b","
        at += 1
    return ends if not data or (ends and ends[-1] == len(data)) else [*ends, len(data)]


@settings(deadline=None, derandomize=True, max_examples=400)
@given(data=TEXTS)
def test_ends_of_rows(data: bytes) -> None:
    ends, _ = row_ends(data, ord(","), final=True)
    assert ends.tolist() == letter_by_letter(data)


@settings(deadline=None, derandomize=True, max_examples=200)
@given(data=TEXTS, cut=st.integers(0, 60))
def test_a_row_without_its_end_waits_for_the_next_part(data: bytes, cut: int) -> None:
    first, _ = row_ends(data[:cut], ord(","), final=False)
    done = int(first[-1]) if len(first) else 0
    rest, _ = row_ends(data[done:], ord(","), final=True)
    assert [*first.tolist(), *(rest + done).tolist()] == letter_by_letter(data)


@settings(deadline=None, derandomize=True, max_examples=200)
@given(data=TEXTS)
def test_as_many_rows_as_the_parser_reads(data: bytes) -> None:
    ends, _ = row_ends(data, ord(","), final=True)
    rows = int((text_of_rows(data, ends) > 0).sum()) if len(ends) else 0
    refused = 0

    def note(row: pa_csv.InvalidRow) -> str:
        nonlocal refused
        refused += 1
        return "skip"

    if not rows:
        return
    table = pa_csv.read_csv(
        pa.BufferReader(data),
        pa_csv.ReadOptions(column_names=["x"]),
        pa_csv.ParseOptions(newlines_in_values=True, invalid_row_handler=note),
        pa_csv.ConvertOptions(column_types={"x": pa.string()}),
    )
    assert table.num_rows + refused == rows


@pytest.mark.parametrize(
    ("data", "broken"),
    [(b'a,"b"\nc,d\n', False), (b'a,"b\nc"\n', True), (b'a,"b\n', True), (b'a,"b', False), (b'a,b" \n"c\nd"\n', True)],
)
def test_line_breaks_within_rows_are_noted(data: bytes, broken: bool) -> None:
    assert row_ends(data, ord(","), final=True)[1] is broken


def test_lengths_and_blank_lines() -> None:
    data = b"ab\r\n\n\r\nc\rd\n\re"
    ends, _ = row_ends(data, ord(","), final=True)
    assert text_of_rows(data, ends).tolist() == [2, 0, 0, 1, 1, 0, 1]
    np.testing.assert_array_equal(blank_lines(data, ends), [False, True, True, False, False, False, False])
