"""From crude to adjusted, worked by hand."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import replace
from typing import Any

import numpy as np
import pandas as pd
import pytest

from oddsmodel.measures.crude_to_adjusted import adjustment_findings, crude_to_adjusted, crude_to_adjusted_table
from oddsmodel.measures.wald import wald
from oddsmodel.model.kept import KeptRecords
from oddsmodel.results.study import CoefficientResult, CrudeEstimate, ProfileResult, WaldResult


def coefficient(crude_log: float, error: float, adjusted_log: float) -> CoefficientResult:
    limits = wald(crude_log, error)
    crude = CrudeEstimate(
        100, math.exp(crude_log), WaldResult(math.exp(limits.lower), math.exp(limits.upper), limits.p)
    )
    return CoefficientResult(
        "smoker", "yes", "no", None, "exposure", "Smoking: yes against no", adjusted_log, 0.2, math.exp(adjusted_log),
        WaldResult(None, None, None), ProfileResult(None, None), crude=crude,
    )  # fmt: skip


def test_difference_and_change() -> None:
    moved = crude_to_adjusted(coefficient(math.log(2.0), 0.2, math.log(1.5)), 0.95, "cohort")
    assert moved.log_difference == pytest.approx(math.log(0.75))
    assert moved.percent_change == pytest.approx(-25.0)
    assert moved.sentence == (
        "Smoking: yes against no: the odds ratio goes from 2.00 to 1.50 on adjustment, a change of −25%."
    )
    assert not moved.reasons


def test_change_is_withheld_near_an_odds_ratio_of_one() -> None:
    # The crude log odds ratio is just below, then just above its standard error.
    below = crude_to_adjusted(coefficient(0.199, 0.2, 0.5), 0.95, "cohort")
    assert below.percent_change is None
    assert below.log_difference == pytest.approx(0.301)
    assert "smaller than its standard error" in below.reasons["percent_change"]
    assert crude_to_adjusted(coefficient(-0.201, 0.2, 0.5), 0.95, "cohort").percent_change is not None


def test_trials_have_chance_imbalance() -> None:
    moved = crude_to_adjusted(coefficient(math.log(2.0), 0.2, math.log(2.1)), 0.95, "trial")
    assert "chance imbalance" in moved.sentence
    (found,) = adjustment_findings("trial", adjusted=True)
    assert "chance imbalance" in found.message
    (found,) = adjustment_findings("cohort", adjusted=True)
    assert "even where nothing confounds" in found.message
    assert adjustment_findings("cohort", adjusted=False) == ()


def test_without_a_pair_there_is_no_change() -> None:
    one = replace(coefficient(1.0, 0.2, 1.1), crude=None, reasons={"crude": "Withheld."})
    moved = crude_to_adjusted(one, 0.95, "cohort")
    assert (moved.log_difference, moved.percent_change) == (None, None)
    assert moved.reasons["log_difference"] == "Withheld."


def test_noncollapsibility_without_confounding(fitting: Callable[..., Any]) -> None:
    # By hand: 100 exposed and 100 unexposed in each stratum, so nothing confounds. The risks 0.9 and 0.64, 0.36 and 0.1
    # have odds 9 and 16/9, 9/16 and 1/9: the odds ratio is 81/16 in both strata. Together 126 and 74 of 200: (63/37)².
    cells = [("b", "yes", 90, 10), ("b", "no", 64, 36), ("a", "yes", 36, 64), ("a", "no", 10, 90)]
    rows = [(s, x, y, n) for s, x, events, others in cells for y, n in ((True, events), (False, others))]
    raw = pd.DataFrame(rows, columns=["stratum", "exposed", "event", "n"])
    frame = pd.DataFrame(
        {"stratum": pd.Categorical(raw["stratum"]), "exposed": pd.Categorical(raw["exposed"], ["no", "yes"])}
    )
    _, found = fitting(frame, raw["event"], "exposed + stratum", ["exposed"], counts=raw["n"])
    one = next(one for one in found if one.term == "exposed")
    assert one.odds_ratio == pytest.approx(81 / 16, rel=1e-9)
    assert one.crude.odds_ratio == pytest.approx((63 / 37) ** 2, rel=1e-9)


def test_table(birthwt: pd.DataFrame, fitting: Callable[..., Any]) -> None:
    frame = birthwt[["smoke", "race", "age"]].copy()
    frame.loc[frame.index[:30], "age"] = np.nan
    kept = KeptRecords(frame, birthwt["low"].to_numpy())
    complete = frame["age"].notna()
    model, found = fitting(
        frame[complete].reset_index(drop=True), birthwt["low"][complete], "smoke + age + race", ["smoke"], kept=kept
    )
    table = crude_to_adjusted_table(model, found)
    keys = [column.key for column in table.columns]
    reference, exposed = (dict(zip(keys, row, strict=True)) for row in table.rows)
    one = next(one for one in found if one.term == "smoke")
    assert reference["crude"] == "1 (reference)"
    assert (reference["change"], reference["all_records"]) == (None, None)
    assert exposed["records"] + reference["records"] == 159
    assert exposed["all_records"] == 189
    assert exposed["crude_all_records"] == pytest.approx(30 * 86 / (44 * 29), rel=1e-9)
    assert exposed["log_difference"] == pytest.approx(math.log(one.odds_ratio / one.crude.odds_ratio))
    for column in table.columns:
        assert column.hidden_with_block == (column.key not in ("label", "records", "events", "adjusted", "all_records"))
