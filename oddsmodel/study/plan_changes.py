"""What changed between two plans, as results.json keeps them: a sentence a key, told as the plan names it."""

from __future__ import annotations

import json
from collections.abc import Iterator, Mapping
from typing import Any

from oddsmodel.export.saved import SavedResults
from oddsmodel.plan.faults import heading, shown_key
from oddsmodel.wording import say
from oddsmodel.wording.plain import as_code, plain

NAMED = ("columns", "derived", "outcomes", "models")
"""Sections with an entry a name."""
LONGEST = 200
MOST_CHANGES = 60
Leaves = dict[tuple[str, ...], Any]
Entries = dict[tuple[str, ...], Leaves]


def plan_changes(before: SavedResults, after: SavedResults) -> tuple[str, ...]:
    """What the plan says differently. Of results that hold no plan (version 1.0) only the models are compared."""
    known = before.plan is not None and after.plan is not None
    first, second = (_entries(_stated(one) if known else _as_fitted(one)) for one in (before, after))
    told = list(_told(first, second))
    if len(told) > MOST_CHANGES:
        told = [*told[:MOST_CHANGES], say("plan-more-changes", number=len(told) - MOST_CHANGES)]
    return tuple(told)


def _stated(results: SavedResults) -> Mapping[str, Any]:
    return {"study": {}, **(results.plan or {})}


def _as_fitted(results: SavedResults) -> Mapping[str, Any]:
    """What can be said of a plan from the results alone."""
    models = [
        {"name": one.name, "formula": one.formula, "exposures": list(one.exposures), "level": one.level}
        for one in results.models
        if not one.added_by_program
    ]
    return {
        "study": {"design": results.study.design},
        "outcome": {"column": results.study.outcome, "event": results.study.event},
        "models": models,
    }


def _entries(plan: Mapping[str, Any]) -> Entries:
    """The values of a plan by entry, (section,) or (section, name), and within it by the way to the value."""
    found: Entries = {}
    for section, content in plan.items():
        if section in NAMED:
            for name, entry in _by_name(content):
                found[section, name] = _leaves(entry)
        else:
            found[section,] = _leaves(content)
    return found


def _by_name(content: Any) -> Iterator[tuple[str, Any]]:
    """The entries of a section with their names, those in a list by their key `name`."""
    if isinstance(content, dict):
        yield from ((str(name), entry) for name, entry in content.items())
    else:
        for place, entry in enumerate(content):
            name = entry.get("name")
            rest = {key: value for key, value in entry.items() if key != "name"}
            yield (name if isinstance(name, str) else say("plan-entry-number", number=place + 1)), rest


def _leaves(value: Any, way: tuple[str, ...] = ()) -> Leaves:
    """Every value that is no section of its own, by the keys that lead to it."""
    if isinstance(value, dict):
        return {path: leaf for key, one in value.items() for path, leaf in _leaves(one, (*way, str(key))).items()}
    return {way: value}


def _told(before: Entries, after: Entries) -> Iterator[str]:
    for entry in dict.fromkeys([*before, *after]):
        where = _heading(entry)
        first, second = before.get(entry), after.get(entry)
        if entry[0] in NAMED and (first is None or second is None):
            yield say("plan-entry-new" if first is None else "plan-entry-gone", where=where)
            continue
        first, second = first or {}, second or {}
        for way in dict.fromkeys([*first, *second]):
            key = f"{where} {', '.join(shown_key(part) for part in way)}".rstrip()
            if way not in first:
                yield say("plan-key-new", where=key, after=_value(second[way]))
            elif way not in second:
                yield say("plan-key-gone", where=key, before=_value(first[way]))
            elif _differ(first[way], second[way]):
                yield say("plan-key-changed", where=key, before=_value(first[way]), after=_value(second[way]))


def _differ(one: Any, other: Any) -> bool:
    """Whether two values differ as JSON: true is not 1, but 1.0 is."""
    return one != other or isinstance(one, bool) != isinstance(other, bool)


def _heading(entry: tuple[str, ...]) -> str:
    section, *name = entry
    if section == "models":
        return f"{heading('models')} {as_code(name[0])}"
    return heading(shown_key(section), name[0] if name else None)


def _value(value: Any) -> str:
    """A value as it stands in a plan, cut where it is long."""
    return plain(json.dumps(_whole(value), ensure_ascii=False), LONGEST)


def _whole(value: Any) -> Any:
    """Whole numbers without a decimal point."""
    if isinstance(value, list):
        return [_whole(one) for one in value]
    return int(value) if isinstance(value, float) and value.is_integer() else value
