"""Formulas that these records do not allow, and records that a design cannot encode: told, never a NaN."""

from __future__ import annotations

from typing import Any

import numpy as np
import pandas as pd
import pytest

from oddsmodel.errors import Fault, InputFault


def faults(call: Any, *given: Any) -> tuple[Fault, ...]:
    with pytest.raises(InputFault) as caught:
        call(*given)
    return caught.value.faults


LOG = "the logarithm is of a number above 0 only, and x is 0"
NO_VALUE = {
    "log(x)": ("log(x)", "2 records", LOG, 3),
    "rcs(log(x), 3)": ("log(x)", "2 records", LOG, 3),
    "sqrt(x - 1)": ("sqrt(x - 1)", "2 records", "the square root is of a number from 0 on only, and x - 1 is −1", 3),
    "I(y / x)": ("y / x", "1 record", "it divides by x, which is 0", 3),
    "exp(y * 1000)": (
        "exp(y * 1000)",
        "4 records",
        "it is larger than any number the computer holds where y * 1000 is 1000",
        1,
    ),
    "I((x - 1) ** 0.5)": ("(x - 1) ** 0.5", "2 records", "x - 1 is −1, of which there is no such power", 3),
    "I(x ** -2)": ("x ** -2", "1 record", "x is 0, of which there is no such power", 3),
}


@pytest.mark.parametrize("formula", NO_VALUE)
def test_no_value(study_of: Any, formula: str) -> None:
    study = study_of(pd.DataFrame({"x": [1.0, 2.0, 0.0, -1.5], "y": [1.0, 2.0, 3.0, 4.0]}))
    term, records, reason, row = NO_VALUE[formula]
    (found,) = faults(study.design, formula)
    assert found.what == (
        f"“{term}” has no value for {records}, because {reason} (the first is row {row} of those analysed)."
    )
    assert "`keep`" in found.remedy


def test_no_value_in_new_records(study_of: Any) -> None:
    design = study_of(pd.DataFrame({"x": [1.0, 2.0, 3.0]})).design("log(x)")
    assert "has no value for 1 record" in faults(design.encode, pd.DataFrame({"x": [1.0, 0.0]}))[0].what


def test_kinds(study_of: Any, clinic: Any) -> None:
    changed = {"visits": {"kind": "identifier"}, "bmi": {"kind": "date"}}
    found = faults(study_of(clinic.frame, **changed).design, "visits + C(bmi) + log(smoking) + rcs(sex, 3) + age")
    assert [fault.what for fault in found] == [
        "“visits” is of the kind identifier, which tells records apart and can be no term of a model.",
        "“bmi” is of the kind date, which tells records apart and can be no term of a model.",
        "“smoking” is of the kind category, and “log(smoking)” needs a number.",
        "“sex” is of the kind category, and “rcs(sex, 3)” needs a number.",
    ]


def test_levels(study_of: Any) -> None:
    smoking = pd.Categorical(["never", "current", "never"], ["never", "former", "current"])
    only = pd.Categorical(["yes", "yes", "yes"], ["no", "yes"])
    study = study_of(pd.DataFrame({"smoking": smoking, "only": only, "x": [1.0, 2.0, 3.0]}))
    assert "All records analysed have the same level of “only”: “yes”." in faults(study.design, "only")[0].what
    assert "All records" in faults(study.design, "cut(x, [0])")[0].what
    assert faults(study.design, "C(smoking, Treatment('nver'))")[0].remedy == (
        "Did you mean “never”? The levels are “never”, “former” and “current”."
    )
    assert (
        "No record of those analysed has the level “former”"
        in faults(study.design, "C(smoking, Treatment('former'))")[0].what
    )
    assert (
        "leaves out “current”, which 1 record" in faults(study.design, "C(smoking, levels=['never', 'former'])")[0].what
    )
    turned = study_of(study.frame, smoking={"reference": "former"})
    assert "No record of those analysed has the level “former”" in faults(turned.design, "smoking")[0].what
    assert turned.design("C(smoking, Treatment('never'))").columns[1].reference == "never"
    assert turned.design("C(smoking, Sum)").columns[1].kind == "contrast"


