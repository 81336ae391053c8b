"""Records that are separated: what is proved and said, what stays finite, one-sided limits, and the model beside."""

from __future__ import annotations

import math
import sys
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import jsonschema
import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm
from scipy import optimize

from oddsmodel.cli.run import run_command
from oddsmodel.export.results_json import results_schema
from oddsmodel.model import rows
from oddsmodel.study import check
from oddsmodel.wording import say
from oddsmodel.wording.inference import PROOFS

sys.path.insert(0, str(Path(__file__).parent))
from method_runs import (
    HALF_QUANTILE,
    coefficient,
    log_likelihood,
    matrix,
    maximum,
    penalised,
    profile_limit,
    records,
    report,
    run,
)


def numbers(value: Any) -> Iterator[float]:
    if isinstance(value, dict | list):
        for one in value.values() if isinstance(value, dict) else value:
            yield from numbers(one)
    elif isinstance(value, float):
        yield value


def stop_of(model: dict[str, Any]) -> dict[str, Any]:
    (found,) = [one for one in model["findings"] if one["code"] == "separated"]
    return dict(found)


def limit_by_refits(X: np.ndarray, y: np.ndarray, place: int, supremum: float, start: float, far: float) -> float:
    """Where the profile log-likelihood of one coefficient is the quantile short of its supremum: statsmodels with the
    coefficient as an offset, and scipy's root. The other columns must not be separated once it is held."""
    others = np.delete(X, place, axis=1)

    def short(theta: float) -> float:
        fitted = sm.GLM(y, others, family=sm.families.Binomial(), offset=theta * X[:, place]).fit(tol=1e-12)
        return float(fitted.llf) - (supremum - HALF_QUANTILE)

    return float(optimize.brentq(short, start, far, xtol=1e-10))


def test_what_stays_finite_is_the_fit_without_the_separated_records(tmp_path: Path) -> None:
    frame = records(nobody="prophylaxis")
    outcome, results = run(tmp_path, frame)
    model = results["models"][0]
    rest = frame[frame.prophylaxis == "no"]
    X, y = matrix(rest, "age", "dirty")
    reference = sm.Logit(y, X).fit(disp=0, tol=1e-12)
    for place, (term, per) in enumerate((("Intercept", 1), ("age", 10), ("dirty", 1))):
        one = coefficient(model, term)
        assert one["log_odds_ratio"] == pytest.approx(per * reference.params[place], rel=1e-8)
        assert one["standard_error"] == pytest.approx(per * reference.bse[place], rel=1e-6)
        limits = np.exp(per * reference.conf_int()[place])
        assert [one["wald"]["lower"], one["wald"]["upper"]] == pytest.approx(limits, rel=1e-6)
    assert model["log_likelihood"] == pytest.approx(reference.llf, abs=1e-9)

    def value(beta: np.ndarray) -> float:
        return log_likelihood(X, y, beta)

    best, height = maximum(value, reference.params)
    profiled = coefficient(model, "dirty")["profile"]
    limits = [profile_limit(value, best, height, 2, towards) for towards in (-1.0, 1.0)]
    assert np.log([profiled["lower"], profiled["upper"]]) == pytest.approx(limits, abs=1e-5)
    assert outcome.not_estimated
    share = y.sum() / len(frame)
    null = y.sum() * math.log(share) + (len(frame) - y.sum()) * math.log(1 - share)
    assert model["null_log_likelihood"] == pytest.approx(null, abs=1e-9)


@pytest.mark.parametrize("everybody", [False, True])
def test_the_limit_on_the_one_side_is_that_of_refits(tmp_path: Path, everybody: bool) -> None:
    frame = records(nobody="prophylaxis")
    if everybody:
        frame["infected"] = np.where(frame.infected == "yes", "no", "yes")
    _, results = run(tmp_path, frame)
    one = coefficient(results["models"][0], "prophylaxis")
    X, y = matrix(frame, "prophylaxis", "age", "dirty")
    supremum = sm.Logit(y[X[:, 1] == 0], X[X[:, 1] == 0][:, [0, 2, 3]]).fit(disp=0, tol=1e-12).llf
    sign = 1.0 if everybody else -1.0
    limit = limit_by_refits(X, y, 1, supremum, 0.0, sign * 6.0)
    end, other = ("lower", "upper") if everybody else ("upper", "lower")
    assert math.log(one["profile"][end]) == pytest.approx(limit, abs=1e-6)
    assert one["profile"][other] is one["odds_ratio"] is one["log_odds_ratio"] is one["standard_error"] is None
    side = "above" if everybody else "below"
    assert f"No finite estimate: at or {side} " in one["reasons"]["profile"]


