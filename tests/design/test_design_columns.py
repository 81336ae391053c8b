"""What every column of a design says of itself: term, level, reference, role, unit and wording."""

from __future__ import annotations

import pickle
from typing import Any

import numpy as np
import pandas as pd
import pytest

from oddsmodel.design.encoder import Design


def labels(design: Design) -> list[str]:
    return [column.label for column in design.columns]


def test_levels_and_numbers(clinic: Any) -> None:
    design = clinic.design("died ~ smoking + age + bmi", exposures=["smoking"])
    assert labels(design) == [
        "Intercept",
        "Smoking: former against never",
        "Smoking: current against never",
        "Age, per 10 years",
        "Body mass index, per 1 kg/m²",
    ]
    intercept, former, _, age, bmi = design.columns
    assert (intercept.term, intercept.kind, intercept.role) == ("Intercept", "intercept", "intercept")
    assert (former.term, former.level, former.reference) == ("smoking", "former", "never")
    assert (former.kind, former.role, former.sources, former.shown) == ("level", "exposure", ("smoking",), True)
    assert (age.kind, age.role, age.per, age.level, age.shown) == ("number", "adjustment", 10.0, None, True)
    assert bmi.per == 1.0
    assert [(term.name, term.start, term.stop) for term in design.terms] == [
        ("Intercept", 0, 1),
        ("smoking", 1, 3),
        ("age", 3, 4),
        ("bmi", 4, 5),
    ]
    assert design.findings == ()


def test_interactions(clinic: Any) -> None:
    design = clinic.design("smoking * sex + age:sex + bmi", exposures=["sex"])
    by_label = {column.label: column for column in design.columns}
    product = by_label["Smoking: current against never × Sex: male against female"]
    assert (product.kind, product.term, product.shown) == ("interaction", "smoking:sex", False)
    assert product.levels == {"smoking": "current", "sex": "male"}
    assert (product.level, product.reference, product.role, product.sources) == (
        None,
        None,
        "exposure",
        ("smoking", "sex"),
    )
    with_number = by_label["Age, per 10 years × Sex: male"]
    assert (with_number.levels, with_number.per) == ({"age": None, "sex": "male"}, 10.0)
    assert by_label["Smoking: current against never"].role == "adjustment"
    assert by_label["Smoking: current against never"].shown is False
    assert by_label["Body mass index, per 1 kg/m²"].shown is True


def test_splines_transforms_bands(clinic: Any) -> None:
    design = clinic.design(
        "rcs(age, 4) + log2(bmi) + cut(visits, [2, 4]) + C(ward, Poly) + C(smoking, Sum)", exposures=["age"]
    )
    found = {column.label: (column.kind, column.role, column.shown) for column in design.columns}
    assert found["Age (spline part 2)"] == ("transform", "exposure", False)
    assert found["Body mass index, per doubling"] == ("transform", "adjustment", True)
    assert found["Visits: 2 to under 4 against under 2"] == ("level", "adjustment", True)
    assert found["Visits: 4 and over against under 2"] == ("level", "adjustment", True)
    assert found["Ward (quadratic part)"] == ("contrast", "adjustment", False)
    assert found["Smoking: never against the mean of all levels"] == ("contrast", "adjustment", False)


def test_one_column_functions(clinic: Any) -> None:
    design = clinic.design("log(age) + log10(bmi) + I(visits ** 2)")
    assert labels(design)[1:] == [
        "Age, per unit of its natural logarithm",
        "Body mass index, per tenfold increase",
        "I(visits ** 2), per 1",
    ]
    assert all(column.shown for column in design.columns[1:])
    design = clinic.design("center(age) + standardize(bmi)")
    deviation = clinic.frame["bmi"].std(ddof=0)
    assert labels(design)[1:] == [
        "Age, per 10 years",
        f"Body mass index, per standard deviation ({deviation:.3g} kg/m²)",
    ]
    assert [column.per for column in design.columns] == [1.0, 10.0, 1.0]


def test_a_column_in_two_terms_is_not_shown(clinic: Any) -> None:
    design = clinic.design("age + I(age ** 2) + bmi")
    assert [column.shown for column in design.columns] == [False, False, False, True]


def test_without_intercept(clinic: Any) -> None:
    design = clinic.design("0 + smoking + age")
    assert labels(design)[:3] == ["Smoking: never", "Smoking: former", "Smoking: current"]
    assert [column.reference for column in design.columns[:3]] == [None, None, None]
    assert [column.shown for column in design.columns] == [False, False, False, True]


def test_references(clinic: Any, study_of: Any) -> None:
    study = study_of(clinic.frame, smoking={"reference": "current"})
    references = {
        "smoking": "current",
        "C(smoking)": "current",
        'C(smoking, Treatment(reference="former"))': "former",
        'C(smoking, levels=["former", "current", "never"])': "former",
        'C(smoking, Treatment("never"), levels=["former", "current", "never"])': "never",
        "C(visits)": "1",
        "C(visits, Treatment(3))": "3",
        'C(cut(visits, [2, 4]), Treatment("2 to under 4"))': "2 to under 4",
    }
    for formula, reference in references.items():
        design = study.design(formula)
        assert {column.reference for column in design.columns[1:]} == {reference}


