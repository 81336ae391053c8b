"""Sentences on records that belong to groups, by code; the study floor's module hands them on."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from oddsmodel.wording.numbers import count, plural
from oddsmodel.wording.plain import quoted
from oddsmodel.wording.say import Sentence

Facts = Mapping[str, Any]


def _of_groups(facts: Facts) -> str:
    return (
        f"{plural(facts['records'], 'record')} of {plural(facts['groups'], 'group')} by {quoted(facts['column'])} were "
        f"analysed. Records of one group are not taken as independent: standard errors, intervals and p-values of the "
        f"odds ratios allow for it."
    )


def _analysed(facts: Facts) -> str:
    return (
        f"The {plural(facts['records'], 'record')} analysed are of {plural(facts['groups'], 'group')} by "
        f"{quoted(facts['column'])}; records are counted here, not groups."
    )


def _few(facts: Facts) -> str:
    return (
        f"There are only {count(facts['groups'])} groups by {quoted(facts['column'])}. With fewer than "
        f"{facts['enough']}, intervals that allow for groups tend to be too narrow, though Student's distribution "
        f"makes up for some of it."
    )


def _too_few(facts: Facts) -> str:
    one = facts["groups"] == 1
    return (
        f"{plural(facts['groups'], 'group')} by {quoted(facts['column'])} {'is' if one else 'are'} too few to learn "
        f"how much groups differ, so the intervals cannot be relied on. Take grouped_by out of the plan, and put "
        f"{quoted(facts['column'])} among the adjustment columns of the formula instead."
    )


def _methods(facts: Facts) -> str:
    return (
        f"The {plural(facts['groups'], 'group')} by {facts['column']} were taken as independent, their records not: "
        f"intervals at {facts['level']} are Wald intervals (Wald, 1943) from a cluster-robust covariance (Liang & "
        f"Zeger, 1986) with the factor G/(G − 1) · (n − 1)/(n − p) for small samples and Student's distribution with "
        f"{count(facts['df'])} degrees of freedom (Cameron & Miller, 2015). There is no likelihood of such records, "
        f"and no test, limit or criterion that rests on one."
    )


def _independence(facts: Facts) -> str:
    return (
        f"The records belong to {plural(facts['groups'], 'group')} by {quoted(facts['column'])}. They are taken as "
        f"independent between groups and not within them."
    )


FAULTS: dict[str, tuple[Sentence, Sentence]] = {
    "grouped-by-outcome": (
        "The outcome cannot name the groups that records belong to.",
        'Name the column of the person or place that several records share, such as grouped_by = "patient".',
    ),
    "grouped-by-count": (
        "A column cannot both count records and name their groups.",
        "Name the column of the person or place that several records share.",
    ),
    "grouped-by-in-formula": (
        "{column} names the groups of the records and stands in the formula as well: the odds ratios of its own "
        "levels then have no standard error.",
        "Take it out of the formula, or take grouped_by out of [records].",
    ),
    "group-column-empty": (
        "No record has a group in {column}.",
        "Check that grouped_by names the right column.",
    ),
}

SENTENCES: dict[str, Sentence] = {
    "records-of-groups": _of_groups,
    "records-analysed-of-groups": _analysed,
    "groups-few": _few,
    "groups-too-few": _too_few,
    "no-likelihood-of-grouped-records": (
        "The records of a group are not independent, so there is no likelihood of them to take this from; the Wald "
        "interval allows for the groups."
    ),
    "no-log-likelihood-of-grouped-records": (
        "The records of a group are not independent, so there is no likelihood of them."
    ),
    "no-check-of-grouped-records": ("It takes the records as independent, and those of a group are not."),
    "no-standard-error-of-one-group": (
        "Its records, or those it is compared with, all belong to a single group, so that nothing tells how much it "
        "differs between groups: there is no standard error that allows for them."
    ),
    "no-wald-of-one-group": "There is no standard error that allows for the groups.",
    "wald-f-in-its-place": (
        "The records of a group are not independent, so there is no likelihood-ratio test; Wald's F stands in its "
        "place."
    ),
    "no-term-test-of-groups": (
        "The records of a group are not independent, so there is no likelihood-ratio test; and the groups are too few "
        "to test so many coefficients at once by Wald's F."
    ),
    "check-as-if-independent": (
        "The records belong to groups; this description takes them as independent, which its marks of uncertainty do "
        "not allow for."
    ),
    "methods-grouped": _methods,
    "methods-grouped-terms": "Whole terms were tested by Wald's F with that covariance.",
    "lead-grouped": (
        "The intervals are Wald intervals that allow for records of one group being alike, with Student's distribution."
    ),
    "column-wald-f": "Wald's F",
    "column-df-denominator": "Degrees of freedom, denominator",
    "terms-table-grouped": "Wald tests of whole terms",
    "terms-note-grouped": (
        "Each term is tested by Wald's F with the cluster-robust covariance, in a model without the terms that "
        "contain it."
    ),
    "independence-within-groups": _independence,
    "left-out-group-not-recorded": "Group not recorded: {label}",
    **{code: what for code, (what, _) in FAULTS.items()},
    **{f"{code}-remedy": remedy for code, (_, remedy) in FAULTS.items()},
}
