"""Losses to follow-up by exposure, counted directly."""

from __future__ import annotations

import numpy as np
import pandas as pd

from oddsmodel.measures.lost import Followed, lost_by_exposure, lost_findings
from oddsmodel.records.types import Column

COLUMNS = {
    "smoker": Column("smoker", "category", "Smoking", levels=("never", "current"), reference="never"),
    "age": Column("age", "number", "Age", units="years"),
}
FRAME = pd.DataFrame(
    {
        "smoker": pd.Categorical(["never"] * 6 + ["current"] * 3 + [None], categories=["never", "current"]),
        "age": np.arange(10.0),
    }
)
LOST = np.array([1, 0, 0, 0, 0, 0, 1, 1, 0, 1], dtype=bool)
COMPLETE = FRAME.smoker.notna().to_numpy()


def test_records_and_losses_at_each_level() -> None:
    table = lost_by_exposure(lambda name: Followed(FRAME, LOST, COMPLETE), COLUMNS, ["smoker"])
    assert table.rows == (
        ("Smoking: never", 6, 1, 1 / 6),
        ("Smoking: current", 3, 2, 2 / 3),
        ("A column of the model not recorded", 1, 1, 1.0),
    )


def test_a_number_is_shown_in_thirds_and_counts_multiply() -> None:
    counts = np.full(10, 2.0)
    table = lost_by_exposure(lambda name: Followed(FRAME, LOST, np.ones(10, dtype=bool), counts), COLUMNS, ["age"])
    # The thirds of 0 to 9 are cut at 3 and 6: the least values with a third and two thirds of records at or below.
    assert [row[:3] for row in table.rows] == [
        ("Age: up to 3 years", 8, 2),
        ("Age: above 3, up to 6 years", 6, 2),
        ("Age: above 6 years", 6, 4),
    ]


def test_above_five_percent_a_time_to_event_analysis_is_advised() -> None:
    frame = pd.DataFrame(index=range(100))
    for lost, advised in ((5, False), (6, True)):
        followed = Followed(frame, np.arange(100) < lost, np.ones(100, dtype=bool))
        found = lost_findings(followed)
        assert bool(found) is advised
        if found:
            assert found[0].facts == {"lost_records": 6, "followed_records": 100, "share": 0.06}
            assert "time-to-event" in found[0].message
