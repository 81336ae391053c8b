"""An outcome from dates: whether the event came within a window of days after the start, for those observed in it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Days = NDArray[np.float64]
Mask = NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class FollowUp:
    """Days (n,) of any one calendar, NaN where not recorded.

    start: where each record's time begins. event: when the event happened; NaN: none is recorded. followed_to: until
    when it is known whether the event happened; None where everybody is followed until `extracted`.
    """

    start: Days
    event: Days
    followed_to: Days | None
    extracted: float


@dataclass(frozen=True, slots=True)
class Window:
    """What one window makes of a follow-up, all masks (n,).

    Each row is under one of: `happened`, `event_free`, or the reasons that leave it without an outcome, in their
    order: `no_start`; `before_start`, an event before the start; `not_finished`, a window that could not have finished
    when the records were extracted; `earlier`, an event before the window; `not_observed`, event-free but not
    observed until the window opens; `lost`, event-free but not observed until it ends.
    """

    happened: Mask
    event_free: Mask
    no_start: Mask
    before_start: Mask
    not_finished: Mask
    earlier: Mask
    not_observed: Mask
    lost: Mask


def within_window(follow_up: FollowUp, within_days: int, from_day: int = 0) -> Window:
    """The outcome in the days from start + from_day up to, not including, start + from_day + within_days.

    Whether a record belongs depends on its start and on what was known when its window opened, never on what happened
    in it. Records whose window could not have finished at extraction are left out whether or not they have an event:
    to count them as event-free, or to keep those of them with an event, would bias the odds ratio wherever the
    exposure's frequency changes over time. With from_day = k the time begins anew at day k, among those who are then
    event-free and observed (the landmark of Anderson, Cain & Gelber 1983).
    """
    opens = follow_up.start + from_day
    ends = opens + within_days
    has_event = ~np.isnan(follow_up.event)
    observed = np.full(ends.shape, follow_up.extracted) if follow_up.followed_to is None else follow_up.followed_to

    # A comparison with NaN is false: no event is never early, no follow-up never long enough.
    reasons = {
        "no_start": np.isnan(follow_up.start),
        "before_start": follow_up.event < follow_up.start,
        "not_finished": ends > follow_up.extracted,
        "earlier": follow_up.event < opens,
    }
    happens = has_event & (follow_up.event < ends)
    reasons["not_observed"] = ~happens & ~(observed >= opens) & (from_day > 0)
    reasons["lost"] = ~happens & ~(observed >= ends)

    left = np.ones(ends.shape, dtype=np.bool_)
    found: dict[str, Mask] = {}
    for name, mask in reasons.items():
        found[name] = left & mask
        left &= ~mask
    return Window(happened=left & happens, event_free=left & ~happens, **found)


def events_after_follow_up(follow_up: FollowUp, window: Window) -> Mask:
    """The window's events (n,) that are dated after their record's end of follow-up."""
    if follow_up.followed_to is None:
        return np.zeros(follow_up.start.shape, dtype=np.bool_)
    return window.happened & (follow_up.event > follow_up.followed_to)
