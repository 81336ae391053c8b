"""Delimited text: what is read, what is said about it, and what is refused."""

from __future__ import annotations

import hashlib
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from oddsmodel.errors import Fault, InputFault
from oddsmodel.records.raw import RawTable
from oddsmodel.records.source import read_table


def read(tmp_path: Path, content: bytes | str, name: str = "people.csv", **options: object) -> RawTable:
    path = tmp_path / name
    path.write_bytes(content.encode("utf-8") if isinstance(content, str) else content)
    return read_table(path, **options)  # type: ignore[arg-type]


def refused(tmp_path: Path, content: bytes | str, name: str = "people.csv") -> tuple[Fault, ...]:
    with pytest.raises(InputFault) as caught:
        read(tmp_path, content, name)
    return caught.value.faults


def codes(table: RawTable) -> list[str]:
    return [finding.code for finding in table.findings]


def texts(table: RawTable, column: str) -> list[object]:
    return [None if pd.isna(value) else value for value in table.frame[column]]


def test_numbers_texts_and_empty_cells(tmp_path: Path) -> None:
    content = "id,age,ward,note\na1, 41 ,north,\na2,,south,x\na3,38.5,,\n"
    table = read(tmp_path, content)
    assert table.types == {"id": "text", "age": "number", "ward": "text", "note": "text"}
    np.testing.assert_array_equal(table.frame["age"], [41.0, np.nan, 38.5])
    assert texts(table, "ward") == ["north", "south", None]
    assert texts(table, "note") == [None, "x", None]
    assert table.sha256 == hashlib.sha256(content.encode()).hexdigest()
    assert table.findings == ()


def test_only_plain_types_come_out(tmp_path: Path) -> None:
    table = read(tmp_path, "a,b,c,d\n1,x,true,2020-01-01\n2,y,false,2020-01-02\n")
    for name in table.frame:
        dtype = table.frame[name].dtype
        assert dtype == np.float64 or (isinstance(dtype, pd.CategoricalDtype) and dtype.categories.dtype == object)
    assert table.types == {"a": "number", "b": "text", "c": "yes-no", "d": "date"}
    assert texts(table, "d") == ["2020-01-01", "2020-01-02"]


@pytest.mark.parametrize(("delimiter", "word"), [(";", "semicolon"), ("\t", "tab"), ("|", "vertical bar")])
def test_delimiter_is_found_and_said(tmp_path: Path, delimiter: str, word: str) -> None:
    rows = [["name", "age", "said"], ["Ann", "30", "well, yes"], ["Ben", "41", "no, not; at all"]]
    rows[2][2] = '"no, not; at | all"'
    table = read(tmp_path, "\n".join(delimiter.join(row) for row in rows))
    assert list(table.frame.columns) == rows[0]
    assert word in table.findings[0].message
    assert texts(table, "said") == ["well, yes", "no, not; at | all"]


def test_tab_in_a_tsv_is_not_worth_a_note(tmp_path: Path) -> None:
    assert codes(read(tmp_path, "a\tb\n1\t2\n", "people.tsv")) == []


def test_quoted_fields_hold_delimiters_quotes_and_line_breaks(tmp_path: Path) -> None:
    table = read(tmp_path, 'a,b\n"x, y",1\n"say ""hi""",2\n"two\nlines",3\n')
    assert texts(table, "a") == ["x, y", 'say "hi"', "two lines"]
    np.testing.assert_array_equal(table.frame["b"], [1, 2, 3])


def test_byte_order_mark_and_accents(tmp_path: Path) -> None:
    table = read(tmp_path, b"\xef\xbb\xbf\xc3\xa2ge,ville\n40,Li\xc3\xa8ge\n")
    assert list(table.frame.columns) == ["âge", "ville"]
    assert texts(table, "ville") == ["Liège"]
    assert codes(table) == []


