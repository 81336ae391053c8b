"""Fit and influence give the same answers wherever the rows are, and within the stated bound where rows are many."""

from __future__ import annotations

import pickle
import sys
from collections.abc import Iterator
from dataclasses import asdict, replace
from importlib import import_module
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.special import expit
from sklearn.metrics import roc_auc_score

from oddsmodel.checks import one_pass as one_pass_module
from oddsmodel.checks.one_pass import one_pass
from oddsmodel.checks.probability_groups import classed_records, sorted_records
from oddsmodel.checks.roc import area_error, area_under_curve
from oddsmodel.checks.roc import check as roc
from oddsmodel.inference import maximise
from oddsmodel.likelihood import BinomialLikelihood
from oddsmodel.model import rows as model_rows
from oddsmodel.model.fitted import FittedModel
from oddsmodel.model.rows import rows_of
from oddsmodel.passes import Made, MemoryPasses, Work
from oddsmodel.passes.files import ColumnWriter
from oddsmodel.passes.local import LocalPasses
from oddsmodel.results.study import CheckResult

sys.path.insert(0, str(Path(__file__).parent))
from form_models import fitted

CHECKS = ("hosmer_lemeshow", "residual_tests", "calibration", "roc", "brier", "influence")
N = 150_000


def results(model: FittedModel) -> dict[str, CheckResult]:
    return {name: import_module(f"oddsmodel.checks.{name}").check(model) for name in CHECKS}


def records(n: int = N) -> tuple[pd.DataFrame, np.ndarray]:
    rng = np.random.default_rng(12)
    frame = pd.DataFrame(
        {
            "smoker": pd.Categorical(rng.choice(["no", "yes"], n, p=[0.8, 0.2]), ["no", "yes"]),
            "age": rng.normal(50, 12, n),
            "ward": pd.Categorical(rng.choice(["a", "b", "c"], n)),
        }
    )
    risk = expit(-2 + 0.5 * (frame["smoker"] == "yes") + 0.03 * (frame["age"] - 50))
    return frame, rng.random(n) < risk


class Shipped(LocalPasses):
    """Rows on disk whose work and results are pickled on the way, as for workers in other processes."""

    def each(self, work: Work, state: Any = None) -> Iterator[Any]:
        there = pickle.loads(pickle.dumps((work, state)))
        return (pickle.loads(pickle.dumps(result)) for result in super().each(*there))

    def mapped(self, made: Made) -> Shipped:
        return Shipped(self.source, (*self.makers, pickle.loads(pickle.dumps(made))))


def on_disk(model: FittedModel, folder: Path) -> FittedModel:
    """The same model with its records in files."""
    assert isinstance(model.rows.people, MemoryPasses)
    arrays = model.rows.people.arrays
    writer = ColumnWriter(folder)
    for first in range(0, model.rows.people.rows, 50_000):
        writer.write({name: array[first : first + 50_000] for name, array in arrays.items()})
    rows = rows_of(Shipped(writer.close()), model.design, model.rows.levels)
    likelihood = BinomialLikelihood.over(rows.passes, len(model.design.columns))
    return replace(model, rows=rows, likelihood=likelihood, fit=maximise(likelihood), held=None)


