"""Events per parameter, sparse cells and independence, against counts made with pandas or by hand."""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from oddsmodel.checks import events_per_parameter, independence, sparse_cells

sys.path.insert(0, str(Path(__file__).parent))
from form_models import birth_weights, fitted


def test_events_per_parameter_by_hand() -> None:
    # 59 of the 189 births are of low weight (Hosmer & Lemeshow 2000, appendix 1)
    frame = birth_weights()
    low = frame["low"] == 1
    result = events_per_parameter.check(fitted("smoke + race", frame, low, ["smoke"]))
    assert result.statistics == {"events_per_parameter": pytest.approx(59 / 3), "parameters": 3}
    assert result.verdict == "fine"
    assert result.line.startswith("There are 20 events for each of the 3 coefficients")
    turned = events_per_parameter.check(fitted("smoke + race", frame, ~low, ["smoke"]))
    assert turned.statistics["events_per_parameter"] == pytest.approx(59 / 3)
    assert "records without the event" in turned.line


@pytest.mark.parametrize(
    ("formula", "verdict", "code"),
    [
        ("smoke + race + age + lwt + ht + ui", "look", "events-per-parameter-few"),
        ("smoke * race * age + lwt + ht", "caution", "events-per-parameter-very-few"),
    ],
)
def test_few_events_are_said_more_strongly_the_fewer(formula: str, verdict: str, code: str) -> None:
    frame = birth_weights()
    result = events_per_parameter.check(fitted(formula, frame, frame["low"] == 1, ["smoke"]))
    assert result.verdict == verdict
    assert [finding.code for finding in result.findings] == [code]


def test_a_model_without_columns_has_no_ratio() -> None:
    frame = birth_weights()
    result = events_per_parameter.check(fitted("1", frame, frame["low"] == 1, []))
    assert result.statistics["events_per_parameter"] is None
    assert result.reasons["events_per_parameter"]


def test_sparse_levels_agree_with_a_crosstab() -> None:
    frame = birth_weights()
    result = sparse_cells.check(fitted("smoke + ht + race", frame, frame["low"] == 1, ["smoke"]))
    (table,) = result.tables
    for label, level, records, events in table.rows:
        crossed = pd.crosstab(frame[str(label).lower()], frame["low"]).loc[level]
        assert (records, events) == (crossed.sum(), crossed[1.0])
    assert result.verdict == "fine"
    assert result.statistics == {"levels": 7, "sparse_levels": 0}
    assert table.blocks == (0, 0, 1, 1, 2, 2, 2)


def test_sparse_levels_are_named_without_their_counts() -> None:
    frame = birth_weights()
    few = np.where(np.arange(189) % 27 == 0, "rare", "common")
    frame["ward"] = pd.Categorical(few, ["common", "rare"])
    low = frame["low"] == 1
    adjusted = sparse_cells.check(fitted("smoke + ward", frame, low, ["smoke"]))
    assert adjusted.verdict == "look"
    assert [(one.severity, one.code) for one in adjusted.findings] == [("note", "sparse-adjustment-levels")]
    assert "Ward: rare" in adjusted.line
    exposed = sparse_cells.check(fitted("ward + smoke", frame, low, ["ward"]))
    assert exposed.verdict == "caution"
    assert exposed.findings[0].severity == "caution"
    assert not any(character.isdigit() for character in exposed.line)


def test_counts_multiply_records() -> None:
    frame = pd.DataFrame(
        {
            "dust": pd.Categorical(["none", "none", "heavy", "heavy"], ["none", "heavy"]),
            "y": [True, False, True, False],
        }
    )
    model = fitted("dust", frame[["dust"]], frame["y"], ["dust"], counts=[96, 109, 4, 666])
    assert sparse_cells.check(model).tables[0].rows == (("Dust", "none", 205, 96), ("Dust", "heavy", 670, 4))
    assert sparse_cells.check(model).verdict == "caution"
    assert events_per_parameter.check(model).statistics["events_per_parameter"] == 100.0
    assert "grouped counts" in independence.check(model).line


def test_numbers_alone_have_no_sparse_levels() -> None:
    frame = birth_weights()
    result = sparse_cells.check(fitted("lwt + age", frame, frame["low"] == 1, ["lwt"]))
    assert result.verdict == "not applicable"
    assert not result.tables


def test_independence_says_what_was_looked_at() -> None:
    frame = birth_weights()
    low = frame["low"] == 1
    assert independence.check(fitted("smoke", frame, low, ["smoke"])).verdict == "look"
    frame["mother"] = pd.Categorical([f"m{i}" for i in range(189)])
    known = independence.check(fitted("smoke", frame, low, ["smoke"], identifiers=["mother"]))
    assert known.verdict == "fine"
    assert known.line.startswith("No identifier repeats")
    matched = independence.check(fitted("smoke", frame, low, ["smoke"], design="matched case-control"))
    assert [finding.code for finding in matched.findings] == ["independence-matched"]
