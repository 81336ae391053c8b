"""A file of records that is read block by block, coded as if it had been read as a whole."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace
from functools import cached_property
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd

from oddsmodel.errors import InputFault
from oddsmodel.findings import Finding
from oddsmodel.plan.schema import StudyPlan
from oddsmodel.progress import Progress
from oddsmodel.records.faults import fault
from oddsmodel.records.groups import without_group
from oddsmodel.records.kinds import kind_by_plan
from oddsmodel.records.load import as_records
from oddsmodel.records.made_outcome import outcome_by_row
from oddsmodel.records.outcome import CodedOutcome
from oddsmodel.records.plan_use import columns_used, kept_as_written, section_of, use_of
from oddsmodel.records.renamed import renamed
from oddsmodel.records.same_value import same_value_key
from oddsmodel.records.source import GZIP, OLD_SPREADSHEET, PARQUET, ZIP
from oddsmodel.records.stream.blocks import Blocks, CodedBlock
from oddsmodel.records.stream.cursor import Cursor
from oddsmodel.records.stream.delimited import open_delimited
from oddsmodel.records.stream.parquet import open_parquet
from oddsmodel.records.stream.settle import Settling, outline_of, with_repairs
from oddsmodel.records.stream.source import Source, rows_of_blocks
from oddsmodel.records.stream.survey import Wanted, take_survey
from oddsmodel.records.types import Column, LeftOut, Records
from oddsmodel.results.derived import DerivedColumn

GROUPED_BY = "the plan, [records] grouped_by"
MOST_ROOM = 1 << 31
"""Bytes of different texts beyond which one array cannot hold them."""


@dataclass(frozen=True)
class RecordStream:
    """Coded records in blocks of consecutive rows, in the order of the file. It can be pickled.

    columns: those of `Records.columns` that the plan has a use for. read, source, sha256, findings, derived: see
    `Records`; of the findings of a file, those on repaired texts count the columns used alone. rows: of the file.
    event_label, other_label: the two values of the outcome. left_out_facts: what the sentences of `Records.left_out`
    need, by reason.
    """

    columns: Mapping[str, Column]
    read: int
    source: str
    sha256: str
    findings: tuple[Finding, ...]
    derived: tuple[DerivedColumn, ...]
    rows: int
    event_label: str
    other_label: str
    left_out_facts: Mapping[str, Mapping[str, Any]]
    plan: StudyPlan
    parts: Blocks

    @property
    def blocks_number(self) -> int:
        return self.parts.source.blocks

    def block(self, number: int) -> Records:
        """One block of at most `BLOCK` rows, for any thread. Raises: InputFault for a file that is not what it was."""
        return self._records(self.parts.coded(self._cursor.table(number), self.parts.codes))

    def blocks(self, first: int = 0, end: int | None = None) -> Iterator[Records]:
        """The blocks `first` up to `end`, all by default, each read once. Raises: InputFault as `block` does."""
        for coded in self.parts.read(self.parts.codes, first, end):
            yield self._records(coded)

    @cached_property
    def _cursor(self) -> Cursor:
        return Cursor(self.parts.source, [code.in_file for code in self.parts.codes.values()])

    def __getstate__(self) -> dict[str, Any]:
        return {name: value for name, value in self.__dict__.items() if name != "_cursor"}

    def outcome_of(self, block: Records) -> CodedOutcome:
        """The outcome of a block, the event as it is among all records."""
        name = self.plan.outcome.column_name
        values = block.frame[name]
        if isinstance(values.dtype, pd.CategoricalDtype):
            event = (values == self.event_label).to_numpy(dtype=np.bool_)
        else:
            numbers = values.to_numpy(dtype=np.float64)
            event = numbers == _number(self.event_label, numbers)
        return CodedOutcome(event, values.notna().to_numpy(), self.event_label, self.other_label, name)

    def _records(self, block: CodedBlock) -> Records:
        coded = {name: replace(one, column=self.columns[name]) for name, one in block.columns.items()}
        left_out: dict[str, LeftOut] = {}
        if self.plan.outcome.column is None:
            made = outcome_by_row(self.parts.table(replace(block, columns=coded)), self.plan.outcome)
            coded[self.plan.outcome.column_name] = made.coded(self.plan.outcome)
            left_out.update(made.left_out)
        if self.plan.records.grouped_by is not None:
            left_out.update(without_group(coded[self.plan.records.grouped_by]))
        found = as_records(self.source, self.sha256, coded, block.counts, (), left_out, ())
        return replace(found, findings=())


def open_stream(path: Path, plan: StudyPlan, progress: Progress, *, memory: int) -> RecordStream:
    """The records of a file that may be larger than memory, as `load_records` codes them.

    Only the columns that the plan has a use for are read, once or more. memory: bytes to keep to: an eighth for a block
    of rows, a quarter for the different texts and numbers that are met in columns.

    Raises: InputFault as `load_records` does; for `repeats`, for groups and for quantile groups that need all records
        at once; for a column with too many different values; for a spreadsheet.
    """
    if plan.records.repeats is not None:
        raise InputFault(fault("needs-memory", "the plan, [records] repeats"))
    source = _opened(path, plan, memory)
    outline, faults = renamed(outline_of(source), plan)
    names = list(outline.frame.columns)
    used = columns_used(plan, names)
    if plan.records.grouped_by in names:
        used.add(plan.records.grouped_by)
    read = [name for name in names if name in used]
    in_file = dict(zip(names, [name for name in source.names if name not in source.refused], strict=True))
    wanted = {in_file[name]: _wanted(name, used, plan) for name in read}
    room = min(memory // 4, MOST_ROOM)
    source, surveyed = take_survey(source, wanted, progress, memory=room)
    outline = with_repairs(outline, source, surveyed)
    in_small = {name: surveyed[in_file[name]] for name in read}
    settled = Settling(plan, source, outline, in_small, progress, room, faults).settled()
    return RecordStream(
        columns=settled.columns,
        read=settled.read,
        source=source.name,
        sha256=source.sha256(),
        findings=settled.findings,
        derived=settled.derived,
        rows=source.rows,
        event_label=settled.outcome.event_label,
        other_label=settled.outcome.other_label,
        left_out_facts=settled.left_out,
        plan=plan,
        parts=settled.blocks,
    )


def _opened(path: Path, plan: StudyPlan, memory: int) -> Source:
    """The source of a kind told by the first bytes of the file."""
    rows = rows_of_blocks(memory, _columns_at_most(plan))
    if path.is_dir():
        return open_parquet(path, rows)
    if not path.exists():
        raise InputFault(fault("file-missing", str(path)))
    if not path.is_file():
        raise InputFault(fault("file-not-regular", str(path)))
    try:
        with path.open("rb") as file:
            head = file.read(8)
    except OSError as error:
        raise InputFault(fault("file-not-readable", str(path), reason=error.strerror or "")) from error
    if head.startswith(PARQUET):
        return open_parquet(path, rows)
    for start, code in ((ZIP, "spreadsheet-in-memory"), (OLD_SPREADSHEET, "old-spreadsheet"), (GZIP, "packed-file")):
        if head.startswith(start):
            raise InputFault(fault(code, path.name))
    return open_delimited(
        path,
        block_rows=rows,
        block_bytes=memory // 16,
        not_recorded=plan.records.not_recorded,
        as_written=kept_as_written(plan),
    )


def _columns_at_most(plan: StudyPlan) -> int:
    """A number that the columns of a block will not exceed: of the words of the plan that may be their names."""
    texts = [text for model in plan.models for text in (model.formula, *model.add, *model.exposures, model.keep or "")]
    texts += [plan.records.keep or "", plan.outcome.event_when or ""]
    words = {word for text in texts for word in re.findall(r"\w+", text)}
    sources = {source for section in plan.derived.values() for source in section.sources}
    return len(words | sources | {*plan.columns, *plan.derived, *plan.outcome.dates}) + 3


def _wanted(name: str, used: set[str], plan: StudyPlan) -> Wanted:
    """What must be known of a column before its blocks can be coded."""
    section, use = section_of(name, plan), use_of(name, used, plan)
    kind = kind_by_plan(section)
    every_value = use in ("outcome", "count") or (kind is not None and kind != "number")
    if kind not in ("identifier", "date") or use != "model" or name in _valued(plan):
        asked_by = GROUPED_BY if name == plan.records.grouped_by else ""
        return Wanted(every_value, kind == "number" and use == "model", asked_by=asked_by)
    own = section.not_recorded if section is not None else None
    texts = plan.records.not_recorded if own is None else own
    keys = frozenset(same_value_key(text) for text in texts) if kind == "identifier" else None
    return Wanted(every_value, identity=keys, if_it_fits=True)


def _valued(plan: StudyPlan) -> set[str]:
    """Columns of which every value must be known, whatever they are."""
    sources = {source for section in plan.derived.values() for source in section.sources}
    return {*sources, *plan.outcome.dates, *(name for name in (plan.records.grouped_by,) if name is not None)}


def _number(label: str, numbers: np.ndarray) -> float:
    """The number among some that a label stands for; NaN where none does."""
    return next((float(number) for number in np.unique(numbers) if same_value_key(float(number)) == label), np.nan)
