"""Is this causal? Answered from the plan's design, timing, reasons and what was not measured."""

from __future__ import annotations

from dataclasses import dataclass

from oddsmodel.report.view.sheet import Sheets
from oddsmodel.report.view.tables import TableView
from oddsmodel.results.study import ModelResult, StudyResults
from oddsmodel.results.tables import Table, TableColumn
from oddsmodel.wording import numbers, say
from oddsmodel.wording.report_answer import CASE_CONTROL


@dataclass(frozen=True, slots=True)
class CauseView:
    answer: tuple[str, ...]
    cautions: tuple[str, ...]
    questions: tuple[str, ...]
    table: TableView | None


def cause(study: StudyResults, lead: ModelResult | None, sheets: Sheets) -> CauseView:
    used = lead.adjustment if lead is not None else ()
    columns = [column for column in study.columns if column.name in used]
    answer = [say("cause-trial" if study.design == "trial" else "cause-observed")]
    if study.design == "cross-sectional":
        answer.append(say("cause-cross-sectional"))
    if study.design in CASE_CONTROL:
        answer.append(say("cause-case-control"))

    cautions, questions = [], []
    if not columns and study.design != "trial":
        mutually = lead is not None and len(lead.exposures) > 1
        cautions.append(say("cause-no-adjustment-but-exposures" if mutually else "cause-no-adjustment"))
    if after := [column.label for column in columns if column.timing == "after exposure"]:
        cautions.append(say("cause-after", labels=after))
    if study.not_measured:
        cautions.append(say("cause-not-measured", names=list(study.not_measured)))
    elif study.design != "trial":
        questions.append(say("cause-nothing-named"))
    if unknown := [column.label for column in columns if column.timing == "unknown"]:
        questions.append(say("cause-unknown", labels=unknown))
    if unexplained := [column.label for column in columns if not column.why]:
        questions.append(say("cause-no-reason", labels=unexplained))

    rows = tuple((one.label, say(f"timing-{one.timing}"), one.why or say("why-none")) for one in columns)
    headings = (
        TableColumn("column", say("cause-column")),
        TableColumn("timing", say("cause-timing")),
        TableColumn("why", say("cause-why")),
    )
    table = sheets.table(Table("cause", say("cause-table"), headings, rows)) if rows else None
    return CauseView(tuple(answer), tuple(cautions), tuple(questions), table)


def closing_cautions(study: StudyResults) -> tuple[str, ...]:
    """The cautions that every report carries, and what nobody measured."""
    cautions = [say("caution-association"), say("caution-odds-not-risk")]
    if study.not_measured:
        cautions.append(say("caution-not-measured", names=numbers.listed(study.not_measured)))
    return (*cautions, say("caution-one-person"), say("caution-review"), say("caution-rules"))
