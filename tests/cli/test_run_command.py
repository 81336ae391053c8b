"""`run` and `check`: statuses and the few lines that are printed. The study floor is stood in for."""

from __future__ import annotations

from collections.abc import Callable
from contextlib import nullcontext
from pathlib import Path
from types import SimpleNamespace
from typing import Any

import pytest

import oddsmodel.study.check
import oddsmodel.study.run
from oddsmodel.errors import Fault, InputFault
from oddsmodel.findings import Finding
from oddsmodel.progress import Progress, Silent
from oddsmodel.results.study import (
    CertificateResult,
    CoefficientResult,
    Exclusion,
    Flow,
    ModelResult,
    ProfileResult,
    Provenance,
    RecordsResult,
    StudyResults,
    WaldResult,
)
from oddsmodel.study.run import RunOutcome

Command = Callable[..., Any]
FLOW = Flow(100, (Exclusion("left-out-outcome-not-recorded", "Outcome not recorded", 4),), 96, 30)


def model(name: str = "main", status: str = "converged") -> ModelResult:
    coefficient = CoefficientResult(
        term="smoker",
        level="yes",
        reference="no",
        levels=None,
        role="exposure",
        label="Smoking: yes against no",
        log_odds_ratio=0.5,
        standard_error=0.2,
        odds_ratio=1.65,
        wald=WaldResult(1.11, 2.44, 0.012),
        profile=ProfileResult(1.12, 2.45),
    )
    return ModelResult(
        id=name,
        name=name,
        formula="died ~ smoker + age",
        method="maximum likelihood",
        added_by_program=False,
        variant={},
        role="",
        why="",
        level=0.95,
        status=status,
        exposures=("smoker",),
        exposure_labels=("Smoking",),
        adjustment=("age",),
        adjustment_labels=("Age",),
        flow=FLOW,
        records=96,
        events=30,
        patterns=10,
        parameters=3,
        log_likelihood=-50.0,
        null_log_likelihood=-60.0,
        coefficients=(coefficient,) if status == "converged" else (),
        terms=(),
        checks=(),
        certificate=CertificateResult(10.0, 100.0),
        findings=(Finding("caution", "few", "Few \x1b[31mevents."),),
    )


def study(*models: ModelResult) -> StudyResults:
    return StudyResults(
        title="t",
        question="Do smokers die more often?",
        design="cohort",
        aim="association",
        audience="shareable",
        outcome="died",
        outcome_label="Death",
        event="yes",
        event_share=0.3,
        not_measured=(),
        columns=(),
        records=RecordsResult("records.csv", "0" * 64, 100, FLOW.left_out),
        models=models,
        characteristics=None,
        findings=(Finding("note", "n", "A note that stays in the report."), Finding("stop", "s", "A stop.")),
        provenance=Provenance("plan.toml", "", "0" * 64, {}, 1),
    )


def standing_in(monkeypatch: pytest.MonkeyPatch, *models: ModelResult) -> list[dict[str, Any]]:
    calls: list[dict[str, Any]] = []

    def run_plan(
        plan_path: Path, *, into: Path | None, records: Path | None, workers: str | None, progress: Progress
    ) -> RunOutcome:
        calls.append({"plan": plan_path, "into": into, "records": records, "workers": workers, "progress": progress})
        files = (Path("out/report.html"), Path("out/results.json"))
        not_estimated = any(one.status != "converged" for one in models)
        return RunOutcome(Path("out"), files, study(*models), not_estimated)

    monkeypatch.setattr(oddsmodel.study.run, "run_plan", run_plan)
    return calls


