"""Refreshes of an invented study: the plan's changes told apart from those of the records, and the series."""

from __future__ import annotations

import json
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import jsonschema
import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm

from oddsmodel.errors import InputFault
from oddsmodel.export.results_json import results_schema
from oddsmodel.results.changes import Changes
from oddsmodel.results.tables import Interval
from oddsmodel.study.changes import changes, names
from oddsmodel.study.run import run_plan

PLAN = """
[study]
title = "Night shifts and falls"
question = "Do people on wards with night shifts fall more often?"
design = "cohort"
[records]
source = "records.csv"
not_recorded = ["", "NA"]
{records}
[outcome]
column = "fell"
event = "yes"
[columns.shift]
kind = "category"
levels = ["day", "night"]
reference = "day"
[columns.age]
kind = "number"
per = {per}   # {comment}
why = "3 patients of 1234 were over 100"
[[models]]
name = "main"
formula = "fell ~ shift + age + ward"
exposures = ["shift", "age"]
[[models]]
name = "crude"
formula = "fell ~ shift"
exposures = ["shift"]
"""


def invented(records: int, wards: tuple[str, ...]) -> pd.DataFrame:
    rng = np.random.default_rng(11)
    shift = rng.choice(["day", "night"], 800)
    age = rng.integers(40, 95, 800)
    risk = 1 / (1 + np.exp(-(-1.2 + 0.6 * (shift == "night") + 0.02 * (age - 70))))
    frame = pd.DataFrame({"fell": np.where(rng.random(800) < risk, "yes", "no"), "shift": shift, "age": age})
    frame["ward"] = np.where(np.arange(800) < 500, rng.choice(["east", "west"], 800), rng.choice(list(wards), 800))
    return frame.head(records)


@dataclass(frozen=True)
class Runs:
    """Three results: spring; autumn, of the same plan on more records with a new ward; and autumn by another plan."""

    spring: Path
    autumn: Path
    replanned: Path
    frames: dict[str, pd.DataFrame]


@pytest.fixture(scope="module")
def runs(tmp_path_factory: pytest.TempPathFactory) -> Runs:
    folder = tmp_path_factory.mktemp("refresh")
    frames = {
        "spring": invented(500, ("east", "west")),
        "autumn": invented(800, ("east", "west", "roof")),
    }
    for name, frame in frames.items():
        frame.to_csv(folder / f"{name}.csv", index=False)
    (folder / "plan.toml").write_text(PLAN.format(records="", per=10, comment="of seven hidden"), encoding="utf-8")
    changed = PLAN.format(records='keep = "age < 94"', per=5, comment="of six hidden")
    (folder / "plan2.toml").write_text(changed, encoding="utf-8")
    paths = [
        run_plan(folder / plan, records=folder / f"{records}.csv", into=folder / f"{into}-report").folder
        for plan, records, into in (
            ("plan.toml", "spring", "spring"),
            ("plan.toml", "autumn", "autumn"),
            ("plan2.toml", "autumn", "replanned"),
        )
    ]
    return Runs(*(path / "results.json" for path in paths), frames)


@pytest.fixture(scope="module")
def found(runs: Runs) -> Changes:
    return changes([runs.spring, runs.autumn, runs.replanned])


def loaded(path: Path) -> dict[str, Any]:
    document: dict[str, Any] = json.loads(path.read_text(encoding="utf-8"))
    return document


def rewritten(path: Path, folder: Path, **keys: Any) -> Path:
    copy = folder / f"{len(list(folder.iterdir()))}.json"
    copy.write_text(json.dumps(loaded(path) | keys), encoding="utf-8")
    return copy


def test_results_hold_what_the_plan_states_and_how_columns_were_taken(runs: Runs) -> None:
    document = loaded(runs.replanned)
    jsonschema.validate(document, results_schema())
    assert document["plan"]["records"] == {"not_recorded": ["", "NA"], "keep": "age < 94"}
    assert document["plan"]["columns"]["age"] == {"kind": "number", "per": 5.0}
    assert [model["name"] for model in document["plan"]["models"]] == ["main", "crude"]
    ward = next(column for column in document["columns"] if column["name"] == "ward")
    assert ward["levels"] == ["east", "roof", "west"]
    assert document["study"]["answer"][0]["label"] == "shift: night against day"
    assert "times those with “day”" in document["study"]["answer"][0]["sentence"]


def test_prose_and_comments_of_the_plan_do_not_leave_with_the_results(runs: Runs) -> None:
    text = runs.spring.read_text(encoding="utf-8")
    for prose in ("3 patients", "over 100", "of seven hidden", "spring.csv"):
        assert prose not in text


def test_what_comes_from_the_records_is_told_apart_from_what_comes_from_the_plan(found: Changes) -> None:
    refresh, replanning = found.steps
    assert "The plan is the same, word for word" in refresh.cause
    assert refresh.plan == ()
    assert refresh.records == ("“ward” has a level that it did not have before: “roof”.",)
    assert "The records are the same file" in replanning.cause
    assert "What differs comes from the plan." in replanning.cause
    assert replanning.plan == (
        '[records] keep is new: "age < 94"',
        "[columns.age] per was 10 and is now 5",
    )
    assert replanning.records == ()
    assert refresh.programs == ""


