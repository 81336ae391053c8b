"""A score: the points of the yes-no columns that say yes, summed."""

from __future__ import annotations

import numpy as np

from oddsmodel.errors import Fault, InputFault
from oddsmodel.records.derived.making import Made, Making, Mask, Source, of_numbers
from oddsmodel.records.faults import fault
from oddsmodel.records.levels import code_levels
from oddsmodel.records.same_value import yes_or_no
from oddsmodel.wording import say
from oddsmodel.wording.numbers import listed
from oddsmodel.wording.plain import quoted

VALUES_NAMED = 5


def points(making: Making) -> Made:
    """A number column: for each part that is yes its points.

    A part that is not recorded makes the score not recorded or, with `if_part_missing = "zero"`, counts as no.

    Raises: InputFault for a part with values other than yes and no in any of their spellings.
    """
    parts = parts_of_score(making)
    worth = list((making.section.points or {}).values())
    score = np.zeros(len(making.weights))
    missing = np.zeros(len(score), dtype=np.bool_)
    for (yes, known), each in zip(parts, worth, strict=True):
        score += each * yes
        missing |= ~known
    if making.section.if_part_missing == "not recorded":
        score[missing] = np.nan
    return Made(of_numbers(making, score))


def parts_of_score(making: Making) -> list[tuple[Mask, Mask]]:
    """For each part the rows (n,) that say yes, and those in which it is recorded. Raises: InputFault as `points`."""
    parts: list[tuple[Mask, Mask]] = []
    faults: list[Fault] = []
    for source in making.sources:
        try:
            parts.append(_yes(making, source))
        except InputFault as found:
            faults.extend(found.faults)
    if faults:
        raise InputFault(faults)
    return parts


def _yes(making: Making, source: Source) -> tuple[Mask, Mask]:
    """Rows (n,) that say yes, and rows in which it is recorded whether they do."""
    coded = code_levels(source.coded.values, (), levels=None, kind="category")
    said = [yes_or_no(level) for level in coded.levels]
    other = [level for level, word in zip(coded.levels, said, strict=True) if word is None]
    met = [level for level in other if coded.counts[coded.levels.index(level)]]
    if met or source.outside.any():
        raise InputFault(_not_yes_no(making, source, met))
    yes = np.asarray([word == "yes" for word in said] + [False], dtype=np.bool_)
    return yes[coded.codes], coded.codes >= 0


def _not_yes_no(making: Making, source: Source, met: list[str]) -> Fault:
    values = [quoted(level) for level in met[:VALUES_NAMED]] or [say("derived-other-levels")]
    facts = {"part": quoted(source.column.name), "values": listed(values), "more": max(len(met) - VALUES_NAMED, 0)}
    return fault("derived-needs-yes-no", source.where, column=quoted(making.name), **facts)
