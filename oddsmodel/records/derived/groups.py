"""Groups of the levels of another column, each level in the group that the plan says."""

from __future__ import annotations

import numpy as np

from oddsmodel.errors import InputFault
from oddsmodel.plan.nearest import nearest
from oddsmodel.records.derived.making import Made, Making, place, with_levels
from oddsmodel.records.faults import fault
from oddsmodel.records.levels import code_levels
from oddsmodel.records.same_value import matching, same_value_key
from oddsmodel.wording.plain import quoted

LEVELS_NAMED = 10
OUTSIDE = -2


def groups(making: Making) -> Made:
    """A category column whose levels are the groups, in the order of the plan.

    Raises: InputFault for levels that stand in no group, unless `other_levels = "exclude and count"`.
    """
    section, source = making.section, making.sources[0]
    mapped = section.groups if isinstance(section.groups, dict) else {}
    names = list(mapped)
    home = {same_value_key(level): at for at, name in enumerate(names) for level in mapped[name]}
    coded = code_levels(source.coded.values, (), levels=None, kind="category")
    listed = [level for levels in mapped.values() for level in levels]
    to_group = np.full(len(coded.levels) + 1, -1, dtype=np.intp)
    for at, level in enumerate(coded.levels):
        alike = matching(level, listed) if source.column.kind == "yes-no" else level
        to_group[at] = home.get(same_value_key(alike or level), OUTSIDE)
    codes = to_group[coded.codes]
    strays = [at for at in np.flatnonzero(to_group[:-1] == OUTSIDE) if coded.counts[at]]
    if strays and section.other_levels == "stop":
        _refuse(making, [(coded.levels[at], making.number(coded.codes == at)) for at in strays], listed)
    outside = (codes == OUTSIDE) | source.outside
    codes = np.where(codes == OUTSIDE, -1, codes)
    return Made(with_levels(making, "category", names, codes, outside))


def _refuse(making: Making, strays: list[tuple[str, int]], listed: list[str]) -> None:
    strays.sort(key=lambda stray: (-stray[1], stray[0]))
    first = strays[:LEVELS_NAMED]
    near = [nearest(level, listed) for level, _ in first]
    raise InputFault(
        fault(
            "derived-level-unmapped",
            place(making.name, "groups"),
            source=quoted(making.sources[0].column.name),
            values=[quoted(level) for level, _ in first],
            with_records=[number for _, number in first],
            total=len(strays),
            nearest=["" if one is None else quoted(one) for one in near],
        )
    )
