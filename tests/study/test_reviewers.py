"""Reviewers' rounds on small invented records: models upon others, trends, averages, one standard deviation."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import jsonschema
import numpy as np
import pandas as pd
import pytest
import statsmodels.formula.api as smf
from scipy.stats import t as student

from oddsmodel.design.formula import vet_formula
from oddsmodel.errors import InputFault
from oddsmodel.export.results_json import results_schema
from oddsmodel.plan.schema import ModelSection
from oddsmodel.records.types import Column
from oddsmodel.study.based_on import write_out
from oddsmodel.study.run import RunOutcome, run_plan

PLAN = """
[study]
title = "A test"
design = "cohort"
[records]
source = "records.csv"
not_recorded = ["NA"]
{records}
[outcome]
column = "died"
event = "yes"
[columns.site]
kind = "category"
levels = ["North", "East", "West"]
reference = "North"
{site}
[columns.dose]
kind = "ordered"
levels = ["low", "middle", "high"]
{dose}
[columns.age]
kind = "number"
units = "years"
per = "SD"
label = "Age"
[[models]]
name = "main"
formula = "died ~ dose + age + site"
exposures = [{exposures}]
{main}
{more}
"""


def invented(n: int = 900) -> pd.DataFrame:
    rng = np.random.default_rng(11)
    age = rng.normal(60, 10, n).round(1)
    dose = rng.choice(3, n, p=[0.5, 0.3, 0.2])
    site = rng.choice(3, n, p=[0.5, 0.3, 0.2])
    sex = rng.choice(["female", "male"], n)
    linear = -1.2 + 0.4 * dose + 0.03 * (age - 60) + np.array([0, 0.4, -0.3])[site] + 0.3 * (sex == "male")
    frame = pd.DataFrame(
        {
            "died": np.where(rng.random(n) < 1 / (1 + np.exp(-linear)), "yes", "no"),
            "dose": np.array(["low", "middle", "high"])[dose],
            "age": age,
            "site": np.array(["North", "East", "West"])[site],
            "sex": sex.astype(object),
            "ward": rng.choice(["medical", "surgical"], n).astype(object),
            "practice": [f"practice {number}" for number in rng.integers(0, 60, n)],
        }
    )
    frame.loc[rng.random(n) < 0.1, "ward"] = "NA"
    return frame


def run(folder: Path, more: str = "", **parts: str) -> tuple[RunOutcome, dict[str, Any]]:
    given = {"records": "", "site": "", "dose": "", "main": "", "exposures": '"dose"'} | parts
    invented().to_csv(folder / "records.csv", index=False)
    (folder / "plan.toml").write_text(PLAN.format(more=more, **given), encoding="utf-8")
    outcome = run_plan(folder / "plan.toml")
    document = json.loads((outcome.folder / "results.json").read_text(encoding="utf-8"))
    jsonschema.validate(document, results_schema())
    return outcome, document


def faults_of(folder: Path, more: str = "", **parts: str) -> list[Any]:
    with pytest.raises(InputFault) as caught:
        run(folder, more, **parts)
    return list(caught.value.faults)


def reference(formula: str, frame: pd.DataFrame) -> Any:
    """The fit by statsmodels; dose and site against low and North."""
    data = frame.assign(event=(frame.died == "yes").astype(float))
    return smf.logit(formula, data).fit(disp=False, tol=1e-12, maxiter=100)


DOSE = "C(dose, Treatment('low'))"
SITE = "C(site, Treatment('North'))"

ROUNDS = """
[[models]]
name = "with ward"
based_on = "main"
add = ["ward"]
role = "sensitivity"
planned = false
why = "a reviewer asked whether the ward matters"
[[models]]
name = "women"
based_on = "main"
keep = "sex == 'female'"
role = "subgroup"
planned = true
level = 0.9
[[models]]
name = "older women, without site"
based_on = "women"
keep = "age > 55"
leave_out = ["site"]
role = "subgroup"
"""


def test_models_upon_others(tmp_path: Path) -> None:
    outcome, results = run(tmp_path, ROUNDS)
    frame = invented()
    main, ward, women, older = results["models"]
    assert [model["role"] for model in results["models"]] == ["main", "sensitivity", "subgroup", "subgroup"]
    assert [model["planned"] for model in results["models"]] == [None, False, True, None]
    assert ward["why"] == "a reviewer asked whether the ward matters"
    assert ward["formula"] == "died ~ dose + age + site + ward"
    assert older["formula"] == "died ~ dose + age"
    assert older["based_on"] == "women"
    assert older["differs"] == "As “women”, without site; only records with age > 55"
    assert women["level"] == older["level"] == 0.9
    # The main model keeps the records that the added column lacks.
    assert main["records"] == len(frame)
    assert ward["records"] == (frame.ward != "NA").sum()
    assert women["records"] == (frame.sex == "female").sum()
    assert older["records"] == ((frame.sex == "female") & (frame.age > 55)).sum()

    expected = {
        "main": reference(f"event ~ {DOSE} + age + {SITE}", frame),
        "with ward": reference(f"event ~ {DOSE} + age + {SITE} + ward", frame[frame.ward != "NA"]),
        "women": reference(f"event ~ {DOSE} + age + {SITE}", frame[frame.sex == "female"]),
        "older women, without site": reference(
            f"event ~ {DOSE} + age", frame[(frame.sex == "female") & (frame.age > 55)]
        ),
    }
    for model in results["models"]:
        found = {(one["term"], one["level"]): one["log_odds_ratio"] for one in model["coefficients"]}
        for level in ("middle", "high"):
            want = expected[model["name"]].params[f"{DOSE}[T.{level}]"]
            assert found["dose", level] == pytest.approx(want, abs=1e-6)

    table = outcome.results.comparison
    assert table is not None
    assert [column.heading for column in table.columns][:3] == ["Model", "What it is", "Exposure"]
    assert [row[:2] for row in table.rows[::2]] == [
        ("main", "Main. Adjusted for Age and site."),
        ("with ward", "Sensitivity, not planned. As “main”, with ward added."),
        ("women", "Subgroup, planned. As “main”, only records with sex == 'female'; 90% intervals."),
        ("older women, without site", "Subgroup. As “women”, without site; only records with age > 55."),
    ]
    assert [row[2] for row in table.rows[:2]] == ["dose: middle against low", "dose: high against low"]
    assert table.blocks == (0, 0, 1, 1, 2, 2, 3, 3)
    assert "judged by an interaction" in table.note
    report = (outcome.folder / "report.html").read_text(encoding="utf-8")
    assert "Sensitivity, not planned." in report
    assert "a reviewer asked whether the ward matters" in report


def test_a_standard_deviation_is_the_main_models_everywhere(tmp_path: Path) -> None:
    outcome, results = run(tmp_path, ROUNDS)
    deviation = invented().age.std(ddof=1)
    assert results["standard_deviations"] == [
        {"column": "age", "label": "Age", "units": "years", "value": pytest.approx(deviation, rel=1e-12)}
    ]
    women = next(one for one in results["models"][2]["coefficients"] if one["term"] == "age")
    frame = invented()
    fit = reference(f"event ~ {DOSE} + age + {SITE}", frame[frame.sex == "female"])
    assert women["log_odds_ratio"] == pytest.approx(fit.params["age"] * deviation, abs=1e-6)
    assert f"{deviation:.3g} years" in (outcome.folder / "report.html").read_text(encoding="utf-8")


def test_a_trend_stands_beside_the_levels(tmp_path: Path) -> None:
    outcome, results = run(tmp_path, main='trend = ["dose"]', dose="scores = [0, 1, 3]")
    (trend,) = results["models"][0]["trends"]
    assert [(one["level"], one["score"]) for one in trend["scores"]] == [("low", 0), ("middle", 1), ("high", 3)]
    frame = invented().assign(score=lambda one: one.dose.map({"low": 0, "middle": 1, "high": 3}))
    fit = reference(f"event ~ score + age + {SITE}", frame)
    assert trend["step"]["log_odds_ratio"] == pytest.approx(fit.params["score"], abs=1e-6)
    without = reference(f"event ~ age + {SITE}", frame)
    assert trend["trend"]["likelihood_ratio"] == pytest.approx(2 * (fit.llf - without.llf), abs=1e-6)
    assert trend["departure"]["df"] == 1
    report = (outcome.folder / "report.html").read_text(encoding="utf-8")
    assert "dose: trend over its levels" in report
    assert "Armitage" in report
    assert "per step of its scores" in (outcome.folder / "tables" / "estimates.csv").read_text(encoding="utf-8")


def test_every_level_against_the_network_average(tmp_path: Path) -> None:
    outcome, results = run(tmp_path, exposures='"site"', site='compare_with = "network average"')
    averages = results["models"][0]["averages"]
    assert [one["level"] for one in averages] == ["North", "East", "West"]
    fit = reference(f"event ~ {DOSE} + age + C(site, Sum(['North', 'East', 'West']))".replace("Sum(", "Sum, levels=("),
                    invented())  # fmt: skip
    sums = [value for name, value in fit.params.items() if name.startswith("C(site")]
    assert [one["log_odds_ratio"] for one in averages[:2]] == pytest.approx(sums, abs=1e-6)
    assert all(one["crude"]["profile"]["lower"] is not None for one in averages)
    report = (outcome.folder / "report.html").read_text(encoding="utf-8")
    assert "the network average (95% interval" in report
    assert "site: North against the network average" in report
    assert "not ranked" in report
    assert len(results["study"]["answer"]) == 3


@pytest.mark.parametrize(
    ("lines", "where", "words", "remedy"),
    [
        ('leave_out = ["sight"]', "leave_out, item 1", "sight", "site"),
        ('leave_out = ["rcs(age, 4)"]', "leave_out, item 1", "does not hold", "Did you mean “age”?"),
        ('add = ["age"]', "add, item 1", "already holds", "Take it out"),
        ('add = ["ward - 1"]', "add, item 1", "intercept", "Leave 0"),
        ('add = ["1"]', "add, item 1", "no term", "Name a term"),
        ('add = ["age:dose"]\nleave_out = ["age"]', "leave_out", "stands in", "both out"),
        ('leave_out = ["dose"]', "exposures", "not a column of the formula", ""),
        ('trend = ["sex"]', "trend, item 1", "not a column of the formula", "Choose from"),
        ('trend = ["site"]', "trend, item 1", "needs an ordered column", "ordered"),
        ('keep = "height > 3"', "keep", "height", ""),
    ],
)
def test_what_cannot_be_built_upon_a_model(tmp_path: Path, lines: str, where: str, words: str, remedy: str) -> None:
    (fault,) = faults_of(tmp_path, f'[[models]]\nname = "second"\nbased_on = "main"\n{lines}\n')
    assert where in fault.where
    assert "“second”" in fault.where
    assert words in fault.what
    assert remedy in fault.remedy


def test_models_upon_a_model_at_fault_are_not_told_as_well(tmp_path: Path) -> None:
    more = (
        '[[models]]\nname = "second"\nbased_on = "main"\nleave_out = ["no"]\n'
        '[[models]]\nname = "third"\nbased_on = "second"\nadd = ["ward"]\n'
    )
    (fault,) = faults_of(tmp_path, more)
    assert "“second”" in fault.where


def test_a_category_only_has_a_network_average(tmp_path: Path) -> None:
    more = '[columns.ward]\ncompare_with = "network average"\nkind = "yes-no"\n'
    assert any("of a category" in fault.what for fault in faults_of(tmp_path, more))


def test_two_models_share_records_as_before(tmp_path: Path) -> None:
    more = '[[models]]\nname = "second"\nbased_on = "main"\nadd = ["ward"]\n'
    _, results = run(tmp_path, more)
    main, second = results["models"]
    assert main["records"] == second["records"] == (invented().ward != "NA").sum()
    assert second["role"] == "secondary"
    _, results = run(tmp_path, more + "same_records = false\n")
    assert results["models"][0]["records"] == len(invented())


def test_groups_are_allowed_for_in_trends_and_averages(tmp_path: Path) -> None:
    _, results = run(
        tmp_path,
        records='grouped_by = "practice"',
        exposures='"site"',
        site='compare_with = "network average"',
        main='trend = ["dose"]',
    )
    frame = invented().assign(
        event=lambda one: (one.died == "yes").astype(float),
        score=lambda one: one.dose.map({"low": 0, "middle": 1, "high": 2}),
    )
    groups = {"groups": pd.factorize(frame.practice)[0]}

    def robust(formula: str) -> Any:
        return smf.logit(formula, frame).fit(disp=False, tol=1e-12, maxiter=100, cov_type="cluster", cov_kwds=groups)

    average = "C(site, Sum, levels=['North', 'East', 'West'])"
    # statsmodels takes G/(G - 1) · (n - 1)/(n - p) as its small-sample factor for clusters, as Cameron & Miller 2015.
    model = results["models"][0]
    fit = robust(f"event ~ {DOSE} + age + {average}")
    crude = robust(f"event ~ {average}")
    for one, name in zip(model["averages"], ["North", "East"], strict=False):
        assert one["log_odds_ratio"] == pytest.approx(fit.params[f"{average}[S.{name}]"], abs=1e-6)
        assert one["standard_error"] == pytest.approx(fit.bse[f"{average}[S.{name}]"], rel=1e-4)
        assert one["wald"]["df"] == 59
        assert one["profile"] == {"lower": None, "upper": None}
        assert "profile" in one["reasons"]
        reach = np.log(one["crude"]["wald"]["upper"] / one["crude"]["wald"]["lower"])
        assert reach == pytest.approx(2 * student.ppf(0.975, 59) * crude.bse[f"{average}[S.{name}]"], rel=1e-4)
    (trend,) = model["trends"]
    line = robust(f"event ~ score + age + {average}")
    assert trend["step"]["log_odds_ratio"] == pytest.approx(line.params["score"], abs=1e-6)
    assert trend["step"]["standard_error"] == pytest.approx(line.bse["score"], rel=1e-4)
    assert trend["trend"]["p"] is None
    assert "likelihood_ratio" in trend["trend"]["reasons"]


def test_a_small_level_hides_its_average_and_what_it_would_give_away(tmp_path: Path) -> None:
    frame = invented()
    few = frame.index[frame.site == "West"][40:]
    frame = frame.drop(few)
    events = frame.index[(frame.site == "West") & (frame.died == "yes")]
    frame.loc[events[3:], "died"] = "no"
    frame.to_csv(tmp_path / "records.csv", index=False)
    given = {"records": "", "site": 'compare_with = "network average"', "dose": "", "main": "", "exposures": '"site"'}
    text = PLAN.format(more="", **given).replace("dose + age + site", "site")
    (tmp_path / "plan.toml").write_text(text, encoding="utf-8")
    outcome = run_plan(tmp_path / "plan.toml")
    document = json.loads((outcome.folder / "results.json").read_text(encoding="utf-8"))
    for one in document["models"][0]["averages"]:
        assert one["odds_ratio"] is None
        assert one["crude"]["odds_ratio"] is None
        assert one["log_odds_ratio"] is None


def test_a_trend_that_repeats_hidden_counts_is_withheld(tmp_path: Path) -> None:
    frame = invented()
    few = frame.index[frame.dose == "high"][30:]
    frame = frame.drop(few)
    events = frame.index[(frame.dose == "high") & (frame.died == "yes")]
    frame.loc[events[3:], "died"] = "no"
    frame.to_csv(tmp_path / "records.csv", index=False)
    given = {"records": "", "site": "", "dose": "", "main": 'trend = ["dose"]', "exposures": '"dose"'}
    text = PLAN.format(more="", **given).replace("dose + age + site", "dose")
    (tmp_path / "plan.toml").write_text(text, encoding="utf-8")
    outcome = run_plan(tmp_path / "plan.toml")
    document = json.loads((outcome.folder / "results.json").read_text(encoding="utf-8"))
    (trend,) = document["models"][0]["trends"]
    assert trend["step"] is None
    assert trend["trend"]["p"] is None
    assert trend["departure"]["p"] is None
    assert "trend over its levels" not in (outcome.folder / "report.html").read_text(encoding="utf-8")


@pytest.mark.parametrize(
    "term",
    [
        "rcs(age, 4)",
        "cut(age, [40, 60.5])",
        "bs(age, df=5, degree=2)",
        'cr(age, df=4, constraints="center")',
        "C(site, Sum, levels=['West', 'North', 'East'])",
        "C(site, Treatment(reference='West'))",
        "I((age - 50)**2 / 100)",
        "log(age + 1)",
        'Q("body mass")',
        "site:age",
        "center(age):site",
    ],
)
def test_a_changed_formula_holds_the_other_terms_as_they_were(term: str) -> None:
    columns = {
        name: Column(name, kind, name, levels=levels, reference=levels[0] if levels else None)
        for name, kind, levels in (
            ("age", "number", ()),
            ("body mass", "number", ()),
            ("site", "category", ("North", "East", "West")),
            ("sex", "category", ("female", "male")),
        )
    }
    main = ModelSection(name="main", formula=f"died ~ 0 + {term} + sex", exposures=("sex",))
    second = ModelSection(name="second", based_on="main", leave_out=("sex",), add=("age",))
    (_, written), faults = write_out([main, second], columns, "died")
    assert not faults
    before, after = (
        vet_formula(one.formula, columns=columns, outcome="died", where="") for one in (main, written.section)
    )
    assert [factor for factor in before.factors if factor.text != "sex"] == [
        factor for factor in after.factors if factor in before.factors
    ]
    assert not after.intercept
    assert len(after.terms) == len(before.terms)
