"""Sentences on the plan's renamed and derived columns: what is wrong, and under `<code>-remedy` what to do."""

from __future__ import annotations

from oddsmodel.wording.numbers import listed
from oddsmodel.wording.say import Sentence

FAULTS: dict[str, tuple[Sentence, Sentence]] = {
    "from-twice": (
        "{file_name} of the file is already what {other} is made from.",
        "Name another column of the file, or take one of the two sections out.",
    ),
    "plausible-not-a-range": (
        "What is plausible is a range of two numbers, the lower first.",
        "Write it as plausible = [0, 20].",
    ),
    "plausible-beside-levels": (
        "A column with levels is no number, so it has no plausible range.",
        "Take out either plausible or levels.",
    ),
    "derived-and-column": (
        "{column} is the name both of a derived column and of a column of the file.",
        "Give the derived column another name; its label, reference and so on stand in its own section.",
    ),
    "derived-is-the-count": (
        "{column} counts how many records each row stands for, so it cannot be derived.",
        "Give the derived column another name.",
    ),
    "derived-from-outcome": (
        "The column is made from the outcome, {column}, so it would explain the outcome by itself.",
        "Make it from columns that are known without the outcome.",
    ),
    "derived-without-rule": (
        "Nothing says how the column is made.",
        lambda facts: f"Add one of {listed(facts['rules'], 'or')}.",
    ),
    "derived-several-rules": (
        lambda facts: f"{listed(facts['rules'])} are given together, and a column is made in one way.",
        "Keep one of them; a second column can be made from the first.",
    ),
    "derived-key-of-another": ("{key} has no meaning beside {rule}.", "Take the line out."),
    "derived-key-for-numbers": (
        "{key} has a meaning only for numbers, and {rule} makes levels.",
        "Take the line out, or write it in the section of the column that this one is made from.",
    ),
    "derived-key-for-levels": ("{rule} makes a number, which has no reference.", "Take the line out."),
    "derived-two-dates": (
        "Years lie between two different columns of dates.",
        'Write them as years_between = ["born", "admitted"], the earlier first.',
    ),
    "derived-no-points": (
        "No column is given a number of points other than 0.",
        "Write them as points = {{diabetes = 1, cancer = 2}}.",
    ),
    "derived-groups-not-a-number": ("Quantile groups need their number.", "Write it as groups = 4."),
    "derived-groups-not-levels": (
        "A number of groups does not say which level belongs to which.",
        'Write groups = {{surgical = ["S1", "S2"], medical = ["M1"]}}; a number belongs to quantile_groups_of.',
    ),
    "derived-edges": (
        "Edges are numbers, at least one, each larger than the one before.",
        "Write them as edges = [40, 60, 80].",
    ),
    "derived-too-few-groups": (
        "At least two groups with names are needed.",
        'Write them as groups = {{surgical = ["S1", "S2"], medical = ["M1"]}}.',
    ),
    "derived-group-empty": ("The group {group} has no level.", "List its levels, or take the group out."),
    "derived-level-twice": (
        lambda facts: f"{facts['level']} is listed twice (under {listed(facts['groups'])}).",
        "List each level once.",
    ),
    "derived-circle": (
        "{column} is made from itself, by way of other derived columns or of keep.",
        "Make it from columns of the file.",
    ),
}

SENTENCES: dict[str, Sentence] = {code: what for code, (what, _) in FAULTS.items()} | {
    f"{code}-remedy": remedy for code, (_, remedy) in FAULTS.items()
}