def test_too_much(study_of: Any) -> None:
    random = np.random.default_rng(1)
    levels = [f"l{number}" for number in range(40)]
    many = {name: pd.Categorical(random.choice(levels, 5000), levels) for name in ("a", "b")}
    study = study_of(pd.DataFrame(many | {"x": random.normal(size=5000)}))
    assert "more than 500 columns" in faults(study.design, "a * b")[0].what
    assert "more than 500 different values" in faults(study.design, "C(x)")[0].what
    assert "polynomial contrasts are for 15 at most" in faults(study.design, "C(a, Poly)")[0].what


def test_knots(study_of: Any) -> None:
    piled = pd.DataFrame({"x": np.repeat([0.0, 1.0, 2.0, 3.0], [40, 10, 10, 40]), "same": np.ones(100)})
    study = study_of(piled)
    found = faults(study.design, "rcs(x, 4)")[0]
    assert "its knots fall together" in found.what
    assert "fall together" in faults(study.design, "bs(x, df=8)")[0].what
    assert "8 columns are wanted of it, and the records have 4 different" in faults(study.design, "cr(x, df=8)")[0].what
    assert (
        "the records have 4 different values" in faults(study.design, "bs(x, knots=[0.5, 1.5, 2.5], degree=1)")[0].what
    )
    assert "from 0 to 3" in faults(study.design, "bs(x, knots=[5])")[0].what
    for formula in ("rcs(same, 3)", "bs(same, df=4)", "cr(same, df=4)", "rcs(same, [1, 2, 3])"):
        assert "all records analysed have the same value" in faults(study.design, formula)[0].what
    assert "has the same value in all records" in faults(study.design, "standardize(same)")[0].what
    skewed = study_of(pd.DataFrame({"x": np.r_[np.zeros(30), np.arange(1.0, 71.0)]}))
    assert faults(skewed.design, "rcs(x, 7)")[0].remedy == "Fewer would do: rcs with 4 knots."


def test_new_records(clinic: Any) -> None:
    design = clinic.design("smoking + age + C(visits) + log(bmi)")
    new = clinic.frame.iloc[:4].reset_index(drop=True)
    new["smoking"] = pd.Categorical(["never", "pipe", "pipe", "never"])
    new.loc[1, "age"] = np.nan
    new.loc[2, "visits"] = 7.0
    assert [fault.what for fault in faults(design.encode, new)] == [
        "“smoking” is “pipe” in 2 records (the first is row 2 of those given), "
        "which none was when the model was built.",
        "“age” is not recorded in 1 record (the first is row 2 of those given).",
        "“visits” is “7” in 1 record (the first is row 3 of those given), which none was when the model was built.",
    ]
    missing = new.assign(smoking=pd.Categorical(["never", None, "never", None]), age=["x"] * 4).drop(columns="bmi")
    missing["visits"] = 1.0
    assert [fault.what for fault in faults(design.encode, missing)] == [
        "“smoking” is not recorded in 2 records (the first is row 2 of those given).",
        "“age” was a number when the model was built, and here it is not.",
        "“bmi” is not among the columns of these records.",
    ]


def test_missing_values_of_training_records(study_of: Any) -> None:
    study = study_of(pd.DataFrame({"x": [1.0, np.nan, 2.0]}))
    assert "not recorded in 1 record" in faults(study.design, "x")[0].what


def test_standard_deviation_of_a_constant(study_of: Any) -> None:
    study = study_of(pd.DataFrame({"x": [2.0, 2.0, 2.0]}), x={"per": "SD"})
    assert "has the same value in all records" in faults(study.design, "x")[0].what