def test_a_limit_is_told_per_the_unit_of_the_plan(tmp_path: Path) -> None:
    """Age alone separates the records but for two of the same age: per 10 years the limit's logarithm is tenfold."""
    age = np.array([30, 34, 38, 41, 45, 50, 50, 55, 60, 63, 70, 72])
    infected = np.array([0, 0, 0, 0, 0, 0, 1, 1, 1, 1, 1, 1])
    frame = pd.DataFrame({"infected": np.where(infected == 1, "yes", "no"), "age": age})
    _, results = run(tmp_path, frame, "age", exposures=("age",))
    one = coefficient(results["models"][0], "age")
    X, y = matrix(frame, "age")
    # the two of the same age keep one event of two, whatever the slope
    limit = limit_by_refits(X - [0, 50], y, 1, 2 * math.log(0.5), 0.0, 2.0)
    assert math.log(one["profile"]["lower"]) == pytest.approx(10 * limit, abs=1e-5)
    words = stop_of(results["models"][0])["message"]
    assert "The values of “age” are all higher among records with the event" in words


def test_the_whole_of_it_has_no_huge_number_and_is_as_the_schema_says(tmp_path: Path) -> None:
    outcome, results = run(tmp_path, records(nobody="prophylaxis"), "prophylaxis + age + dirty + ward")
    jsonschema.validate(results, results_schema())
    assert all(math.isfinite(one) and abs(one) < 1e5 for one in numbers(results["models"]))
    for model in results["models"]:
        for one in model["coefficients"]:
            for name in ("odds_ratio", "log_odds_ratio", "standard_error"):
                assert one[name] is not None or one["reasons"][name]
    assert "No number of correct digits" not in report(outcome)
    for path in (outcome.folder / "tables").glob("*.csv"):
        assert "nan" not in path.read_text(encoding="utf-8").lower()


def test_the_proof_and_the_pattern_are_told(tmp_path: Path) -> None:
    frame = records(nobody="ward")
    _, results = run(tmp_path, frame, "ward + age", exposures=("ward",))
    stop = stop_of(results["models"][0])
    assert "None of the records with “ward: C” has the event." in stop["message"]
    assert "the odds ratio of ward: C against A falls to zero" in stop["message"]
    assert "the proof checked in exact arithmetic" in stop["message"]
    assert stop["facts"]["proof"] == "exact"

    everybody = frame.assign(infected=np.where(frame.ward == "A", "yes", frame.infected))
    folder = tmp_path / "reference"
    folder.mkdir()
    _, results = run(folder, everybody, "ward + age", exposures=("ward",), design="case-control")
    words = stop_of(results["models"][0])["message"]
    # the reference is separated, and so are all contrasts with it
    assert "None of the records with “ward: C” is a case. Every record with “ward: A” is one." in words


@pytest.mark.parametrize("proof", ["exact", "within rounding", "too many columns", "too many steps"])
def test_how_far_the_proof_was_checked_is_said(proof: str) -> None:
    facts = {"rising": ["dose"], "falling": [], "undetermined": ["ward"], "without": [], "always": ["dose: high"]}
    facts |= {"higher": [], "lower": ["age"]}
    words = say("separated", **facts, complete=False, proof=proof, limits=True, case_control=False)
    assert PROOFS[proof] in words
    assert ("in exact arithmetic." in words) == (proof in ("exact", "too many columns"))
    assert "Every record with “dose: high” has the event." in words
    assert "The values of “age” are all lower among records with the event than among the others." in words
    assert "the odds ratio of dose rises without end" in words
    assert "do not settle which way ward would go" in words


def test_separation_by_several_columns_together_names_none(tmp_path: Path) -> None:
    groups = [("yes", "yes", 0, 9), ("yes", "no", 3, 6), ("no", "yes", 4, 7), ("no", "no", 8, 0)]
    frame = pd.DataFrame(
        [
            {"prophylaxis": p, "dirty": d, "infected": outcome, "n": n}
            for p, d, events, others in groups
            for outcome, n in (("yes", events), ("no", others))
        ]
    )
    _, results = run(tmp_path, frame, "prophylaxis + dirty", records='count = "n"')
    assert "No column does so alone; several do together." in stop_of(results["models"][0])["message"]


def test_a_product_of_levels_in_which_nobody_has_the_event_is_named(tmp_path: Path) -> None:
    frame = records(200, seed=6)
    frame.loc[(frame.prophylaxis == "yes") & (frame.dirty == "yes"), "infected"] = "no"
    outcome, results = run(tmp_path, frame, "prophylaxis * dirty + age")
    (label,) = stop_of(results["models"][0])["facts"]["without"]
    assert "prophylaxis" in label
    assert "dirty" in label
    # no odds ratio of its own, so the answer is in words
    assert "enters the model through several columns" in report(outcome)


def test_complete_separation_leaves_nothing_finite(tmp_path: Path) -> None:
    frame = pd.DataFrame({"infected": ["no"] * 8 + ["yes"] * 8, "age": range(30, 46)})
    outcome, results = run(tmp_path, frame, "age", exposures=("age",))
    model, beside = results["models"]
    assert "every record is predicted perfectly" in stop_of(model)["message"]
    one = coefficient(model, "age")
    assert one["odds_ratio"] is None
    assert one["profile"]["upper"] is None
    X, y = matrix(frame, "age")
    best, _ = maximum(penalised((X - [0, 37]) / [1, 10], y), np.zeros(2))
    assert coefficient(beside, "age")["log_odds_ratio"] == pytest.approx(best[1], abs=1e-4)
    assert "without a finite estimate" in report(outcome)


