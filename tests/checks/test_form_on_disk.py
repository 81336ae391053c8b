"""The checks of form where rows are many: the same on disk as in memory, and against statsmodels."""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm

from oddsmodel.checks import collinearity, independence, linearity, overlap, sparse_cells
from oddsmodel.checks.curves import fit_curves, straight_lines
from oddsmodel.model.fitted import FittedModel
from oddsmodel.study.term_tests import term_tests

sys.path.insert(0, str(Path(__file__).parent))
from form_models import fitted
from form_on_disk import on_disk, single_rows, ward_model, ward_records

MANY = 70_000


@pytest.fixture(scope="module")
def many() -> FittedModel:
    patch = pytest.MonkeyPatch()
    single_rows(patch)
    model = ward_model(MANY)
    patch.undo()
    assert model.rows.single
    return model


def test_same_results_on_disk_as_in_memory(many: FittedModel, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    single_rows(monkeypatch)
    there = on_disk(many, tmp_path / "rows")
    assert there.held is None
    for check in (linearity.check, overlap.check, sparse_cells.check, collinearity.check):
        assert check(there) == check(many)
    assert term_tests(there) == term_tests(many)


@pytest.mark.parametrize("exposure", ["exposure", "age"])
def test_few_rows_on_disk_too(exposure: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    single_rows(monkeypatch)
    model = ward_model(4000, exposures=[exposure])
    there = on_disk(model, tmp_path / "rows")
    for check in (linearity.check, overlap.check, sparse_cells.check):
        one, other = check(there), check(model)
        assert other.statistics == {
            name: None if value is None else pytest.approx(value, rel=1e-9) for name, value in one.statistics.items()
        }
        assert (one.line, one.verdict, one.reasons) == (other.line, other.verdict, other.reasons)


def matrix(frame: pd.DataFrame) -> pd.DataFrame:
    """The model's columns made with pandas."""
    made = pd.DataFrame({"constant": 1.0, "age": frame["age"], "log stay": np.log(frame["stay"])})
    for name, levels in (("exposure", ["some", "much"]), ("ward", ["surgical", "other"])):
        for level in levels:
            made[level] = (frame[name] == level).astype(float)
    return made


def test_term_tests_of_many_rows_agree_with_statsmodels(many: FittedModel) -> None:
    frame, event = ward_records(MANY)
    y, X = event.astype(float), matrix(frame)
    full = sm.Logit(y, X).fit(disp=0).llf
    dropped = {
        "exposure": ["some", "much"],
        "ward": ["surgical", "other"],
        "age": ["age"],
        "log(stay)": ["log stay"],
        "all exposure columns": ["some", "much"],
        "whole model": list(X.columns[1:]),
    }
    found = {test.term: test for test in term_tests(many).tests}
    assert set(found) == set(dropped)
    for term, columns in dropped.items():
        rest = sm.Logit(y, X.drop(columns=columns)).fit(disp=0).llf
        assert found[term].likelihood_ratio == pytest.approx(2 * (full - rest), rel=1e-9, abs=1e-7)
        assert found[term].df == len(columns)


def test_curves_of_many_rows_agree_with_full_newton_steps(many: FittedModel, monkeypatch: pytest.MonkeyPatch) -> None:
    lines = straight_lines(many)
    assert [line.label for line in lines] == ["Age", "Stay as log(stay)"]
    near = fit_curves(many, lines)
    monkeypatch.setattr("oddsmodel.checks.curves.PART_FROM", 10 * MANY)
    slow = fit_curves(many, lines)
    assert near.together == pytest.approx(slow.together, rel=1e-5)
    for one, other in zip(near.fitted, slow.fitted, strict=True):
        assert one.statistic == pytest.approx(other.statistic, rel=1e-9, abs=1e-8)
        error = np.sqrt(np.diag(other.covariance))
        assert (np.abs(one.coefficients - other.coefficients) <= 1e-5 * error).all()
        grid = np.linspace(*one.line.entered.quantiles([0.025, 0.975]), 50)
        # the band is drawn: its width is good to the eye
        reference = one.line.entered.quantiles(0.5)
        assert one.log_odds(grid, reference)[1] == pytest.approx(other.log_odds(grid, reference)[1], rel=0.002)


def test_overlap_of_many_rows_agrees_with_statsmodels(many: FittedModel) -> None:
    frame, event = ward_records(MANY)
    X = matrix(frame)
    outside = np.zeros(MANY, dtype=bool)
    result = overlap.check(many)
    for row, level in zip(result.tables[0].rows, ("some", "much"), strict=True):
        among = frame["exposure"].isin(["none", level]).to_numpy()
        at = (frame["exposure"] == level).to_numpy(float)[among]
        probability = sm.Logit(at, X[among].drop(columns=["some", "much"])).fit(disp=0).predict()
        # Walker et al. 2013: logit F = logit S - logit P
        odds = probability / (1 - probability) / (at.mean() / (1 - at.mean()))
        beyond = (odds / (1 + odds) < 0.05) | (odds / (1 + odds) > 0.95)
        assert row[1:5] == (level, "none", among.sum(), beyond.sum())
        outside[np.flatnonzero(among)[beyond]] = True
    assert outside.any()
    rest = sm.Logit(event.astype(float)[~outside], X[~outside]).fit(disp=0)
    whole = sm.Logit(event.astype(float), X).fit(disp=0)
    most = max(["some", "much"], key=lambda level: abs(rest.params[level] - whole.params[level]))
    assert result.statistics["exposure_odds_ratio_within_overlap"] == pytest.approx(np.exp(rest.params[most]), rel=1e-7)


def test_variance_left_to_a_number_in_many_rows(many: FittedModel, monkeypatch: pytest.MonkeyPatch) -> None:
    single_rows(monkeypatch)
    frame, _ = ward_records(MANY)
    X = matrix(frame)
    expected = sm.OLS(X["age"], X.drop(columns=["age"])).fit().rsquared
    for formula in ("exposure + ward + age + log(stay)", "exposure + ward + rcs(age, 4) + log(stay)"):
        result = overlap.check(ward_model(MANY, formula, exposures=["age"]))
        assert result.statistics["exposure_variance_explained"] == pytest.approx(expected, rel=1e-9)


def test_where_steps_do_not_settle_the_answers_are_those_of_newton(
    many: FittedModel, monkeypatch: pytest.MonkeyPatch
) -> None:
    expected = linearity.check(many), overlap.check(many), term_tests(many)
    monkeypatch.setattr("oddsmodel.checks.nearby.MOST_PASSES", 1)
    found = linearity.check(many), overlap.check(many), term_tests(many)
    for one, other in zip(expected[:2], found[:2], strict=True):
        assert one.line == other.line
        assert other.statistics == {
            name: None if value is None else pytest.approx(value, rel=1e-8) for name, value in one.statistics.items()
        }
    for one, other in zip(expected[2].tests, found[2].tests, strict=True):
        assert one.likelihood_ratio == pytest.approx(other.likelihood_ratio, rel=1e-9, abs=1e-8)


def test_counts_multiply_many_rows(many: FittedModel, monkeypatch: pytest.MonkeyPatch) -> None:
    single_rows(monkeypatch)
    twice = ward_model(MANY, counts=np.full(MANY, 2.0))
    assert twice.records == 2 * many.records
    for one, other in zip(term_tests(many).tests, term_tests(twice).tests, strict=True):
        assert other.likelihood_ratio == pytest.approx(2 * one.likelihood_ratio, rel=1e-9)
    one, other = overlap.check(many), overlap.check(twice)
    assert [row[:3] for row in other.tables[0].rows] == [row[:3] for row in one.tables[0].rows]
    assert [row[3:5] for row in other.tables[0].rows] == [(2 * row[3], 2 * row[4]) for row in one.tables[0].rows]
    key = "exposure_odds_ratio_within_overlap"
    assert other.statistics[key] == pytest.approx(one.statistics[key], rel=1e-8)
    straight, again = linearity.check(many), linearity.check(twice)
    for row, doubled in zip(straight.tables[0].rows, again.tables[0].rows, strict=True):
        assert doubled[1] == pytest.approx(2 * row[1], rel=1e-6)


def test_an_identifier_of_records_not_held_is_not_looked_at(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    single_rows(monkeypatch)
    model = ward_model(500)
    there = on_disk(model, tmp_path / "rows")
    assert "no identifier shows" in independence.check(there).line
    frame, event = ward_records(500)
    frame["patient"] = pd.Categorical([f"p{i}" for i in range(500)])
    named = on_disk(fitted("ward + age", frame, event, ["ward"], identifiers=["patient"]), tmp_path / "named")
    assert "nobody has looked" in independence.check(named).line
    assert independence.check(named).verdict == "look"
