"""Sentences on results set side by side and on the index of reports, by code; for faults, `<code>-remedy`."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from oddsmodel.wording.numbers import count, listed, plural
from oddsmodel.wording.say import Sentence

MOST_LISTED = 12


def _few(words: list[str]) -> str:
    """Words in quotes, the first of very many."""
    quoted = [f"“{word}”" for word in words[:MOST_LISTED]]
    more = len(words) - len(quoted)
    return listed([*quoted, f"{more} more"] if more else quoted)


def _levels_new(facts: Mapping[str, Any]) -> str:
    words = "has a level that it did not have before" if len(facts["levels"]) == 1 else "has new levels"
    return f"“{facts['label']}” {words}: {_few(facts['levels'])}."


def _levels_gone(facts: Mapping[str, Any]) -> str:
    words = "no longer has the level" if len(facts["levels"]) == 1 else "no longer has the levels"
    return f"“{facts['label']}” {words} {_few(facts['levels'])}."


def _reference(facts: Mapping[str, Any]) -> str:
    return (
        f"The reference of “{facts['label']}”, which the plan leaves open, was “{facts['before']}” and is now "
        f"“{facts['after']}”."
    )


def _programs(facts: Mapping[str, Any]) -> str:
    told = [f"{name} {before or 'none'}, then {after or 'none'}" for name, before, after in facts["changed"]]
    return f"Made with other versions: {'; '.join(told)}."


def _analysed(facts: Mapping[str, Any]) -> str:
    return f"Analysed: {_few(facts['models'])}" if facts["models"] else "Analysed"


def _events(facts: Mapping[str, Any]) -> str:
    return f"With the event: {_few(facts['models'])}" if facts["models"] else "With the event"


def _none_of_its_own(facts: Mapping[str, Any]) -> str:
    return f"Without an odds ratio of its own in any of the results: {_few(facts['labels'])}."


def _based_on(facts: Mapping[str, Any]) -> str:
    words = []
    if facts["read"] is not None:
        words.append(f"{plural(facts['read'], 'record')} read")
    if facts["analysed"] is not None:
        words.append(f"{count(facts['analysed'])} analysed")
    if facts["events"] is not None:
        words.append(f"{count(facts['events'])} with the event")
    return f"{', '.join(words)}." if words else "How many records is not shown."


def _findings(facts: Mapping[str, Any]) -> str:
    words = [
        plural(facts[name], one)
        for name, one in (("stops", "stop"), ("cautions", "caution"), ("notes", "note"))
        if facts[name]
    ]
    return f"Findings: {listed(words)}." if words else "No findings."


FAULTS: dict[str, tuple[str, str]] = {
    "results-missing": ("There is no such file.", "Check the name and the folder."),
    "results-is-a-folder": ("This is a folder.", "Name the results.json inside it."),
    "results-not-a-file": ("This is not an ordinary file.", "Name a results.json that `oddsmodel run` wrote."),
    "results-unreadable": ("The file could not be read: {reason}.", "Check that you may open it."),
    "results-too-large": (
        "The file is larger than {megabytes} MB, far more than results can need.",
        "Name a results.json that `oddsmodel run` wrote.",
    ),
    "results-not-utf-8": ("The file is not UTF-8 text.", "Name a results.json as `oddsmodel run` wrote it."),
    "results-not-json": ("The file cannot be read as JSON: {why}.", "Name a results.json as `oddsmodel run` wrote it."),
    "results-not-ours": (
        "The file is JSON, but not results of oddsmodel: it states no schema_version.",
        "Name a results.json that `oddsmodel run` wrote.",
    ),
    "results-other-major": (
        "The results are of version {found}, and this program reads version {major} only.",
        "Run the plan again, or use the program that wrote them.",
    ),
    "results-key-missing": (
        "This key is not there.",
        "The file was changed after the run: take an unchanged copy, or run the plan again.",
    ),
    "results-value": (
        "The value here is not what results hold at this place.",
        "The file was changed after the run: take an unchanged copy, or run the plan again.",
    ),
    "results-more-faults": ("Not what they should be: {number} more.", "Mend those above first."),
    "changes-too-few": (
        "There is nothing to compare: name at least two results.",
        "Write oddsmodel changes EARLIER/results.json LATER/results.json.",
    ),
    "changes-too-many": ("More than {most} results were named.", "Compare fewer at a time."),
    "page-not-html": ("The page to write is no .html file.", "Give it a name such as {name}."),
    "page-not-ours": (
        "There is a file of this name already that this command did not write, and it is not overwritten.",
        "Choose another name.",
    ),
    "page-no-folder": ("The folder for this file does not exist.", "Make the folder first, or name another."),
    "shelf-no-folder": ("There is no such folder.", "Name a folder that holds reports."),
    "shelf-empty": (
        "No report was found in this folder or in those within it.",
        "Reports are found by their oddsmodel-manifest.json and results.json, as `oddsmodel run` writes them.",
    ),
    "shelf-too-large": (
        "There are more than {most} folders within this one.",
        "Name a folder that holds reports and little else.",
    ),
}

SENTENCES: dict[str, Sentence] = {
    # Why JSON cannot be read
    "json-broken": "it breaks off or goes wrong in line {line}",
    "json-too-deep": "its lists and objects are nested far deeper than results can need",
    "json-number": "it holds a number that is not finite, or one of far too many digits",
    "json-key-twice": "the key {key} stands twice in one object",
    # What the differences can come from
    "cause-plan-same-records-same": (
        "Plan and records are the same, byte for byte: no number can differ but by the versions of the programs."
    ),
    "cause-plan-same-records-other": (
        "The plan is the same, word for word; the records are another file. What differs comes from the records."
    ),
    "cause-plan-unseen-records-same": (
        "The records are the same file. The plan's text differs, but in nothing that is compared here: in comments, "
        "in reasons, or in where it says that the records are."
    ),
    "cause-plan-unseen-records-other": (
        "The records are another file. The plan's text differs, but in nothing that is compared here: in comments, in "
        "reasons, or in where it says that the records are."
    ),
    "cause-plan-changed-records-same": (
        "The records are the same file, byte for byte; the plan changed. What differs comes from the plan."
    ),
    "cause-plan-changed-records-other": (
        "Both the plan and the records changed, so that a difference cannot be put down to either. To tell them "
        "apart, run the later plan on the earlier records too (`oddsmodel run PLAN --records FILE`)."
    ),
    # Changes of the plan
    "plan-entry-new": "{where} is new.",
    "plan-entry-gone": "{where} is no longer there.",
    "plan-entry-number": "number {number}",
    "plan-key-new": "{where} is new: {after}",
    "plan-key-gone": "{where} is no longer there; it was {before}",
    "plan-key-changed": "{where} was {before} and is now {after}",
    "plan-more-changes": "… and {number} more in the plan.",
    # Changes of the records
    "column-kind": "“{label}”, whose kind the plan leaves open, was taken as {before} and is now taken as {after}.",
    "column-levels-new": _levels_new,
    "column-levels-gone": _levels_gone,
    "column-reference": _reference,
    "programs-changed": _programs,
    "overlap-same": "It is the same file of records: the two sets of estimates rest on the same people.",
    "overlap-larger": (
        "The later file holds more records. Whether it holds those of the earlier one cannot be told from here; each "
        "extract may hold records of the one before, and then the estimates are not independent."
    ),
    "overlap-smaller": (
        "The later file holds fewer records, so it is not simply the earlier one with records added. It may still "
        "hold records of the one before, and then the estimates are not independent."
    ),
    "overlap-about-as-many": (
        "The later file is another one with as many records, or nearly so. It may be the earlier one corrected: the "
        "estimates are then not independent."
    ),
    "overlap-unknown": (
        "How many records were read is not shown everywhere. Each extract may hold records of the one before, and "
        "then the estimates are not independent."
    ),
    # Models
    "model-new": "The model “{name}” is new.",
    "model-gone": "The model “{name}” is no longer there.",
    "model-now-estimated": "The model “{name}”, which could not be estimated before, now is.",
    "model-not-estimated-now": "The model “{name}” was estimated before and now could not be ({status}).",
    "finding-of-model": "{name}: {message}",
    "other-outcome": (
        "The outcome or its event is not the same everywhere: the odds ratios answer different questions."
    ),
    "other-design": "The design is not the same everywhere, so the odds ratios need not mean the same.",
    "other-title": "The studies have different titles. Make sure that they are one study.",
    "internal-among-them": "Some of the results are internal and some shareable: this comparison is internal.",
    # The counts
    "table-counts": "Records of each refresh",
    "column-count": "Records",
    "count-read": "Read",
    "count-left-out": "Left out. {reason}",
    "count-analysed": _analysed,
    "count-events": _events,
    "fewer-apart": "fewer than {threshold} apart",
    "fewer-apart-note": (
        "“fewer than {threshold} apart” stands for a count that, or the rest of which, lies less than {threshold} "
        "from one before it in its row: the difference between two counts is itself a count of people."
    ),
    # The series
    "series-title": "{model}: odds ratios of the exposure, refresh by refresh",
    "series-table": "{model}: the numbers of the series",
    "column-refresh": "Refresh",
    "column-interval": "{percent} interval",
    "series-no-reason": "not shown",
    "series-no-model": "no such model",
    "series-no-contrast": "no such contrast",
    "series-not-estimated": "not estimated",
    "series-too-large": "too far from 1 to be drawn",
    "series-none": _none_of_its_own,
    "series-not-drawn": "There are too many series to draw; the numbers stand in the table.",
    "series-other-adjustment": (
        "The model is not adjusted for the same columns everywhere. Odds ratios that are adjusted for different "
        "columns differ even without any confounding, so a change here is not a change in the people."
    ),
    "series-other-formula": "The formula of the model is not the same everywhere.",
    "series-other-level": "The level of the intervals is not the same everywhere.",
    "series-own-deviation": (
        "Odds ratios per standard deviation are each per the standard deviation of their own extract."
    ),
    "series-units-unknown": (
        "Some of the results do not say per how many units the odds ratio of a number is told; see their labels."
    ),
    "series-moved": "{label}: the estimate of “{after}” lies outside the interval of “{before}”.",
    # The page and the terminal
    "changes-title": "Changes: {title}",
    "changes-contents": "On this page",
    "changes-eyebrow": "What changed",
    "changes-lead": "{number} results of one study, in the order in which they were given.",
    "changes-read": (
        "Two intervals that overlap, or do not, are no test of whether two odds ratios differ, least of all where "
        "extracts share records. No such test is made here."
    ),
    "changes-series": "The answer, refresh by refresh",
    "changes-other-models": "The other models",
    "changes-counts": "Who was counted",
    "changes-steps": "What changed, and why",
    "changes-step": "From “{before}” to “{after}”",
    "changes-plan": "In the plan",
    "changes-records": "In the records, the plan being silent",
    "changes-models": "In the models",
    "changes-appeared": "New to keep in mind",
    "changes-went": "No longer found",
    "changes-made-from": "What was compared",
    "changes-made-from-plan": "Plan, fingerprint (SHA-256)",
    "changes-made-from-records": "Records, fingerprint (SHA-256)",
    "changes-none-estimated": "No odds ratio of the exposure stands in any of the results.",
    "changes-written": "The page is in {file}",
    # The index
    "shelf-title": "Study reports",
    "shelf-eyebrow": "Index",
    "shelf-lead": lambda facts: f"{plural(facts['number'], 'report')}, by title.",
    "shelf-banner": (
        "INTERNAL. At least one report listed here shows every count. It is not for sharing outside the organisation."
    ),
    "shelf-internal": "Internal",
    "shelf-no-answer": "The answer is in the report.",
    "shelf-open": "Open the report",
    "shelf-place": "In the folder",
    "shelf-no-report": "Its report is not there.",
    "shelf-records": _based_on,
    "shelf-findings": _findings,
    "shelf-changed": "Its results were changed after the run.",
    "shelf-left-out": "Not listed",
    "shelf-left-out-reason": "{folder}: {reason}",
    "shelf-unfinished": "its results are not there.",
    "shelf-manifest": "its oddsmodel-manifest.json cannot be read.",
    "shelf-written": lambda facts: f"The index of {plural(facts['number'], 'report')} is in {facts['file']}",
}
SENTENCES |= {code: what for code, (what, _) in FAULTS.items()}
SENTENCES |= {f"{code}-remedy": remedy for code, (_, remedy) in FAULTS.items()}