def test_the_model_beside_is_penalised_and_said_to_be_added(tmp_path: Path) -> None:
    frame = records(nobody="prophylaxis")
    outcome, results = run(tmp_path, frame)
    model, beside = results["models"]
    assert beside["id"] == "model-1-penalised"
    assert beside["name"] == "main, by penalised likelihood"
    assert (beside["method"], beside["status"], beside["added_by_program"]) == ("penalised", "converged", True)
    assert beside["formula"] == model["formula"]
    X, y = matrix(frame, "prophylaxis", "age", "dirty")
    best, _ = maximum(penalised(X / [1, 1, 10, 1], y), np.zeros(4))
    assert coefficient(beside, "prophylaxis")["log_odds_ratio"] == pytest.approx(best[1], abs=1e-4)
    assert "penalised-added" in [one["code"] for one in model["findings"]]
    text = report(outcome)
    assert '<a href="#model-2">' in text
    assert '<details id="model-2" open>' in text
    assert "Added by the program, not asked for in the plan." in text
    assert "By penalised likelihood, which always has an answer, the odds ratio is" in text
    # the answer leads with what is known, not with a refusal
    assert "The odds of “infected” were lower: at most 0.0" in text
    assert "could not be estimated" not in text
    sentence = results["study"]["answer"][0]["sentence"]
    assert "at most" in sentence
    assert "By penalised likelihood" in sentence


@pytest.mark.parametrize("method", ["maximum likelihood", "exact", "penalised"])
def test_nothing_is_added_beside_a_method_that_the_plan_names(tmp_path: Path, method: str) -> None:
    frame = records(60, nobody="prophylaxis").assign(age=lambda one: one.age // 20 * 20)
    outcome, results = run(tmp_path, frame, more=f'method = "{method}"')
    assert len(results["models"]) == 1
    assert outcome.not_estimated == (method == "maximum likelihood")
    assert (coefficient(results["models"][0], "prophylaxis")["odds_ratio"] is None) == (method != "penalised")


def test_the_exit_status_and_the_lines_on_the_terminal(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    run(tmp_path, records(nobody="prophylaxis"))
    assert run_command(tmp_path / "plan.toml", None, None) == 3
    said = " ".join(capsys.readouterr().out.split())
    assert "at most" in said
    assert "By penalised likelihood, which always has an answer" in said


def test_another_model_that_is_separated_is_told_of_in_its_own_section(tmp_path: Path) -> None:
    frame = records(150, nobody="ward")
    more = '[[models]]\nname = "with wards"\nbased_on = "main"\nadd = ["ward"]\n'
    outcome, results = run(tmp_path, frame, more=more)
    main_model, wards, beside = results["models"]
    assert [one["status"] for one in results["models"]] == ["converged", "no finite maximum", "converged"]
    assert beside["id"] == "model-2-penalised"
    # the exposure's odds ratio has a finite estimate in the separated model too
    assert coefficient(wards, "prophylaxis")["odds_ratio"] is not None
    text = report(outcome)
    assert "Estimated in part: with wards" in text
    assert main_model["method"] == "maximum likelihood"
    assert "by maximum likelihood</span>" in text


def test_records_of_groups_have_no_limits_and_no_model_beside(tmp_path: Path) -> None:
    frame = records(200, nobody="prophylaxis").assign(patient=[f"p{k // 3}" for k in range(200)])
    outcome, results = run(tmp_path, frame, records='grouped_by = "patient"')
    (model,) = results["models"]
    assert model["coefficients"] == []
    assert "No odds ratio of this model is shown" in stop_of(model)["message"]
    assert "could not be estimated" in report(outcome)


def test_records_on_disk_give_the_same(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    frame = records(400, nobody="prophylaxis")
    found = []
    for where in ("memory", "disk", "rows"):
        if where != "memory":
            monkeypatch.setattr(check, "wanted", lambda path: 10**15)
        if where == "rows":
            monkeypatch.setattr(rows, "MOST_PATTERNS", 3)
        (tmp_path / where).mkdir()
        _, results = run(tmp_path / where, frame)
        found.append(results["models"])
    for other in found[1:]:
        for one, again in zip(found[0], other, strict=True):
            assert (one["id"], one["status"]) == (again["id"], again["status"])
            for before, after in zip(one["coefficients"], again["coefficients"], strict=True):
                pairs = [(before[name], after[name]) for name in ("odds_ratio", "standard_error")]
                pairs += [(before["profile"][end], after["profile"][end]) for end in ("lower", "upper")]
                for value, same in pairs:
                    assert (value is None) == (same is None)
                    assert value is None or value == pytest.approx(same, rel=1e-7)


def test_the_second_run_is_the_same_to_the_byte(tmp_path: Path) -> None:
    texts = []
    for name in ("one", "other"):
        (tmp_path / name).mkdir()
        outcome, _ = run(tmp_path / name, records(nobody="prophylaxis"))
        texts.append([path.read_bytes() for path in sorted(outcome.files)])
    assert texts[0] == texts[1]
