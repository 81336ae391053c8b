"""Independence: what the analysis takes for granted about how the records came together."""

from __future__ import annotations

from oddsmodel.model.fitted import FittedModel, Held
from oddsmodel.results.study import CheckResult
from oddsmodel.wording import finding, say


def check(model: FittedModel) -> CheckResult:
    """No test: independence cannot be seen in the records, save that an identifier does not repeat among them.

    Where the plan declares no identifier, where the records are grouped, or where they are not held in memory, nobody
    has looked: the line says so. Matched sets analysed as if they were single records are told as a caution (Breslow
    & Day 1980, chapter 7).
    """
    matched = model.study_design == "matched case-control"
    grouped = "count" in model.rows.people.taken([0])
    identifiers = [name for name, column in model.columns.items() if column.kind == "identifier"]
    distinct = not grouped and model.held is not None and _another_for_each(model.held, identifiers)
    if model.grouping is not None:
        line = say("independence-within-groups", column=model.grouping.label, groups=model.grouping.number)
    elif matched:
        line = say("independence-matched")
    elif grouped:
        line = say("independence-grouped")
    elif distinct:
        line = say("independence-identifier")
    else:
        line = say("independence-not-looked-at" if identifiers and model.held is None else "independence-unchecked")
    return CheckResult(
        name="independence",
        family="independence",
        title=say("independence-title"),
        verdict="caution" if matched else "fine" if distinct or model.grouping is not None else "look",
        line=line,
        findings=(finding("caution", "independence-matched"),) if matched else (),
        explanation=say("independence-explanation"),
    )


def _another_for_each(held: Held, identifiers: list[str]) -> bool:
    """Whether one of the identifiers is another for every record."""
    return any(held.frame[name].is_unique for name in identifiers if name in held.frame)