def test_a_change_of_comments_alone_is_no_change_of_the_plan(runs: Runs, tmp_path: Path) -> None:
    document = loaded(runs.spring)
    other = rewritten(runs.spring, tmp_path, provenance=document["provenance"] | {"plan_sha256": "f" * 64})
    (step,) = changes([runs.spring, other]).steps
    assert "in nothing that is compared here" in step.cause
    assert step.plan == ()


def test_plan_and_records_changed_together_are_not_put_down_to_either(runs: Runs) -> None:
    (step,) = changes([runs.spring, runs.replanned]).steps
    assert "cannot be put down to either" in step.cause


def test_other_versions_of_the_programs_are_told(runs: Runs, tmp_path: Path) -> None:
    document = loaded(runs.spring)
    versions = document["provenance"]["versions"] | {"numpy": "99.0"}
    other = rewritten(runs.spring, tmp_path, provenance=document["provenance"] | {"versions": versions})
    (step,) = changes([runs.spring, other]).steps
    assert "same, byte for byte" in step.cause
    assert f"numpy {np.__version__}, then 99.0" in step.programs


def test_of_overlap_only_what_can_be_known_is_said(runs: Runs, found: Changes, tmp_path: Path) -> None:
    assert "each extract may hold records of the one before" in found.steps[0].overlap
    assert "not independent" in found.steps[0].overlap
    assert "same file of records" in found.steps[1].overlap
    records = loaded(runs.spring)["records"] | {"sha256": "e" * 64}
    for read, told in ((498, "as many records, or nearly so"), (400, "fewer records"), (None, "not shown everywhere")):
        other = rewritten(runs.spring, tmp_path, records=records | {"read": read})
        assert told in changes([runs.spring, other]).steps[0].overlap


def test_the_series_holds_the_odds_ratios_of_each_refresh(runs: Runs, found: Changes) -> None:
    main = found.models[0]
    assert main.figure is not None
    assert main.table is not None
    marks = {(mark.label, mark.series): mark for mark in main.figure.marks}
    for series, records in (("1 (spring)", "spring"), ("2 (autumn)", "autumn")):
        frame = runs.frames[records]
        wards = [frame.ward == ward for ward in ("roof", "west") if (frame.ward == ward).any()]
        X = np.column_stack([np.ones(len(frame)), frame["shift"] == "night", frame.age, *wards]).astype(float)
        # Reference: statsmodels.
        reference = sm.Logit((frame.fell == "yes").to_numpy(float), X).fit(disp=0, tol=1e-12)
        mark = marks["shift: night against day", series]
        assert mark.estimate == pytest.approx(np.exp(reference.params[1]), rel=1e-8)
        coefficients = loaded(getattr(runs, records))["models"][0]["coefficients"]
        profile = next(one["profile"] for one in coefficients if one["term"] == "shift")
        assert (mark.lower, mark.upper) == (profile["lower"], profile["upper"])
    shown = [row for row in main.table.rows if row[0] == "shift: night against day"]
    assert [row[1] for row in shown] == ["1 (spring)", "2 (autumn)", "3 (replanned)"]
    assert all(isinstance(row[3], Interval) for row in shown)


def test_an_odds_ratio_per_another_unit_is_another_series(found: Changes) -> None:
    assert found.models[0].figure is not None
    ages = [mark for mark in found.models[0].figure.marks if "age" in mark.label]
    assert len(ages) == 6
    assert [mark.estimate is None for mark in ages] == [False, False, True, True, True, False]
    assert ages[2].note == "no such contrast"


def test_a_model_that_could_not_be_estimated_leaves_a_gap_with_its_reason(runs: Runs, tmp_path: Path) -> None:
    models = loaded(runs.autumn)["models"]
    models[1] |= {"status": "no finite maximum", "coefficients": []}
    other = rewritten(runs.autumn, tmp_path, models=models)
    compared = changes([runs.spring, other])
    assert compared.models[1].figure is not None
    assert compared.models[1].figure.marks[1].note == "not estimated"
    assert compared.steps[0].models == (
        "The model “crude” was estimated before and now could not be (no finite maximum).",
    )
    assert changes([other, runs.spring]).steps[0].models == (
        "The model “crude”, which could not be estimated before, now is.",
    )
    assert changes([runs.spring, rewritten(runs.autumn, tmp_path, models=models[:1])]).steps[0].models == (
        "The model “crude” is no longer there.",
    )


def test_an_estimate_beyond_the_interval_before_is_pointed_at(runs: Runs, tmp_path: Path) -> None:
    models = loaded(runs.autumn)["models"]
    next(one for one in models[0]["coefficients"] if one["term"] == "shift")["odds_ratio"] = 9.0
    compared = changes([runs.spring, rewritten(runs.autumn, tmp_path, models=models)])
    assert any("lies outside the interval of “1 (spring)”" in note for note in compared.models[0].notes)