def test_standard_deviation_of_the_training_records(clinic: Any, study_of: Any) -> None:
    study = study_of(clinic.frame, age={"per": "SD", "units": "years", "label": "Age"})
    column = study.design("age + sex").columns[2]
    deviation = float(clinic.frame["age"].std(ddof=1))
    assert column.per == pytest.approx(deviation, rel=1e-14)
    assert column.label == f"Age, per standard deviation ({deviation:.3g} years)"
    counts = np.arange(1.0, 91.0)
    written_out = np.repeat(clinic.frame["age"].to_numpy(), counts.astype(int))
    assert study.design("age", counts=counts).columns[1].per == pytest.approx(written_out.std(ddof=1), rel=1e-13)


def test_units_in_words(clinic: Any, study_of: Any) -> None:
    for changed, words in (
        ({"units": "years", "per": 1.0}, "Age, per 1 year"),
        ({"units": "years", "per": 0.5}, "Age, per 0.5 years"),
        ({"units": "mmol/l", "per": 1.0}, "Age, per 1 mmol/l"),
        ({"per": 1.0}, "Age, per 1 unit"),
        ({"per": 5.0}, "Age, per 5 units"),
    ):
        assert labels(study_of(clinic.frame, age=changed).design("age"))[1] == words


def test_levels_without_records(study_of: Any) -> None:
    smoking = pd.Categorical(["never", "current", "current", "never"], ["never", "former", "current"])
    stage = pd.Categorical(["i", "ii", "iv", "iv"], ["i", "ii", "iii", "iv"])
    design = study_of(pd.DataFrame({"smoking": smoking, "stage": stage})).design("smoking + C(stage, Poly)")
    assert labels(design)[1] == "Smoking: current against never"
    assert [(one.severity, one.code, one.facts["level"]) for one in design.findings] == [
        ("note", "level-without-records", "former"),
        ("note", "level-without-records", "iii"),
    ]
    # The polynomial keeps the distance that the absent level leaves: scores 0, 1 and 3.
    linear = design.encode(pd.DataFrame({"smoking": smoking, "stage": stage}))[:, 2]
    np.testing.assert_allclose((linear[2] - linear[1]) / (linear[1] - linear[0]), 2.0)


def test_a_spline_that_holds_the_constant_is_told(clinic: Any) -> None:
    assert [one.code for one in clinic.design("cr(age, df=4)").findings] == ["spline-holds-constant"]
    assert clinic.design("0 + cr(age, df=4)").findings == ()
    assert clinic.design("cr(age, df=4, constraints='center')").findings == ()


def test_design_pickles_and_holds_no_record(clinic: Any) -> None:
    formula = (
        "smoking * sex + rcs(age, 4) + bs(bmi, df=5) + cr(age, df=4, constraints='center') + cc(bmi, df=4) + "
        "C(visits) + C(ward, Poly) + cut(age, [40, 60]) + standardize(log(bmi)) + I(center(age) ** 2)"
    )
    design = clinic.design(formula, exposures=["smoking"])
    packed = pickle.dumps(design)
    again = pickle.loads(packed)
    np.testing.assert_array_equal(again.encode(clinic.frame), design.encode(clinic.frame))
    assert again.columns == design.columns
    many = pd.concat([clinic.frame] * 40, ignore_index=True)
    assert abs(len(pickle.dumps(type(clinic)(many, clinic.columns).design(formula))) - len(packed)) < 200
    assert design.encode(clinic.frame).flags.c_contiguous


def test_rows_of_a_frame_may_come_in_any_order_and_number(clinic: Any) -> None:
    design = clinic.design("smoking * age + rcs(bmi, 3) + C(visits)")
    X = design.encode(clinic.frame)
    order = np.random.default_rng(2).permutation(90)
    np.testing.assert_array_equal(design.encode(clinic.frame.iloc[order]), X[order])
    np.testing.assert_array_equal(design.encode(clinic.frame.iloc[:1]), X[:1])
    assert design.encode(clinic.frame.iloc[:0]).shape == (0, X.shape[1])
    many = pd.concat([clinic.frame] * 400, ignore_index=True)
    np.testing.assert_array_equal(design.encode(many), np.tile(X, (400, 1)))


def test_categories_in_another_order(clinic: Any) -> None:
    design = clinic.design("smoking + sex")
    turned = clinic.frame.assign(
        smoking=clinic.frame["smoking"].cat.reorder_categories(["current", "never", "former"]),
        sex=clinic.frame["sex"].astype(str),
    )
    np.testing.assert_array_equal(design.encode(turned), design.encode(clinic.frame))


def test_bands_hold_their_lower_edge(study_of: Any) -> None:
    frame = pd.DataFrame({"age": [39.9, 40.0, 59.9, 60.0, 75.0]})
    expected = [[1, 0, 0], [1, 1, 0], [1, 1, 0], [1, 0, 1], [1, 0, 1]]
    np.testing.assert_array_equal(study_of(frame).matrix("cut(age, [40, 60])"), expected)
