"""Invented follow-up in which the exposure becomes commoner over time, with the odds ratio that is true of it."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from oddsmodel.records.follow_up import FollowUp

Mask = NDArray[np.bool_]
WITHIN, LAST_DAY = 365, 1200
RISK_UNEXPOSED, RISK_EXPOSED = 0.15, 0.30
"""The risks of the event within the window; times to it are exponential."""


def log_odds_ratio_of(unexposed: float, exposed: float) -> float:
    return float(np.log(exposed / (1 - exposed)) - np.log(unexposed / (1 - unexposed)))


TRUE = log_odds_ratio_of(RISK_UNEXPOSED, RISK_EXPOSED)


def invented(records: int, seed: int) -> tuple[Mask, FollowUp]:
    """Who is exposed (n,), and the follow-up (n,): admissions to the last day before extraction, nobody lost."""
    rng = np.random.default_rng(seed)
    start = rng.uniform(0, LAST_DAY, records)
    exposed = rng.random(records) < 0.15 + 0.7 * start / LAST_DAY
    risk = np.where(exposed, RISK_EXPOSED, RISK_UNEXPOSED)
    event = start + rng.exponential(-WITHIN / np.log1p(-risk))
    seen = np.minimum(event, LAST_DAY)
    return exposed, FollowUp(start, np.where(event <= LAST_DAY, event, np.nan), seen, float(LAST_DAY))


def estimate(exposed: Mask, happened: Mask, analysed: Mask) -> tuple[float, float]:
    """The crude log odds ratio of the analysed records and its standard error (Woolf 1955)."""
    cells = [float((analysed & (exposed == e) & (happened == h)).sum()) for e in (True, False) for h in (True, False)]
    a, b, c, d = cells
    return float(np.log(a * d / (b * c))), float(np.sqrt(sum(1 / cell for cell in cells)))


def late_as_event_free(follow_up: FollowUp) -> tuple[Mask, Mask]:
    """The quick way: whoever has no event within the window counts as event-free, late entrants too."""
    happened = follow_up.event < follow_up.start + WITHIN
    return happened, np.ones_like(happened)


def event_or_fully_followed(follow_up: FollowUp) -> tuple[Mask, Mask]:
    """The other quick way: late entrants are kept where they have an event, and left out where they have none."""
    happened = follow_up.event < follow_up.start + WITHIN
    return happened, happened | (follow_up.start + WITHIN <= follow_up.extracted)
