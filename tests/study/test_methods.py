"""Penalised likelihood and log-F priors by way of a plan, against direct computation with scipy and statsmodels."""

from __future__ import annotations

import sys
from pathlib import Path

import jsonschema
import mpmath
import numpy as np
import pytest
import statsmodels.api as sm
from scipy import stats

from oddsmodel.errors import InputFault
from oddsmodel.export.results_json import results_schema
from oddsmodel.plan.read import read_plan
from oddsmodel.study import check
from oddsmodel.study.streamed.open import refuse_what_needs_memory

sys.path.insert(0, str(Path(__file__).parent))
from method_runs import (
    COLUMNS,
    ORDERED,
    coefficient,
    log_likelihood,
    matrix,
    maximum,
    penalised,
    profile_limit,
    records,
    report,
    run,
    table,
)

PRIOR = 'method = "log-F"\nprior = {m = 2, columns = ["prophylaxis"]}\n'
PER_COLUMN = np.array([1.0, 1.0, 10.0, 1.0])
"""Intercept, prophylaxis, age per 10 years, dirty."""

OF_ANY_METHOD = {"counting", "sparse_cells", "overlap", "independence"}


# Penalised likelihood


def test_penalised_estimates_limits_and_tests_are_those_of_direct_maximisation(tmp_path: Path) -> None:
    frame = records(60)
    _, results = run(tmp_path, frame, more='method = "penalised"')
    (model,) = results["models"]
    assert (model["method"], model["status"], model["added_by_program"]) == ("penalised", "converged", False)
    X, y = matrix(frame, "prophylaxis", "age", "dirty")
    X = X / PER_COLUMN
    value = penalised(X, y)
    best, height = maximum(value, np.zeros(4))
    found = [coefficient(model, term) for term in ("Intercept", "prophylaxis", "age", "dirty")]
    assert [one["log_odds_ratio"] for one in found] == pytest.approx(best.tolist(), abs=1e-5)
    lower, upper = (profile_limit(value, best, height, 1, towards) for towards in (-1.0, 1.0))
    limits = found[1]["profile"]
    assert np.log([limits["lower"], limits["upper"]]) == pytest.approx([lower, upper], abs=1e-5)
    # the test keeps the penalty of the whole model (Heinze & Schemper 2002)
    _, without = maximum(lambda rest: value(np.array([rest[0], 0.0, rest[1], rest[2]])), np.zeros(3))
    term = next(term for term in model["terms"] if term["term"] == "prophylaxis")
    assert term["likelihood_ratio"] == pytest.approx(2 * (height - without), abs=1e-6)
    assert term["p"] == pytest.approx(stats.chi2.sf(2 * (height - without), 1), rel=1e-5)
    assert model["log_likelihood"] == pytest.approx(log_likelihood(X, y, best), abs=1e-6)
    assert model["certificate"]["digits"] is None
    assert "not for this method" in model["reasons"]["certificate"]
    jsonschema.validate(results, results_schema())


def test_penalised_estimates_to_many_digits(tmp_path: Path) -> None:
    """The modified score equations, solved by mpmath."""
    frame = records(25, seed=8)
    _, results = run(tmp_path, frame, "prophylaxis + age", 'method = "penalised"')
    X, y = matrix(frame, "prophylaxis", "age")
    with mpmath.workdps(30):
        rows = [[mpmath.mpf(float(cell)) for cell in row] for row in X]

        def score(*beta: mpmath.mpf) -> list[mpmath.mpf]:
            risks = [1 / (1 + mpmath.exp(-sum(b * x for b, x in zip(beta, row, strict=True)))) for row in rows]
            information = mpmath.matrix(3, 3)
            for row, risk in zip(rows, risks, strict=True):
                for i in range(3):
                    for j in range(3):
                        information[i, j] += risk * (1 - risk) * row[i] * row[j]
            inverse = information**-1
            total = [mpmath.mpf(0)] * 3
            for row, risk, event in zip(rows, risks, y, strict=True):
                reach = sum(row[i] * inverse[i, j] * row[j] for i in range(3) for j in range(3))
                residual = event - risk + risk * (1 - risk) * reach * (mpmath.mpf("0.5") - risk)
                total = [one + residual * cell for one, cell in zip(total, row, strict=True)]
            return total

        model = results["models"][0]
        found = [coefficient(model, term)["log_odds_ratio"] for term in ("Intercept", "prophylaxis", "age")]
        root = [float(one) for one in mpmath.findroot(score, [found[0], found[1], found[2] / 10])]
    assert found == pytest.approx([root[0], root[1], 10 * root[2]], rel=1e-9)


