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
        "query": 'query = "select * from admissions where year = 2025"',
        "table": 'table = "admissions"',
        "not_recorded": 'not_recorded = ["", "NA"]',
        "keep": 'keep = "age >= 18"',
        "count": 'count = "n"',
        "grouped_by": 'grouped_by = "patient"',
        "repeats": 'repeats = {of = "patient", use = "first", ordered_by = "admitted"}',
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
        "scores": "scores = [0, 1, 2]",
        "compare_with": 'compare_with = "network average"',
        "from": 'from = "Parity (n)"',
        "plausible": "plausible = [0, 20]",
    },
    "derived": {
        "bands_of": 'bands_of = "age"',
        "edges": "edges = [40, 60, 80]",
        "years_between": 'years_between = ["born", "admitted"]',
        "points": "points = {diabetes = 1, cancer = 2}",
        "if_part_missing": 'if_part_missing = "zero"',
        "groups_of": 'groups_of = "ward"',
        "quantile_groups_of": 'quantile_groups_of = "age"',
        "groups": 'groups = {surgical = ["S1", "S2"], medical = ["M1"]} or groups = 4',
        "other_levels": 'other_levels = "stop"',
        "plausible": "plausible = [0, 110]",
        "label": 'label = "Age at admission"',
        "units": 'units = "years"',
        "per": 'per = 10 or per = "SD"',
        "reference": 'reference = "40 to under 60"',
        "timing": 'timing = "before exposure"',
        "why": 'why = "older people are readmitted more often"',
    },
    "outcome": {
        "column": 'column = "died"',
        "event": 'event = "yes"',
        "label": 'label = "Death within 30 days"',
        "name": 'name = "died_within_year"',
        "event_when": "event_when = \"died == 'yes' or readmitted == 'yes'\"",
        "start": 'start = "admitted"',
        "event_date": 'event_date = "died_on"',
        "followed_to": 'followed_to = "last_seen"',
        "within_days": "within_days = 365",
        "from_day": "from_day = 0",
        "extracted": "extracted = 2025-03-31",
    },
    "models": {
        "name": 'name = "main"',
        "formula": 'formula = "smoker + age + sex"',
        "exposures": 'exposures = ["smoker"]',
        "level": "level = 0.95",
        "keep": 'keep = "age >= 18"',
        "same_records": "same_records = false",
        "based_on": 'based_on = "main"',
        "add": 'add = ["ward"]',
        "leave_out": 'leave_out = ["age"]',
        "role": 'role = "sensitivity"',
        "why": 'why = "reverse causation"',
        "planned": "planned = true",
        "method": 'method = "penalised"',
        "prior": 'prior = {m = 2, columns = ["smoker"]}',
        "trend": 'trend = ["age_band"]',
    },
    "report": {"audience": 'audience = "shareable"', "hide_counts_below": "hide_counts_below = 5"},
    "checks": {"also": "also = []"},
    "run": {"seed": "seed = 20260101", "memory": 'memory = "2 GB"'},
}


def example(location: Sequence[str | int]) -> str:
    """The example line of the key at `location`; for a section, its first line."""
    section, *rest = location
    if section in ("columns", "derived", "models"):
        rest = rest[1:]
    lines = EXAMPLES.get(str(section), {})
    return lines.get(str(rest[0]) if rest else "", next(iter(lines.values()), 'key = "value"'))
