"""What must hold of renamed and of derived columns, before any record is read."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator, Mapping, Sequence
from itertools import pairwise

from oddsmodel.errors import Fault
from oddsmodel.plan.band_names import band_names
from oddsmodel.plan.examples import EXAMPLES
from oddsmodel.plan.faults import fault, shown_number
from oddsmodel.plan.schema import ColumnSection, DerivedSection
from oddsmodel.plan.translate import offer
from oddsmodel.wording.plain import quoted

At = Callable[..., str]
"""Where a key stands, from its location: `Parts.at`."""

RULES: dict[str, tuple[str, ...]] = {
    "bands_of": ("edges",),
    "years_between": (),
    "points": ("if_part_missing",),
    "groups_of": ("groups", "other_levels"),
    "quantile_groups_of": ("groups",),
}
"""Each rule that makes a column, and the keys that go with it."""

NEEDED = ("edges", "groups")
MAKING_NUMBERS = ("years_between", "points")
KEYS_FOR_NUMBERS = ("units", "per", "plausible")
FEWEST_GROUPS, MOST_GROUPS = 2, 20


def check_renamed(columns: Mapping[str, ColumnSection], at: At) -> Iterator[Fault]:
    """Faults of `from`, two columns from one of the file, and of `plausible`."""
    first: dict[str, str] = {}
    for name, column in columns.items():
        if column.plausible is not None:
            yield from _range(column.plausible, at("columns", name, "plausible"))
            if column.kind is None and column.levels is not None:
                yield fault("plausible-beside-levels", at("columns", name, "plausible"))
        if column.from_name is None:
            continue
        if column.from_name in first:
            where = at("columns", name, "from")
            yield fault("from-twice", where, file_name=quoted(column.from_name), other=quoted(first[column.from_name]))
        first.setdefault(column.from_name, name)


def check_derived(
    derived: Mapping[str, DerivedSection],
    columns: Mapping[str, ColumnSection],
    count: str | None,
    outcome: str | None,
    at: At,
) -> Iterator[Fault]:
    """Faults of derived columns. count, outcome: the columns that the plan names as such."""
    for name, section in derived.items():
        where = at("derived", name)
        if name in columns:
            yield fault("derived-and-column", where, column=quoted(name))
        if name == count:
            yield fault("derived-is-the-count", where, column=quoted(name))
        if outcome is not None and outcome in section.sources and name != outcome:
            yield fault("derived-from-outcome", where, column=quoted(outcome))
        rules = [rule for rule in RULES if rule in section.model_fields_set]
        if len(rules) != 1:
            yield _not_one_rule(rules, where)
            continue
        yield from _keys(section, rules[0], name, at)
        yield from _values(section, rules[0], name, at)
    yield from _circles(derived, at)


def _not_one_rule(rules: Sequence[str], where: str) -> Fault:
    code = "derived-several-rules" if rules else "derived-without-rule"
    return fault(code, where, rules=list(rules or RULES))


def _keys(section: DerivedSection, rule: str, name: str, at: At) -> Iterator[Fault]:
    """Keys that the rule needs and does not have, or has no use for."""
    for key in dict.fromkeys(key for keys in RULES.values() for key in keys):
        given = key in section.model_fields_set
        if given and key not in RULES[rule]:
            yield fault("derived-key-of-another", at("derived", name, key), key=key, rule=rule)
        if not given and key in RULES[rule] and key in NEEDED:
            line = 'groups = {surgical = ["S1", "S2"], medical = ["M1"]}' if rule == "groups_of" else "groups = 4"
            line = EXAMPLES["derived"][key] if key != "groups" else line
            yield fault("key-missing", at("derived", name), key=key, example=line)
    if rule not in MAKING_NUMBERS:
        for key in KEYS_FOR_NUMBERS:
            if key in section.model_fields_set:
                yield fault("derived-key-for-numbers", at("derived", name, key), key=key, rule=rule)
    elif "reference" in section.model_fields_set:
        yield fault("derived-key-for-levels", at("derived", name, "reference"), rule=rule)
    if section.plausible is not None:
        yield from _range(section.plausible, at("derived", name, "plausible"))


def _values(section: DerivedSection, rule: str, name: str, at: At) -> Iterator[Fault]:
    if rule == "bands_of" and section.edges is not None:
        yield from _edges(section, section.edges, name, at)
    if rule == "years_between" and len(set(section.sources)) != 2:
        yield fault("derived-two-dates", at("derived", name, rule))
    if rule == "points":
        points = section.points or {}
        if not points or not all(math.isfinite(one) for one in points.values()) or not any(points.values()):
            yield fault("derived-no-points", at("derived", name, rule))
    if rule == "groups_of" and section.groups is not None:
        yield from _groups(section, section.groups, name, at)
    if rule == "quantile_groups_of" and section.groups is not None:
        number = section.groups
        if not isinstance(number, int):
            yield fault("derived-groups-not-a-number", at("derived", name, "groups"))
        elif not FEWEST_GROUPS <= number <= MOST_GROUPS:
            found = shown_number(number).removeprefix("the number ")
            yield fault("out-of-range", at("derived", name, "groups"), found=found, least="2", most="20")


def _edges(section: DerivedSection, edges: Sequence[float], name: str, at: At) -> Iterator[Fault]:
    rising = all(lower < upper for lower, upper in pairwise(edges))
    if not edges or not rising or not all(math.isfinite(edge) for edge in edges):
        yield fault("derived-edges", at("derived", name, "edges"))
    else:
        yield from _reference(section, band_names(edges), name, at)


def _groups(section: DerivedSection, groups: int | dict[str, tuple[str, ...]], name: str, at: At) -> Iterator[Fault]:
    where = at("derived", name, "groups")
    if isinstance(groups, int):
        yield fault("derived-groups-not-levels", where)
        return
    if len(groups) < FEWEST_GROUPS or not all(group.strip() for group in groups):
        yield fault("derived-too-few-groups", where)
    home: dict[str, str] = {}
    for group, levels in groups.items():
        if not levels:
            yield fault("derived-group-empty", where, group=quoted(group))
        for level in levels:
            if level in home:
                both = [quoted(home[level]), quoted(group)]
                yield fault("derived-level-twice", where, level=quoted(level), groups=both)
            home.setdefault(level, group)
    yield from _reference(section, tuple(groups), name, at)


def _reference(section: DerivedSection, names: Sequence[str], name: str, at: At) -> Iterator[Fault]:
    reference = section.reference
    if reference is not None and reference not in names:
        where = at("derived", name, "reference")
        yield fault("reference-not-a-level", where, reference=quoted(reference), **offer(reference, names))


def _range(plausible: Sequence[float], where: str) -> Iterator[Fault]:
    if len(plausible) != 2 or not all(math.isfinite(one) for one in plausible) or plausible[0] >= plausible[1]:
        yield fault("plausible-not-a-range", where)


def _circles(derived: Mapping[str, DerivedSection], at: At) -> Iterator[Fault]:
    """Columns that are, by way of others, made from themselves; each circle is told once."""
    told: set[str] = set()
    for name in derived:
        way, waiting = {name}, list(derived[name].sources)
        while waiting:
            source = waiting.pop()
            if source == name and name not in told:
                told |= way
                yield fault("derived-circle", at("derived", name), column=quoted(name))
                break
            if source in derived and source not in way:
                way.add(source)
                waiting += derived[source].sources