def test_composed_and_decomposed_accents_are_one(tmp_path: Path) -> None:
    table = read(tmp_path, "ville,n\nLi\u00e8ge,1\nLie\u0300ge,2\n")
    assert texts(table, "ville") == ["Li\u00e8ge", "Li\u00e8ge"]


def test_windows_1252_is_told_apart_and_said(tmp_path: Path) -> None:
    table = read(tmp_path, "ville,n\nLiège,1\nKöln,2\n€ 5,3\n".encode("cp1252"))
    assert texts(table, "ville") == ["Liège", "Köln", "€ 5"]
    assert "Windows-1252" in table.findings[0].message


def test_utf_16_with_its_mark_is_converted_and_said(tmp_path: Path) -> None:
    table = read(tmp_path, "ville,n\nLiège,1\n".encode("utf-16"))
    assert texts(table, "ville") == ["Liège"]
    assert "UTF-16" in table.findings[0].message


@pytest.mark.parametrize(
    ("content", "row", "word"),
    [
        (b"a,b\n1,2\n1,\x002\n", "row 3", "NUL"),
        ("a,b\n1,2\n".encode("utf-16-le"), "row 1", "NUL"),
        ("a,b\n1,2\n".encode("utf-32"), "people.csv", "UTF-32"),
        ("a,b\né,2\nü,3\n".encode() + b"\xe9,4\n", "row 4", "bytes that are not"),
        (b"a,b\n1,2\n1,\x81\x8d\n", "row 3", "neither UTF-8 nor Windows-1252"),
    ],
)
def test_bytes_that_are_no_text(tmp_path: Path, content: bytes, row: str, word: str) -> None:
    (fault,) = refused(tmp_path, content)
    assert row in fault.where
    assert word in fault.what


