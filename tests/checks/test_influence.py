"""Influence by covariate pattern against Pregibon 1981, statsmodels and fits without the patterns."""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm
from hypothesis import given, settings
from hypothesis import strategies as st

from oddsmodel.checks.deletion import without
from oddsmodel.checks.influence import check
from oddsmodel.checks.one_step import AtTheFit, OneStep, one_step, ranked
from oddsmodel.checks.residuals import pattern_residuals
from oddsmodel.likelihood import BinomialLikelihood
from oddsmodel.model.fitted import FittedModel

sys.path.insert(0, str(Path(__file__).parent))
from fit_models import grouped_model, record_model, simulated, vaso
from form_models import fitted


def counted(m: int = 30, seed: int = 8) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    rng = np.random.default_rng(seed)
    X = np.column_stack([np.ones(m), rng.normal(size=(m, 2))])
    trials = rng.integers(3, 60, m)
    events = rng.binomial(trials, 1 / (1 + np.exp(-(X @ [-0.4, 0.7, -0.5]))))
    return X, events, trials


def steps_of(model: FittedModel, targets: tuple[int, ...]) -> OneStep:
    rows = model.rows.passes.arrays
    residuals = pattern_residuals(rows, model.fit.coefficients)
    return one_step(rows["X"], residuals, AtTheFit.of(model, targets))


def test_patterns_4_and_18_of_pregibon_1981() -> None:
    # Pregibon 1981, section 5: observations 4 and 18 stand out in chi-square, deviance and coefficients
    X, y = vaso()
    steps = steps_of(grouped_model(X, y), (1, 2))
    for diagnostic in (steps.delta_chi_square, steps.delta_deviance, steps.distance, steps.target_distance):
        assert set(np.argsort(diagnostic)[-2:]) == {3, 17}


def test_statsmodels_agrees() -> None:
    X, events, trials = counted()
    model = grouped_model(X, events, trials)
    steps = steps_of(model, (0, 1, 2))
    reference = sm.GLM(np.column_stack([events, trials - events]), X, family=sm.families.Binomial()).fit(tol=1e-14)
    influence = reference.get_influence(observed=False)
    leverage = influence.hat_matrix_diag
    assert steps.leverage == pytest.approx(leverage, rel=1e-6)
    pearson, deviance = reference.resid_pearson, reference.resid_deviance
    assert steps.delta_chi_square == pytest.approx(pearson**2 / (1 - leverage), rel=1e-5)
    assert steps.delta_deviance == pytest.approx(deviance**2 + pearson**2 * leverage / (1 - leverage), rel=1e-5)
    assert steps.distance == pytest.approx(3 * influence.cooks_distance[0], rel=1e-5)
    # With every coefficient asked for, their standardised shift is the overall one
    assert steps.target_distance == pytest.approx(steps.distance, rel=1e-8)


def test_the_table_of_patterns_holds_what_pregibon_names() -> None:
    X, events, trials = counted()
    result = check(grouped_model(X, events, trials, exposed=(1, 2)))
    table = result.tables[1]
    reference = sm.GLM(np.column_stack([events, trials - events]), X, family=sm.families.Binomial()).fit(tol=1e-14)
    influence = reference.get_influence(observed=False)
    h, pearson, deviance = influence.hat_matrix_diag, reference.resid_pearson, reference.resid_deviance
    covariance = reference.cov_params()
    raw = events - trials * reference.fittedvalues
    shift = -((X @ covariance) * (raw / (1 - h))[:, None])
    keys = [column.key for column in table.columns]
    numbers = {
        "leverage": h,
        "pearson": pearson,
        "deviance": deviance,
        "delta_chi_square": pearson**2 / (1 - h),
        "delta_deviance": deviance**2 + pearson**2 * h / (1 - h),
        "distance": pearson**2 * h / (1 - h) ** 2,
        "odds_ratio_1": np.exp(reference.params[1] + shift[:, 1]),
        "odds_ratio_2": np.exp(reference.params[2] + shift[:, 2]),
    }
    order = ranked(steps_of(grouped_model(X, events, trials), (1, 2)).target_distance, 10)
    for row, j in zip(table.rows, order, strict=True):
        assert row[1:3] == (trials[j], events[j])
        for key, values in numbers.items():
            assert row[keys.index(key)] == pytest.approx(values[j], rel=1e-5, abs=1e-9)


