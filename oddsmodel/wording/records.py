"""Sentences of the records floor, by code: notes and questions on the records, and why a record is left out."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from oddsmodel.wording.numbers import count, listed, plural
from oddsmodel.wording.plain import plain, quoted
from oddsmodel.wording.records_database import DATABASE_FAULTS, DATABASE_FINDINGS
from oddsmodel.wording.records_derived import DATE_FAULTS, DERIVED_FAULTS, DERIVED_WORDS
from oddsmodel.wording.records_faults import FAULTS
from oddsmodel.wording.records_follow_up import FOLLOW_UP, FOLLOW_UP_FAULTS
from oddsmodel.wording.say import Sentence

Facts = Mapping[str, Any]
LONGEST_LIST = 12


def _quoted_list(values: Sequence[str], last: str = "and") -> str:
    """Values in quotes; beyond twelve the number of the others stands for them."""
    shown = [quoted(value) for value in values[:LONGEST_LIST]]
    if len(values) > LONGEST_LIST:
        shown.append(f"{len(values) - LONGEST_LIST} more")
    return listed(shown, last)


def _repaired(what: str, facts: Facts) -> str:
    cells = plural(facts["records"], "cell")
    return f"{what} in {cells} of {_columns(facts['columns'])}."


def _columns(names: Sequence[str]) -> str:
    return f"{'the column' if len(names) == 1 else 'the columns'} {_quoted_list(names)}"


def _left_out_columns(facts: Facts) -> str:
    parts = [f"{quoted(name)} ({hold})" for name, hold in zip(facts["columns"], facts["hold"], strict=True)]
    return f"Not read, because a cell holds more than one plain value: {listed(parts)}."


def _few_whole_numbers(facts: Facts) -> str:
    return (
        f"{quoted(facts['column'])} holds only the whole numbers {listed([str(v) for v in facts['values']])} and is "
        f"treated as a number: one odds ratio per unit. Is it rather a set of categories? "
        f'Say so in the plan with kind = "number" or kind = "category".'
    )


def _suspected(facts: Facts) -> str:
    parts = [
        f"{quoted(value)} ({plural(records, 'record')})"
        for value, records in zip(facts["values"], facts["with_records"], strict=True)
    ]
    many = len(parts) > 1
    return (
        f"{quoted(facts['column'])} has {listed(parts)}, which {'look' if many else 'looks'} like "
        f"{'codes' if many else 'a code'} for “not recorded” and {'are' if many else 'is'} analysed as "
        f"{'values' if many else 'a value'}. If {'they mean' if many else 'it means'} that, add "
        f"{'them' if many else 'it'} to the column's not_recorded in the plan."
    )


def _references(facts: Facts) -> str:
    parts = [
        f"{quoted(column)} against {quoted(level)}"
        for column, level in zip(facts["columns"], facts["levels"], strict=True)
    ]
    return f"The plan names no reference, so levels are compared with the first one: {listed(parts)}."


def _sheet(facts: Facts) -> str:
    return f"The first sheet, {quoted(facts['sheet'])}, was read; {_quoted_list(facts['others'])} not."


def _levels_absent(facts: Facts) -> str:
    levels = facts["levels"]
    return (
        f"No record has {_quoted_list(levels, 'or')} in {quoted(facts['column'])}, though the plan lists {_it(levels)}."
    )


def _it(values: Sequence[str]) -> str:
    return "it" if len(values) == 1 else "them"


def _by_case(facts: Facts) -> str:
    return (
        f"In {quoted(facts['column'])} the levels {_quoted_list(facts['levels'])} differ only in capital letters "
        f"and are kept apart. If they are one, write them alike in the records."
    )


def _identifier_repeats(facts: Facts) -> str:
    return (
        f"{quoted(facts['column'])} is an identifier, but {plural(facts['records'], 'record')} have only "
        f"{count(facts['different'])} different values of it: some persons or units stand in several records. "
        f"Such records are not independent, and standard errors that take them so are too small. "
        f"Keep a single record of each (repeats, in [records]), or allow for their likeness (grouped_by)."
    )


def _left_out(words: str, without: str) -> Sentence:
    def sentence(facts: Facts) -> str:
        labels = [plain(label, 60) for label in facts["labels"]]
        return words.format(columns=listed(labels, "or")) if labels else without

    return sentence


def _not_kept(facts: Facts) -> str:
    return f"Not among those the plan keeps: {' and '.join(plain(text, 200) for text in facts['conditions'])}"


FINDINGS: dict[str, Sentence] = {
    "encoding-converted": "The file is not UTF-8 but {encoding} text; it was converted. Check that accents are right.",
    "delimiter": "The fields of the file are separated by a {delimiter}.",
    "decimal-comma": "Numbers in the file are written with a decimal comma and were read so.",
    "blank-lines": "The file has blank lines; they were passed over and are not counted in row numbers.",
    "sheet-used": _sheet,
    "spaces-removed": lambda facts: _repaired("Spaces before or after a text were removed", facts),
    "characters-removed": lambda facts: _repaired(
        "Line breaks and characters that cannot be shown were replaced by a space", facts
    ),
    "columns-left-out": _left_out_columns,
    "column-empty": lambda facts: f"{quoted(facts['column'])} has no recorded value.",
    "few-whole-numbers": _few_whole_numbers,
    "suspected-codes": _suspected,
    "many-levels": lambda facts: (
        f"{quoted(facts['column'])} has {count(facts['levels'])} levels. Is it a category, "
        f"or a number, a date or an identifier? The plan can say it with kind."
    ),
    "level-absent": _levels_absent,
    "levels-differ-by-case": _by_case,
    "references-taken": _references,
    "identifier-repeats": _identifier_repeats,
    "rows-of-no-record": lambda facts: (
        f"{plural(facts['zeros'], 'row')} with a count of 0 {'stands' if facts['zeros'] == 1 else 'stand'} for no "
        "record."
    ),
    "left-out-not-kept": _not_kept,
    "left-out-keep-undecided": _left_out(
        "Cannot be decided whether they are kept: not recorded in {columns}", "Cannot be decided whether they are kept"
    ),
    "left-out-outcome-not-recorded": _left_out("Outcome not recorded: {columns}", "Outcome not recorded"),
    "left-out-exposure-not-recorded": _left_out("Exposure not recorded: {columns}", "Exposure not recorded"),
    "left-out-adjustment-not-recorded": _left_out(
        "Adjustment column not recorded: {columns}", "Adjustment column not recorded"
    ),
    "left-out-level-not-in-plan": _left_out("Level not in the plan: {columns}", "Level not in the plan"),
    "survey-suspected": lambda facts: (
        f"Does {_quoted_list(facts['values'], 'or')} mean “not recorded”? Then keep it in not_recorded."
    ),
    "survey-stray-texts": "Some cells hold texts among the numbers: which of them mean “not recorded”?",
    "survey-few-whole-numbers": "Few whole numbers: is it a number, or a set of categories?",
    "survey-running-number": "A different whole number in each record: is it an identifier?",
    "survey-identifier": "A different text in each record: is it an identifier?",
    "survey-date": "A date cannot stand in a formula; the years between two dates can: years_between in the plan.",
    "survey-spelled-alike": lambda facts: f"Are {_quoted_list(facts['levels'])} the same? Then write them alike.",
    "survey-many-levels": lambda facts: f"{count(facts['levels'])} levels: is it a category?",
    "survey-empty": "No value is recorded: leave the column out.",
}

ALL_FAULTS = FAULTS | FOLLOW_UP_FAULTS | DATE_FAULTS | DERIVED_FAULTS | DATABASE_FAULTS

SENTENCES: dict[str, Sentence] = (
    FINDINGS
    | FOLLOW_UP
    | DATABASE_FINDINGS
    | DERIVED_WORDS
    | {code: what for code, (what, _) in ALL_FAULTS.items()}
    | {f"{code}-remedy": remedy for code, (_, remedy) in ALL_FAULTS.items()}
)
