"""Who is analysed and who is left out, each record once, under the first reason that holds."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from oddsmodel.records.condition import vet_condition
from oddsmodel.records.outcome import CodedOutcome
from oddsmodel.records.types import Column, Records
from oddsmodel.results.study import Exclusion, Flow
from oddsmodel.wording import say

Mask = NDArray[np.bool_]

REASONS = (
    "not-kept",
    "keep-undecided",
    "person-not-recorded",
    "repeat-undecided",
    "repeat",
    "start-not-recorded",
    "event-before-start",
    "window-not-finished",
    "event-before-window",
    "not-observed-to-window",
    "group-not-recorded",
    "outcome-not-recorded",
    "exposure-not-recorded",
    "adjustment-not-recorded",
    "level-not-in-plan",
)
"""Every reason for which a record is left out, in the order in which they are asked."""

NOT_OF_THE_STUDY = ("not-kept", "repeat", "event-before-start", "window-not-finished", "event-before-window")
"""Reasons that the plan itself sets; such records do not belong to the study and are not missed."""


@dataclass(frozen=True, slots=True)
class Accounting:
    """included: rows (n,) that are analysed; flow: how many records that is, and why the others are not."""

    included: Mask
    flow: Flow


@dataclass(frozen=True, slots=True)
class Tally:
    """Who is analysed among some rows, before it is told in words; tallies of rows one after another add up.

    included: rows (n,) that are analysed. left_out: by reason how many records, and the columns that bring it about.
    asked: by reason, all columns that could.
    """

    included: Mask
    left_out: Mapping[str, tuple[int, tuple[str, ...]]]
    asked: Mapping[str, tuple[str, ...]]
    analysed: int
    events: int


def account(
    records: Records,
    outcome: CodedOutcome,
    *,
    keep: Sequence[str],
    exposures: Sequence[str],
    adjustment: Sequence[str],
) -> Accounting:
    """The accounting of one model.

    keep: conditions that must all hold. A record that is left out is counted once, under the first of `REASONS` that
    holds; those between the conditions and the outcome come from `records.left_out`. Each row counts as many records
    as `records.counts` says. Reasons that no record has are not listed.

    Raises: InputFault for a condition that does not fit the columns.
    """
    found = tally(records, outcome, keep=keep, exposures=exposures, adjustment=adjustment)
    facts = {code: one.facts for code, one in records.left_out.items()}
    return Accounting(found.included, flow_of([found], records.read, records.columns, keep, facts))


def tally(
    records: Records,
    outcome: CodedOutcome,
    *,
    keep: Sequence[str],
    exposures: Sequence[str],
    adjustment: Sequence[str],
) -> Tally:
    """Who is analysed among some rows; the arguments are those of `account`."""
    n = len(records.frame)
    conditions = [vet_condition(text, records.columns, "keep") for text in keep]
    holds, fails = np.ones(n, dtype=np.bool_), np.zeros(n, dtype=np.bool_)
    for condition in conditions:
        true, known = condition.evaluate(records.frame, records.outside_levels)
        holds &= true
        fails |= known & ~true
    asked = tuple(dict.fromkeys(name for condition in conditions for name in condition.columns))
    others = tuple(name for name in dict.fromkeys(adjustment) if name not in exposures)
    in_model = (outcome.column, *exposures, *others)
    reasons: dict[str, tuple[tuple[str, ...], Mask]] = {
        "not-kept": ((), fails),
        "keep-undecided": (asked, ~(holds | fails)),
        **{code: ((), one.rows) for code, one in records.left_out.items()},
        "outcome-not-recorded": ((outcome.column,), ~outcome.recorded & ~_outside(records, (outcome.column,))),
        "exposure-not-recorded": (tuple(exposures), _not_recorded(records, exposures)),
        "adjustment-not-recorded": (others, _not_recorded(records, others)),
        "level-not-in-plan": (in_model, _outside(records, in_model)),
    }
    included = np.ones(n, dtype=np.bool_)
    left_out: dict[str, tuple[int, tuple[str, ...]]] = {}
    for code in sorted(reasons, key=REASONS.index):
        columns, mask = reasons[code]
        here = included & mask
        included &= ~mask
        number = _records(records, here)
        if number:
            left_out[code] = (number, tuple(_concerned(records, code, columns, here)))
    asked_of = {code: columns for code, (columns, _) in reasons.items()}
    return Tally(included, left_out, asked_of, _records(records, included), _records(records, included & outcome.event))


def flow_of(
    tallies: Sequence[Tally],
    read: int,
    columns: Mapping[str, Column],
    keep: Sequence[str],
    facts: Mapping[str, Mapping[str, Any]],
) -> Flow:
    """Tallies added up and told. read: records read. facts: what the sentences of `records.left_out` need."""
    left_out: list[Exclusion] = []
    for code in REASONS:
        parts = [one.left_out[code] for one in tallies if code in one.left_out]
        if parts:
            concerned = {name for _, names in parts for name in names}
            labels = [columns[name].label for name in tallies[0].asked[code] if name in concerned]
            words = say(f"left-out-{code}", **{"labels": labels, "conditions": list(keep), **facts.get(code, {})})
            left_out.append(Exclusion(code, words, sum(number for number, _ in parts)))
    return Flow(
        read=read,
        left_out=tuple(left_out),
        analysed=sum(one.analysed for one in tallies),
        events=sum(one.events for one in tallies),
    )


def _records(records: Records, rows: Mask) -> int:
    """How many records some rows stand for."""
    if records.counts is None:
        return int(rows.sum())
    return int(records.counts.to_numpy(dtype=np.float64)[rows].sum())


def _not_recorded(records: Records, columns: Sequence[str]) -> Mask:
    """Rows (n,) in which any of the columns is not recorded; a level that is not in the plan is recorded."""
    found = np.zeros(len(records.frame), dtype=np.bool_)
    for name in columns:
        found |= records.frame[name].isna().to_numpy(dtype=np.bool_) & ~_outside(records, (name,))
    return found


def _outside(records: Records, columns: Sequence[str]) -> Mask:
    """Rows (n,) in which any of the columns has a level that is not in the plan."""
    found = np.zeros(len(records.frame), dtype=np.bool_)
    for name in columns:
        if name in records.outside_levels:
            found |= records.outside_levels[name].to_numpy(dtype=np.bool_)
    return found


def _concerned(records: Records, code: str, columns: Sequence[str], rows: Mask) -> list[str]:
    """Of the columns of a reason those that bring it about in some of the rows."""
    if code == "level-not-in-plan":
        return [name for name in columns if (_outside(records, (name,)) & rows).any()]
    return [name for name in columns if (_not_recorded(records, (name,)) & rows).any()]
