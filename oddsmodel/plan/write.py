"""A commented starter plan, written from what the records showed."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from textwrap import wrap

from oddsmodel.errors import InputFault
from oddsmodel.plan.faults import fault
from oddsmodel.plan.schema import Kind
from oddsmodel.plan.toml_text import formula_name, key, text_list, text_value, writable
from oddsmodel.wording.numbers import count, plural
from oddsmodel.wording.plain import as_code, plain, quoted
from oddsmodel.wording.say import say

MOST_LEVELS = 30
LONGEST_TEXT = 200
LONGEST_QUESTION = 600
LINE_WIDTH = 110
LARGEST_DRAFT = 400_000
WITH_LEVELS = ("category", "ordered", "yes-no")
COMMENT_COLUMN = 40


@dataclass(frozen=True, slots=True)
class DraftColumn:
    """What the records showed of one column.

    levels: for kinds with levels, and for the outcome, the values with their records, in the levels' order.
    different: how many different values there are, where `levels` does not hold them all. not_recorded: records
    without a value. suspected: texts and codes that may mean "not recorded". questions: sentences on what the
    analyst must settle.
    """

    name: str
    kind: Kind
    levels: tuple[tuple[str, int], ...] = ()
    different: int | None = None
    not_recorded: int = 0
    suspected: tuple[str, ...] = ()
    questions: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class DraftRecords:
    """What the records showed as a whole.

    source: the path as it is to stand in the plan. event: the outcome's value that is the event, where there is no
    doubt.
    """

    source: str
    records: int
    outcome: DraftColumn
    columns: Sequence[DraftColumn]
    event: str | None = None


def draft_plan(found: DraftRecords) -> str:
    """A starter plan as TOML text, with comments on what is to be settled; `read_plan` accepts it.

    Counts in the comments are rounded to tens, since a report shows the plan it was made from. The model holds the
    first column that can be an exposure; the other candidates are named, not chosen.

    Raises InputFault where the outcome's name cannot be written or no column is left to be an exposure.
    """
    if not _usable(found.outcome.name):
        raise InputFault(fault("draft-outcome-name", quoted(found.outcome.name)))
    columns = [column for column in found.columns if column.name != found.outcome.name]
    candidates = [column for column in columns if _can_be_in_a_model(column)]
    if not candidates:
        raise InputFault(fault("draft-no-exposure", plain(found.source)))

    described, left = _column_sections(columns)
    lines = [
        *_opening(found, candidates),
        *_study(),
        *_records(found),
        *_outcome(found),
        *described,
        *([_comment("draft-columns-left", number=count(left)), ""] if left else []),
        *_model(candidates),
        *_report(),
    ]
    return "\n".join(lines) + "\n"


def _usable(text: str) -> bool:
    return 0 < len(text) <= LONGEST_TEXT and writable(text)


def _levels(column: DraftColumn) -> list[tuple[str, int]]:
    """The levels, or none where there are too few or too many of them or they cannot all be written."""
    levels = dict(column.levels)
    whole = column.different is None or column.different == len(levels)
    usable = whole and 2 <= len(levels) <= MOST_LEVELS and all(_usable(level) for level in levels)
    return list(levels.items()) if usable and not levels.keys() & set(column.suspected) else []


def _can_be_in_a_model(column: DraftColumn) -> bool:
    if not _usable(column.name):
        return False
    return column.kind == "number" or (column.kind in WITH_LEVELS and bool(_levels(column)))


def _about(records: int) -> str:
    return f"about {count(10 * round(records / 10))}" if records >= 10 else "under 10"


def _values(levels: Sequence[tuple[str, int]]) -> str:
    return ", ".join(f"{as_code(level, 40)} ({_about(records)})" for level, records in levels)


def _line(text: str, comment: str = "") -> str:
    return f"{f'{text} ':<{COMMENT_COLUMN}}# {comment}" if comment else text


def _comment(code: str, **facts: str) -> str:
    return f"# {say(code, **facts)}"


def _opening(found: DraftRecords, candidates: Sequence[DraftColumn]) -> list[str]:
    outcome = quoted(found.outcome.name)
    questions = [
        *([] if len(found.outcome.levels) == 2 else [say("draft-settle-values", column=outcome)]),
        *([] if found.event is not None else [say("draft-settle-event", column=outcome)]),
        say("draft-settle-exposure", column=quoted(candidates[0].name)),
        say("draft-settle-adjustment"),
        say("draft-settle-design"),
        say("draft-settle-columns"),
    ]
    return [
        _comment("draft-title", source=plain(found.source), records=plural(found.records, "record")),
        _comment("draft-how"),
        "#",
        _comment("draft-to-settle"),
        *(line for number, question in enumerate(questions, start=1) for line in _wrapped(question, f"#   {number}. ")),
        "",
    ]


def _wrapped(text: str, opening: str) -> list[str]:
    """A sentence as comment lines; what opens the first is answered by spaces on the others."""
    return wrap(
        plain(text, LONGEST_QUESTION),
        width=LINE_WIDTH,
        initial_indent=opening,
        subsequent_indent="#" + " " * (len(opening) - 1),
        break_long_words=False,
        break_on_hyphens=False,
    )


def _study() -> list[str]:
    return [
        "[study]",
        _line('title = "To be named"'),
        _line('question = ""', say("draft-question")),
        _line('design = "cohort"', say("draft-design")),
        _line("not_measured = []", say("draft-not-measured")),
        "",
    ]


def _records(found: DraftRecords) -> list[str]:
    return [
        "[records]",
        f"source = {text_value(found.source)}",
        _line('not_recorded = [""]', say("draft-not-recorded")),
        _line('# keep = "age >= 18"', say("draft-keep")),
        _line('# count = "n"', say("draft-count")),
        "",
    ]


def _outcome(found: DraftRecords) -> list[str]:
    outcome = found.outcome
    if found.event is None or not writable(found.event):
        rarest = min(outcome.levels, key=lambda value: value[1], default=("yes", 0))[0]
        line = _line(f"# event = {text_value(rarest if _usable(rarest) else 'yes')}", say("draft-event-open"))
    else:
        line = f"event = {text_value(found.event)}"
    suspects = _suspects(outcome)
    return [
        "[outcome]",
        f"column = {text_value(outcome.name)}",
        *([_comment("draft-values", values=_values(outcome.levels[:MOST_LEVELS]))] if outcome.levels else []),
        line,
        _line('# label = "Death within 30 days"', say("draft-label")),
        "",
        *([f"[columns.{key(outcome.name)}]", *suspects, ""] if suspects else []),
    ]


def _suspects(column: DraftColumn) -> list[str]:
    """The column's own texts for "not recorded": texts as found, codes that are numbers to be settled."""
    texts = [text for text in column.suspected if _usable(text) and not _is_number(text)]
    codes = [text for text in column.suspected if _is_number(text)]
    lines = []
    if texts:
        lines.append(_line(f"not_recorded = {text_list(['', *texts])}", say("draft-settle-these")))
    if codes:
        lines.append(_line(f"# not_recorded = {text_list(['', *texts, *codes])}", say("draft-settle-codes")))
    return lines