def test_a_saturated_penalised_model_is_the_table_with_a_half_added(tmp_path: Path) -> None:
    """Firth 1993: for any 2×2 table, exactly."""
    for number, (a, b, c, d) in enumerate([(3, 17, 9, 8), (0, 12, 7, 20), (5, 0, 2, 9)]):
        folder = tmp_path / str(number)
        folder.mkdir()
        _, results = run(folder, table(a, b, c, d), "prophylaxis", 'method = "penalised"', records='count = "n"')
        (model,) = results["models"]
        expected = (a + 0.5) * (d + 0.5) / ((b + 0.5) * (c + 0.5))
        assert model["status"] == "converged"
        assert coefficient(model, "prophylaxis")["odds_ratio"] == pytest.approx(expected, rel=1e-10)


def test_true_frequencies_count_as_records(tmp_path: Path) -> None:
    frame = records(90).drop(columns=["age", "ward"])
    counted = frame.groupby(list(frame.columns), as_index=False).size().rename(columns={"size": "n"})
    for name, more in (("p", 'method = "penalised"'), ("l", PRIOR), ("e", 'method = "exact"')):
        found = []
        for data, rows in ((frame, ""), (counted, 'count = "n"')):
            folder = tmp_path / f"{name}{len(found)}"
            folder.mkdir()
            _, results = run(folder, data, "prophylaxis + dirty", more, records=rows)
            found.append(coefficient(results["models"][0], "prophylaxis"))
        part = "exact" if name == "e" else "profile"
        assert found[0]["odds_ratio"] == pytest.approx(found[1]["odds_ratio"], rel=1e-9)
        assert found[0][part] == pytest.approx(found[1][part], rel=1e-8)


def test_intercepts_for_risks_stand_only_where_the_design_knows_risks(tmp_path: Path) -> None:
    for design in ("cohort", "case-control"):
        (tmp_path / design).mkdir()
        outcome, results = run(tmp_path / design, records(), more='method = "penalised"', design=design)
        tables = {one.id: one for one in outcome.results.models[0].tables}
        assert ("corrected_intercept" in tables) == (design == "cohort")
        intercept = coefficient(results["models"][0], "Intercept")
        assert (intercept["odds_ratio"] is None) == (design == "case-control")
        assert ("FLIC" in report(outcome)) == (design == "cohort")


def test_a_corrected_intercept_gives_the_share_observed(tmp_path: Path) -> None:
    """Puhr et al. 2017."""
    frame = records(80, seed=9)
    outcome, results = run(tmp_path, frame, more='method = "penalised"')
    (model,) = results["models"]
    X, y = matrix(frame, "prophylaxis", "age", "dirty")
    beta = np.array(
        [coefficient(model, term)["log_odds_ratio"] for term in ("Intercept", "prophylaxis", "age", "dirty")]
    )
    (corrected,) = [one for one in outcome.results.models[0].tables if one.id == "corrected_intercept"]
    (_, plain), (_, flic), (_, flac) = corrected.rows
    assert plain == pytest.approx(beta[0], rel=1e-12)
    assert isinstance(flic, float)
    assert isinstance(flac, float)
    risk = 1 / (1 + np.exp(-(X / PER_COLUMN @ np.array([flic, *beta[1:]]))))
    assert risk.mean() == pytest.approx(y.mean(), rel=1e-9)
    assert abs(flac - flic) < 0.2