def test_invalid_byte_is_found_across_the_chunks_of_the_check(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("oddsmodel.records.encoding.CHUNK", 7)
    (fault,) = refused(tmp_path, b"ville,n\n" + "Liège,1\n".encode() * 40 + b"\xff,2\n")
    assert fault.where.endswith("row 42")
    assert texts(read(tmp_path, "ville,n\n" + "Liège,1\n" * 40), "ville") == ["Liège"] * 40


def test_ragged_rows_are_named_with_their_widths(tmp_path: Path) -> None:
    rows = ["a,b,c"] + ["1,2,3"] * 10
    rows[3], rows[7] = "1,2", "1,2,3,4"
    (fault,) = refused(tmp_path, "\n".join(rows))
    assert "row 4 has 2" in fault.what
    assert "row 8 has 4" in fault.what
    assert "3 fields" in fault.what


def test_many_ragged_rows_are_counted(tmp_path: Path) -> None:
    (fault,) = refused(tmp_path, "a,b\n" + "1,2\n" * 50 + "1,2,3\n" * 200)
    assert "row 52 has 3" in fault.what
    assert "195 more rows differ" in fault.what


def test_quotation_mark_not_closed(tmp_path: Path) -> None:
    faults = refused(tmp_path, 'a,b\n1,2\n"x,3\n4,5\n')
    assert any("row 3" in fault.where and "not closed" in fault.what for fault in faults)


@pytest.mark.parametrize("content", ['a,b\n1,2\n1,"x\n2,3\n4,5\n', 'a,b\n1,2\n1,"x\n2,3\n'])
def test_rows_swallowed_by_a_quotation_mark_are_not_lost_in_silence(tmp_path: Path, content: str) -> None:
    (fault,) = refused(tmp_path, content)
    assert fault.where.endswith("row 3")
    assert "not closed" in fault.what


def test_a_quotation_mark_within_a_text_is_only_a_text(tmp_path: Path) -> None:
    assert texts(read(tmp_path, 'a,b\n1,5" pipe\n2,x\n'), "b") == ['5" pipe', "x"]


@pytest.mark.parametrize("size", [1_000_001, 10_000_000])
def test_a_field_of_megabytes_is_refused(tmp_path: Path, size: int) -> None:
    (fault,) = refused(tmp_path, b"a,b\n1,x\n2," + b"y" * size + b"\n3,z\n")
    assert "row 3" in fault.where
    assert "bytes" in fault.what


def test_a_quoted_field_of_megabytes_with_line_breaks_is_refused(tmp_path: Path) -> None:
    (fault,) = refused(tmp_path, b'a,b\n1,"' + b"yyyyyyyyy\n" * 1_000_000 + b'"\n')
    assert "million bytes" in fault.what


def test_a_field_of_almost_a_megabyte_is_read(tmp_path: Path) -> None:
    assert len(read(tmp_path, b"a,b\n1," + b"y" * 999_000 + b"\n").frame) == 1


@pytest.mark.parametrize(
    ("content", "word"),
    [
        ("", "nothing"),
        ("\n\n  \n", "nothing"),
        ("a,b\n", "no row"),
        ("a,b", "no row"),
        ("a,b\n\n\n", "no row"),
        ("a\n1\n", "not split"),
        ("a,b,a\n1,2,3\n", "name “a” is given to columns 1 and 3"),
        ("a,,c,\n1,2,3,4\n", "columns 2 and 4"),
        ("a, a \n1,2\n", "is given to columns 1 and 2"),
        ("1,2,3\n4,5,6\n", "only numbers"),
        ('a,"b\n1,2\n', "not closed"),
        ("a,b\u202etxt\n1,2\n", "cannot be shown"),
        ("a," + "b" * 600 + "\n1,2\n", "more than 500"),
        (",".join(f"c{i}" for i in range(10_001)) + "\n" + ",".join(["1"] * 10_001), "at most"),
    ],
)
def test_files_without_rows_or_with_faulty_names(tmp_path: Path, content: str, word: str) -> None:
    faults = refused(tmp_path, content)
    assert any(word in fault.what for fault in faults)
    assert all(fault.remedy for fault in faults)


def test_every_faulty_name_is_reported(tmp_path: Path) -> None:
    assert len(refused(tmp_path, "a,a,,b,b\n1,2,3,4,5\n")) == 3


def test_decimal_comma_between_semicolons(tmp_path: Path) -> None:
    table = read(tmp_path, "age;bmi;n\n40;24,5;1\n41;;2\n42;31,25;3\n43;27;4\n")
    np.testing.assert_array_equal(table.frame["bmi"], [24.5, np.nan, 31.25, 27])
    np.testing.assert_array_equal(table.frame["age"], [40, 41, 42, 43])
    assert "decimal-comma" in codes(table)


@pytest.mark.parametrize(
    "content",
    [
        "age;bmi\n40;24,5\n41;31.2\n",
        "age;bmi;hba\n40;24,5;5.1\n41;31,2;6.2\n",
        "age;pay\n40;1,234\n41;2,345\n",
        "age;pay\n40;1.234,5\n41;2,5\n",
    ],
)
def test_ambiguous_decimal_mark_is_refused(tmp_path: Path, content: str) -> None:
    faults = refused(tmp_path, content)
    assert all("comma or a point" in fault.what for fault in faults)


def test_semicolons_with_decimal_points_need_no_note(tmp_path: Path) -> None:
    table = read(tmp_path, "age;bmi;who\n40;24.5;Doe, J\n41;30;Roe, R\n")
    np.testing.assert_array_equal(table.frame["bmi"], [24.5, 30])
    assert codes(table) == ["delimiter"]


def test_leading_zeros_large_numbers_and_words_for_no_number_stay_texts(tmp_path: Path) -> None:
    table = read(
        tmp_path,
        "code,plain,large,huge,odd,dose\n007,0,9007199254740993,99999999999999999999,nan,0.5\n"
        "12,10,9007199254740992,1,inf,10.25\n",
    )
    assert texts(table, "code") == ["007", "12"]
    assert texts(table, "large") == ["9007199254740993", "9007199254740992"]
    assert texts(table, "huge") == ["99999999999999999999", "1"]
    assert texts(table, "odd") == ["nan", "inf"]
    assert table.types["plain"] == table.types["dose"] == "number"


@pytest.mark.parametrize("cell", ["01", "“01”", " 01", "-01", " 01 ", "00.5"])
def test_a_leading_zero_is_found_wherever_it_stands(tmp_path: Path, cell: str, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("oddsmodel.records.delimited.WINDOW", 5)
    for before in range(6):
        table = read(tmp_path, f"{'a' * (before + 1)},b,c\n1,2,3\n4,{cell},10\n")
        assert table.types["b"] == "text"
        assert table.types["c"] == "number"


def test_not_recorded_texts_do_not_keep_numbers_from_being_numbers(tmp_path: Path) -> None:
    content = "age,ward\nNA,NA\n40,north\n"
    table = read(tmp_path, content, not_recorded=("", "NA"))
    np.testing.assert_array_equal(table.frame["age"], [np.nan, 40])
    assert texts(table, "ward") == ["NA", "north"]
    assert read(tmp_path, content).types["age"] == "text"


def test_text_columns_are_kept_as_written(tmp_path: Path) -> None:
    table = read(tmp_path, "a,b\n1.0,2020-01-01\n1,true\n", text_columns=["a", "b", "absent"])
    assert texts(table, "a") == ["1.0", "1"]
    assert texts(table, "b") == ["2020-01-01", "true"]


def test_spaces_and_unseen_characters_go_with_a_note(tmp_path: Path) -> None:
    table = read(tmp_path, "ward,n\n north,1\nnorth ,2\nnorth,3\n\u202esouth,4\nea\x07st,5\n  ,6\n")
    assert texts(table, "ward") == ["north", "north", "north", "south", "ea st", None]
    assert {finding.code: finding.facts["records"] for finding in table.findings} == {
        "spaces-removed": 3,
        "characters-removed": 2,
    }


def test_blank_lines_are_passed_over_with_a_note(tmp_path: Path) -> None:
    table = read(tmp_path, "a,b\n1,2\n\n3,4\n\n\n")
    np.testing.assert_array_equal(table.frame["b"], [2, 4])
    assert codes(table) == ["blank-lines"]
    assert codes(read(tmp_path, "a,b\n1,2\n3,4\n\n\n")) == []
    assert codes(read(tmp_path, 'a,b\n1,"x\n\ny"\n3,4\n')) == ["characters-removed"]


@pytest.mark.parametrize("end", ["\r\n", "\r"])
def test_line_ends_of_all_kinds(tmp_path: Path, end: str) -> None:
    table = read(tmp_path, end.join(["a,b", "1,x", "2,y", ""]))
    np.testing.assert_array_equal(table.frame["a"], [1, 2])
    assert texts(table, "b") == ["x", "y"]


def test_hostile_cells_are_only_text(tmp_path: Path) -> None:
    cells = ["<script>alert(1)</script>", "=1+1", "+SUM(A1)", "-2+3", "@x", "{column}", "%s", "__import__('os')"]
    table = read(tmp_path, "cell,n\n" + "".join(f"{cell},{i}\n" for i, cell in enumerate(cells)))
    assert texts(table, "cell") == cells


def test_ten_thousand_rows_in_blocks_agree_with_pandas(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("oddsmodel.records.delimited.BLOCK", 1 << 12)
    rng = np.random.default_rng(7)
    frame = pd.DataFrame(
        {
            "x": rng.normal(size=10_000).round(4),
            "level": rng.choice(["a", "b", "c d", "é"], 10_000),
            "who": [f"p{i}" for i in range(10_000)],
        }
    )
    frame.to_csv(tmp_path / "people.csv", index=False)
    table = read_table(tmp_path / "people.csv")
    np.testing.assert_array_equal(table.frame["x"], frame["x"])
    assert list(table.frame["level"]) == list(frame["level"])
    assert list(table.frame["who"]) == list(frame["who"])