@pytest.mark.parametrize(
    ("formula", "counted", "single"),
    [
        ("smoker + age + ward", False, True),
        ("smoker + age + ward", True, True),
        ("smoker + cut(age, [40, 60]) + ward", False, False),
    ],
)
def test_rows_on_disk_give_the_answers_of_rows_in_memory(
    formula: str, counted: bool, single: bool, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(model_rows, "MOST_PATTERNS", 10_000)
    frame, event = records()
    counts = np.random.default_rng(1).integers(0, 4, N) if counted else None
    held = fitted(formula, frame, event, ["smoker"], counts=counts)
    filed = on_disk(held, tmp_path / "rows")
    assert held.rows.single == filed.rows.single == single
    one, other = results(held), results(filed)
    for name in CHECKS:
        assert asdict(one[name]) == asdict(other[name])
    if single:
        assert one["residual_tests"].statistics["deviance"] is None
        assert "not counted" in one["residual_tests"].line
        influence = one["influence"]
        assert influence.statistics["patterns"] is None
        assert influence.statistics["rows_left_out"] == 10
        assert set(influence.reasons) >= {"patterns", "patterns_left_out"}
        assert "pattern" not in influence.line + influence.title + influence.figures[0].alt
    else:
        assert any("Age: several values" in str(row[0]) for row in one["influence"].tables[1].rows)


def test_records_on_disk_without_which_the_rest_are_separated(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(model_rows, "MOST_PATTERNS", 10_000)
    frame, event = records()
    rare = np.arange(N) % 3000 == 7
    frame["smoker"] = pd.Categorical(np.where(rare, "yes", "no"), ["no", "yes"])
    event[rare] = False
    event[30_007] = True
    model = on_disk(fitted("smoker + age", frame, event, ["smoker"]), tmp_path / "rows")
    assert model.rows.single
    result = results(model)["influence"]
    assert result.verdict == "caution"
    assert result.findings[0].code == "few-patterns-carry-the-exposure"
    assert result.line.startswith("Without the row with most influence")
    assert [row[2] is None for row in result.tables[0].rows] == [False, True, True, True]


def test_single_rows_and_their_patterns_give_the_same_numbers(monkeypatch: pytest.MonkeyPatch) -> None:
    frame, event = records(40_000)
    together = fitted("smoker + age + ward", frame, event, ["smoker"])
    monkeypatch.setattr(model_rows, "MOST_PATTERNS", 1000)
    apart = fitted("smoker + age + ward", frame, event, ["smoker"])
    assert apart.rows.single
    assert not together.rows.single
    one, other = results(together), results(apart)
    for name in ("calibration", "roc", "brier"):
        assert one[name].statistics == pytest.approx(other[name].statistics, rel=1e-9)
    tables = (one["influence"].tables[0].rows, other["influence"].tables[0].rows)
    assert [row[2] for row in tables[0]] == pytest.approx([row[2] for row in tables[1]], rel=1e-9)


@pytest.mark.parametrize("classes", [1 << 20, 500])
def test_more_rows_than_are_sorted_agree_within_the_bound(classes: int, monkeypatch: pytest.MonkeyPatch) -> None:
    frame, event = records()
    model = fitted("smoker + age + ward", frame, event, ["smoker"])
    exact = results(model)
    score = model.likelihood.passes.taken(range(model.rows.number))["X"] @ model.fit.coefficients
    monkeypatch.setattr(one_pass_module, "MOST_SORTED", 1000)
    monkeypatch.setattr(one_pass_module, "CLASSES", classes)
    near = results(replace(model, name="again"))
    bound = near["roc"].statistics["error_bound"]
    assert bound is not None
    area = near["roc"].statistics["estimate"]
    assert abs(area - roc_auc_score(event, score)) <= bound
    assert bound < (1e-5 if classes > 500 else 5e-3)
    assert ("right to within" in near["roc"].tables[0].note) == (classes == 500)
    assert "error_bound" not in exact["roc"].statistics
    assert near["brier"].statistics == exact["brier"].statistics
    assert near["calibration"].statistics["mean_gap"] == pytest.approx(
        exact["calibration"].statistics["mean_gap"], abs=1e-5 if classes > 500 else 5e-4
    )
    counts = [[row[1] for row in near["hosmer_lemeshow"].tables[0].rows] for near in (exact, near)]
    assert sum(counts[0]) == sum(counts[1]) == N
    assert np.abs(np.subtract(*counts)).max() <= (5 if classes > 500 else 2000)
    smooth = [np.array(one["calibration"].figures[0].smooth) for one in (exact, near)]
    assert smooth[0] == pytest.approx(smooth[1], abs=1e-3 if classes > 500 else 5e-3)


@settings(deadline=None, derandomize=True, max_examples=60)
@given(
    st.lists(st.tuples(st.floats(-60, 60), st.integers(0, 3), st.integers(0, 3)), min_size=2, max_size=40),
    st.integers(1, 30),
)
def test_classes_lose_no_record_and_the_bound_holds(rows: list[tuple[float, int, int]], classes: int) -> None:
    linear, events, others = (np.array(values, dtype=float) for values in zip(*rows, strict=True))
    trials = events + others
    if not (events.any() and others.any()):
        return
    passes = MemoryPasses({"X": linear[:, None], "events": events, "trials": trials})
    classed = classed_records(passes, np.ones(1), float(linear.min()), float(linear.max()), classes)
    kept = trials > 0
    exact = sorted_records({"linear": linear[kept], "events": events[kept], "trials": trials[kept]})
    assert classed.records.size <= classes
    for name in ("records", "events", "expected", "unexpected", "variance", "fourth"):
        assert getattr(classed, name).sum() == pytest.approx(getattr(exact, name).sum(), rel=1e-9, abs=1e-12)
    near = area_under_curve(classed.events, classed.records - classed.events).area
    best = area_under_curve(exact.events, exact.records - exact.events).area
    assert abs(near - best) <= area_error(classed.events, classed.records - classed.events) + 1e-12


def test_single_records_in_order_are_those_of_a_plain_sort() -> None:
    rng = np.random.default_rng(3)
    linear, event = np.round(rng.normal(size=5000), 2), (rng.random(5000) < 0.4).astype(float)
    linear[:3] = [0.0, -0.0, 1e-300]
    found = sorted_records({"linear": linear, "events": event})
    values, index = np.unique(np.round(linear, 9), return_inverse=True)
    assert found.records.tolist() == np.bincount(index).tolist()
    assert found.events.tolist() == np.bincount(index, weights=event).tolist()
    assert found.probability == pytest.approx(expit(values), rel=1e-9)


def test_one_pass_serves_all_checks_and_goes_with_its_model(monkeypatch: pytest.MonkeyPatch) -> None:
    frame, event = records(2000)
    model = fitted("smoker + age + ward", frame, event, ["smoker"])
    seen = one_pass(model)
    assert one_pass(model) is seen
    other = replace(model, name="other")
    assert one_pass(other) is not seen
    assert one_pass(model) is not seen
    roc(model)
    del model, other, seen
    assert one_pass_module._latest is None
