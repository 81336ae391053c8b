"""Optimism and cross-validation against refits by statsmodels on written-out records, and what designs demand."""

from __future__ import annotations

import sys
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import statsmodels.api as sm
from sklearn.metrics import brier_score_loss, roc_auc_score

from oddsmodel.checks import internal_validation, run_checks, validation
from oddsmodel.checks.internal_validation import check
from oddsmodel.checks.refits import ColumnsAnew, SameColumns, refits_of
from oddsmodel.checks.resamples import population_of_rows
from oddsmodel.checks.validation import Validation, bootstrap_optimism, cross_validated
from oddsmodel.design.encoder import build_design
from oddsmodel.design.formula import vet_formula
from oddsmodel.model.fitted import FittedModel
from oddsmodel.randomness import generator

sys.path.insert(0, str(Path(__file__).parent))
from fit_models import grouped_model, record_model, simulated
from form_models import birth_weights, fitted
from form_on_disk import on_disk, single_rows, ward_model
from grouped_models import grouped

Written = tuple[np.ndarray, np.ndarray]


def small() -> FittedModel:
    X, y = simulated(150, [-0.8, 0.7, 0.0, -0.4], seed=4)
    return record_model(np.round(X, 1), y)


def validated(model: FittedModel, **changes: Any) -> Validation:
    made = Validation(*refits_of(model), True, True, model.seed, model.name)
    return replace(made, **changes)


def written_out(model: FittedModel, events: np.ndarray, trials: np.ndarray, X: np.ndarray | None = None) -> Written:
    """The rows of the matrix and the outcomes, each as often as it counts."""
    X = model.likelihood.passes.taken(range(model.rows.number))["X"] if X is None else X
    both = np.column_stack([events, trials - events]).ravel()
    return np.repeat(np.repeat(X, 2, axis=0), both, axis=0), np.repeat(np.tile([1.0, 0.0], len(X)), both)


def measured(X: np.ndarray, y: np.ndarray, coefficients: np.ndarray) -> tuple[float, float, float, float]:
    """Area and Brier score by scikit-learn, slope and intercept by statsmodels."""
    linear = X @ coefficients
    slope = sm.GLM(y, sm.add_constant(linear), family=sm.families.Binomial()).fit(tol=1e-13).params[1]
    level = sm.GLM(y, np.ones(len(y)), family=sm.families.Binomial(), offset=linear).fit(tol=1e-13).params[0]
    return roc_auc_score(y, linear), slope, level, brier_score_loss(y, 1 / (1 + np.exp(-linear)))


def refit(X: np.ndarray, y: np.ndarray) -> np.ndarray:
    return np.asarray(sm.GLM(y, X, family=sm.families.Binomial()).fit(tol=1e-13).params)


def test_optimism_is_that_of_refits_to_copies_of_the_records() -> None:
    model = small()
    made = validated(model)
    found = bootstrap_optimism(made, 12, lambda steps: None)
    population = made.population
    original = written_out(model, *population.counted(population.cells))
    gaps = []
    for replicate in range(12):
        drawn = population.drawn(generator(model.seed, "bootstrap", model.name, replicate))
        assert drawn.sum() == 150
        own = written_out(model, *population.counted(drawn))
        coefficients = refit(*own)
        gaps.append(np.subtract(measured(*own, coefficients), measured(*original, coefficients)))
    assert found.fitted == found.resamples == 12
    assert tuple(found.optimism or ()) == pytest.approx(np.mean(gaps, axis=0), rel=1e-6, abs=1e-8)


def test_cross_validation_is_that_of_refits_without_each_fold() -> None:
    model = small()
    made = validated(model)
    found = cross_validated(made, 5, 3, lambda steps: None)
    population = made.population
    repeats = []
    for repeat in range(3):
        folds = population.dealt(5, generator(model.seed, "cross-validation", model.name, repeat))
        assert (folds.sum(axis=0) == population.cells).all()
        linear, outcomes, pairs = [], [], []
        for fold in folds:
            coefficients = refit(*written_out(model, *population.counted(population.cells - fold)))
            X, y = written_out(model, *population.counted(fold))
            linear.append(X @ coefficients)
            outcomes.append(y)
            pairs.append((y.sum() * (1 - y).sum(), roc_auc_score(y, linear[-1])))
        number, areas = np.array(pairs).T
        _, slope, level, brier = measured(np.concatenate(linear)[:, None], np.concatenate(outcomes), np.ones(1))
        repeats.append((np.average(areas, weights=number), slope, level, brier))
    assert tuple(found.measures or ()) == pytest.approx(np.mean(repeats, axis=0), rel=1e-6, abs=1e-8)
    assert found.fitted == 15


