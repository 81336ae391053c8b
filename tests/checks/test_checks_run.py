"""All checks together: their order, their names and the lines that speak for them."""

from __future__ import annotations

import json
import math
import sys
from dataclasses import asdict
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from oddsmodel.checks import (
    FAMILIES,
    brier,
    calibration,
    counting,
    hosmer_lemeshow,
    influence,
    residual_tests,
    roc,
    run_checks,
    speaking,
)
from oddsmodel.results.study import CheckResult, Exclusion, Flow

sys.path.insert(0, str(Path(__file__).parent))
from fit_models import grouped_model, record_model, simulated
from form_models import birth_weights, fitted


class Heard:
    def __init__(self) -> None:
        self.stages: list[tuple[str, int | None]] = []
        self.steps = 0

    def stage(self, name: str, total: int | None = None) -> None:
        self.stages.append((name, total))

    def advance(self, steps: int = 1) -> None:
        self.steps += steps


def line(family: str, verdict: str, text: str) -> CheckResult:
    return CheckResult(name=text, family=family, title="", verdict=verdict, line=text)


def test_every_check_of_a_real_model() -> None:
    frame = birth_weights()
    heard = Heard()
    checks = run_checks(
        fitted("smoke + age + lwt + race", frame, frame["low"] == 1, ["smoke"]),
        heard,
        Flow(200, (Exclusion("not-kept", "", 5), Exclusion("exposure-not-recorded", "", 6)), 189, 59),
    )
    families = [FAMILIES.index(check.family) for check in checks]
    assert families == sorted(families)
    names = [check.name for check in checks]
    assert len(set(names)) == len(names) == heard.steps == heard.stages[0][1]
    assert {"hosmer_lemeshow", "auc", "counting"} <= set(names)
    lines = speaking(checks)
    assert len(lines) <= 7
    assert len({one.family for one in lines}) == len(lines)
    for check in checks:
        assert check.explanation
        assert set(check.reasons) >= {name for name, value in check.statistics.items() if value is None}
        numbers = [value for value in check.statistics.values() if value is not None]
        assert all(math.isfinite(value) for value in numbers)
        text = json.dumps([asdict(finding) for finding in check.findings])
        assert "signific" not in (check.line + check.explanation + text).lower()
        for table in check.tables:
            assert all(len(row) == len(table.columns) for row in table.rows)


def test_the_worst_verdict_speaks_for_its_family() -> None:
    lines = speaking(
        [
            line("fit", "not applicable", "first"),
            line("fit", "fine", ""),
            line("fit", "fine", "second"),
            line("fit", "look", "third"),
            line("fit", "look", "fourth"),
            line("counting", "fine", "fifth"),
        ]
    )
    assert [(one.family, one.verdict, one.line) for one in lines] == [
        ("counting", "fine", "fifth"),
        ("fit", "look", "third"),
    ]
    assert speaking([]) == ()


@pytest.mark.parametrize(
    ("left_out", "verdict", "share"), [(0, "fine", 0.0), (30, "fine", 0.03), (60, "look", 0.06), (250, "caution", 0.25)]
)
def test_counting(left_out: int, verdict: str, share: float) -> None:
    X, y = simulated(300, [0.0, 0.5])
    flow = Flow(1200, (Exclusion("not-kept", "", 200), Exclusion("outcome", "", left_out)), 1000 - left_out, 10)
    result = counting.check(record_model(X, y), flow)
    assert result.verdict == verdict
    assert result.statistics["share_left_out"] == pytest.approx(share)
    assert len(result.findings) == (verdict != "fine")


def test_counting_without_a_flow_or_its_counts() -> None:
    X, y = simulated(300, [0.0, 0.5])
    model = record_model(X, y)
    assert counting.check(model).statistics["share_left_out"] is None
    hidden = Flow(None, (Exclusion("outcome", "", None),), None, None)
    assert counting.check(model, hidden).reasons["share_left_out"]


def test_few_patterns_one_event_and_whole_frames() -> None:
    frame = pd.DataFrame({"x": np.linspace(-1, 1, 30), "z": pd.Categorical(["a", "b", "c"] * 10)})
    event = np.zeros(30, dtype=bool)
    event[[11, 12, 13]] = True
    checks = run_checks(fitted("x + z", frame, event, ["x"]))
    assert all(check.line or check.verdict in ("fine", "not applicable") for check in checks)
    assert counting.check(grouped_model([[1.0]], [1], [40], exposed=())).line


def test_rows_that_stand_for_no_record_change_nothing() -> None:
    X = np.array([[1, a, b] for a in (0, 1) for b in (0, 1, 2, 3)], dtype=float)
    events, trials = [12, 25, 33, 0, 28, 35, 61, 40], [100, 100, 100, 0, 100, 100, 100, 100]
    held = np.array(trials) > 0
    padded = grouped_model(X, events, trials)
    bare = grouped_model(X[held], np.array(events)[held], np.array(trials)[held])
    for check in (hosmer_lemeshow, residual_tests, calibration, roc, brier, influence):
        one, other = check.check(padded), check.check(bare)
        assert one.line == other.line
        assert one.statistics.keys() == other.statistics.keys()
        for name, value in one.statistics.items():
            assert value == (None if other.statistics[name] is None else pytest.approx(other.statistics[name]))
        assert [len(table.rows) for table in one.tables] == [len(table.rows) for table in other.tables]