def test_a_column_compared_with_the_network_average_is_a_series_against_it(runs: Runs, tmp_path: Path) -> None:
    models = loaded(runs.spring)["models"]
    shift = next(one for one in models[0]["coefficients"] if one["term"] == "shift")
    against = {"reference": "the network average", "label": "shift against the average", "odds_ratio": 1.25}
    models[0]["averages"] = [shift | against]
    main = changes([rewritten(runs.spring, tmp_path, models=models), runs.autumn]).models[0]
    assert main.figure is not None
    estimates = {mark.label: mark.estimate for mark in main.figure.marks if mark.series.startswith("1")}
    assert estimates["shift against the average"] == 1.25
    assert estimates["shift: night against day"] is None


def test_another_adjustment_is_a_warning_not_a_trend(runs: Runs, tmp_path: Path) -> None:
    models = loaded(runs.autumn)["models"]
    models[0] |= {"adjustment": ["ward", "sex"], "formula": "fell ~ shift + age + ward + sex"}
    compared = changes([runs.spring, rewritten(runs.autumn, tmp_path, models=models)])
    assert any(
        "adjusted for different columns differ even without any confounding" in n for n in compared.models[0].notes
    )


def test_small_differences_of_counts_are_withheld_in_counts_and_in_findings(runs: Runs, tmp_path: Path) -> None:
    document = loaded(runs.spring)
    records = document["records"] | {"read": 503, "sha256": "d" * 64}
    models = document["models"]
    for model in models:
        model["records"] = 503
    told = {"severity": "caution", "code": "new-one", "facts": {}, "message": "Of 503 records some are odd."}
    other = rewritten(runs.spring, tmp_path, records=records, models=models, findings=[told])
    compared = changes([runs.spring, other])
    rows = {str(row[0]): row[1:] for row in compared.counts.rows}
    assert rows["Read"] == (500, "fewer than 5 apart")
    assert rows["Analysed"] == (500, "fewer than 5 apart")
    (appeared,) = compared.steps[0].appeared
    assert "503" not in appeared.message

    internal = rewritten(other, tmp_path, disclosure=document["disclosure"] | {"audience": "internal"})
    compared = changes([runs.spring, internal])
    assert compared.internal
    assert next(row for row in compared.counts.rows if row[0] == "Read")[1:] == (500, 503)
    assert "503" in compared.steps[0].appeared[0].message
    assert any("internal" in caution for caution in compared.cautions)


def test_one_run_done_twice_shows_the_same_counts(runs: Runs) -> None:
    compared = changes([runs.spring, runs.autumn, runs.spring])
    assert next(row for row in compared.counts.rows if row[0] == "Read")[1:] == (500, 800, 500)


def test_results_of_version_one_nought_are_compared_by_their_models(runs: Runs, tmp_path: Path) -> None:
    document = loaded(runs.replanned)
    for key in ("plan", "columns"):
        del document[key]
    del document["study"]["answer"]
    document["models"][0]["formula"] = "fell ~ shift"
    old = tmp_path / "old.json"
    old.write_text(json.dumps(document | {"schema_version": "1.0"}), encoding="utf-8")
    compared = changes([old, runs.spring])
    assert compared.steps[0].plan == (
        '[[models]] "main" formula was "fell ~ shift" and is now "fell ~ shift + age + ward"',
    )
    assert any("per how many units" in note for note in compared.models[0].notes)


def test_another_study_is_a_caution(runs: Runs, tmp_path: Path) -> None:
    study = loaded(runs.spring)["study"]
    other = rewritten(runs.spring, tmp_path, study=study | {"outcome": "died", "title": "Another", "design": "trial"})
    assert len(changes([runs.spring, other]).cautions) == 3


def test_too_few_or_faulty_results_are_all_told(runs: Runs, tmp_path: Path) -> None:
    with pytest.raises(InputFault, match="at least two"):
        changes([runs.spring])
    with pytest.raises(InputFault, match="More than 24"):
        changes([runs.spring] * 25)
    with pytest.raises(InputFault) as raised:
        changes([tmp_path, tmp_path / "nowhere.json", runs.spring])
    assert len(raised.value.faults) == 2


def test_hostile_values_of_a_plan_are_told_on_one_line(runs: Runs, tmp_path: Path) -> None:
    plan = {
        "columns": {"a\x1b[31m\n": {"per": 1, "x": {"y": ["\ud800" * 3, "<b>", "z" * 5000]}}},
        "models": [{"formula": 1}, {"name": 5}],
    }
    provenance = loaded(runs.spring)["provenance"] | {"plan_sha256": "c" * 64}
    (step,) = changes([runs.spring, rewritten(runs.spring, tmp_path, plan=plan, provenance=provenance)]).steps
    assert any('[[models]] "number 1"' in one for one in step.plan)
    for one in step.plan:
        assert "\x1b" not in one
        assert "\n" not in one
        assert len(one) < 600


def test_names_tell_the_results_apart() -> None:
    paths = [Path("a/q1-report/results.json"), Path("a/q1-report/results-INTERNAL.json"), Path("b/late.json")]
    assert names(paths) == ["1 (q1)", "2 (q1)", "3 (late)"]
