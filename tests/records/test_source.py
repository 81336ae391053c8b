"""Parquet, spreadsheets, data frames and paths that cannot be read."""

from __future__ import annotations

import builtins
import datetime
import gzip
import hashlib
import io
import zipfile
from decimal import Decimal
from pathlib import Path
from typing import Any

import numpy as np
import openpyxl
import pandas as pd
import pyarrow as pa
import pyarrow.parquet as pq
import pytest

from oddsmodel.errors import InputFault
from oddsmodel.records.raw import RawTable
from oddsmodel.records.source import read_table, table_from_frame


def texts(table: RawTable, column: str) -> list[object]:
    return [None if pd.isna(value) else value for value in table.frame[column]]


def refusal(path: Path) -> str:
    with pytest.raises(InputFault) as caught:
        read_table(path)
    assert all(fault.remedy for fault in caught.value.faults)
    return str(caught.value)


MANY_TYPES = {
    "int": pa.array([1, None, 3], pa.int32()),
    "large": pa.array([2**60, None, 2**60 + 1], pa.int64()),
    "unsigned": pa.array([1, 2, 3], pa.uint64()),
    "half": pa.array(np.asarray([1.5, 2.5, 3.5], np.float16)),
    "float": pa.array([0.5, None, float("nan")], pa.float64()),
    "decimal": pa.array([Decimal("1.25"), None, Decimal("3.50")], pa.decimal128(8, 2)),
    "whole_decimal": pa.array([Decimal(2**60), None, Decimal(1)], pa.decimal128(38, 0)),
    "bool": pa.array([True, None, False]),
    "text": pa.array([" a", None, "b"]),
    "large_text": pa.array(["a", None, "b"], pa.large_string()),
    "view": pa.array(["a", None, "b"], pa.string_view()),
    "dictionary": pa.array(["a", None, "b"]).dictionary_encode(),
    "numbers_dictionary": pa.array([1, None, 3]).dictionary_encode(),
    "date": pa.array([datetime.date(2020, 1, 2), None, datetime.date(2020, 1, 3)]),
    "midnight": pa.array([datetime.datetime(2020, 1, 2), None, datetime.datetime(2020, 1, 3)], pa.timestamp("ns")),
    "moment": pa.array([datetime.datetime(2020, 1, 2, 10, 30), None, None], pa.timestamp("s")),
    "zoned": pa.array([datetime.datetime(2020, 1, 2, 10, 30), None, None], pa.timestamp("s", "UTC")),
    "time": pa.array([datetime.time(10, 30), None, None], pa.time32("s")),
    "nothing": pa.nulls(3),
    "list": pa.array([[1], None, [2]]),
    "record": pa.array([{"a": 1}, None, {"a": 2}]),
    "bytes": pa.array([b"a", None, b"b"]),
    "duration": pa.array([1, None, 2], pa.duration("s")),
}
EXPECTED: dict[str, tuple[str, list[object]]] = {
    "int": ("number", [1.0, None, 3.0]),
    "large": ("text", ["1152921504606846976", None, "1152921504606846977"]),
    "unsigned": ("number", [1.0, 2.0, 3.0]),
    "half": ("number", [1.5, 2.5, 3.5]),
    "float": ("number", [0.5, None, None]),
    "decimal": ("number", [1.25, None, 3.5]),
    "whole_decimal": ("text", ["1152921504606846976", None, "1"]),
    "bool": ("yes-no", ["true", None, "false"]),
    "text": ("text", ["a", None, "b"]),
    "large_text": ("text", ["a", None, "b"]),
    "view": ("text", ["a", None, "b"]),
    "dictionary": ("text", ["a", None, "b"]),
    "numbers_dictionary": ("number", [1.0, None, 3.0]),
    "date": ("date", ["2020-01-02", None, "2020-01-03"]),
    "midnight": ("date", ["2020-01-02", None, "2020-01-03"]),
    "moment": ("date", ["2020-01-02 10:30:00", None, None]),
    "zoned": ("date", ["2020-01-02 10:30:00Z", None, None]),
    "time": ("date", ["10:30:00", None, None]),
    "nothing": ("empty", [None, None, None]),
}