def test_the_table_of_vaso_names_patterns_4_and_18_first() -> None:
    # Pregibon 1981, section 5: observations 4 and 18
    X, y = vaso()
    table = check(grouped_model(X, y, exposed=(1, 2))).tables[1]
    keys = [column.key for column in table.columns]
    pearson = [abs(row[keys.index("pearson")]) for row in table.rows]
    reference = sm.GLM(y, X, family=sm.families.Binomial()).fit(tol=1e-14)
    largest = np.sort(np.abs(reference.resid_pearson))[-2:]
    assert np.sort(pearson[:2]) == pytest.approx(largest, rel=1e-6)
    assert set(np.argsort(np.abs(reference.resid_pearson))[-2:]) == {3, 17}


def test_one_step_is_newtons_first_step_without_the_pattern() -> None:
    X, events, trials = counted()
    model = grouped_model(X, events, trials)
    steps = steps_of(model, (1, 2))
    p = 1 / (1 + np.exp(-X @ model.fit.coefficients))
    for j in (0, 7, 29):
        keep = np.arange(30) != j
        weight = (trials * p * (1 - p))[keep]
        score = X[keep].T @ (events - trials * p)[keep]
        step = np.linalg.solve(X[keep].T @ (X[keep] * weight[:, None]), score)
        assert steps.change[j] == pytest.approx(step[[1, 2]], rel=1e-6)


def test_exact_fits_against_statsmodels() -> None:
    X, events, trials = counted()
    model = grouped_model(X, events, trials)
    result = check(model)
    order = ranked(steps_of(model, (1,)).target_distance, 10)
    table = result.tables[0]
    assert [row[0] for row in table.rows] == ["none", "1", "5", "10"]
    for row, k in zip(table.rows[1:], (1, 5, 10), strict=True):
        keep = ~np.isin(np.arange(30), order[:k])
        outcome = np.column_stack([events, trials - events])[keep]
        reference = sm.GLM(outcome, X[keep], family=sm.families.Binomial()).fit(tol=1e-14)
        assert row[1] == trials[~keep].sum()
        assert row[2] == pytest.approx(np.exp(reference.params[1]), rel=1e-8)


def test_vaso_hangs_on_a_few_records() -> None:
    X, y = vaso()
    model = grouped_model(X, y)
    result = check(model)
    keep = np.arange(39) != 3
    without_4 = sm.Logit(y[keep], X[keep]).fit(disp=0, tol=1e-12)
    assert result.tables[1].rows[0][1] == 1
    assert result.tables[0].rows[1][2] == pytest.approx(np.exp(without_4.params[1]), rel=1e-6)
    assert result.verdict in ("look", "caution")
    assert result.findings[0].code == "few-patterns-move-the-exposure"
    assert "odds ratio" in result.line


def test_many_records_hang_on_none() -> None:
    X, y = simulated(4000, [-1.0, 0.5, 0.5])
    result = check(record_model(X, y))
    assert result.verdict == "fine"
    assert result.statistics["patterns_left_out"] == 10
    assert result.findings == ()
    figure = result.figures[0]
    assert len(figure.x) == len(figure.y) == len(figure.size) == len(figure.records) == 2000
    assert "random sample" in figure.alt
    assert figure == check(record_model(X, y)).figures[0]


def test_a_spline_is_told_in_standard_errors() -> None:
    X, events, trials = counted()
    result = check(grouped_model(X, events, trials, exposed=(1, 2), shown=False))
    assert "standard errors" in result.line
    assert result.statistics["odds_ratio_without"] is None
    assert result.reasons["odds_ratio_without"]
    assert [column.key for column in result.tables[0].columns] == ["patterns", "records"]