def test_knots_and_means_are_taken_anew_from_each_resample() -> None:
    frame = birth_weights()
    model = fitted("rcs(age, 3) + standardize(lwt) + smoke", frame, frame["low"] == 1, ["smoke"])
    population, refits = refits_of(model)
    assert isinstance(refits, ColumnsAnew)
    events, trials = population.counted(population.drawn(generator(1, "bootstrap", "main", 0)))
    linear = refits.linear(events[None], trials[None])[0]
    rows = refits.frame
    copies = rows.iloc[np.repeat(np.arange(len(rows)), trials)].reset_index(drop=True)
    vetted = vet_formula("rcs(age, 3) + standardize(lwt) + smoke", columns=set(frame), outcome="low", where="test")
    design = build_design(vetted, copies, model.columns, ("smoke",))
    X = design.encode(rows)
    assert linear == pytest.approx(X @ refit(*written_out(model, events, trials, X)), rel=1e-6, abs=1e-7)
    held = model.design.encode(rows)
    fixed = held @ refit(*written_out(model, events, trials, held))
    assert np.abs(linear - fixed).max() > 1e-3


@pytest.mark.parametrize(
    ("formula", "learns"),
    [
        ("smoke + age", False),
        ("smoke + log(age) + I(age**2) + rcs(lwt, [100, 130, 160]) + cut(age, [20, 30])", False),
        ("smoke * rcs(age, 3)", True),
        ("smoke + bs(age, df=4)", True),
        ("cr(age, df=3) - 1", True),
        ("smoke + I((age - 20) * center(lwt))", True),
        ("smoke + C(race, Treatment('other')) : standardize(lwt)", True),
    ],
)
def test_which_formulas_learn_from_the_records(formula: str, learns: bool) -> None:
    frame = birth_weights()
    model = fitted(formula, frame, frame["low"] == 1, ["smoke"] if "smoke" in formula else ["age"])
    population, refits = refits_of(model)
    assert isinstance(refits, ColumnsAnew if learns else SameColumns)
    # The records themselves give back the model's own fit, whatever the way.
    events, trials = population.counted(population.cells)
    linear = refits.linear(events[None], trials[None])[0]
    X = model.likelihood.passes.taken(range(model.rows.number))["X"]
    if isinstance(refits, ColumnsAnew):
        X = model.design.encode(refits.frame)
    assert linear == pytest.approx(X @ model.fit.coefficients, rel=1e-7, abs=1e-7)


def test_resamples_that_separate_or_lack_a_level_are_counted_and_left_out() -> None:
    X, y = simulated(120, [-0.5, 0.6], seed=3)
    rare = np.zeros(120)
    rare[[3, 40, 77]] = 1.0
    y[[3, 40, 77]] = [1.0, 0.0, 0.0]
    model = record_model(np.column_stack([X, rare]), y)
    result = check(model)
    fitted_ones = result.statistics["resamples_fitted"]
    assert fitted_ones is not None
    # Independently: a resample can be fitted where the three records have both outcomes.
    population = population_of_rows(model)
    rows = model.likelihood.passes.taken(range(model.rows.number))["X"][:, 2] == 1.0

    def mixed(cells: np.ndarray) -> bool:
        events, trials = (counts[rows].sum() for counts in population.counted(cells))
        return bool(0 < events < trials)

    both = sum(mixed(population.drawn(generator(model.seed, "bootstrap", "main", one))) for one in range(200))
    deals = [population.dealt(10, generator(model.seed, "cross-validation", "main", one)) for one in range(10)]
    told_apart = sum(mixed(population.cells - fold) for deal in deals for fold in deal)
    assert fitted_ones == both < 150
    assert f"could not be fitted to {200 - both} of the resamples" in result.tables[0].note
    assert result.statistics["folds_fitted"] == told_apart < 95
    assert f"{100 - told_apart} of the 100 folds held out" in result.tables[0].note


def test_nothing_is_said_where_hardly_a_resample_can_be_fitted() -> None:
    X, y = simulated(60, [0.0, 0.5], seed=3)
    marks = np.zeros((60, 4))
    for k in range(4):
        marks[[2 * k, 2 * k + 1], k] = 1.0
        y[[2 * k, 2 * k + 1]] = [0.0, 1.0]
    result = check(record_model(np.column_stack([X, marks]), y))
    assert result.verdict == "look"
    assert result.statistics["area_corrected"] is None
    assert "half of the resamples" in result.reasons["slope_corrected"]
    assert "Too many resamples" in result.line
    assert result.findings[0].code == "predictions-too-extreme"


