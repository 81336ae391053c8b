"""Sentences of the plan floor, by code: what is wrong with a plan, and under `<code>-remedy` what to do."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from oddsmodel.wording.numbers import listed
from oddsmodel.wording.plan_derived import SENTENCES as DERIVED
from oddsmodel.wording.plan_models import SENTENCES as MODELS
from oddsmodel.wording.plan_outcome import OUTCOME_FAULTS
from oddsmodel.wording.say import Sentence

LONGEST_LIST = 12


def _nearest_or_all(facts: Mapping[str, Any]) -> str:
    """ "Did you mean ...?" where one is near, and what there is to choose from."""
    valid = list(facts["valid"])
    choice = listed([*valid[:LONGEST_LIST], "others"] if len(valid) > LONGEST_LIST else valid, facts["last"])
    meant = f"Did you mean {facts['nearest']}? " if facts["nearest"] else ""
    return f"{meant}{facts['choice']} {choice}." if valid else meant.strip()


def _others(facts: Mapping[str, Any]) -> str:
    return f"{facts['number']} more {'fault was' if facts['number'] == 1 else 'faults were'} found."


FAULTS: dict[str, tuple[Sentence, Sentence]] = {
    # The file.
    "plan-missing": (
        "There is no such file.",
        "Check the name and the folder. `oddsmodel draft RECORDS --outcome COLUMN` writes a starter plan.",
    ),
    "plan-is-a-folder": ("This is a folder, not a plan.", "Name the plan inside it, a file such as plan.toml."),
    "plan-not-a-file": ("This is not an ordinary file.", "Save the plan as a file of its own and name that."),
    "plan-unreadable": ("The file could not be read: {reason}.", "Check that you may open it."),
    "plan-too-large": (
        "The file is larger than {megabytes} MB, far more than a plan can need.",
        "Check that this is the plan and not the records.",
    ),
    "plan-not-utf-8": (
        "The file is not UTF-8 text: line {line} holds a byte that cannot be read.",
        "Save it as UTF-8 in your editor.",
    ),
    "plan-nested-too-deeply": (
        "Sections or lists are nested far deeper than a plan can need.",
        "A plan has sections, keys and lists of values, no more.",
    ),
    # The file as TOML. Where a line is at fault, it follows the sentence.
    "toml-value": (
        "What stands after the equals sign is not a value{line}.",
        'Text goes in quotes ("yes"), numbers have a decimal point (1.5), true and false are written small and '
        'lists stand in brackets (["a", "b"]).',
    ),
    "toml-curly-quotes": (
        "Curly quotation marks stand where straight ones are needed{line}.",
        'Replace them by ", as a plain text editor writes them.',
    ),
    "toml-twice": (
        "A key or a section is written twice{line}.",
        "Keep one of the two. Only models are written several times, each under [[models]] in double brackets.",
    ),
    "toml-equals": (
        "A key is not followed by an equals sign{line}.",
        "Write key = value; a key with a space or an accent in it goes in quotes.",
    ),
    "toml-line-end": (
        "Something follows where the value has ended{line}.",
        "Write one key = value a line, numbers with a decimal point, texts with double quotes inside in single ones.",
    ),
    "toml-statement": ("This is neither a key, a [section] nor a # comment{line}.", "Begin the line with one of them."),
    "toml-name": (
        "A name is missing or begins with a character that needs quotes{line}.",
        'Put the name in quotes, such as [columns."body mass"].',
    ),
    "toml-list": ("A list is not closed{line}.", "End the list with ], with commas between its values."),
    "toml-braces": ("A value in braces is not closed{line}.", "End it with }}, with commas between its parts."),
    "toml-heading": ("A heading is not closed{line}.", "End it with ], or with ]] for [[models]]."),
    "toml-backslash": (
        "A backslash in double quotes has a meaning of its own{line}.",
        "Write the text in single quotes, or with / in place of the backslash.",
    ),
    "toml-text": (
        "A text in quotes is not closed, or a control character stands in it{line}.",
        "End the text with the quotes that open it, on the same line.",
    ),
    "toml-date": ("This date does not exist{line}.", "Write a date as 2026-01-31, or a text in quotes."),
    "toml-other": ("The plan is not TOML from here on{line}.", "Compare it with a plan that `oddsmodel draft` writes."),
    # Keys and values.
    "section-missing": ("The plan has no {heading} section.", "Add {heading} and under it {example}."),
    "key-missing": ("{key} is missing.", "Add a line such as {example}."),
    "unknown-section": ("The plan has no section or key called “{key}”.", _nearest_or_all),
    "unknown-key": ("{heading} has no key called “{key}”.", _nearest_or_all),
    "key-of-another-section": ("{heading} has no key called “{key}”.", "It belongs under {other}: move it there."),
    "dotted-column-name": (
        "“{key}” stands below [columns.{column}] as a section of its own, which no column has.",
        "If the column's name has a full stop in it, put the name in quotes: {example}.",
    ),
    "not-a-section": (
        "This is {found} where a section is wanted.",
        "Write {heading} on a line of its own and its keys below.",
    ),
    "not-a-section-per-column": (
        "This is {found} where a section for each column is wanted.",
        "Write a heading such as [{section}.age] and below it the keys of that column.",
    ),
    "not-a-list-of-models": (
        "This is {found} where models are wanted.",
        "Head each model with [[models]], in double brackets, and give it a name below.",
    ),
    "wrong-kind-of-value": ("This is {found} where {wanted} is wanted.", "Write it as {example}."),
    "empty-text": ("The text is empty.", "Write something there, such as {example}."),
    "not-one-of": ("{found} is not one of the values that this key can have.", _nearest_or_all),
    "per-not-positive": ("{found} cannot be the step of an odds ratio.", 'Give a number above 0, or per = "SD".'),
    "out-of-range": ("{found} is outside the range from {least} to {most}.", "Give a number within it."),
    "level-in-percent": (
        "{found} is outside the range from {least} to {most}.",
        "For a {found}% interval write level = {share}.",
    ),
    "not-readable-as": ("The value cannot be used here ({problem}).", "Write it as {example}."),
    "more-faults": (_others, "Put these right first and check the plan again."),
    # What a later version brings.
    "later-outcomes": (
        "This version takes only one outcome a plan, as yet.",
        "Until then, write a plan for each outcome, with [outcome] in single brackets.",
    ),
    "later-missing": (
        "This version fills in no values that were not recorded yet: it analyses complete records.",
        "Until then, take the section out; the report counts which records were left out and why.",
    ),
    "later-risks": (
        "This version gives no risks for a case-control study yet.",
        "Until then, take the line out; the odds ratios do not need it.",
    ),
    "later-control-sampling": (
        "This version cannot allow for how controls were sampled yet: it reports odds ratios.",
        "Until then, take the line out, and say in `question` how the controls were sampled.",
    ),
    "later-smallest-important": (
        "This version compares nothing with a smallest important odds ratio yet.",
        "Until then, take the line out and judge the interval against it by eye.",
    ),
    "later-compare-with": (
        "This version compares levels in this way for a whole column only, as yet.",
        "Until then, take the line out and write compare_with in the section of the exposure's column.",
    ),
    "later-matched": (
        "This version fits no matched sets yet.",
        "Until then, analyse matched studies elsewhere: leaving out the matching would bias the odds ratio.",
    ),
    "later-weight": (
        "This version uses no sampling weights yet.",
        "Until then, take the line out; true counts of equal records go under count.",
    ),
    "later-survey": ("This version makes no allowance for a survey's design yet.", "Until then, take the line out."),
    "later-modifiers": (
        "This version gives no odds ratios by stratum yet.",
        "Until then, take the line out; a product such as smoker:sex may stand in the formula.",
    ),
    "later-hiding": (
        "This version hides small counts under one threshold only, as yet.",
        "Until then, take the line out and use hide_counts_below.",
    ),
    "later-earlier": (
        "This version does not compare a report with earlier ones yet.",
        "Until then, take the line out and check by hand that the two reports together give no small count away.",
    ),
    "not-a-size": (
        "{found} is not a size of memory of 1 GB or more.",
        'Write a number with MB, GB or TB in quotes, such as memory = "2 GB".',
    ),
    "database-not-on-workers": (
        "Records in a database cannot be read by workers.",
        "Leave --workers out, or write the records to Parquet files that every worker can read.",
    ),
    "needs-memory": (
        "This needs all records in memory at once, and they do not fit into the memory that the run may use.",
        "Raise [run] memory if the machine has more, or take the line out.",
    ),
    # The plan against itself.
    "no-models": ("The plan has no model.", "Add [[models]] with name, formula and exposures."),
    "model-name-repeated": (
        "Models number {first} and {second} have the same name (small and capital letters count as the same).",
        "Give each model a name of its own.",
    ),
    "model-name-too-long": ("The name is longer than {longest} characters.", "Shorten it: it heads tables."),
    "model-name-control": ("The name holds a line break or another control character.", "Write it on one line."),
    "no-exposures": (
        "The list is empty: the model must say which of its columns the question is about.",
        'Name at least one, such as exposures = ["smoker"].',
    ),
    "exposure-repeated": ("{exposure} is listed twice.", "List it once."),
    "exposure-is-the-outcome": (
        "{exposure} is the outcome, so it cannot be an exposure.",
        "Name the column that is asked about.",
    ),
    "exposure-is-the-count": (
        "{exposure} counts how many records each row stands for, so it cannot be an exposure.",
        "Name the column that is asked about.",
    ),
    "outcome-is-the-count": (
        "{column} is named both as the outcome and as the count of records that each row stands for.",
        "Name the column that holds whether the event happened; its rows then carry the count.",
    ),
    "outcome-key": ("{column} is the outcome, for which {key} has no meaning.", "Take the line out."),
    "outcome-reference": (
        "{column} is the outcome, for which {key} has no meaning.",
        "Take the line out and name the value that is the event as event in [outcome].",
    ),
    "event-not-recorded": (
        "{event} is both the event and a text that means “not recorded”.",
        "Name another event, or take it out of not_recorded.",
    ),
    "per-beside-levels": ("A column with levels is no number, so it has no step.", "Take out either per or levels."),
    "outcome-kind": (
        "A column of the kind “{kind}” cannot be the outcome, which has two values.",
        'Take the line out, or write kind = "yes-no".',
    ),
    "outcome-levels": ("The outcome has {number} levels here, but it must have exactly two.", "Name the two values."),
    "event-not-a-level": ("{event} is not among the levels that the outcome's own section lists.", _nearest_or_all),
    "count-key": ("{column} counts records, for which {key} has no meaning.", "Take the line out."),
    "count-kind": (
        "A column of the kind “{kind}” cannot count records.",
        'Take the line out, or write kind = "number".',
    ),
    "levels-too-few": (
        "At least two levels are needed, and {number} given.",
        "List every level, the reference among them.",
    ),
    "levels-yes-no": (
        "A yes-no column has two levels, and {number} are listed.",
        'List two, or write kind = "category".',
    ),
    "levels-missing-ordered": (
        "An ordered column needs its levels, since their order cannot be told from the records.",
        'Add a line such as levels = ["low", "middle", "high"], the lowest first.',
    ),
    "level-repeated": ("{level} is listed twice.", "List each level once."),
    "level-not-recorded": (
        "{level} is both a level and a text that means “not recorded”.",
        "Keep it in one of the two lists; a column may have a not_recorded list of its own.",
    ),
    "reference-not-a-level": ("{reference} is not among the levels.", _nearest_or_all),
    "key-for-levels": (
        "{key} has a meaning only for a column with levels, and this one is of the kind “{kind}”.",
        'Take the line out, or write kind = "category".',
    ),
    "key-for-numbers": (
        "{key} has a meaning only for numbers, and this column is of the kind “{kind}”.",
        'Take the line out, or write kind = "number".',
    ),
    "draft-outcome-name": (
        "The outcome's name is empty, longer than 200 characters or holds characters that no text file can.",
        "Rename the column.",
    ),
    "draft-no-exposure": (
        "No column besides the outcome can be an exposure: each has one value only, too many, or names or dates.",
        "Add the column that the question is about.",
    ),
    "check-unknown": (
        "There is no check called {check} to ask for.",
        _nearest_or_all,
    ),
}

DRAFT: dict[str, Sentence] = {
    "draft-title": "A starter plan for {source} ({records}), written by `oddsmodel draft`.",
    "draft-how": "Lines that begin with # are comments. Settle the points below, then check the plan and run it.",
    "draft-to-settle": "To settle:",
    "draft-settle-event": "Which value of {column} is the event? Say it under [outcome].",
    "draft-settle-exposure": (
        "What is the question about? The model has {column} as its exposure, being the first column that can be one."
    ),
    "draft-settle-adjustment": (
        "Which columns to adjust for? Those that bear on the outcome and on who was exposed. A column measured after "
        "the exposure may be one of its effects: leave it out."
    ),
    "draft-settle-design": "How did the records come about? The design decides what the report may say.",
    "draft-settle-columns": "Is each column what it was taken for, and is its reference the level to compare with?",
    "draft-settle-values": "{column} must have exactly two values to be an outcome; now it does not.",
    "draft-settle": "To settle: {question}",
    "draft-settle-these": "to settle: do these mean not recorded?",
    "draft-settle-codes": "to settle: and these?",
    "draft-question": "the question in one sentence",
    "draft-design": "or cross-sectional, case-control, trial",
    "draft-not-measured": 'confounders that nobody recorded, such as ["frailty"]',
    "draft-not-recorded": "cell texts that mean not recorded",
    "draft-keep": "who belongs to the study",
    "draft-count": "the column that says how many equal records a row stands for",
    "draft-event-open": "to settle",
    "draft-values": "Values, with rounded numbers of records: {values}",
    "draft-label": "what the report calls it",
    "draft-without-value": "Not recorded: {records}",
    "draft-per": 'the odds ratio is for a step of this size; "SD" for one standard deviation',
    "draft-reference": "the level that the others are compared with",
    "draft-levels-unlisted": "{number} different values, too few or too many to compare as levels",
    "draft-timing": "before or after the exposure?",
    "draft-name-unusable": "A column is left out here: its name is too long or cannot be written.",
    "draft-columns-left": "Not described here, but as usable as the others: {number} more of the columns.",
    "draft-candidates": "With every other candidate (take out what does not belong):",
    "draft-exposures": "what the question is about",
    "draft-audience": 'or "internal", which shows small counts',
    "draft-hide": "counts below this are hidden",
}

SENTENCES: dict[str, Sentence] = (
    {code: what for code, (what, _) in (FAULTS | OUTCOME_FAULTS).items()}
    | {f"{code}-remedy": remedy for code, (_, remedy) in (FAULTS | OUTCOME_FAULTS).items()}
    | DRAFT
    | MODELS
    | DERIVED
)
