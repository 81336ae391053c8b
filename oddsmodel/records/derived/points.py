"""A score: the points of the yes-no columns that say yes, summed."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
import pandas as pd

from oddsmodel.errors import Fault, InputFault
from oddsmodel.records.derived.making import Array, Made, Making, Mask, Source, not_recorded, of_numbers, value_range
from oddsmodel.records.faults import fault
from oddsmodel.records.levels import code_levels
from oddsmodel.records.same_value import same_value_key, yes_or_no
from oddsmodel.results.derived import DerivedCount
from oddsmodel.wording import say
from oddsmodel.wording.numbers import listed
from oddsmodel.wording.plain import quoted

MOST_CROSSED = 100
VALUES_NAMED = 5


def points(making: Making) -> Made:
    """A number column: for each part that is yes its points.

    A part that is not recorded makes the score not recorded or, with `if_part_missing = "zero"`, counts as no.

    Raises: InputFault for a part with values other than yes and no in any of their spellings.
    """
    parts: list[tuple[Mask, Mask]] = []
    faults: list[Fault] = []
    for source in making.sources:
        try:
            parts.append(_yes(making, source))
        except InputFault as found:
            faults.extend(found.faults)
    if faults:
        raise InputFault(faults)
    worth = list((making.section.points or {}).values())
    score = np.zeros(len(making.weights))
    missing = np.zeros(len(score), dtype=np.bool_)
    for (yes, known), each in zip(parts, worth, strict=True):
        score += each * yes
        missing |= ~known
    if making.section.if_part_missing == "not recorded":
        score[missing] = np.nan
    coded = of_numbers(making, score)
    numbers = coded.values.to_numpy(dtype=np.float64)
    return Made(coded, tuple(_counts(making, numbers, parts)))


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


def _counts(making: Making, score: Array, parts: list[tuple[Mask, Mask]]) -> Iterator[DerivedCount]:
    """Records by score, and for each part those that say yes: by score where that makes a table one can read."""
    codes, found = pd.factorize(score, sort=True)
    names = [same_value_key(float(value)) for value in found]
    crossed = len(names) * len(parts) <= MOST_CROSSED
    if crossed or len(names) <= MOST_CROSSED:
        for position, name in enumerate(names):
            yield DerivedCount(name, "", "", making.number(codes == position))
    else:
        recorded = ~np.isnan(score)
        yield DerivedCount(say("derived-recorded"), "", "", making.number(recorded), *value_range(score))
    yield from not_recorded(making, "", np.isnan(score))
    for source, (yes, known) in zip(making.sources, parts, strict=True):
        label = source.column.label
        groups = [(name, codes == position) for position, name in enumerate(names)] if crossed else [("", known)]
        for name, here in groups:
            number = making.number(here & yes)
            if number:
                yield DerivedCount(name, label, say("derived-yes"), number)
        if not known.all():
            yield DerivedCount("", label, say("derived-not-recorded"), making.number(~known))
