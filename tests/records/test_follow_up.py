"""An outcome from dates: the window's edges, the reasons for having no outcome, and the bias of the quick ways."""

from __future__ import annotations

import sys
from dataclasses import fields
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from oddsmodel.records.follow_up import FollowUp, Window, events_after_follow_up, within_window

sys.path.insert(0, str(Path(__file__).parent))
from late_entrants import (
    RISK_EXPOSED,
    RISK_UNEXPOSED,
    TRUE,
    WITHIN,
    estimate,
    event_or_fully_followed,
    invented,
    late_as_event_free,
    log_odds_ratio_of,
)

NONE = np.nan


def follow_up(*rows: tuple[float, float, float], extracted: float = 1000.0) -> FollowUp:
    start, event, followed = np.array(rows, dtype=float).T
    return FollowUp(start, event, followed, extracted)


def classes(window: Window) -> list[str]:
    """The name of the one mask that each row is under."""
    masks = {field.name: getattr(window, field.name) for field in fields(window)}
    assert (sum(mask.astype(int) for mask in masks.values()) == 1).all()
    return [next(name for name, mask in masks.items() if mask[row]) for row in range(len(window.happened))]


def test_the_edges_of_a_window_of_ten_days() -> None:
    window = within_window(
        follow_up(
            (0, 0, 0),  # on the day of the start
            (0, 9, 9),  # on the last day
            (0, 10, 10),  # a day late: event-free, followed to the end
            (0, NONE, 10),
            (0, NONE, 9),  # seen a day too short
            (0, 9, 5),  # an event after the end of follow-up is an event
            (0, NONE, NONE),
            (0, -1, 50),
            (990, NONE, 1000),  # ends as the records are extracted
            (991, 995, 995),  # could not have finished, though there is an event
            (991, NONE, 1000),
            (NONE, 5, 5),
        ),
        within_days=10,
    )
    assert classes(window) == [
        "happened",
        "happened",
        "event_free",
        "event_free",
        "lost",
        "happened",
        "lost",
        "before_start",
        "event_free",
        "not_finished",
        "not_finished",
        "no_start",
    ]


def test_a_window_that_opens_on_day_five() -> None:
    window = within_window(
        follow_up(
            (0, 4, 4),
            (0, 5, 5),
            (0, 14, 14),
            (0, 15, 15),
            (0, NONE, 4),  # not observed when the window opens
            (0, NONE, 5),
            (0, NONE, 15),
            (0, NONE, NONE),
            (985, NONE, 1000),
            (986, 988, 988),
        ),
        within_days=10,
        from_day=5,
    )
    assert classes(window) == [
        "earlier",
        "happened",
        "happened",
        "event_free",
        "not_observed",
        "lost",
        "event_free",
        "not_observed",
        "event_free",
        "not_finished",
    ]


def test_without_an_end_of_follow_up_everybody_is_followed_until_extraction() -> None:
    whole = FollowUp(np.array([0.0, 0.0]), np.array([NONE, 3.0]), None, 1000.0)
    assert classes(within_window(whole, 10)) == ["event_free", "happened"]
    assert not events_after_follow_up(whole, within_window(whole, 10)).any()


def test_events_after_the_end_of_follow_up_are_found() -> None:
    some = follow_up((0, 9, 5), (0, 9, 9), (0, 12, 5))
    assert events_after_follow_up(some, within_window(some, 10)).tolist() == [True, False, False]


DAY = st.one_of(st.just(NONE), st.integers(-20, 40).map(float))


@settings(deadline=None, derandomize=True, max_examples=200)
@given(
    st.lists(st.tuples(DAY, DAY, DAY), min_size=1, max_size=20),
    st.integers(1, 20),
    st.integers(0, 10),
    st.integers(0, 40),
)
def test_every_record_is_under_one_heading(
    rows: list[tuple[float, float, float]], within: int, from_day: int, extracted: int
) -> None:
    some = follow_up(*rows, extracted=float(extracted))
    found = classes(within_window(some, within, from_day))
    # The same rules said record by record.
    for (start, event, followed), name in zip(rows, found, strict=True):
        opens, ends = start + from_day, start + from_day + within
        if np.isnan(start):
            expected = "no_start"
        elif event < start:
            expected = "before_start"
        elif ends > extracted:
            expected = "not_finished"
        elif event < opens:
            expected = "earlier"
        elif event < ends:
            expected = "happened"
        elif from_day and not followed >= opens:
            expected = "not_observed"
        else:
            expected = "event_free" if followed >= ends else "lost"
        assert name == expected


# Simulation: the exposure becomes commoner over time, so that late entrants are exposed more often. The truth is the
# odds ratio of the risks that the times to the event were drawn with.


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_late_entrants_bias_the_quick_ways_and_not_this_rule(seed: int) -> None:
    exposed, data = invented(60_000, seed)
    window = within_window(data, WITHIN)
    assert not window.lost.any()
    ours, error = estimate(exposed, window.happened, window.happened | window.event_free)
    assert abs(ours - TRUE) < 3.5 * error
    low, error = estimate(exposed, *late_as_event_free(data))
    assert low < TRUE - 8 * error
    high, error = estimate(exposed, *event_or_fully_followed(data))
    assert high > TRUE + 4 * error


@pytest.mark.parametrize("seed", [1, 2])
def test_a_window_that_begins_anew_has_the_odds_ratio_of_those_event_free_when_it_opens(seed: int) -> None:
    exposed, data = invented(60_000, seed)
    window = within_window(data, WITHIN, from_day=90)
    ours, error = estimate(exposed, window.happened, window.happened | window.event_free)
    # Times are exponential, without memory: at day 90 the risk of the next 365 days is what it was at the start.
    assert abs(ours - log_odds_ratio_of(RISK_UNEXPOSED, RISK_EXPOSED)) < 3.5 * error
    # Leaving early events out without moving the window would answer another question, of 275 days.
    shorter = [1 - (1 - risk) ** (275 / 365) for risk in (RISK_UNEXPOSED, RISK_EXPOSED)]
    keeps = window.happened & (data.event < data.start + WITHIN)
    other, error = estimate(exposed, keeps, window.happened | window.event_free)
    assert abs(other - log_odds_ratio_of(*shorter)) < 3.5 * error