def test_every_plain_parquet_type_and_no_nested_one(tmp_path: Path) -> None:
    path = tmp_path / "people.parquet"
    writable = {name: array for name, array in MANY_TYPES.items() if name != "view"}
    pq.write_table(pa.table(writable), path)
    table = read_table(path)
    for name in writable:
        if name in EXPECTED:
            assert (table.types[name], texts(table, name)) == EXPECTED[name], name
    assert table.refused == {
        "list": "lists",
        "record": "records within records",
        "bytes": "bytes",
        "duration": "lengths of time",
    }
    assert [finding.code for finding in table.findings] == ["spaces-removed", "columns-left-out"]
    assert table.sha256 == hashlib.sha256(path.read_bytes()).hexdigest()
    assert table.first_row == 1


def test_a_folder_is_read_in_the_order_of_its_names(tmp_path: Path) -> None:
    folder = tmp_path / "people"
    for number, year in ((2, 2021), (1, 2020)):
        (folder / f"year={year}").mkdir(parents=True)
        pq.write_table(
            pa.table({"x": [float(number)], "level": pa.array([f"l{number}"]).dictionary_encode()}),
            folder / f"year={year}" / "part.parquet",
        )
    (folder / "_SUCCESS").write_text("")
    (folder / ".hidden.parquet").write_text("nothing")
    (folder / "notes.txt").write_text("nothing")
    table = read_table(folder)
    assert texts(table, "x") == [1.0, 2.0]
    assert texts(table, "level") == ["l1", "l2"]
    assert texts(table, "year") == [2020.0, 2021.0]
    before = table.sha256
    (folder / "notes.txt").write_text("something else")
    assert read_table(folder).sha256 == before
    (folder / "year=2020" / "part.parquet").rename(folder / "year=2020" / "other.parquet")
    assert read_table(folder).sha256 != before


def test_a_folder_of_different_columns_is_refused(tmp_path: Path) -> None:
    pq.write_table(pa.table({"x": [1.0]}), tmp_path / "a.parquet")
    pq.write_table(pa.table({"y": [1.0]}), tmp_path / "b.parquet")
    assert "do not have the same columns" in refusal(tmp_path)


def test_a_folder_of_different_types_is_refused(tmp_path: Path) -> None:
    pq.write_table(pa.table({"x": [1.0]}), tmp_path / "a.parquet")
    pq.write_table(pa.table({"x": ["text"]}), tmp_path / "b.parquet")
    assert "different types" in refusal(tmp_path)


def test_parquet_without_rows_and_with_a_name_twice(tmp_path: Path) -> None:
    pq.write_table(pa.table({"x": pa.array([], pa.float64())}), tmp_path / "none.parquet")
    assert "no row" in refusal(tmp_path / "none.parquet")
    pq.write_table(pa.table([pa.array([1]), pa.array([2])], names=["x", " x"]), tmp_path / "twice.parquet")
    assert "is given to columns" in refusal(tmp_path / "twice.parquet")


def test_damaged_parquet(tmp_path: Path) -> None:
    path = tmp_path / "people.parquet"
    pq.write_table(pa.table({"x": np.arange(1000.0)}), path)
    content = bytearray(path.read_bytes())
    content[-40:-8] = b"\xff" * 32
    path.write_bytes(content)
    assert "damaged" in refusal(path)


@pytest.mark.parametrize(
    ("name", "content", "word"),
    [
        ("people.csv.gz", gzip.compress(b"a,b\n1,2\n", mtime=0), "Unpack"),
        ("people.xls", b"\xd0\xcf\x11\xe0" + bytes(100), "old format"),
        ("people.xlsx", b"PK\x03\x04" + bytes(100), "damaged"),
    ],
)
def test_files_of_other_kinds(tmp_path: Path, name: str, content: bytes, word: str) -> None:
    (tmp_path / name).write_bytes(content)
    assert word in refusal(tmp_path / name)


def test_paths_without_records(tmp_path: Path) -> None:
    assert "no such file" in refusal(tmp_path / "absent.csv")
    assert "No file in the folder" in refusal(tmp_path)


def sheet(tmp_path: Path, rows: list[list[Any]], *more: str, name: str = "people.xlsx") -> Path:
    book = openpyxl.Workbook()
    page = book.active
    assert page is not None
    page.title = "Patients"
    for row in rows:
        page.append(row)
    for title in more:
        book.create_sheet(title)
    book.save(tmp_path / name)
    return tmp_path / name


