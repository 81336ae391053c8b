"""Sentences on losses to follow-up, by code."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from oddsmodel.wording.numbers import count, percent, plural
from oddsmodel.wording.say import Sentence


def _many_lost(facts: Mapping[str, Any]) -> str:
    return (
        f"Of {plural(facts['followed_records'], 'record')} whose window could have finished, "
        f"{count(facts['lost_records'])} ({percent(facts['share'])}) were lost before its end, so that their outcome "
        f"is not recorded. Events that came before the loss are known while the absence of later ones is not, which "
        f"biases the odds ratio, the more so where exposure goes with loss. A time-to-event analysis, which uses the "
        f"time that the lost were observed, suits these records better."
    )


LOST: dict[str, Sentence] = {
    "many-lost": _many_lost,
    "lost-title": "Lost to follow-up, by exposure",
    "lost-exposure": "Exposure",
    "lost-records": "Records whose window could have finished",
    "lost-lost": "Lost before its end",
    "lost-share": "Share lost",
    "lost-others": "A column of the model not recorded",
    "lost-note": (
        "Lost records have no event and were not followed to the end of the window: their outcome is not recorded. "
        "Losses that differ between levels of the exposure bias the odds ratio."
    ),
}