def test_large_patterns_are_no_few_records() -> None:
    X = np.array([[1, a, b] for a in (0, 1) for b in (0, 1, 2)], dtype=float)
    result = check(grouped_model(X, [120, 250, 330, 280, 350, 610], np.full(6, 1000)))
    assert result.verdict == "fine"
    assert "large covariate patterns" in result.line
    assert [row[0] for row in result.tables[0].rows] == ["none", "1"]


def test_saturated_and_empty_models() -> None:
    saturated = check(grouped_model([[1, 0], [1, 1]], [10, 20], [50, 50]))
    assert saturated.verdict == "not applicable"
    assert "fixes a coefficient" in saturated.line
    empty = check(grouped_model([[1.0]], [4], [10], exposed=()))
    assert empty.verdict == "not applicable"
    assert empty.reasons["odds_ratio_without"]


def test_no_exposure_still_has_influence() -> None:
    X, events, trials = counted()
    result = check(grouped_model(X, events, trials, exposed=()))
    assert "the model's coefficients" in result.line


def test_a_pattern_that_alone_holds_the_exposure() -> None:
    X, y = simulated(60, [0.0, 0.6])
    X = np.column_stack([X[:, 0], np.zeros(60), X[:, 1]])
    X = np.vstack([X, [1.0, 1.0, 0.2]])
    events, trials = np.append(y, 1.0), np.append(np.ones(60), 2.0)
    model = grouped_model(X, events, trials)
    steps = steps_of(model, (1,))
    assert steps.alone.tolist() == [False] * 60 + [True]
    assert steps.essential[-1]
    result = check(model)
    assert result.verdict == "caution"
    assert result.findings[0].code == "few-patterns-carry-the-exposure"
    assert result.tables[0].rows[1][2] is None
    assert result.tables[0].note
    # the same pattern is nothing to an exposure in the other column
    other = steps_of(model, (2,))
    assert other.alone[-1]
    assert not other.essential[-1]


def test_an_adjustment_level_that_vanishes_does_not_stop_the_exposure() -> None:
    X, y = simulated(80, [0.0, 0.6])
    rare = (np.arange(80) < 2).astype(float)
    y[:2] = [0.0, 1.0]
    model = grouped_model(np.column_stack([X, rare]), y)
    deletion = without(model, [np.array([0, 1])], (1,))[0]
    reference = sm.Logit(y[2:], X[2:]).fit(disp=0, tol=1e-12)
    assert deletion.coefficients is not None
    assert deletion.coefficients[1] == pytest.approx(reference.params[1], rel=1e-8)
    assert without(model, [np.array([0, 1])], (2,))[0].coefficients is None


def test_patterns_are_put_in_words_without_anybodys_own_value() -> None:
    rng = np.random.default_rng(4)
    frame = pd.DataFrame(
        {
            "age": rng.integers(20, 80, 60).astype(float),
            "sex": pd.Categorical(rng.choice(["female", "male"], 60)),
            "dose": rng.integers(0, 12, 60).astype(float),
        }
    )
    model = fitted("cut(age, [50]) + sex + I(dose ** 2)", frame, rng.random(60) < 0.4, ["sex"])
    table = check(model).tables[1]
    # Squares tell the doses apart, bands do not tell the ages apart; a band may hold one person alone
    expected = set()
    for (_, sex, dose), own in frame.groupby([frame["age"] < 50, "sex", "dose"], observed=True):
        age = f"{own['age'].iloc[0]:g}" if own["age"].nunique() == 1 else "several values"
        expected.add((f"Age: {age}, Sex: {sex}, Dose: {dose:g}", len(own)))
    assert {(row[0], row[1]) for row in table.rows} <= expected
    assert {"several" in row[0] for row in table.rows} == {True, False}
    assert all(column.hidden_with or column.kind == "count" for column in table.columns)