def test_a_sheet_of_mixed_cells(tmp_path: Path) -> None:
    day = datetime.datetime(2020, 1, 2)
    path = sheet(
        tmp_path,
        [
            ["age", "ward", "smoker", "seen", "mixed", "empty", None],
            [40, "north", True, day, 1, None, None],
            [41.5, " south", False, day, "unknown", None],
            [None, "north", None, None, 2.0],
            [None, None],
        ],
        "Notes",
    )
    table = read_table(path)
    assert texts(table, "age") == [40.0, 41.5, None]
    assert texts(table, "ward") == ["north", "south", "north"]
    assert texts(table, "smoker") == ["true", "false", None]
    assert texts(table, "seen") == ["2020-01-02", "2020-01-02", None]
    assert texts(table, "mixed") == ["1", "unknown", "2"]
    assert table.types == {
        "age": "number",
        "ward": "text",
        "smoker": "yes-no",
        "seen": "date",
        "mixed": "text",
        "empty": "empty",
    }
    assert "“Patients”" in table.findings[0].message
    assert "“Notes”" in table.findings[0].message
    assert table.first_row == 2


def test_a_single_sheet_needs_no_note(tmp_path: Path) -> None:
    assert read_table(sheet(tmp_path, [["a", "b"], [1, 2]])).findings == ()


def test_a_formula_gives_its_saved_value_and_is_refused_without_one(tmp_path: Path) -> None:
    path = sheet(tmp_path, [["a", "b"], [1, "=A2*2"], [2, "=A3*2"]])
    assert "2 cells with a formula" in refusal(path)
    saved = io.BytesIO()
    with zipfile.ZipFile(path) as package, zipfile.ZipFile(saved, "w") as rewritten:
        for item in package.infolist():
            content = package.read(item)
            if item.filename == "xl/worksheets/sheet1.xml":
                content = content.replace(b"<v></v>", b"<v>14</v>").replace(b"<v />", b"<v>14</v>")
                content = content.replace(b"<v/>", b"<v>14</v>")
            rewritten.writestr(item, content)
    path.write_bytes(saved.getvalue())
    assert texts(read_table(path), "b") == [14.0, 14.0]


@pytest.mark.parametrize(
    ("rows", "word"),
    [
        ([], "nothing"),
        ([["a", "b"]], "no row"),
        ([["a", None], [1, 2]], "No name is given for column 2"),
        ([["a", "a"], [1, 2]], "is given to columns 1 and 2"),
        ([["a"], [1, 2]], "No name is given for column 2"),
    ],
)
def test_faulty_sheets(tmp_path: Path, rows: list[list[Any]], word: str) -> None:
    message = refusal(sheet(tmp_path, rows))
    assert word in message
    assert "Patients" in message


