"""Records, events, crude and adjusted odds ratios by the levels of each exposure."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from oddsmodel.findings import Finding
from oddsmodel.measures.counts import exposure_counts
from oddsmodel.measures.crude import plain_exposures
from oddsmodel.measures.designs import CASE_CONTROL
from oddsmodel.measures.intervals import interval_of, lead_interval
from oddsmodel.measures.risks import QUANTITY
from oddsmodel.model.fitted import FittedModel
from oddsmodel.results.study import CoefficientResult
from oddsmodel.results.tables import Cell, Table, TableColumn
from oddsmodel.wording import finding, say

COMMON = 0.10
"""Above this share of events an odds ratio is no longer near the risk ratio."""

REFERENCE = "1 (reference)"


@dataclass(frozen=True, slots=True)
class ExposureRow:
    """A level of an exposure, or a number exposure. `coefficient` is None for the reference and where none is shown."""

    label: str
    records: int
    events: int
    coefficient: CoefficientResult | None
    reference: bool = False

    @property
    def crude(self) -> Cell:
        if self.reference:
            return REFERENCE
        crude = self.coefficient.crude if self.coefficient else None
        return crude.odds_ratio if crude else None

    @property
    def crude_interval(self) -> Cell:
        crude = self.coefficient.crude if self.coefficient else None
        return lead_interval(crude.profile, crude.wald) if crude else None

    @property
    def adjusted(self) -> Cell:
        if self.reference:
            return REFERENCE
        return self.coefficient.odds_ratio if self.coefficient else None

    @property
    def adjusted_interval(self) -> Cell:
        return interval_of(self.coefficient) if self.coefficient else None


def levels(
    model: FittedModel, coefficients: Sequence[CoefficientResult], averages: Sequence[CoefficientResult] = ()
) -> Table:
    """A row for each level of each exposure, the reference included; a number exposure has one row.

    averages: of exposures that are compared with the average of their levels, the comparison of each level.

    The share of events stands only where the design knows it (cohort, trial, cross-sectional). Events of a
    case-control study are called cases. The odds ratios of an exposure that enters as a spline or with an
    interaction are left empty. Where the model adjusts for no other column, its odds ratios are hidden as crude ones
    are; with one exposure only they are the crude ones, and have no columns of their own.
    """
    share = QUANTITY.get(model.study_design)
    events_heading = "Cases" if model.study_design in CASE_CONTROL else "Events"
    percent = round(100 * model.level, 1)
    alone = not model.adjustment
    adjusted = not alone or len(model.exposures) > 1
    columns = [
        TableColumn("label", "Exposure"),
        TableColumn("records", "Records", "count", sums_known=True),
        TableColumn("events", events_heading, "count", part_of="records", sums_known=True),
    ]
    if share is not None:
        heading = "Events per 100" if share == "risk" else "Prevalence per 100"
        columns.append(TableColumn("per_100", heading, "number", hidden_with=("records", "events")))
    columns += [
        TableColumn("crude", "Crude odds ratio", "odds_ratio", hidden_with_block=True),
        TableColumn("crude_interval", f"Crude {percent:g}% interval", "interval", hidden_with_block=True),
    ]
    if adjusted:
        columns += [
            TableColumn("adjusted", "Adjusted odds ratio", "odds_ratio", hidden_with_block=alone),
            TableColumn("adjusted_interval", f"Adjusted {percent:g}% interval", "interval", hidden_with_block=alone),
        ]
    rows: list[tuple[Cell, ...]] = []
    blocks: list[int] = []
    for block, name in enumerate(model.exposures):
        for row in exposure_rows(model, name, coefficients, averages):
            per_100 = (100.0 * row.events / row.records if row.records else None,) if share is not None else ()
            own = (row.adjusted, row.adjusted_interval) if adjusted else ()
            rows.append((row.label, row.records, row.events, *per_100, row.crude, row.crude_interval, *own))
            blocks.append(block)
    by_likelihood = model.method == "maximum likelihood"
    note = say("levels-note" if adjusted else "levels-note-unadjusted" if by_likelihood else "levels-note-other-method")
    if adjusted and model.method == "exact":
        note += " " + say("levels-note-exact")
    for term in dict.fromkeys(one.term for one in averages):
        label = next(model.columns[one.sources[0]].label for one in model.design.columns if one.term == term)
        note += " " + say("average-note", label=label, levels=sum(one.term == term for one in averages))
    return Table("levels", "By exposure", tuple(columns), tuple(rows), note, tuple(blocks))


def exposure_rows(
    model: FittedModel,
    name: str,
    coefficients: Sequence[CoefficientResult],
    averages: Sequence[CoefficientResult] = (),
) -> list[ExposureRow]:
    """The rows of one exposure: its levels in order, or one row for a number. averages: as of `levels`."""
    column = model.columns[name]
    plain = name in plain_exposures(model)
    own = {
        design.level: result
        for design, result in zip(model.design.columns, coefficients, strict=True)
        if plain and design.sources == (name,)
    }
    counted = exposure_counts(model, name)
    if counted is None:
        coefficient = own.get(None)
        label = coefficient.label if coefficient else say("exposure-in-several-columns", label=column.label)
        return [ExposureRow(label, model.records, model.events, coefficient)]
    references = {result.reference for result in own.values()}
    terms = {result.term for result in own.values()}
    against = {one.level: one for one in averages if one.term in terms}
    if against:
        own, references = against, set()
    return [
        ExposureRow(f"{column.label}: {level}", int(records), int(events), own.get(level), level in references)
        for level, records, events in zip(counted.levels, counted.records, counted.events, strict=True)
        if records > 0 or level in own
    ]


def common_outcome(model: FittedModel) -> tuple[Finding, ...]:
    """The caution that the odds ratio overstates the risk ratio, above 10% of events, where the design knows them."""
    quantity = QUANTITY.get(model.study_design)
    share = model.events / model.records if model.records else 0.0
    if quantity is None or share <= COMMON:
        return ()
    return (finding("caution", "odds-ratio-overstates-risk-ratio", share=round(share, 6), quantity=quantity),)
