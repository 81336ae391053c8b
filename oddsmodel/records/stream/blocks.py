"""Blocks of a source as coded columns side by side, derived ones among them."""

from __future__ import annotations

from collections.abc import Collection, Iterator, Mapping
from dataclasses import dataclass

import numpy as np
import pandas as pd
import pyarrow as pa
from numpy.typing import NDArray

from oddsmodel.plan.schema import DerivedSection, StudyPlan
from oddsmodel.records.coding import CodedColumn
from oddsmodel.records.derived import derive
from oddsmodel.records.faults import in_column
from oddsmodel.records.made_outcome import Table, table_of
from oddsmodel.records.renamed import file_name
from oddsmodel.records.rows import RowsInOrder
from oddsmodel.records.stream.coder import ColumnCode
from oddsmodel.records.stream.source import Source

Array = NDArray[np.float64]


@dataclass(frozen=True)
class CodedBlock:
    """columns: coded, of the file and derived. counts (n,): see `Records`; weights (n,): records of each row."""

    columns: dict[str, CodedColumn]
    counts: pd.Series | None
    weights: Array


@dataclass(frozen=True)
class Blocks:
    """How the blocks of a source are coded. plan: one whose derived columns are made row by row (`row_by_row`).

    count: the column of counts, None where there is none or it is at fault.
    """

    source: Source
    codes: Mapping[str, ColumnCode]
    plan: StudyPlan
    count: str | None

    def read(self, names: Collection[str], first: int = 0, end: int | None = None) -> Iterator[CodedBlock]:
        """Blocks with some columns of the file, and the derived columns that can be made of these."""
        codes = {name: code for name, code in self.codes.items() if name in names}
        for table in self.source.tables([code.in_file for code in codes.values()], first, end):
            yield self.coded(table, codes)

    def coded(self, table: pa.Table, codes: Mapping[str, ColumnCode]) -> CodedBlock:
        columns = {name: code.coded(table[code.in_file]) for name, code in codes.items()}
        counts = columns[self.count].values if self.count is not None else None
        weights = np.ones(table.num_rows) if counts is None else counts.to_numpy(dtype=np.float64)
        if self.plan.derived:
            columns.update(derive(self.plan, columns, weights, self.where, RowsInOrder()).columns)
        return CodedBlock(columns, counts, weights)

    def table(self, block: CodedBlock) -> Table:
        """The columns of a block for an outcome that is made of them."""
        return table_of(block.columns, block.counts, self.where, RowsInOrder())

    def where(self, name: str) -> str:
        """The place of a column in messages."""
        return in_column(self.source.name, file_name(name, self.plan))


def row_by_row(plan: StudyPlan, cuts: Mapping[str, tuple[float, ...]]) -> StudyPlan:
    """The plan with derived columns that need no other rows: quantile groups are bands between their cut points, and
    are left out until these are known; what is judged of all rows together is not asked of a block."""
    sections: dict[str, DerivedSection] = {}
    for name, section in plan.derived.items():
        if section.quantile_groups_of is None:
            sections[name] = section.model_copy(update={"reference": None, "other_levels": "exclude and count"})
        elif name in cuts:
            sections[name] = DerivedSection(bands_of=section.quantile_groups_of, edges=cuts[name])
    return plan.model_copy(update={"derived": sections})