def test_several_levels_and_a_trend_by_penalised_likelihood(tmp_path: Path) -> None:
    frame = records(80, seed=5)
    more = 'method = "penalised"\ntrend = ["ward"]\n'
    outcome, _ = run(tmp_path, frame, "ward + dirty", more, exposures=("ward",), ward=ORDERED)
    (model,) = outcome.results.models
    X, y = matrix(frame, "ward", "dirty")
    value = penalised(X, y)
    best, height = maximum(value, np.zeros(4))
    assert [one.log_odds_ratio for one in model.coefficients] == pytest.approx(best.tolist(), abs=1e-5)
    (trend,) = model.trends
    # the score stands for the levels, with the penalty of the whole model
    step, along = maximum(lambda b: value(np.array([b[0], b[1], 2 * b[1], b[2]])), np.zeros(3))
    _, without = maximum(lambda b: value(np.array([b[0], 0.0, 0.0, b[1]])), np.zeros(2))
    assert trend.step is not None
    assert trend.step.log_odds_ratio == pytest.approx(step[1], abs=1e-5)
    assert trend.trend.likelihood_ratio == pytest.approx(2 * (along - without), abs=1e-6)
    assert trend.departure.likelihood_ratio == pytest.approx(2 * (height - along), abs=1e-6)


def test_without_an_intercept_the_whole_model_is_tested_against_no_columns(tmp_path: Path) -> None:
    frame = records(80)
    _, results = run(tmp_path, frame, "0 + age", 'method = "penalised"', exposures=("age",))
    X, y = matrix(frame, "age")
    value = penalised(X[:, 1:] / 10, y)
    _, height = maximum(value, np.zeros(1))
    whole = next(term for term in results["models"][0]["terms"] if term["term"] == "whole model")
    assert whole["likelihood_ratio"] == pytest.approx(2 * (height - value(np.zeros(1))), abs=1e-6)


# log-F priors


def test_a_prior_is_pseudo_records_in_estimates_and_errors(tmp_path: Path) -> None:
    """Data augmentation (Greenland & Mansournia 2015): m/2 events and m/2 others whose only column is the exposure's
    (or age per 10 years), by statsmodels' weighted binomial regression."""
    frame = records(100)
    more = 'method = "log-F"\nprior = {m = 3, columns = ["prophylaxis", "age"]}\n'
    outcome, results = run(tmp_path, frame, more=more)
    (model,) = results["models"]
    X, y = matrix(frame, "prophylaxis", "age", "dirty")
    pseudo = np.array([[0.0, 1.0, 0.0, 0.0], [0.0, 0.0, 10.0, 0.0]])
    rows = np.vstack([X, pseudo])
    outcomes = np.column_stack([np.append(y, [1.5, 1.5]), np.append(1 - y, [1.5, 1.5])])
    fitted = sm.GLM(outcomes, rows, family=sm.families.Binomial()).fit(tol=1e-14, maxiter=200)
    for place, term in enumerate(("Intercept", "prophylaxis", "age", "dirty")):
        one = coefficient(model, term)
        assert one["log_odds_ratio"] == pytest.approx(PER_COLUMN[place] * fitted.params[place], abs=1e-8)
        assert one["standard_error"] == pytest.approx(PER_COLUMN[place] * fitted.bse[place], rel=1e-6)
    # pseudo-records reach no count
    assert model["records"] == 100
    assert model["events"] == int(y.sum())
    assert model["log_likelihood"] == pytest.approx(log_likelihood(X, y, fitted.params), abs=1e-8)
    assert model["certificate"]["digits"] >= 12
    told = next(one for one in model["findings"] if one["code"] == "prior-in-words")
    low, high = told["facts"]["lower"], told["facts"]["upper"]
    assert high == pytest.approx(stats.f.ppf(0.975, 3, 3), rel=1e-9)
    assert low == pytest.approx(1 / high, rel=1e-9)
    assert "95% probable before the records are seen" in report(outcome)


