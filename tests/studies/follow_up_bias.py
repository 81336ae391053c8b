"""Bias of the odds ratio from late entrants and from losses, over many invented studies.

Run with `.venv/bin/python tests/studies/follow_up_bias.py` (a few seconds). The exposure becomes commoner over time;
times to the event are exponential, so that the true odds ratio is known. For each way to make the outcome it prints
the mean estimate and how many of the 95% intervals hold the truth; it ends with status 1 where the rule of the program
is biased or its intervals hold the truth too rarely, or where a quick way is not biased.
"""

from __future__ import annotations

import sys
from collections.abc import Callable
from pathlib import Path

import numpy as np

from oddsmodel.records.follow_up import FollowUp, within_window

sys.path.insert(0, str(Path(__file__).parent.parent / "records"))
from late_entrants import (
    LAST_DAY,
    TRUE,
    WITHIN,
    Mask,
    estimate,
    event_or_fully_followed,
    invented,
    late_as_event_free,
)

STUDIES, RECORDS = 400, 20_000
Way = Callable[[FollowUp], tuple[Mask, Mask]]


def window_could_have_finished(follow_up: FollowUp) -> tuple[Mask, Mask]:
    window = within_window(follow_up, WITHIN)
    return window.happened, window.happened | window.event_free


WAYS: dict[str, Way] = {
    "late entrants left out, events among them too": window_could_have_finished,
    "late entrants counted as event-free": late_as_event_free,
    "event or fully followed": event_or_fully_followed,
}


def simulate(way: Way, exposed_lost: float = 0.0) -> tuple[float, float, float]:
    """Mean of the log odds ratios, its simulation error, and the share of intervals that hold the truth.

    exposed_lost: the share of the exposed who are lost within the window, at an even rate.
    """
    estimates, holds = [], []
    for seed in range(STUDIES):
        exposed, follow_up = invented(RECORDS, seed)
        value, error = estimate(exposed, *way(_with_losses(exposed, follow_up, exposed_lost, seed)))
        estimates.append(value)
        holds.append(abs(value - TRUE) <= 1.959964 * error)
    return float(np.mean(estimates)), float(np.std(estimates) / STUDIES**0.5), float(np.mean(holds))


def _with_losses(exposed: Mask, follow_up: FollowUp, share: float, seed: int) -> FollowUp:
    if share == 0.0 or follow_up.followed_to is None:
        return follow_up
    rng = np.random.default_rng((seed, 1))
    until = follow_up.start + rng.exponential(-WITHIN / np.log1p(-share), len(exposed))
    gone = exposed & (until < np.fmin(follow_up.event, LAST_DAY))
    return FollowUp(
        follow_up.start,
        np.where(gone, np.nan, follow_up.event),
        np.where(gone, until, follow_up.followed_to),
        follow_up.extracted,
    )


def main() -> int:
    print(f"{STUDIES} studies of {RECORDS} records; true odds ratio {np.exp(TRUE):.3f}")
    right = True
    for name, way in WAYS.items():
        mean, error, held = simulate(way)
        print(f"{name}: mean odds ratio {np.exp(mean):.3f}, intervals that hold the truth {100 * held:.1f}%")
        biased = abs(mean - TRUE) > 5 * error
        right &= (not biased and held > 0.92) if way is window_could_have_finished else (biased and held < 0.9)
    for share in (0.02, 0.05, 0.10, 0.20):
        mean, _, held = simulate(window_could_have_finished, share)
        print(
            f"{100 * share:.0f}% of the exposed lost: mean odds ratio {np.exp(mean):.3f}, intervals {100 * held:.1f}%"
        )
    return 0 if right else 1


if __name__ == "__main__":
    sys.exit(main())