def test_cases_and_controls_are_drawn_apart_and_what_rests_on_the_intercept_is_left_out() -> None:
    model = replace(small(), study_design="case-control")
    population = population_of_rows(model)
    cases = model.events
    for replicate in range(5):
        events, trials = population.counted(population.drawn(generator(1, "a", "b", replicate)))
        assert (events.sum(), trials.sum()) == (cases, 150)
    result = check(model)
    assert result.statistics["area_corrected"] is not None
    assert result.statistics["slope_cross_validated"] is not None
    for name in ("in_the_large_corrected", "brier", "brier_corrected", "brier_cross_validated"):
        assert result.statistics[name] is None
        assert "case-control" in result.reasons[name]
    assert [row[0] for row in result.tables[0].rows] == ["Area under the curve", "Calibration slope (1 is right)"]
    matched = check(replace(model, study_design="matched case-control"))
    assert matched.verdict == "not applicable"


def test_groups_are_drawn_and_dealt_whole() -> None:
    model = grouped()
    assert model.grouping is not None
    held, patterns = model.grouped
    population = population_of_rows(model)
    codes, number = model.grouping.codes, model.grouping.number
    times = np.bincount(generator(5, "a", "b", 0).integers(0, number, number), minlength=number)
    events, trials = population.counted(population.drawn(generator(5, "a", "b", 0)))
    assert (trials == np.bincount(patterns.index, weights=times[codes], minlength=len(trials))).all()
    assert (events == np.bincount(patterns.index, weights=times[codes] * held.event, minlength=len(trials))).all()
    folds = population.dealt(10, generator(5, "a", "b", 1))
    assert (folds.sum(axis=0) == population.cells).all()
    fold = generator(5, "a", "b", 1).permutation(number) % 10
    assert folds.sum(axis=1).tolist() == np.bincount(fold[codes], minlength=10).tolist()
    result = check(model)
    assert result.statistics["resamples"] == 200
    assert result.verdict != "not applicable"
    # Records, not patterns, are the rows where knots are taken anew; the groups drawn are the same.
    curved = grouped("rcs(x, 3) + z")
    other, refits = refits_of(curved)
    assert isinstance(refits, ColumnsAnew)
    again = other.counted(other.drawn(generator(5, "a", "b", 0)))
    assert (again[1] == times[codes]).all()
    assert (again[0] == times[codes] * held.event).all()
    assert check(curved).statistics["area_corrected"] is not None
    few = check(replace(model, grouping=replace(model.grouping, number=9)))
    assert few.verdict == "not applicable"
    assert "9 groups" in few.line


@pytest.mark.parametrize("times", [1, 40])
def test_draws_and_deals_of_counted_records(times: int) -> None:
    """Records drawn one by one and as counts of their cells: means and variances of the multinomial distribution."""
    model = grouped_model([[1, 0], [1, 1], [1, 2]], np.array([2, 3, 5]) * times, np.array([6, 6, 6]) * times)
    population = population_of_rows(model)
    n = 18 * times
    draws = np.array([population.drawn(generator(3, "draws", "", one)) for one in range(4000)])
    share = population.cells / n
    assert (draws.sum(axis=1) == n).all()
    error = np.sqrt(n * share * (1 - share) / 4000)
    assert (np.abs(draws.mean(axis=0) - n * share) < 4 * error).all()
    assert draws.var(axis=0) == pytest.approx(n * share * (1 - share), rel=0.12)
    folds = np.array([population.dealt(6, generator(3, "folds", "", one)) for one in range(1000)])
    assert (folds.sum(axis=1) == population.cells).all()
    assert np.ptp(folds[:, :, :3].sum(axis=2)) <= 1
    assert np.ptp(folds[:, :, 3:].sum(axis=2)) <= 1
    for part in (slice(0, 3), slice(3, 6)):
        sizes = folds[0, :, part].sum(axis=1)
        expected = np.outer(sizes, population.cells[part] / population.cells[part].sum())
        assert folds[:, :, part].mean(axis=0) == pytest.approx(expected, rel=0.15)


def test_results_do_not_depend_on_how_many_are_fitted_together(monkeypatch: pytest.MonkeyPatch) -> None:
    model = small()
    whole = check(model).statistics
    monkeypatch.setattr(validation, "MOST_AT_ONCE", 7)
    assert check(model).statistics == pytest.approx(whole, rel=1e-9)
    assert check(replace(model, seed=3)).statistics["area_optimism"] != whole["area_optimism"]
    assert check(replace(model, name="other")).statistics["area_optimism"] != whole["area_optimism"]


