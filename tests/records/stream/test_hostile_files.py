"""Files that are damaged or misleading only far from their start: the fault, and the true row, as in memory."""

from __future__ import annotations

import gzip
import sys
from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest

from oddsmodel.errors import InputFault
from oddsmodel.plan.schema import StudyPlan

sys.path.insert(0, str(Path(__file__).parent))
from same_records import assert_same, streamed

ROWS = 400
LINES = [f"{'yes' if number % 3 else 'no'},{number % 7},ward {number % 4}" for number in range(ROWS)]
PLAN = StudyPlan.model_validate(
    {
        "study": {"title": "Falls", "design": "cohort"},
        "records": {"source": "people.csv"},
        "outcome": {"column": "died", "event": "yes"},
        "models": ({"name": "main", "formula": "died ~ x + ward", "exposures": ("x",)},),
    }
)


@pytest.fixture(autouse=True)
def small_blocks(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("oddsmodel.records.stream.source.BLOCK", 50)


def written(folder: Path, lines: list[str], end: str = "\n") -> Path:
    path = folder / "people.csv"
    path.write_bytes((end.join(["died,x,ward", *lines]) + end).encode())
    return path


def refusal(path: Path) -> str:
    """What both the stream and the reader in memory say of a file."""
    assert assert_same(path, PLAN) is None
    with pytest.raises(InputFault) as found:
        streamed(path, PLAN)
    return str(found.value)


def with_line(number: int, line: str) -> list[str]:
    return [*LINES[:number], line, *LINES[number + 1 :]]


def test_rows_of_another_length_far_from_the_start(tmp_path: Path) -> None:
    lines = with_line(330, "yes,1")
    lines[371] = "yes,1,a,b"
    message = refusal(written(tmp_path, lines))
    assert "row 332 has 2 and row 373 has 4" in message


def test_nul_bytes_far_from_the_start(tmp_path: Path) -> None:
    assert "row 302" in refusal(written(tmp_path, with_line(300, "yes,\0,a")))


def test_bytes_that_are_no_letters_far_from_the_start(tmp_path: Path) -> None:
    path = written(tmp_path, with_line(1, "yes,1,Li\u00e8ge"))
    path.write_bytes(path.read_bytes().replace(b"\nno,6,ward 3", b"\nno,6,ward \xff\x81", 1))
    assert_same(path, PLAN)


def test_a_quotation_mark_that_is_not_closed(tmp_path: Path) -> None:
    assert "not closed" in refusal(written(tmp_path, with_line(310, 'yes,1,"ward 2')))
    assert "row 312" in refusal(written(tmp_path, with_line(310, 'yes,"1,ward 2')))


def test_a_quotation_mark_that_takes_the_rest_of_a_long_file(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("oddsmodel.records.stream.text_layout.LONGEST_ROW", 1000)
    with pytest.raises(InputFault) as found:
        streamed(written(tmp_path, with_line(110, 'yes,1,"ward 2')), PLAN)
    assert "row 112" in str(found.value)
    assert "not closed" in str(found.value)


@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
def test_line_ends_of_all_kinds(tmp_path: Path, end: str) -> None:
    assert assert_same(written(tmp_path, LINES, end), PLAN) is not None


def test_line_ends_mixed_blank_lines_and_quoted_line_breaks(tmp_path: Path) -> None:
    lines = [f"{line}\r" if number % 5 == 0 else line for number, line in enumerate(LINES)]
    assert assert_same(written(tmp_path, lines), PLAN) is not None
    lines[60] = f"{lines[60]}\n\n"
    lines[200] = 'yes,1,"a ward\nof two lines, and ""more"""'
    lines[201] = lines[203] = 'yes,1,5" pipe'
    lines[202] = 'yes,1,"quoted" and not'
    stream = assert_same(written(tmp_path, lines), PLAN)
    assert stream is not None
    assert "blank-lines" in [one.code for one in stream.findings]
    assert stream.rows == ROWS


def test_a_new_text_in_the_last_row(tmp_path: Path) -> None:
    stream = assert_same(written(tmp_path, with_line(ROWS - 1, "yes,1,attic")), PLAN)
    assert stream is not None
    assert "attic" in stream.columns["ward"].levels


def test_a_field_of_more_than_a_megabyte(tmp_path: Path) -> None:
    message = refusal(written(tmp_path, with_line(300, f"yes,1,{'y' * 1_000_001}")))
    assert "row 302" in message


def test_files_of_other_kinds(tmp_path: Path) -> None:
    for name, content, word in (
        ("people.csv.gz", gzip.compress(b"a,b\n1,2\n", mtime=0), "packed"),
        ("people.xls", b"\xd0\xcf\x11\xe0" + bytes(100), "old format"),
        ("people.xlsx", b"PK\x03\x04" + bytes(100), "read as a whole"),
        ("empty.csv", b"", "nothing"),
        ("names.csv", b"died,x\n", "no row"),
    ):
        (tmp_path / name).write_bytes(content)
        with pytest.raises(InputFault, match=word):
            streamed(tmp_path / name, PLAN)
    with pytest.raises(InputFault, match="no such file"):
        streamed(tmp_path / "absent.csv", PLAN)


def people(rows: int = ROWS) -> pa.Table:
    numbers = np.arange(rows)
    died = pa.array(np.where(numbers % 3 > 0, "yes", "no"))
    return pa.table({"died": died, "x": numbers % 7, "ward": pa.array([f"ward {number % 4}" for number in numbers])})


def test_parquet_that_is_cut_off_or_damaged_within(tmp_path: Path) -> None:
    path = tmp_path / "people.parquet"
    pq.write_table(people(40_000), path, row_group_size=10_000, compression="none", use_dictionary=False)
    content = path.read_bytes()
    path.write_bytes(content[: len(content) // 2])
    assert "damaged" in refusal(path)
    half = len(content) // 2
    path.write_bytes(content[:half] + b"\xff" * 20_000 + content[half + 20_000 :])
    assert "damaged" in refusal(path)


def test_a_folder_whose_files_do_not_fit_together(tmp_path: Path) -> None:
    pq.write_table(people(), tmp_path / "a.parquet")
    pq.write_table(people().append_column("more", pa.array([1] * ROWS)), tmp_path / "b.parquet")
    assert "do not have the same columns" in refusal(tmp_path)
    texts = pa.array(["seven"] * ROWS)
    pq.write_table(people().set_column(1, "x", texts), tmp_path / "b.parquet")
    assert "different types" in refusal(tmp_path)


def test_a_file_that_changes_after_it_was_opened(tmp_path: Path) -> None:
    path = written(tmp_path, LINES)
    stream = streamed(path, PLAN)
    written(tmp_path, LINES[:200])
    with pytest.raises(InputFault, match="no longer what it was"):
        list(stream.blocks())
    folder = tmp_path / "people.parquet"
    pq.write_table(people(), folder)
    stream = streamed(folder, PLAN)
    pq.write_table(people(120), folder)
    with pytest.raises(InputFault):
        list(stream.blocks())