def test_profile_limits_with_a_prior(tmp_path: Path) -> None:
    frame = records(70)
    _, results = run(tmp_path, frame, "prophylaxis + dirty", PRIOR)
    X, y = matrix(frame, "prophylaxis", "dirty")

    def value(beta: np.ndarray) -> float:
        # log-F(2, 2) is the logistic distribution
        return log_likelihood(X, y, beta) + float(stats.logistic.logpdf(beta[1]))

    best, height = maximum(value, np.zeros(3))
    limits = [profile_limit(value, best, height, 1, towards) for towards in (-1.0, 1.0)]
    found = coefficient(results["models"][0], "prophylaxis")["profile"]
    assert np.log([found["lower"], found["upper"]]) == pytest.approx(limits, abs=1e-5)


def test_a_prior_makes_separated_records_finite_or_leaves_them_without_maximum(tmp_path: Path) -> None:
    frame = records(nobody="prophylaxis")
    for name, column in (("held", "prophylaxis"), ("free", "age")):
        (tmp_path / name).mkdir()
        more = f'method = "log-F"\nprior = {{m = 1, columns = ["{column}"]}}\n'
        outcome, results = run(tmp_path / name, frame, more=more)
        (model,) = results["models"]
        if name == "held":
            assert model["status"] == "converged"
            assert coefficient(model, "prophylaxis")["odds_ratio"] < 0.2
        else:
            # asked for in the plan, so nothing is added beside it
            assert outcome.not_estimated
            assert model["status"] == "no finite maximum"
            (stop,) = [one for one in model["findings"] if one["code"] == "separated"]
            assert "No odds ratio of this model is shown" in stop["message"]


@pytest.mark.parametrize(
    ("formula", "prior", "words"),
    [
        ("prophylaxis + age", '["dirty"]', "The prior names “dirty”, which is not in the formula"),
        ("prophylaxis + age", '["prophylaxs"]', "Did you mean “prophylaxis”?"),
        ("prophylaxis + rcs(age, 3)", '["age"]', "“age” has no odds ratio of its own"),
        ("prophylaxis * dirty", '["dirty"]', "“dirty” has no odds ratio of its own"),
        ("prophylaxis + age", "[]", "The prior names no column"),
    ],
)
def test_a_prior_for_what_has_no_odds_ratio_is_a_fault(tmp_path: Path, formula: str, prior: str, words: str) -> None:
    with pytest.raises(InputFault) as caught:
        run(tmp_path, records(), formula, f'method = "log-F"\nprior = {{m = 2, columns = {prior}}}\n')
    assert words in str(caught.value)
    assert "prior" in str(caught.value)


# Records that are not in memory


@pytest.mark.parametrize("more", ['method = "exact"', PRIOR])
def test_what_needs_the_records_in_memory_says_so(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, more: str) -> None:
    monkeypatch.setattr(check, "wanted", lambda path: 10**15)
    with pytest.raises(InputFault) as caught:
        run(tmp_path, records(), more=more)
    assert caught.value.faults[0].where == "the plan, [[models]] “main” method"
    assert "This method needs the records in memory" in str(caught.value)
    assert not (tmp_path / "plan-report").exists()


@pytest.mark.parametrize("more", ['method = "exact"', PRIOR])
def test_what_needs_all_records_in_one_place_is_refused_on_workers(tmp_path: Path, more: str) -> None:
    run(tmp_path, records(40).assign(age=50), "prophylaxis", more)
    plan = read_plan(tmp_path / "plan.toml").plan
    with pytest.raises(InputFault, match="the run has them on workers"):
        refuse_what_needs_memory(plan, "needs-one-machine")


