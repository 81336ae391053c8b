"""Groups of a calibration figure, merged until none tells of a small count."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from statistics import NormalDist

from oddsmodel.results.figures import CalibrationFigure, CalibrationGroup
from oddsmodel.wording import say


def merge_groups(
    groups: Sequence[CalibrationGroup], threshold: int, level: float = 0.95
) -> tuple[CalibrationGroup, ...]:
    """Neighbours merged, from the lowest risk on, until every group has `threshold` records of either outcome or none.

    A group that stays alone is as it was; a merged one has the mean fitted probability of its records, their observed
    share and its Wilson 1927 limits (as in Brown, Cai & DasGupta 2001, equation 4). What is left at the upper end is
    merged downwards. No group at all remains where all records together have too few of an outcome.
    """
    gathered: list[list[CalibrationGroup]] = []
    waiting: list[CalibrationGroup] = []
    for group in groups:
        waiting.append(group)
        if _is_safe(waiting, threshold):
            gathered.append(waiting)
            waiting = []
    while waiting and gathered and not _is_safe(waiting, threshold):
        waiting = gathered.pop() + waiting
    if waiting and _is_safe(waiting, threshold):
        gathered.append(waiting)
    return tuple(members[0] if len(members) == 1 else _merged(members, level) for members in gathered)


def coarsen_calibration(figure: CalibrationFigure, threshold: int, level: float) -> CalibrationFigure | None:
    """The figure with merged groups, and a smooth curve and band that end at the outermost; None if nothing is left."""
    groups = merge_groups(figure.groups, threshold, level)
    if not groups:
        return None
    lowest, highest = groups[0].predicted, groups[-1].predicted
    smooth = tuple(point for point in figure.smooth if lowest <= point[0] <= highest)
    band = tuple(point for point in figure.band if lowest <= point[0] <= highest)
    alt = figure.alt
    if groups != figure.groups:
        alt = f"{alt} {say('groups-merged', threshold=threshold, groups=len(groups))}".strip()
    return replace(figure, alt=alt, groups=groups, smooth=smooth, band=band)


def _is_safe(groups: Sequence[CalibrationGroup], threshold: int) -> bool:
    events = sum(group.events for group in groups)
    others = sum(group.records for group in groups) - events
    return events + others >= threshold and all(count == 0 or count >= threshold for count in (events, others))


def _merged(groups: Sequence[CalibrationGroup], level: float) -> CalibrationGroup:
    records = sum(group.records for group in groups)
    events = sum(group.events for group in groups)
    predicted = sum(group.predicted * group.records for group in groups) / records
    observed = events / records
    z = NormalDist().inv_cdf(0.5 + level / 2)
    centre = (observed + z * z / (2 * records)) / (1 + z * z / records)
    half = z / (1 + z * z / records) * math.sqrt(observed * (1 - observed) / records + (z / (2 * records)) ** 2)
    return CalibrationGroup(predicted, observed, max(0.0, centre - half), min(1.0, centre + half), records, events)
