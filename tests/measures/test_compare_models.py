"""The models side by side."""

from __future__ import annotations

from typing import Any

from oddsmodel.measures.compare_models import compare_models, models_figure
from oddsmodel.results.study import (
    CertificateResult,
    CoefficientResult,
    Flow,
    ModelResult,
    ProfileResult,
    WaldResult,
)
from oddsmodel.results.tables import Interval


def coefficient(level: str, odds_ratio: float | None, *, profile: bool = True) -> CoefficientResult:
    return CoefficientResult(
        "smoker", level, "never", None, "exposure", f"Smoking: {level} against never", 0.1, 0.1, odds_ratio,
        WaldResult(0.9, 1.4, 0.3), ProfileResult(0.91, 1.41) if profile else ProfileResult(None, None),
    )  # fmt: skip


def model(name: str, records: int, *found: CoefficientResult, status: str = "converged") -> ModelResult:
    empty: Any = ()
    return ModelResult(
        name, name, "", "maximum likelihood", False, {}, "", "", 0.95, status, ("smoker",), ("Smoking",), empty, empty,
        Flow(records, (), records, 10), records, 10, 4, 2, None, None, found, (), (), CertificateResult(None, None), (),
    )  # fmt: skip


def test_one_model_is_not_compared() -> None:
    assert compare_models([model("main", 100)]) is None
    assert models_figure([model("main", 100)]) is None


def test_a_row_for_each_coefficient_and_model() -> None:
    minimal = model("minimal", 120, coefficient("former", 1.3), coefficient("current", 2.0, profile=False))
    full = model("full", 100, coefficient("former", 1.2), coefficient("current", 1.8))
    table = compare_models([minimal, full])
    assert table is not None
    former, current = "Smoking: former against never", "Smoking: current against never"
    assert table.rows == (
        (former, "minimal", 120, 10, 1.3, Interval(0.91, 1.41)),
        (former, "full", 100, 10, 1.2, Interval(0.91, 1.41)),
        (current, "minimal", 120, 10, 2.0, Interval(0.9, 1.4)),
        (current, "full", 100, 10, 1.8, Interval(0.91, 1.41)),
    )
    assert table.blocks == (0, 0, 1, 1)
    assert "rest on different records" in table.note
    figure = models_figure([minimal, full])
    assert figure is not None
    assert [(mark.series, mark.estimate) for mark in figure.marks] == [
        ("minimal", 1.3), ("full", 1.2), ("minimal", 2.0), ("full", 1.8),
    ]  # fmt: skip


def test_what_a_model_lacks_is_said() -> None:
    table = compare_models(
        [model("main", 100, coefficient("current", 2.0)), model("spline", 100), model("broken", 100, status="aliased")]
    )
    assert table is not None
    assert [row[4] for row in table.rows] == [2.0, None, None]
    assert "spline has no odds ratio of its own" in table.note
    assert "broken could not be estimated (aliased)" in table.note
    assert "different records" not in table.note


def test_all_that_a_model_lacks_is_said_in_one_sentence() -> None:
    several = model("main", 100, coefficient("former", 1.3), coefficient("current", 2.0))
    table = compare_models([several, model("spline", 100)])
    assert table is not None
    assert table.note.count("spline has no odds ratio of its own") == 1
