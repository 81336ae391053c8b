"""Sentences of the disclosure and export floors, by code."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from oddsmodel.wording.numbers import count, interval, ratio
from oddsmodel.wording.say import Sentence


def _flow(facts: Mapping[str, Any]) -> str:
    read, analysed = _said(facts["read"]), _said(facts["analysed"])
    left = "; ".join(f"{reason}: {_said(number)} left out" for reason, number in facts["left_out"])
    return f"Records read: {read}. {left + '. ' if left else ''}Records analysed: {analysed}."


def _said(number: int | None) -> str:
    return "a number not shown" if number is None else count(number)


def _estimates(facts: Mapping[str, Any]) -> str:
    told = [
        f"{label}, {series}: {ratio(estimate)} ({interval(lower, upper)})"
        for label, series, estimate, lower, upper in facts["marks"]
        if estimate is not None
    ]
    return f"Odds ratios with their intervals. {'; '.join(told)}." if told else "No odds ratio can be shown here."


SENTENCES: dict[str, Sentence] = {
    # In the place of a number
    "fewer-than": "fewer than {threshold}",
    "number-not-shown": "a number not shown",
    "share-not-shown": "a share not shown",
    "record-not-shown": "not shown",
    "other-reasons-together": "other reasons, together",
    "count-hidden": "small count, or one that would give a small count away",
    "estimate-hidden": "with the counts beside it, it would give a small count away",
    "estimate-hidden-in-figure": "not shown: it would give a small count away",
    # Why a number is missing
    "why-count-hidden": (
        "Hidden: it is a count under {threshold}, or one from which, with the others shown, such a count could be "
        "worked out."
    ),
    "why-estimate-hidden": (
        "Hidden: with the counts that are shown, it would give away one that is hidden because it is small."
    ),
    "why-likelihood-hidden": (
        "Hidden: with the number of records, it would give away a number of events that is hidden."
    ),
    "why-check-hidden": (
        "Hidden: this model has a parameter for each group that it tells apart, so that its answers would give away "
        "counts that are hidden because they are small."
    ),
    # Figures
    "points-gathered": (
        "Points are gathered in cells of a grid; cells with fewer than {threshold} records are not drawn."
    ),
    "groups-merged": (
        "Neighbouring groups are merged until each holds at least {threshold} records of either outcome, or none: "
        "{groups} are drawn."
    ),
    "flow-as-shown": _flow,
    "estimates-as-shown": _estimates,
    # results.json
    "no-odds-ratio-of-its-own": (
        "This column belongs to a term of several columns, or is part of an interaction; its odds ratio has no meaning "
        "of its own."
    ),
    "number-not-available": "This number does not exist for this model.",
    # Folders
    "folder-is-a-file": "This is a file, not a folder.",
    "folder-holds-other-files": "The folder holds files that are not from an earlier run.",
    "folder-manifest-unreadable": "The folder's {manifest} cannot be read, so that it is not known what is ours in it.",
    "folder-holds-a-link": "“{name}” in the folder is a link to another place.",
    "folder-name-taken": "“{name}” in the folder is not a file of an earlier run and would be overwritten.",
    "folder-not-writable": "Nothing can be written here: {reason}.",
    "choose-another-folder": "Name an empty folder, a new one, or one that an earlier run wrote.",
}
