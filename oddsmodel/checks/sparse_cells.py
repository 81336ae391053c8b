"""Sparse cells: levels of the category columns that hold few events or few records without the event."""

from __future__ import annotations

from oddsmodel.findings import Finding
from oddsmodel.measures.counts import level_counts, model_levels
from oddsmodel.model.fitted import FittedModel
from oddsmodel.results.study import CheckResult, Verdict
from oddsmodel.results.tables import Cell, Table, TableColumn
from oddsmodel.wording import finding, say

FEW = 5
CATEGORY_KINDS = ("category", "ordered", "yes-no")
MOST_LEVELS_TABULATED = 100


def check(model: FittedModel) -> CheckResult:
    """Each level of each category column of the model, crossed with the outcome.

    A level with fewer than five records of either outcome is named: its odds ratio rests on a handful, and
    large-sample intervals are rough there (Greenland, Mansournia & Altman 2016, BMJ 352:i1981). Counts stand in the
    table alone, where disclosure can hide them.
    """
    names = [
        name
        for name in dict.fromkeys((*model.exposures, *model.adjustment))
        if model.columns[name].kind in CATEGORY_KINDS
    ]
    rows: list[tuple[Cell, ...]] = []
    blocks: list[int] = []
    sparse: dict[bool, list[str]] = {True: [], False: []}
    for block, name in enumerate(names):
        label = model.columns[name].label
        people = model.people.of(name)
        counted = level_counts(people.frame[name], people.event, people.counts, model_levels(model, name))
        for level, records, events in zip(counted.levels, counted.records, counted.events, strict=True):
            if records == 0:
                continue
            rows.append((label, level, int(records), int(events)))
            blocks.append(block)
            if min(events, records - events) < FEW:
                sparse[name in model.exposures].append(f"{label}: {level}")
    exposure, adjustment = sparse[True], sparse[False]
    verdict: Verdict = "caution" if exposure else "look" if adjustment else "fine"
    findings: list[Finding] = []
    if exposure:
        exact = model.method == "exact"
        # of a separated model the same is said already, and more
        quiet = exact or model.fit.status != "converged"
        findings.append(
            finding("note" if quiet else "caution", "sparse-exposure-levels", levels=exposure, few=FEW, exact=exact)
        )
    if adjustment:
        findings.append(finding("note", "sparse-adjustment-levels", levels=adjustment, few=FEW))
    return CheckResult(
        name="sparse_cells",
        family="sparsity",
        title=say("sparse-cells-title"),
        verdict=verdict if names else "not applicable",
        line=say("sparse-cells-line", few=FEW, levels=len(rows), exposure=exposure, adjustment=adjustment),
        statistics={"levels": len(rows), "sparse_levels": len(exposure) + len(adjustment)},
        findings=tuple(findings),
        tables=(_table(rows, blocks),) if 0 < len(rows) <= MOST_LEVELS_TABULATED else (),
        explanation=say("sparse-cells-explanation", few=FEW),
    )


def _table(rows: list[tuple[Cell, ...]], blocks: list[int]) -> Table:
    return Table(
        id="sparse_cells",
        title=say("sparse-cells-table"),
        columns=(
            TableColumn("column", say("form-heading-column")),
            TableColumn("level", say("form-heading-level")),
            TableColumn("records", say("form-heading-records"), "count", sums_known=True),
            TableColumn("events", say("form-heading-events"), "count", part_of="records", sums_known=True),
        ),
        rows=tuple(rows),
        blocks=tuple(blocks),
    )
