"""The records of a study as its results need them, in memory or not."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from oddsmodel.findings import Finding
from oddsmodel.measures.characteristics import study_characteristics
from oddsmodel.measures.lost import Followed
from oddsmodel.model.kept import KeptRecords, People
from oddsmodel.plan.schema import StudyPlan
from oddsmodel.records.accounting import account
from oddsmodel.records.outcome import CodedOutcome
from oddsmodel.records.types import Column, Records
from oddsmodel.results.derived import DerivedColumn
from oddsmodel.results.tables import Table
from oddsmodel.study.derived import with_counts
from oddsmodel.study.groups import with_groups_told
from oddsmodel.study.prepare import Prepared, conditions, on_records_of


class StudyRecords(Protocol):
    """What is known of the records, and what is counted among them."""

    @property
    def columns(self) -> Mapping[str, Column]: ...

    @property
    def source(self) -> str: ...

    @property
    def sha256(self) -> str: ...

    @property
    def read(self) -> int: ...

    @property
    def findings(self) -> tuple[Finding, ...]: ...

    @property
    def event_label(self) -> str:
        """The outcome's value that is the event."""

    @property
    def other_label(self) -> str:
        """Its other value."""

    def kept(self, prepared: Prepared) -> People:
        """Records that belong to a model's study population and have the outcome, complete or not."""

    def characteristics(self, main: Prepared) -> Table:
        """The table "who they were"."""

    def followed(self, prepared: Prepared, exposure: str) -> Followed:
        """Those whose window could have finished, with the outcome or lost, counted by an exposure at least."""

    def derived(self, main: Prepared) -> tuple[DerivedColumn, ...]:
        """The derived columns with their counts among the records of a model."""

    def on_records_of(self, prepared: Prepared, other: Prepared) -> Prepared | None:
        """A model on the records it shares with another one; None where it cannot be built there."""


@dataclass(frozen=True)
class RecordsInMemory:
    """All records in a frame."""

    plan: StudyPlan
    records: Records
    outcome: CodedOutcome

    @property
    def columns(self) -> Mapping[str, Column]:
        return self.records.columns

    @property
    def source(self) -> str:
        return self.records.source

    @property
    def sha256(self) -> str:
        return self.records.sha256

    @property
    def read(self) -> int:
        return self.records.read

    @property
    def findings(self) -> tuple[Finding, ...]:
        return self.records.findings

    @property
    def event_label(self) -> str:
        return self.outcome.event_label

    @property
    def other_label(self) -> str:
        return self.outcome.other_label

    def _rows_kept(self, prepared: Prepared, exposures: tuple[str, ...]) -> NDArray[np.bool_]:
        keep = conditions(self.plan, prepared.section)
        return account(self.records, self.outcome, keep=keep, exposures=exposures, adjustment=()).included

    def _some(self, rows: NDArray[np.bool_]) -> KeptRecords:
        counts = None if self.records.counts is None else np.asarray(self.records.counts, dtype=np.float64)[rows]
        return KeptRecords(self.records.frame.loc[rows].reset_index(drop=True), self.outcome.event[rows], counts)

    def kept(self, prepared: Prepared) -> KeptRecords:
        """See `StudyRecords`."""
        rows = self._rows_kept(prepared, ())
        held = prepared.in_memory
        if rows.sum() == len(held.event):
            return KeptRecords(held.frame, held.event, held.counts)
        return self._some(rows)

    def characteristics(self, main: Prepared) -> Table:
        """See `StudyRecords`."""
        rows = self._rows_kept(main, main.exposures)
        held = main.in_memory
        whole = rows.sum() == len(held.event)
        table = study_characteristics(
            self.plan.study.design,
            KeptRecords(held.frame, held.event, held.counts) if whole else self._some(rows),
            self.records.columns,
            main.exposures,
            main.adjustment,
            held.included[rows],
        )
        return with_groups_told(table, main, self.plan.records.grouped_by)

    def followed(self, prepared: Prepared, exposure: str) -> Followed:
        """See `StudyRecords`."""
        records, plan = self.records, self.plan
        known = CodedOutcome(
            self.outcome.event,
            np.ones_like(self.outcome.recorded),
            self.outcome.event_label,
            self.outcome.other_label,
            self.outcome.column,
        )
        keep = conditions(plan, prepared.section)
        rows = account(records, known, keep=keep, exposures=(), adjustment=()).included
        needed = account(records, known, keep=keep, exposures=prepared.exposures, adjustment=prepared.needed).included
        counts = None if records.counts is None else records.counts.to_numpy(dtype=np.float64)[rows]
        frame = records.frame.loc[rows].reset_index(drop=True)
        return Followed(frame, ~self.outcome.recorded[rows], needed[rows], counts)

    def derived(self, main: Prepared) -> tuple[DerivedColumn, ...]:
        """See `StudyRecords`."""
        return with_counts(self.records.derived, main)

    def on_records_of(self, prepared: Prepared, other: Prepared) -> Prepared | None:
        """See `StudyRecords`."""
        return on_records_of(prepared, other)
