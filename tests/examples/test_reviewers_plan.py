"""The reviewers' rounds of the readmissions example: the plan runs, and its models are what it says."""

from __future__ import annotations

from pathlib import Path

from oddsmodel.study.check import check_plan

PLAN = Path(__file__).resolve().parents[2] / "examples" / "readmissions" / "reviewers.toml"


def test_the_plan_holds_and_its_models_are_written_out() -> None:
    checked = check_plan(PLAN)
    models = {model.section.name: model for model in checked.models}
    main, emergencies = models["main"], models["emergencies aged 65 or over"]
    assert emergencies.formula.text == "readmitted ~ hospital + age + sex + dependency + smoking"
    assert emergencies.section.keep == "(admission == 'emergency') and (age >= 65)"
    assert not emergencies.section.same_records
    assert main.columns["age"].deviation == emergencies.columns["age"].deviation
    assert models["with living alone"].flow.analysed < main.flow.analysed