def _is_number(text: str) -> bool:
    try:
        float(text)
    except ValueError:
        return False
    return True


def _column_sections(columns: Sequence[DraftColumn]) -> tuple[list[str], int]:
    """The columns' sections, and how many columns are left without one because the draft grew too long."""
    lines: list[str] = []
    length = 0
    for number, column in enumerate(columns):
        section = _column(column) if _usable(column.name) else [_comment("draft-name-unusable"), ""]
        length += sum(len(line.encode()) + 1 for line in section)
        if length > LARGEST_DRAFT:
            return lines, len(columns) - number
        lines += section
    return lines, 0


def _column(column: DraftColumn) -> list[str]:
    levels = _levels(column)
    misfit = (column.kind == "ordered" and not levels) or (column.kind == "yes-no" and len(levels) > 2)
    kind = "category" if misfit else column.kind
    lines = [f"[columns.{key(column.name)}]", f'kind = "{kind}"']
    if column.not_recorded:
        lines.append(_comment("draft-without-value", records=_about(column.not_recorded)))
    for question in column.questions:
        lines += _wrapped(say("draft-settle", question=question), "# ")
    lines += _suspects(column)
    if kind == "number":
        lines += [_line("per = 1", say("draft-per")), _line('# units = "years"')]
    elif kind in WITH_LEVELS and levels:
        reference = levels[0][0] if kind != "category" else max(levels, key=lambda level: level[1])[0]
        lines += [
            _comment("draft-values", values=_values(levels)),
            f"levels = {text_list(level for level, _ in levels)}",
            _line(f"reference = {text_value(reference)}", say("draft-reference")),
        ]
    elif kind in WITH_LEVELS:
        different = len(column.levels) if column.different is None else column.different
        lines.append(_comment("draft-levels-unlisted", number=count(different)))
    if kind in WITH_LEVELS or kind == "number":
        lines.append(_line('# timing = "before exposure"', say("draft-timing")))
    return [*lines, ""]


def _model(candidates: Sequence[DraftColumn]) -> list[str]:
    exposure, others = candidates[0].name, [column.name for column in candidates[1:]]
    comments = []
    if others:
        full = " + ".join(formula_name(name) for name in (exposure, *others[:MOST_LEVELS]))
        comments = [_comment("draft-candidates"), f"#   formula = {text_value(full)}"]
    return [
        "[[models]]",
        'name = "main"',
        f"formula = {text_value(formula_name(exposure))}",
        *comments,
        _line(f"exposures = {text_list([exposure])}", say("draft-exposures")),
        "",
    ]


def _report() -> list[str]:
    return [
        "[report]",
        _line('audience = "shareable"', say("draft-audience")),
        _line("hide_counts_below = 5", say("draft-hide")),
    ]
