"""Sentences of the command line, by code; for its faults, under `<code>-remedy` what to do."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from oddsmodel.wording.numbers import plural
from oddsmodel.wording.plain import plain, quoted
from oddsmodel.wording.say import Sentence


def _machine(facts: Mapping[str, Any]) -> str:
    where = f" ({facts['file']})" if facts["file"] else ""
    return f"The machine refused: {facts['reason']}{where}. Nothing half-done is left."


def _analysed(facts: Mapping[str, Any]) -> str:
    words = f"{plural(facts['records'], 'record')} to be analysed"
    return f"{words}, {plural(facts['events'], 'event')} among them." if facts["events"] is not None else f"{words}."


FAULTS: dict[str, tuple[str, str]] = {
    "draft-exists": ("There is something of this name already, and it is not overwritten.", "Choose another name."),
    "draft-no-folder": ("The folder for this file does not exist.", "Make the folder first, or name another."),
    "demo-folder-not-empty": ("The folder is not empty.", "Name a new folder, or an empty one."),
    "demo-not-a-folder": ("There is a file of this name.", "Name a new folder, or an empty one."),
    "table-form": (
        "A table needs either --exposed and --unexposed, or --cases and --controls.",
        "Write, for instance, oddsmodel table --exposed 20/100 --unexposed 10/120.",
    ),
    "table-not-a-part": (
        "{found} is not a number out of a total.",
        "Write two whole numbers with a stroke, such as 20/100.",
    ),
    "table-part-too-large": (
        "{part} is more than the total of {whole}.",
        "Write the smaller number first: those with the event (or exposed), a stroke, then all of them.",
    ),
    "table-level-in-percent": (
        "{found} is outside the range from {least} to {most}.",
        "For a {found}% interval write --level {share}.",
    ),
}

SENTENCES: dict[str, Sentence] = {
    # Endings
    "to-put-right": lambda facts: f"{plural(facts['faults'], 'thing')} to put right:",
    "interrupted": "Interrupted. Nothing half-done is left.",
    "out-of-memory": "The machine ran out of memory. Your plan and records are not at fault.",
    "machine-failed": _machine,
    "program-failed": (
        "The program itself failed ({kind}: {reason}); your plan and records need not be at fault. "
        "To see where, set the environment variable {variable}=1 and run the command again."
    ),
    # Progress
    "stage-reading": "Reading the records",
    "stage-gathering": "Gathering the columns of the models",
    "stage-fitting": "Fitting the models",
    "stage-counting outcomes": "Counting outcomes for exact inference",
    "stage-profiling": "Profiling the likelihood",
    "stage-checking": "Checking the models",
    "stage-validating": "Fitting the models again to resamples",
    "stage-drawing": "Drawing the report",
    # run, check, draft, demo
    "report-is-in": "The report is in {file}",
    "read-this-first": "Read this first:",
    "what-was-found": "What was found:",
    "more-findings": "… and {number} more, in the report.",
    "model-not-estimated": lambda facts: (
        f"The model {quoted(facts['name'])} could not be estimated; the report says why."
    ),
    "records-were-read": lambda facts: f"{facts['source']}: {plural(facts['records'], 'record')} read.",
    "outcome-is": lambda facts: (
        f"The outcome is {quoted(facts['column'])}; "
        f"its event is {quoted(facts['event'])}, against {quoted(facts['other'])}."
    ),
    "model-is": lambda facts: f"Model {quoted(facts['name'])}: {plain(facts['formula'], 300)}",
    "model-has": lambda facts: f"{plural(facts['coefficients'], 'coefficient')} to be estimated.",
    "records-left-out": lambda facts: f"{plural(facts['records'], 'record')} left out. {facts['reason']}.",
    "records-analysed": _analysed,
    "cannot-all-be-fitted": "At least one model cannot be estimated as it stands; nothing was fitted.",
    "draft-written": "{file} is written. Settle the points at its top, then run `oddsmodel check` with it.",
    "demo-copied": "The plan of an invented study is in {plan}",
    # table
    "table-event": "event",
    "table-no-event": "no event",
    "table-cases": "cases",
    "table-controls": "controls",
    "table-all": "all",
    "table-exposed": "exposed",
    "table-unexposed": "unexposed",
    "table-sample": "Odds ratio",
    "table-woolf": "  {percent} interval, Woolf",
    "table-conditional": "Odds ratio given the table's margins",
    "table-exact": "  {percent} interval, exact",
    "table-exact-p": "  p-value, exact (twice the smaller tail)",
    "table-mid-p": "  {percent} interval, mid-P",
    "table-mid-p-p": "  p-value, mid-P",
    "table-risk-exposed": "Risk of the exposed ({percent} interval, Wilson)",
    "table-risk-unexposed": "Risk of the unexposed ({percent} interval, Wilson)",
    "table-risk-difference": "Risk difference in percentage points ({percent} interval, Newcombe)",
    "table-risk-ratio": "Risk ratio ({percent} interval, Katz)",
    "table-same-reason": "none, for the same reason",
    "table-crude": "All of this is crude: nothing is adjusted for, and association is not causation.",
}
SENTENCES |= {code: what for code, (what, _) in FAULTS.items()}
SENTENCES |= {f"{code}-remedy": remedy for code, (_, remedy) in FAULTS.items()}
