"""Whether a stream of a file gives what reading it into memory gives: columns, findings, rows, or the same faults."""

from __future__ import annotations

import pickle
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from oddsmodel.errors import Fault, InputFault
from oddsmodel.findings import Finding
from oddsmodel.plan.schema import StudyPlan
from oddsmodel.progress import Silent
from oddsmodel.records.load import load_records
from oddsmodel.records.outcome import code_outcome
from oddsmodel.records.stream import RecordStream, open_stream
from oddsmodel.records.types import Records

MEMORY = 1 << 30
OF_ALL_COLUMNS = ("spaces-removed", "characters-removed")
"""Findings that a stream tells of the columns that the plan has a use for, and `load_records` of all."""


def streamed(path: Path, plan: StudyPlan, memory: int = MEMORY) -> RecordStream:
    return open_stream(path, plan, Silent(), memory=memory)


def assert_same(path: Path, plan: StudyPlan, memory: int = MEMORY) -> RecordStream | None:
    """The stream, which equals the records in memory; None where both refuse with the same faults."""
    expected = _loaded(path, plan)
    if not isinstance(expected, Records):
        with pytest.raises(InputFault) as found:
            streamed(path, plan, memory)
        assert [str(one) for one in found.value.faults] == [str(one) for one in expected]
        return None
    stream = streamed(path, plan, memory)
    assert_equal(pickle.loads(pickle.dumps(stream)), expected, plan)
    return stream


def assert_equal(stream: RecordStream, expected: Records, plan: StudyPlan) -> None:
    assert dict(stream.columns) == {name: expected.columns[name] for name in expected.columns if name in stream.columns}
    assert list(stream.columns) == [name for name in expected.columns if name in stream.columns]
    assert (stream.read, stream.source, stream.sha256) == (expected.read, expected.source, expected.sha256)
    assert stream.derived == expected.derived
    assert [one.message for one in told(stream.findings)] == [one.message for one in told(expected.findings)]
    assert told(stream.findings) == told(expected.findings)
    blocks = list(stream.blocks())
    assert len(blocks) == stream.blocks_number
    assert sum(block.read for block in blocks) == expected.read
    for number in {0, len(blocks) // 2, len(blocks) - 1}:
        pd.testing.assert_frame_equal(stream.block(number).frame, blocks[number].frame)
    names = [*stream.columns] if not blocks else list(blocks[0].columns)
    for block in blocks:
        assert dict(block.columns) == {name: stream.columns[name] for name in names}
        assert list(block.frame.columns) == names
    left = set(stream.columns) - set(names)
    assert all(stream.columns[name].kind in ("identifier", "date") for name in left)
    for name in names:
        _assert_column(name, blocks, expected)
    n = len(expected.frame)
    for name in names:
        nowhere = pd.Series(np.zeros(n, dtype=bool))
        found = np.concatenate(
            [np.asarray(block.outside_levels.get(name, np.zeros(len(block.frame), bool)), bool) for block in blocks]
        )
        np.testing.assert_array_equal(found, np.asarray(expected.outside_levels.get(name, nowhere), bool))
    if expected.counts is None:
        assert all(block.counts is None for block in blocks)
    else:
        np.testing.assert_array_equal(np.concatenate([block.counts for block in blocks]), expected.counts)
    for reason in {*expected.left_out, *(code for block in blocks for code in block.left_out)}:
        nobody = np.zeros(n, dtype=bool)
        found = np.concatenate(
            [
                block.left_out[reason].rows if reason in block.left_out else np.zeros(len(block.frame), dtype=bool)
                for block in blocks
            ]
        )
        rows = expected.left_out[reason].rows if reason in expected.left_out else nobody
        np.testing.assert_array_equal(found, rows)
        if reason in expected.left_out:
            assert stream.left_out_facts[reason] == expected.left_out[reason].facts
    outcome = code_outcome(expected, plan.outcome)
    assert (stream.event_label, stream.other_label) == (outcome.event_label, outcome.other_label)
    coded = [stream.outcome_of(block) for block in blocks]
    np.testing.assert_array_equal(np.concatenate([one.event for one in coded]), outcome.event)
    np.testing.assert_array_equal(np.concatenate([one.recorded for one in coded]), outcome.recorded)


def told(findings: tuple[Finding, ...]) -> list[Finding]:
    return [one for one in findings if one.code not in OF_ALL_COLUMNS]


def _loaded(path: Path, plan: StudyPlan) -> Records | tuple[Fault, ...]:
    try:
        return load_records(path, plan, Silent())
    except InputFault as found:
        return found.faults


def _assert_column(name: str, blocks: list[Records], expected: Records) -> None:
    wanted = expected.frame[name]
    parts = [block.frame[name] for block in blocks]
    if isinstance(wanted.dtype, pd.CategoricalDtype):
        if expected.columns[name].levels:
            assert all(part.dtype == wanted.dtype for part in parts), name
        found = np.concatenate([part.astype(object).to_numpy() for part in parts])
        pd.testing.assert_series_equal(
            pd.Series(found, dtype=object), pd.Series(wanted.astype(object).to_numpy(), dtype=object)
        )
    else:
        np.testing.assert_array_equal(np.concatenate([part.to_numpy() for part in parts]), wanted.to_numpy())
