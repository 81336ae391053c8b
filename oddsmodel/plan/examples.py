"""One good line for each key of the plan, shown where a line is missing or of the wrong kind."""

from __future__ import annotations

from collections.abc import Sequence

EXAMPLES: dict[str, dict[str, str]] = {
    "study": {
        "title": 'title = "Smoking and readmission"',
        "question": 'question = "Are smokers readmitted more often?"',
        "design": 'design = "cohort"',
        "aim": 'aim = "association"',
        "not_measured": 'not_measured = ["frailty"]',
    },
    "records": {
        "source": 'source = "records.csv"',
        "not_recorded": 'not_recorded = ["", "NA"]',
        "keep": 'keep = "age >= 18"',
        "count": 'count = "n"',
    },
    "columns": {
        "kind": 'kind = "category"',
        "levels": 'levels = ["never", "current"]',
        "reference": 'reference = "never"',
        "other_levels": 'other_levels = "stop"',
        "label": 'label = "Smoking"',
        "timing": 'timing = "before exposure"',
        "why": 'why = "differs by ward, affects readmission"',
        "units": 'units = "years"',
        "per": 'per = 10 or per = "SD"',
        "not_recorded": 'not_recorded = ["999"]',
    },
    "outcome": {"column": 'column = "died"', "event": 'event = "yes"', "label": 'label = "Death within 30 days"'},
    "models": {
        "name": 'name = "main"',
        "formula": 'formula = "smoker + age + sex"',
        "exposures": 'exposures = ["smoker"]',
        "level": "level = 0.95",
        "keep": 'keep = "age >= 18"',
        "same_records": "same_records = false",
    },
    "report": {"audience": 'audience = "shareable"', "hide_counts_below": "hide_counts_below = 5"},
    "checks": {"also": "also = []"},
    "run": {"seed": "seed = 20260101"},
}


def example(location: Sequence[str | int]) -> str:
    """The example line of the key at `location`; for a section, its first line."""
    section, *rest = location
    if section in ("columns", "models"):
        rest = rest[1:]
    lines = EXAMPLES.get(str(section), {})
    return lines.get(str(rest[0]) if rest else "", next(iter(lines.values()), 'key = "value"'))
