"""Keys of the plan that a later version brings: recognised, and told as "not yet" with what to do meanwhile."""

from __future__ import annotations

from collections.abc import Sequence

LATER_SECTIONS: dict[str, str] = {
    "outcomes": "later-outcomes",
    "missing": "later-missing",
}
"""Section → the code of its sentence."""

LATER_KEYS: dict[str, dict[str, str]] = {
    "study": {
        "prevalence": "later-risks",
        "sampling_fractions": "later-risks",
        "control_sampling": "later-control-sampling",
        "smallest_important": "later-smallest-important",
    },
    "records": {
        "matched_set": "later-matched",
        "weight": "later-weight",
        "strata": "later-survey",
        "primary_unit": "later-survey",
    },
    "models": {
        "modifiers": "later-modifiers",
        "compare_with": "later-compare-with",
        "smallest_important": "later-smallest-important",
    },
    "report": {
        "hide_zero": "later-hiding",
        "round_counts_to": "later-hiding",
        "earlier": "later-earlier",
        "smallest_important": "later-smallest-important",
    },
}
"""Section → key → the code of its sentence."""

LATER_DESIGN = {"matched case-control": "later-matched"}


def later(location: Sequence[str | int]) -> str | None:
    """The code of the sentence for the key at `location`, if it is one that a later version brings."""
    section, *rest = location
    if not rest:
        return LATER_SECTIONS.get(str(section))
    if section in ("columns", "derived", "models"):
        rest = rest[1:]
    return LATER_KEYS.get(str(section), {}).get(str(rest[0])) if len(rest) == 1 else None