@pytest.mark.parametrize("formula", ["exposure + ward + age", "exposure + ward + rcs(age, 3)"])
def test_records_on_disk_and_single_rows_give_the_same(
    formula: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(internal_validation, "MOST_RESAMPLES", 20)
    together = ward_model(3000, formula)
    one = check(together).statistics
    assert check(on_disk(together, tmp_path / "patterns")).statistics == pytest.approx(one, rel=1e-7, abs=1e-9)
    single_rows(monkeypatch)
    apart = on_disk(ward_model(3000, formula), tmp_path / "rows")
    assert apart.rows.single
    assert check(apart).statistics == pytest.approx(one, rel=1e-7, abs=1e-9)


def test_columns_that_nearly_depend_on_one_another() -> None:
    """Raw calendar years with their squares: the same as with years since 2005."""
    rng = np.random.default_rng(6)
    year = rng.integers(1990, 2021, 300).astype(float)
    y = (rng.random(300) < 1 / (1 + np.exp(-0.05 * (year - 2005)))).astype(float)
    since = year - 2005.0
    one = check(record_model(np.column_stack([np.ones(300), year, year**2]), y)).statistics
    other = check(record_model(np.column_stack([np.ones(300), since, since**2]), y)).statistics
    assert one == pytest.approx(other, rel=1e-6, abs=1e-8)


def test_too_many_rows_say_what_to_expect(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(internal_validation, "MOST_SORTED", 100)
    model = small()
    result = check(model)
    assert result.verdict == "not applicable"
    ratio = 2 * (model.fit.log_likelihood - sm.Logit(*reversed(written_out_once(model))).fit(disp=0).llnull)
    assert f"about {1 - 3 / ratio:.4f}" in result.line
    monkeypatch.undo()
    monkeypatch.setattr(internal_validation, "WORK", 1e6)
    assert check(model).statistics["resamples"] == 32
    monkeypatch.setattr(internal_validation, "WORK", 1e5)
    assert check(model).verdict == "not applicable"


def written_out_once(model: FittedModel) -> Written:
    population = population_of_rows(model)
    return written_out(model, *population.counted(population.cells))


def test_what_cannot_be_validated() -> None:
    X, y = simulated(100, [-3.0, 0.5], seed=1)
    assert y.sum() < 10
    assert "at least 10" in check(record_model(X, y)).line
    alone = check(record_model(np.ones((50, 1)), np.repeat([0.0, 1.0], 25), exposed=()))
    assert alone.verdict == "not applicable"
    assert "no column" in alone.line
    assert set(alone.reasons) == set(alone.statistics)


def test_a_model_without_an_intercept_is_measured_on_its_own_records() -> None:
    X, y = simulated(200, [-0.6, 0.8, 0.4], seed=9)
    model = record_model(np.round(X[:, 1:], 1), y, intercept=False, exposed=(0,))
    made = validated(model, balanced=False)
    found = bootstrap_optimism(made, 3, lambda steps: None)
    population = made.population
    original = written_out(model, *population.counted(population.cells))
    gaps = []
    for replicate in range(3):
        drawn = population.drawn(generator(model.seed, "bootstrap", model.name, replicate))
        own = written_out(model, *population.counted(drawn))
        coefficients = refit(*own)
        gaps.append(np.subtract(measured(*own, coefficients), measured(*original, coefficients)))
    assert tuple(found.optimism or ()) == pytest.approx(np.mean(gaps, axis=0), rel=1e-6, abs=1e-8)
    assert check(model).statistics["area_corrected"] is not None


def test_prediction_asks_for_it_and_progress_is_told() -> None:
    class Heard:
        def __init__(self) -> None:
            self.stages: list[tuple[str, int | None]] = []
            self.steps: list[int] = []

        def stage(self, name: str, total: int | None = None) -> None:
            self.stages.append((name, total))
            self.steps.append(0)

        def advance(self, steps: int = 1) -> None:
            self.steps[-1] += steps

    frame = birth_weights()
    model = fitted("smoke + age + lwt", frame, frame["low"] == 1, ["smoke"])
    assert not {"internal_validation", "sample_size_for_prediction"} & {one.name for one in run_checks(model)}
    heard = Heard()
    checks = run_checks(replace(model, aim="prediction"), heard)
    assert {"internal_validation", "sample_size_for_prediction"} <= {one.name for one in checks}
    assert [name for name, _ in heard.stages] == ["checking", "validating"]
    assert heard.steps == [total for _, total in heard.stages]
    asked = run_checks(replace(model, also=("calibration_error", "discrimination")))
    assert {"calibration_error", "discrimination"} <= {one.name for one in asked}