def test_case_control_shows_no_expected_share() -> None:
    X, events, trials = counted()
    result = check(grouped_model(X, events, trials, design="case-control"))
    headings = [column.heading for column in result.tables[1].columns]
    assert "Cases" in headings
    assert not any("per 100" in heading for heading in headings)


def test_nearly_collinear_columns_do_no_harm() -> None:
    rng = np.random.default_rng(3)
    year = rng.integers(1990, 2021, 400).astype(float)
    X, c = np.column_stack([np.ones(400), year, year**2]), (year - 2005) / 10
    y = (rng.random(400) < 1 / (1 + np.exp(-(0.2 + 0.5 * c - 0.4 * c**2)))).astype(float)
    raw = steps_of(record_model(X, y), (1, 2))
    centred = steps_of(record_model(np.column_stack([np.ones(400), c, c**2]), y), (1, 2))
    assert raw.leverage == pytest.approx(centred.leverage, rel=1e-5)
    assert raw.distance == pytest.approx(centred.distance, rel=1e-5)


def test_ranking_keeps_the_order_of_equals() -> None:
    assert ranked(np.array([1.0, 3.0, 3.0 + 1e-13, 2.0]), 3).tolist() == [1, 2, 3]
    assert ranked(np.zeros(4), 2).tolist() == [0, 1]


@settings(deadline=None, derandomize=True, max_examples=60)
@given(
    st.lists(st.sampled_from([0.0, 1e-20, 0.5, 0.5 + 1e-13, 2.0, np.inf]), min_size=1, max_size=40), st.integers(1, 9)
)
def test_the_largest_of_all_are_among_the_largest_of_the_parts(scores: list[float], most: int) -> None:
    score = np.array(scores)
    parts = [np.arange(first, min(first + 7, score.size)) for first in range(0, score.size, 7)]
    kept = np.sort(np.concatenate([part[ranked(score[part], most)] for part in parts]))
    assert kept[ranked(score[kept], most)].tolist() == ranked(score, most).tolist()


def test_many_records_are_fitted_again_in_few_passes(monkeypatch: pytest.MonkeyPatch) -> None:
    X, y = simulated(20_000, [-1.0, 0.5, 0.3])
    model = grouped_model(X, y)
    sets = [ranked(steps_of(model, (1,)).target_distance, k) for k in (1, 5, 10)]
    evaluate, calls = BinomialLikelihood.evaluate, []

    def counting(self: BinomialLikelihood, *given: object, **how: object) -> object:
        calls.append(self.rows)
        return evaluate(self, *given, **how)

    monkeypatch.setattr(BinomialLikelihood, "evaluate", counting)
    deletions = without(model, sets, (1,))
    assert calls.count(20_000) <= 3
    for deletion, positions in zip(deletions, sets, strict=True):
        keep = np.ones(20_000, dtype=bool)
        keep[positions] = False
        reference = sm.GLM(y[keep], X[keep], family=sm.families.Binomial()).fit(tol=1e-14)
        assert deletion.coefficients == pytest.approx(reference.params, abs=1e-8 * reference.bse.max())


@pytest.mark.parametrize("n", [300, 30_000])
def test_records_without_which_the_rest_are_separated(n: int) -> None:
    # one of forty exposed has the event: without it there is no finite maximum for the exposure
    X, y = simulated(n, [-0.5, 0.6])
    exposed = (np.arange(n) < 40).astype(float)
    y[:40] = 0.0
    y[17] = 1.0
    model = grouped_model(np.column_stack([X[:, 0], exposed, X[:, 1]]), y)
    lost, other = without(model, [np.array([17]), np.array([3])], (1,))
    assert lost.coefficients is None
    assert other.coefficients is not None
    result = check(model)
    assert result.verdict == "caution"
    assert result.tables[1].rows[0][1:3] == (1, 1)
    assert result.tables[0].rows[1][2] is None