def test_the_answer_and_what_to_read_first(command: Command, monkeypatch: pytest.MonkeyPatch) -> None:
    calls = standing_in(monkeypatch, model())
    ended = command("run", "plan.toml", "--into", "out", "--records", "other.csv")
    assert ended.status == 0
    assert calls[0]["plan"] == Path("plan.toml")
    assert calls[0]["into"] == Path("out")
    assert calls[0]["records"] == Path("other.csv")
    assert isinstance(calls[0]["progress"], Silent)
    lines = ended.out.splitlines()
    assert lines[0] == "The report is in out/report.html"
    assert "Do smokers die more often?" in lines
    assert "1.65" in ended.out
    assert "1.12 to 2.45" in ended.out
    assert "- Stop: A stop." in ended.out
    assert "- Caution: Few [31mevents." in ended.out
    assert "A note" not in ended.out
    assert ended.out.index("A stop.") < ended.out.index("Few")
    assert ended.err == ""


def test_a_model_that_could_not_be_estimated_ends_in_3(command: Command, monkeypatch: pytest.MonkeyPatch) -> None:
    standing_in(monkeypatch, model(), model("second", "no finite maximum"))
    ended = command("run", "plan.toml")
    assert ended.status == 3
    assert "The model “second” could not be estimated" in ended.out
    standing_in(monkeypatch, model("main", "aliased"))
    ended = command("run", "plan.toml")
    assert ended.status == 3
    assert "could not be estimated" in ended.out


def test_many_findings_are_counted(command: Command, monkeypatch: pytest.MonkeyPatch) -> None:
    from dataclasses import replace

    many = tuple(Finding("caution", f"code-{n}", f"Caution number {n}.") for n in range(40))
    standing_in(monkeypatch, replace(model(), findings=many))
    ended = command("run", "plan.toml")
    assert "Caution number 10." in ended.out
    assert "Caution number 11." not in ended.out
    assert "and 29 more, in the report" in ended.out


def test_faults_and_interruptions(command: Command, monkeypatch: pytest.MonkeyPatch) -> None:
    def faulty(*_: object, **__: object) -> RunOutcome:
        raise InputFault(Fault("Wrong.", "plan.toml", "Mend it."))

    def interrupted(*_: object, **__: object) -> RunOutcome:
        raise KeyboardInterrupt

    monkeypatch.setattr(oddsmodel.study.run, "run_plan", faulty)
    assert command("run", "plan.toml").status == 2
    monkeypatch.setattr(oddsmodel.study.run, "run_plan", interrupted)
    assert command("run", "plan.toml").status == 130


def test_a_plan_that_is_not_there(command: Command, tmp_path: Path) -> None:
    ended = command("run", tmp_path / "nowhere.toml")
    assert ended.status == 2
    assert "There is no such file." in ended.err
    assert list(tmp_path.iterdir()) == []


def checked(design: object, *findings: Finding) -> Any:
    section = SimpleNamespace(name="main", formula="died ~ smoker")
    prepared = SimpleNamespace(section=section, flow=FLOW, design=design)
    plan = SimpleNamespace(outcome=SimpleNamespace(column_name="died"))
    return SimpleNamespace(
        file=SimpleNamespace(plan=plan),
        data=SimpleNamespace(source="records.csv", read=100, event_label="yes", other_label="no"),
        models=(prepared,),
        findings=findings,
    )


def test_check_tells_what_it_found(command: Command, monkeypatch: pytest.MonkeyPatch) -> None:
    design = SimpleNamespace(columns=(1, 2, 3))
    note = Finding("note", "n", "Age was taken as a number.")
    monkeypatch.setattr(oddsmodel.study.check, "opened_plan", lambda *_, **__: nullcontext(checked(design, note)))
    ended = command("check", "plan.toml")
    assert ended.status == 0
    for told in (
        "records.csv: 100 records read.",
        "its event is “yes”, against “no”",
        "Model “main”: died ~ smoker",
        "4 records left out. Outcome not recorded.",
        "96 records to be analysed, 30 events among them.",
        "3 coefficients to be estimated.",
        "- Note: Age was taken as a number.",
        "nothing was fitted",
    ):
        assert told in ended.out


def test_check_says_what_cannot_be_fitted(command: Command, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(oddsmodel.study.check, "opened_plan", lambda *_, **__: nullcontext(checked(None)))
    ended = command("check", "plan.toml")
    assert ended.status == 3
    assert "cannot be estimated as it stands" in ended.out
