"""The column that names the groups that records belong to: patients with several stays, sites, households."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

import numpy as np

from oddsmodel.errors import Fault
from oddsmodel.records.coding import CodedColumn
from oddsmodel.records.faults import fault
from oddsmodel.records.types import LeftOut
from oddsmodel.wording.plain import quoted


def faults_of_groups(coded: Mapping[str, CodedColumn], column: str | None) -> Iterator[Fault]:
    """The fault of a column of groups in which nothing is recorded."""
    if column is not None and column in coded and not coded[column].faults and coded[column].values.isna().all():
        yield fault("group-column-empty", "the plan, [records] grouped_by", column=quoted(column))


def without_group(column: CodedColumn) -> dict[str, LeftOut]:
    """Records of which it is not known which group they belong to, as a reason to leave them out."""
    rows = column.values.isna().to_numpy(dtype=np.bool_)
    return {"group-not-recorded": LeftOut(rows, {"label": column.column.label})} if rows.any() else {}
