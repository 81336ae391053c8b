"""What a stream keeps to: its blocks, its memory, the columns that it reads, threads and pickles."""

from __future__ import annotations

import pickle
import sys
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pyarrow as pa
import pyarrow.parquet as pq
import pytest

from oddsmodel.errors import InputFault
from oddsmodel.plan.schema import StudyPlan
from oddsmodel.records.stream import BLOCK, open_stream, source
from oddsmodel.records.stream.cursor import Cursor

sys.path.insert(0, str(Path(__file__).parent))
from same_records import assert_same, streamed

ROWS = 30_000


def plan_of(formula: str = "died ~ x + ward", **sections: Any) -> StudyPlan:
    return StudyPlan.model_validate(
        {
            "study": {"title": "Falls", "design": "cohort"},
            "records": {"source": "people.parquet", **sections.get("records", {})},
            "columns": sections.get("columns", {}),
            "derived": sections.get("derived", {}),
            "outcome": {"column": "died", "event": "yes"},
            "models": ({"name": "main", "formula": formula, "exposures": ("x",)},),
        }
    )


@pytest.fixture(scope="module")
def people(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Invented people: a number, a ward, an identifier of each, and a column that the plan has no use for."""
    rng = np.random.default_rng(11)
    table = pa.table(
        {
            "died": pa.array(rng.choice(["yes", "no"], ROWS)),
            "x": rng.normal(50.0, 9.0, ROWS),
            "ward": pa.array(rng.choice(["north", "south", "east"], ROWS)),
            "who": pa.array([f"P{number:06d}" for number in range(ROWS)]),
            "group": pa.array(rng.integers(0, 9000, ROWS)),
            "unused": pa.array(["a"] * ROWS),
        }
    )
    path = tmp_path_factory.mktemp("people") / "people.parquet"
    pq.write_table(table, path, row_group_size=9000)
    return path


@pytest.fixture(autouse=True)
def blocks_of_a_leaf(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(source, "BLOCK", 4096)


def test_blocks_are_whole_leaves_whatever_the_row_groups(people: Path) -> None:
    stream = streamed(people, plan_of())
    sizes = [len(block.frame) for block in stream.blocks()]
    assert sizes == [4096] * 7 + [ROWS - 7 * 4096]
    assert (stream.rows, stream.read, stream.blocks_number) == (ROWS, ROWS, 8)
    assert [len(block.frame) for block in stream.blocks(6)] == sizes[6:]
    assert BLOCK == 64 * 4096


@pytest.mark.parametrize("order", [[7, 0, 3, 3, 2], [0, 2, 1, 3, 5, 4, 7, 6], list(range(7, -1, -1))])
def test_blocks_in_any_order_and_by_several_threads(people: Path, order: list[int]) -> None:
    stream = streamed(people, plan_of())
    expected = list(stream.blocks())
    for number in order:
        pd.testing.assert_frame_equal(stream.block(number).frame, expected[number].frame)
    with ThreadPoolExecutor(3) as workers:
        for number, block in zip(order, workers.map(stream.block, order), strict=True):
            pd.testing.assert_frame_equal(block.frame, expected[number].frame)


def test_blocks_in_about_their_order_are_decoded_once(people: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    stream = streamed(people, plan_of())
    begun: list[int] = []
    tables = type(stream.parts.source).tables

    def noted(self: Any, columns: Any, first: int = 0, end: int | None = None) -> Any:
        begun.append(first)
        return tables(self, columns, first, end)

    monkeypatch.setattr(type(stream.parts.source), "tables", noted)
    cursor = Cursor(stream.parts.source, ["x"])
    for number in (0, 2, 1, 3, 5, 4, 6, 7):
        assert cursor.table(number).num_rows
    assert begun == [0]
    cursor.table(0)
    assert begun == [0, 0]


def test_a_pickled_stream_goes_on_alone(people: Path) -> None:
    stream = streamed(people, plan_of(records={"grouped_by": "group"}))
    first = stream.block(2)
    again = pickle.loads(pickle.dumps(stream))
    pd.testing.assert_frame_equal(again.block(2).frame, first.frame)
    assert again.columns == stream.columns


def test_only_the_columns_in_use_are_read(people: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    asked: set[str] = set()
    from oddsmodel.records.stream.parquet import ParquetSource

    tables = ParquetSource.tables

    def noted(self: Any, columns: Any, first: int = 0, end: int | None = None) -> Any:
        asked.update(columns)
        return tables(self, columns, first, end)

    monkeypatch.setattr(ParquetSource, "tables", noted)
    stream = streamed(people, plan_of(columns={"who": {"kind": "identifier"}}))
    assert asked == {"died", "x", "ward", "who"}
    assert "who" in stream.columns
    assert list(stream.block(0).frame.columns) == ["died", "x", "ward"]


def test_groups_have_the_same_code_in_every_block(people: Path) -> None:
    stream = streamed(people, plan_of(records={"grouped_by": "group"}))
    blocks = [block.frame["group"] for block in stream.blocks()]
    assert all(block.dtype == blocks[0].dtype for block in blocks)
    codes = np.concatenate([block.cat.codes for block in blocks])
    table = pq.read_table(people, columns=["group"])["group"].to_numpy()
    _, expected = np.unique(table, return_inverse=True)
    assert len(np.unique(np.stack([codes, expected]), axis=1).T) == len(np.unique(expected))


def test_what_does_not_fit_into_memory_is_refused_or_left_out(people: Path) -> None:
    little = 1 << 20
    with pytest.raises(InputFault, match=r"grouped_by.*memory"):
        open_stream(people, plan_of(records={"grouped_by": "who"}), _Told(), memory=little)
    with pytest.raises(InputFault, match=r"“who”.*more different values"):
        open_stream(people, plan_of("died ~ who"), _Told(), memory=little)
    derived = {"quarter": {"quantile_groups_of": "x", "groups": 4}}
    with pytest.raises(InputFault, match=r"quantile_groups_of.*memory"):
        open_stream(people, plan_of(derived=derived), _Told(), memory=little)
    stream = open_stream(people, plan_of(columns={"who": {"kind": "identifier"}}), _Told(), memory=little)
    assert "identifier-not-checked" in [one.code for one in stream.findings]
    assert_same(people, plan_of(columns={"who": {"kind": "identifier"}}))


def test_a_block_takes_its_share_of_the_memory() -> None:
    assert source.rows_of_blocks(1 << 40, 10) == source.BLOCK
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(source, "BLOCK", BLOCK)
        assert source.rows_of_blocks(1 << 40, 10) == BLOCK
        assert source.rows_of_blocks(200_000_000, 10) == 77_824
        assert source.rows_of_blocks(200_000_000, 10) * 32 * 10 <= 200_000_000 / 8
        assert source.rows_of_blocks(1000, 10) == 4096


class _Told:
    def __init__(self) -> None:
        self.stages: list[tuple[str, int | None]] = []
        self.steps = 0

    def stage(self, name: str, total: int | None = None) -> None:
        self.stages.append((name, total))

    def advance(self, steps: int = 1) -> None:
        self.steps += steps


def test_progress_is_told_block_by_block(people: Path) -> None:
    told = _Told()
    open_stream(people, plan_of(columns={"x": {"plausible": [10, 90]}}), told, memory=1 << 30)
    assert told.stages == [("reading", 8), ("reading", 8)]
    assert told.steps == 16


def test_many_different_numbers_are_coded_as_in_memory(people: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("oddsmodel.records.stream.tally.MOST_NUMBERS", 1000)
    for columns in ({}, {"x": {"plausible": [45, 55]}}, {"x": {"plausible": [200, 300]}}, {"x": {"kind": "number"}}):
        assert assert_same(people, plan_of("died ~ x", columns=columns)) is not None
