"""What is wrong with a file of records, or with a plan beside it, and what to do: (sentence, remedy) by code."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from oddsmodel.wording.numbers import count, listed, plural
from oddsmodel.wording.say import Sentence

Facts = Mapping[str, Any]


def _rows(facts: Facts) -> str:
    """ "row 3", "rows 3, 8 and 9", "rows 3, 8, 9 and 120 more"."""
    rows = [str(row) for row in facts["rows"]]
    more = int(facts["total"]) - len(rows)
    if more > 0:
        rows.append(f"{count(more)} more")
    return f"{'row' if len(rows) == 1 else 'rows'} {listed(rows)}"


def _numbered(word: str, numbers: Sequence[int]) -> str:
    """ "column 2", "columns 2 and 4"."""
    return f"{word}{'' if len(numbers) == 1 else 's'} {listed([str(number) for number in numbers])}"


def _with_rows(before: str, after: str) -> Sentence:
    return lambda facts: f"{before} {_rows(facts)} {after}".replace(" .", ".")


def with_counts(facts: Facts) -> str:
    """'"a" (12 records) and "b" (1 record)', and how many other values there are."""
    parts = [
        f"{value} ({plural(int(records), 'record')})"
        for value, records in zip(facts["values"], facts["with_records"], strict=True)
    ]
    more = int(facts["total"]) - len(parts)
    if more > 0:
        parts.append(plural(more, "other value"))
    return listed(parts)


def _uneven(facts: Facts) -> str:
    parts = [f"row {row} has {width}" for row, width in zip(facts["rows"], facts["widths"], strict=True)]
    more = int(facts["total"]) - len(parts)
    if more > 0:
        parts.append(f"{plural(more, 'more row')} {'differs' if more == 1 else 'differ'}")
    return f"The row of names has {plural(int(facts['expected']), 'field')}, but {listed(parts)}."


def _number_with_text(facts: Facts) -> str:
    parts = [f"row {row} has {value}" for row, value in zip(facts["rows"], facts["values"], strict=True)]
    more = int(facts["total"]) - len(parts)
    if more > 0:
        parts.append(f"{plural(more, 'more row')} {'holds' if more == 1 else 'hold'} text")
    return f"This is a column of numbers, but {listed(parts)}."


def _number_with_text_remedy(facts: Facts) -> str:
    if facts["comma"]:
        return "Write the numbers with a decimal point."
    return (
        "Correct the file; or, where a text means “not recorded”, add it to the column's not_recorded in the plan; "
        'or say kind = "category" there.'
    )


def _not_in_plan(facts: Facts) -> str:
    return f"The plan's levels do not have {with_counts(facts)}."


def _not_in_plan_remedy(facts: Facts) -> str:
    pairs = zip(facts["values"], facts["nearest"], strict=True)
    meant = [f"{value} may be meant for {near}" for value, near in pairs if near]
    hint = f"{listed(meant)}. " if meant else ""
    return (
        f"{hint}Add to levels in {facts['section']}, correct the file, or leave these records out "
        f'with other_levels = "exclude and count".'
    )


def _meant(facts: Facts) -> str:
    return f"Did you mean {facts['nearest']}? " if facts["nearest"] else ""


def _outcome_values(facts: Facts) -> str:
    total = int(facts["total"])
    if total == 0:
        return "The outcome has no recorded value."
    if total == 1:
        return f"The outcome has one value only: {with_counts(facts)}."
    return (
        f"The outcome must have exactly two values among recorded ones, and has {count(total)}: {with_counts(facts)}."
    )


def _outcome_values_remedy(facts: Facts) -> str:
    if int(facts["total"]) < 2:
        return "Name a column with an event and its absence under [outcome]."
    return (
        "Put values that mean “not recorded” into the column's not_recorded, or make a column with two values "
        "and name it under [outcome]."
    )


WHOLE_FAULTS: dict[str, tuple[Sentence, Sentence]] = {
    "file-missing": (
        "There is no such file or folder.",
        "Check the name and the folder; the source that a plan names is looked for beside the plan.",
    ),
    "file-not-regular": ("This is not an ordinary file.", "Save the records as a file."),
    "file-not-readable": ("The file cannot be opened: {reason}.", "Check that you may read it."),
    "file-empty": (
        "There is nothing in it.",
        "Save the records again, with the names of the columns in the first row.",
    ),
    "packed-file": ("The file is packed (gzip).", "Unpack it first."),
    "old-spreadsheet": ("This is a spreadsheet in an old format.", "Save it as .xlsx or as CSV."),
    "folder-without-parquet": ("No file in the folder ends in .parquet.", "Name a folder of Parquet files, or a file."),
    "parquet-not-readable": (
        "The Parquet data cannot be read: a file is damaged, or files of one folder hold different types.",
        "Write it again.",
    ),
    "parquet-files-differ": (
        "The files of the folder do not have the same columns.",
        "Keep only files of one table in the folder.",
    ),
    "spreadsheet-needs-openpyxl": (
        "Reading spreadsheets needs a part that is not installed.",
        'Install it with: pip install "oddsmodel[office]"; or save the sheet as CSV.',
    ),
    "spreadsheet-not-readable": (
        "The file cannot be read as a spreadsheet: it is damaged, protected by a password, or of another kind.",
        "Save it again as .xlsx, or as CSV.",
    ),
    "spreadsheet-too-large": ("The spreadsheet unpacks to more than {gigabytes} GB.", "Save the sheet as CSV."),
    "formula-without-value": (
        lambda facts: (
            f"{plural(int(facts['cells']), 'cell')} with a formula {'was' if int(facts['cells']) == 1 else 'were'} "
            "saved without the value."
        ),
        "Open the file in the spreadsheet program, save it, and try again; or replace formulas by their values.",
    ),
    "encoding-not-read": ("The file is {encoding} text, which is not read.", "Save it as UTF-8."),
    "encoding-mixed": (
        "The file is UTF-8 text, but here it holds bytes that are not.",
        "Save it as UTF-8 again from the program it comes from.",
    ),
    "encoding-unknown": (
        "The text is neither UTF-8 nor Windows-1252, so its letters cannot be told.",
        "Save the file as UTF-8.",
    ),
    "nul-bytes": (
        "There are NUL bytes here: the file is damaged, or it is not text (or UTF-16 without its mark).",
        "Save the records as UTF-8 text again.",
    ),
    "one-column": (
        "The first row is not split by a comma, semicolon, tab or vertical bar.",
        "Separate the fields by one of these, in the row of names and in all others.",
    ),
    "header-not-readable": (
        "A quotation mark in the row of names is not closed.",
        "Close it, and keep each name on one line.",
    ),
    "too-many-columns": (
        lambda facts: (
            f"There are {count(int(facts['columns']))} columns; at most {count(int(facts['most']))} are read."
        ),
        "Keep the columns that the study needs.",
    ),
    "name-empty": (
        lambda facts: f"No name is given for {_numbered('column', facts['positions'])}.",
        "Give each column a name, or take it out.",
    ),
    "name-twice": (
        lambda facts: f"The name {facts['name']} is given to {_numbered('column', facts['positions'])}.",
        "Give each column a name of its own.",
    ),
    "name-not-usable": (
        "The name {name} holds characters that cannot be shown, or has more than {longest} characters.",
        "Give the column a plain name.",
    ),
    "no-row-of-names": (
        lambda facts: f"The first row has only numbers ({listed(list(facts['names']))}), not the names of the columns.",
        "Put a row of names first.",
    ),
    "no-rows": ("There are names of columns, but no row of records.", "Check that the right file was saved."),
    "field-too-long": (
        lambda facts: f"A field has {count(int(facts['bytes']))} bytes; at most 1 million are read.",
        "Look for a quotation mark that is not closed; take long texts out of the file.",
    ),
    "quote-not-closed": (
        "A quotation mark is not closed; the first row with an odd number of them is this one.",
        "Close it, or double a quotation mark that belongs to the text.",
    ),
    "rows-uneven": (
        _uneven,
        "Correct these rows; a text that holds the separating character stands in quotation marks.",
    ),
    "rows-not-readable": (
        "The rows cannot be told apart: a row is longer than 4 million bytes, or quotation marks are misplaced.",
        "Save the records as CSV again.",
    ),
    "decimal-mark-ambiguous": (
        "It cannot be told whether a comma or a point marks the decimals of these numbers.",
        "Write all numbers with a decimal point and without marks for thousands.",
    ),
}

COLUMN_FAULTS: dict[str, tuple[Sentence, Sentence]] = {
    "column-not-in-file": (
        "The records have no column {column}.",
        lambda facts: f"{_meant(facts)}Names are told apart by capital letters.",
    ),
    "column-not-codable": (
        "The column holds {holds}, which have no place in a model.",
        "Make a column with one plain value a row.",
    ),
    "number-with-text": (_number_with_text, _number_with_text_remedy),
    "number-infinite": (
        _with_rows("A value is infinite or too large to be a number:", "."),
        "Correct the file, or name the value in the column's not_recorded.",
    ),
    "number-too-large": (
        _with_rows(f"Whole numbers beyond {count(2**53)} cannot be told apart as numbers:", "."),
        'If they name persons or units, say kind = "identifier" in the plan.',
    ),
    "level-not-in-plan": (_not_in_plan, _not_in_plan_remedy),
    "not-yes-or-no": (
        lambda facts: (
            f"Yes and no are known as yes/no, y/n, true/false and 1/0; the column also has {with_counts(facts)}."
        ),
        'Correct the file, put what means “not recorded” into not_recorded, or say kind = "category" in {section}.',
    ),
    "reference-not-met": (
        "No record has the reference {reference}.",
        lambda facts: f"{_meant(facts)}The levels are {listed(list(facts['levels']))}.",
    ),
    "count-not-whole": (
        _with_rows("A count of records must be a whole number from 0 up, and is not in", "."),
        "Correct the file.",
    ),
    "count-not-number": ("The column of counts does not hold numbers.", "Check that count names the right column."),
    "count-of-none": ("All counts are 0: there are no records.", "Check that count names the right column."),
    "count-too-large": (
        "The counts add up to more than can be counted exactly.",
        "Check that count names the right column.",
    ),
    "outcome-not-two-values": (_outcome_values, _outcome_values_remedy),
    "event-left-open": (
        lambda facts: (
            f"The outcome is {listed(list(facts['values']), 'or')}, and which of them is the event is not said."
        ),
        lambda facts: f"Add event = {facts['written'][0]} or event = {facts['written'][1]} under [outcome].",
    ),
    "event-not-met": (
        lambda facts: f"The event {facts['event']} is none of the outcome's values, {listed(list(facts['values']))}.",
        lambda facts: f"{_meant(facts)}Name one of the two.",
    ),
    "date-in-formula": (
        "{column} is a date, which has no place in a formula.",
        'Make years of it in the plan, as in [derived.age] with years_between = ["born", "admitted"].',
    ),
    "identifier-in-formula": (
        "{column} is an identifier, which has no place in a formula.",
        "Take it out; or, if it is a category, say so with kind in the plan.",
    ),
}

CONDITION_FAULTS: dict[str, tuple[Sentence, Sentence]] = {
    "condition-too-long": (
        "The condition is too long: at most {longest} characters.",
        "Make a column that says who belongs, and keep by that.",
    ),
    "condition-too-deep": (
        "Parentheses and not are nested more than {deepest} deep.",
        "Write the condition more plainly.",
    ),
    "condition-single-equals": ("A single = compares nothing.", "Write == for equal."),
    "condition-quote-not-closed": ("A quotation mark is not closed.", "Close it with the mark that opened it."),
    "condition-word-for-sign": (
        "The sign {sign} has no meaning here.",
        "Write the word {word}; for unequal, write !=.",
    ),
    "condition-sign": (
        "{sign} has no meaning in a condition.",
        "Use == != < <= > >=, and, or, not, in [..] and is recorded; there is no arithmetic.",
    ),
    "condition-unexpected": (
        "{met} stands where {expected} is needed.",
        "Use == != < <= > >=, and, or, not, in [..] and is recorded; there is no arithmetic.",
    ),
    "condition-unknown-column": (
        "The records have no column {column}.",
        lambda facts: (
            f"{_meant(facts)}A text goes in quotation marks; a column whose name has spaces or signs in it "
            f"goes between backticks: `birth weight`."
        ),
    ),
    "condition-not-a-column": ("{text} is not a column.", "Write the name of a column first."),
    "condition-bare-column": (
        "{column} stands alone: it is compared with nothing.",
        'Write what it must be, such as column == "yes".',
    ),
    "condition-bare-text": (
        "{text} is neither a number nor a text in quotation marks, and no column has that name.",
        "Write {written} with its quotation marks if it is a value.",
    ),
    "condition-call": ("{name} is used as a function, and a condition has none.", "Compare columns with values."),
    "condition-without-column": ("Two values are compared, and no column.", "Name a column on one side."),
    "condition-two-columns": (
        lambda facts: f"{listed(list(facts['columns']))} are not both numbers.",
        "Only number columns can be compared with each other.",
    ),
    "condition-number-with-text": (
        "{column} is a number and cannot be compared with {text}.",
        "Compare it with a number.",
    ),
    "condition-unknown-level": (
        "{column} has no level {level}.",
        lambda facts: f"{_meant(facts)}The levels are {listed(list(facts['levels']))}.",
    ),
    "condition-order": (
        "{column} is of the kind {kind}, which has no order.",
        'Use == or in [..]; or say kind = "ordered" with its levels in the plan.',
    ),
}

FAULTS: dict[str, tuple[Sentence, Sentence]] = WHOLE_FAULTS | COLUMN_FAULTS | CONDITION_FAULTS
