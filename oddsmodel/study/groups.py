"""Records that belong to groups: how many there are, and whether they are enough."""

from __future__ import annotations

from dataclasses import replace

from oddsmodel.findings import Finding
from oddsmodel.model.grouped import Grouping, group_codes
from oddsmodel.results.study import Flow
from oddsmodel.results.tables import Table
from oddsmodel.study.prepare import Prepared
from oddsmodel.wording import finding, say

ENOUGH = 40
"""Below this many groups a cluster-robust interval tends to be too narrow (Cameron & Miller 2015, section VI)."""

VERY_FEW = 10


def findings_of_groups(grouping: Grouping, flow: Flow) -> tuple[Finding, ...]:
    """How many records are of how many groups, and the caution where the groups are few."""
    facts = {"column": grouping.label, "groups": grouping.number}
    told = finding("note", "records-of-groups", records=flow.analysed, **facts)
    if grouping.number < VERY_FEW:
        return (told, finding("caution", "groups-too-few", **facts, enough=ENOUGH))
    if grouping.number < ENOUGH:
        return (told, finding("caution", "groups-few", **facts, enough=ENOUGH))
    return (told,)


def with_groups_told(table: Table, main: Prepared, grouped_by: str | None) -> Table:
    """The table of who they were, its note beginning with how many groups the records analysed are of."""
    if grouped_by is None:
        return table
    _, number = group_codes(main.in_memory.frame[grouped_by])
    label = main.columns[grouped_by].label
    told = say("records-analysed-of-groups", records=main.flow.analysed, groups=number, column=label)
    return replace(table, note=f"{told} {table.note}".rstrip())