def test_spreadsheets_without_the_extra_say_how_to_get_it(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    path = sheet(tmp_path, [["a", "b"], [1, 2]])
    original = builtins.__import__

    def without(name: str, *args: Any, **kwargs: Any) -> Any:
        if name == "openpyxl":
            raise ImportError(name)
        return original(name, *args, **kwargs)

    monkeypatch.setattr(builtins, "__import__", without)
    assert 'pip install "oddsmodel[office]"' in refusal(path)


def test_a_spreadsheet_that_unpacks_to_gigabytes_is_refused(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("oddsmodel.records.spreadsheet.LARGEST", 100)
    assert "unpacks to more" in refusal(sheet(tmp_path, [["a", "b"], [1, 2]]))


def test_a_data_frame_of_many_dtypes() -> None:
    arrow = {
        name: pd.Series(pd.arrays.ArrowExtensionArray(pa.chunked_array([array]))) for name, array in MANY_TYPES.items()
    }
    frame = pd.DataFrame(arrow)
    frame.index = pd.Index([5, 5, 9])
    table = table_from_frame(frame)
    for name, expected in EXPECTED.items():
        assert (table.types[name], texts(table, name)) == expected, name
    assert set(table.refused) == {"list", "record", "bytes", "duration"}
    assert list(table.frame.index) == [0, 1, 2]


def test_a_data_frame_of_pandas_dtypes() -> None:
    frame = pd.DataFrame(
        {
            "nullable": pd.array([1, None, 3], dtype="Int64"),
            "boolean": pd.array([True, None, False], dtype="boolean"),
            "string": pd.array(["a", None, "b"], dtype="string"),
            "object": pd.Series(["a", None, 1.0], dtype=object),
            "truth": pd.Series([True, None, False], dtype=object),
            "decimals": pd.Series([Decimal("0.5"), None, Decimal(2)], dtype=object),
            "ordered": pd.Categorical(["mid", None, "low"], categories=["low", "mid", "top"], ordered=True),
            "codes": pd.Categorical([2, None, 1]),
            "seen": pd.to_datetime(["2020-01-02", None, "2020-01-03"]),
            "month": pd.PeriodIndex(["2020-01", None, "2020-02"], freq="M"),
            "band": pd.cut([15, np.nan, 25], [10, 20, 30]),
            "sparse": pd.arrays.SparseArray([1.0, np.nan, 3.0]),
            "compound": pd.Series([[1], None, [2]], dtype=object),
            "complex": np.asarray([1j, 2, 3]),
        }
    )
    table = table_from_frame(frame)
    expected: dict[str, tuple[str, list[object]]] = {
        "nullable": ("number", [1.0, None, 3.0]),
        "boolean": ("yes-no", ["true", None, "false"]),
        "string": ("text", ["a", None, "b"]),
        "object": ("text", ["a", None, "1"]),
        "truth": ("yes-no", ["true", None, "false"]),
        "decimals": ("number", [0.5, None, 2.0]),
        "ordered": ("ordered", ["mid", None, "low"]),
        "codes": ("category", ["2", None, "1"]),
        "seen": ("date", ["2020-01-02", None, "2020-01-03"]),
        "month": ("date", ["2020-01", None, "2020-02"]),
        "band": ("ordered", ["(10, 20]", None, "(20, 30]"]),
        "sparse": ("number", [1.0, None, 3.0]),
    }
    for name, content in expected.items():
        assert (table.types[name], texts(table, name)) == content, name
    assert list(table.frame["ordered"].cat.categories) == ["low", "mid", "top"]
    assert set(table.refused) == {"compound", "complex"}


def test_the_checksum_of_a_data_frame_is_of_its_values() -> None:
    frame = pd.DataFrame({"x": [1.0, 2.0], "level": ["a", "b"]})
    checksum = table_from_frame(frame).sha256
    assert table_from_frame(frame.set_index(pd.Index([7, 8]))).sha256 == checksum
    assert table_from_frame(frame.assign(x=[1.0, 3.0])).sha256 != checksum
    assert table_from_frame(frame.assign(level=["b", "a"])).sha256 != checksum
    assert table_from_frame(frame.rename(columns={"x": "y"})).sha256 != checksum


def test_data_frames_without_rows_or_with_names_twice() -> None:
    with pytest.raises(InputFault, match="no row"):
        table_from_frame(pd.DataFrame({"x": []}))
    with pytest.raises(InputFault, match="is given to columns"):
        table_from_frame(pd.DataFrame([[1, 2]], columns=["x", "x"]))


def test_one_value_as_a_number_and_as_a_text_is_one_level() -> None:
    mixed = pd.Series([1, "1", None, 2.5, "f", 1.0], dtype=object)
    ordered = pd.Series(pd.Categorical([1, "1", "f", "f", 1, "1"], categories=[1, "1", "f"]))
    table = table_from_frame(pd.DataFrame({"mixed": mixed, "category": ordered}))
    assert [None if pd.isna(value) else value for value in table.frame["mixed"]] == ["1", "1", None, "2.5", "f", "1"]
    assert list(table.frame["category"]) == ["1", "1", "f", "f", "1", "1"]


@pytest.mark.parametrize("mark", ["\u200f", "\u200b", "\u00ad", "\ufeff", "\u202e", "\x1b"])
def test_a_name_with_characters_that_cannot_be_seen_is_refused_with_its_column(mark: str) -> None:
    frame = pd.DataFrame({"died": [0, 1], f"smo{mark}ker": [0, 1]})
    with pytest.raises(InputFault, match="column 2") as found:
        table_from_frame(frame)
    assert "cannot be shown" in str(found.value)