def test_penalised_likelihood_does_not_need_the_records_in_memory(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    found = []
    for where in ("memory", "disk"):
        if where == "disk":
            monkeypatch.setattr(check, "wanted", lambda path: 10**15)
        (tmp_path / where).mkdir()
        found.append(run(tmp_path / where, records(200), more='method = "penalised"')[1])
    assert found[0]["models"][0]["coefficients"] == found[1]["models"][0]["coefficients"]


# Several models


def test_a_model_upon_another_takes_its_method_and_prior_or_has_its_own(tmp_path: Path) -> None:
    more = (
        PRIOR
        + """
[[models]]
name = "same prior"
based_on = "main"
leave_out = ["age"]
[[models]]
name = "stronger prior"
based_on = "main"
prior = {m = 8, columns = ["prophylaxis"]}
[[models]]
name = "penalised"
based_on = "main"
method = "penalised"
[[models]]
name = "plain"
based_on = "penalised"
method = "maximum likelihood"
"""
    )
    frame = records()
    outcome, results = run(tmp_path, frame, more=more)
    main, same, stronger, firth, plain = results["models"]
    ways = ["log-F", "log-F", "log-F", "penalised", "maximum likelihood"]
    assert [one["method"] for one in results["models"]] == ways
    ratios = [coefficient(one, "prophylaxis")["log_odds_ratio"] for one in (main, stronger, plain)]
    assert abs(ratios[1]) < abs(ratios[0]) < abs(ratios[2])
    X, y = matrix(frame, "prophylaxis", "age", "dirty")
    reference = sm.Logit(y, X).fit(disp=0, tol=1e-12)
    assert ratios[2] == pytest.approx(reference.params[1], rel=1e-8)
    best, _ = maximum(penalised(X / PER_COLUMN, y), np.zeros(4))
    assert coefficient(firth, "prophylaxis")["log_odds_ratio"] == pytest.approx(best[1], abs=1e-5)
    assert same["differs"] == "As “main”, without age"
    assert stronger["differs"] == "As “main”, with a log-F(8, 8) prior for the odds ratio of prophylaxis"
    assert firth["differs"] == "As “main”, by penalised likelihood"
    assert plain["differs"] == "As “penalised”, by maximum likelihood"
    words = report(outcome)
    assert "by penalised likelihood</span>" in words
    assert "“penalised” was fitted by penalised likelihood with Jeffreys&#39; penalty" in words


def test_checks_that_rest_on_maximum_likelihood_are_not_made_of_another_fit(tmp_path: Path) -> None:
    for name, more in (("p", 'method = "penalised"'), ("l", PRIOR)):
        (tmp_path / name).mkdir()
        outcome, results = run(tmp_path / name, records(), more=more)
        (model,) = results["models"]
        assert set(model["checks"]) == OF_ANY_METHOD
        assert "checks-of-method" in [one["code"] for one in model["findings"]]
        assert model["checks"]["overlap"]["exposure_odds_ratio_within_overlap"] is None
        assert "Hosmer" not in report(outcome)


def test_levels_against_their_average_by_penalised_likelihood_and_not_by_exact_inference(tmp_path: Path) -> None:
    frame = records(70, seed=11)
    X, y = matrix(frame, "ward", "dirty")
    averaged = f'{COLUMNS["ward"]}\ncompare_with = "network average"'
    for name in ("penalised", "exact"):
        (tmp_path / name).mkdir()
        more = f'method = "{name}"'
        outcome, _ = run(tmp_path / name, frame, "ward + dirty", more, exposures=("ward",), ward=averaged)
        (model,) = outcome.results.models
        if name == "exact":
            assert model.averages == ()
            assert "average-without-contrast" in [one.code for one in model.findings]
            continue
        # the contrasts of B and C with the average as coefficients of their own
        turned = X @ np.linalg.inv(
            np.array([[1.0, 0, 0, 0], [0, 2 / 3, -1 / 3, 0], [0, -1 / 3, 2 / 3, 0], [0, 0, 0, 1]])
        )
        value = penalised(turned, y)
        best, height = maximum(value, np.zeros(4))
        one = model.averages[1]
        assert one.level == "B"
        assert one.log_odds_ratio == pytest.approx(best[1], abs=1e-5)
        limits = [profile_limit(value, best, height, 1, towards) for towards in (-1.0, 1.0)]
        assert np.log([one.profile.lower, one.profile.upper]) == pytest.approx(limits, abs=1e-5)
