"""What adjustment changes: the crude odds ratio beside the adjusted one."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

from oddsmodel.findings import Finding
from oddsmodel.measures.designs import CASE_CONTROL
from oddsmodel.measures.levels import exposure_rows
from oddsmodel.measures.wald import standard_error_from_ratios
from oddsmodel.model.fitted import FittedModel
from oddsmodel.results.study import CoefficientResult
from oddsmodel.results.tables import Cell, Table, TableColumn
from oddsmodel.wording import finding, say


@dataclass(frozen=True, slots=True)
class CrudeToAdjusted:
    """log_difference: log adjusted − log crude odds ratio. percent_change: 100 (adjusted / crude − 1).

    `sentence` says it in words; what does not exist is None, with its reason under the name of the field.
    """

    log_difference: float | None
    percent_change: float | None
    sentence: str
    reasons: Mapping[str, str] = field(default_factory=dict)


def crude_to_adjusted(coefficient: CoefficientResult, level: float, design: str) -> CrudeToAdjusted:
    """From the crude estimate on the same records to the adjusted one.

    The percentage change of the odds ratio is withheld where the crude log odds ratio is smaller than its standard
    error: a change of what cannot be told from chance is no percentage of it.
    """
    crude = coefficient.crude
    # No pair of estimates: nothing changed into anything.
    if crude is None or crude.odds_ratio is None or coefficient.odds_ratio is None:
        reason = coefficient.reasons.get("crude") or coefficient.reasons.get("odds_ratio") or say("no-crude-estimate")
        reasons = {"log_difference": reason, "percent_change": reason}
        return CrudeToAdjusted(None, None, say("no-change-to-tell", label=coefficient.label), reasons)

    log_crude, log_adjusted = math.log(crude.odds_ratio), math.log(coefficient.odds_ratio)
    facts = {
        "label": coefficient.label,
        "crude": crude.odds_ratio,
        "adjusted": coefficient.odds_ratio,
        "trial": design == "trial",
    }
    limits = crude.wald
    if limits is None or limits.lower is None or limits.upper is None:
        reason = say("crude-without-standard-error")
    elif abs(log_crude) < standard_error_from_ratios(limits.lower, limits.upper, level, limits.df):
        reason = say("percent-change-of-almost-nothing")
    else:
        change = 100.0 * (math.exp(log_adjusted - log_crude) - 1.0)
        return CrudeToAdjusted(
            log_adjusted - log_crude, change, say("crude-to-adjusted-with-change", change=change, **facts)
        )
    return CrudeToAdjusted(
        log_adjusted - log_crude, None, say("crude-to-adjusted", **facts), {"percent_change": reason}
    )


def adjustment_findings(design: str, adjusted: bool) -> tuple[Finding, ...]:
    """The caution that belongs beside any crude and adjusted pair; none where the model adjusts for nothing."""
    if not adjusted:
        return ()
    code = "adjustment-in-a-trial" if design == "trial" else "noncollapsibility"
    return (finding("note", code),)


def crude_to_adjusted_table(
    model: FittedModel, coefficients: Sequence[CoefficientResult], averages: Sequence[CoefficientResult] = ()
) -> Table:
    """The rows of `levels`, with what adjustment changes and the crude estimate on all records that have the column."""
    columns = [
        TableColumn("label", "Exposure"),
        TableColumn("records", "Records", "count", sums_known=True),
        TableColumn("events", "Cases" if model.study_design in CASE_CONTROL else "Events", "count", "records", True),
        TableColumn("crude", "Crude odds ratio", "odds_ratio", hidden_with_block=True),
        TableColumn("adjusted", "Adjusted odds ratio", "odds_ratio", hidden_with_block=not model.adjustment),
        TableColumn("log_difference", "Difference of logs", "number", hidden_with_block=True),
        TableColumn("change", "Change of the odds ratio, %", "number", hidden_with_block=True),
        TableColumn("all_records", "All records with the exposure", "count"),
        TableColumn(
            "crude_all_records",
            "Crude odds ratio on these",
            "odds_ratio",
            hidden_with=("all_records",),
            hidden_with_block=True,
        ),
    ]
    rows: list[tuple[Cell, ...]] = []
    blocks: list[int] = []
    remarks: list[str] = []
    for block, name in enumerate(model.exposures):
        for row in exposure_rows(model, name, coefficients, averages):
            change: tuple[Cell, ...] = (None, None, None, None)
            remark = ""
            if row.coefficient is not None:
                moved = crude_to_adjusted(row.coefficient, model.level, model.study_design)
                everyone = row.coefficient.crude_all_records
                on_all = (everyone.records, everyone.odds_ratio) if everyone else (None, None)
                change = (moved.log_difference, moved.percent_change, *on_all)
                remark = _why_empty(row.coefficient, moved)
            rows.append((row.label, row.records, row.events, row.crude, row.adjusted, *change))
            remarks.append(remark)
            blocks.append(block)
    if any(remarks):
        columns.append(TableColumn("remark", "Why a cell is empty", hidden_with_block=True))
        rows = [(*row, remark) for row, remark in zip(rows, remarks, strict=True)]
    note = say("crude-beside-adjusted-note")
    return Table("crude_to_adjusted", "From crude to adjusted", tuple(columns), tuple(rows), note, tuple(blocks))


def _why_empty(coefficient: CoefficientResult, moved: CrudeToAdjusted) -> str:
    """The reasons stand in a column of their own, because they can tell a hidden count ("nobody had the event")."""
    reasons = [moved.reasons["percent_change"]] if "percent_change" in moved.reasons else []
    everyone = coefficient.crude_all_records
    if everyone is not None and everyone.odds_ratio is None:
        reasons.append(coefficient.reasons.get("crude_all_records", say("no-crude-estimate")))
    return " ".join(dict.fromkeys(reasons))
