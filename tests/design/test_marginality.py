"""Marginality worked by hand on a three-way product."""

from __future__ import annotations

from typing import Any

from oddsmodel.design.marginality import restricted_columns


def test_terms_that_contain_the_tested_one_leave_both_models(clinic: Any) -> None:
    design = clinic.design("age * sex * bmi + smoking")
    columns = {term.name: set(range(term.start, term.stop)) for term in design.terms}
    everything = set(range(len(design.columns)))
    expected = {
        "Intercept": columns["Intercept"],
        "smoking": everything,
        "age:sex:bmi": everything,
        "age:sex": everything - columns["age:sex:bmi"],
        "sex": everything - columns["age:sex:bmi"] - columns["age:sex"] - columns["sex:bmi"],
    }
    for term in design.terms:
        if term.name in expected:
            larger, smaller = restricted_columns(design, term)
            assert set(larger) == expected[term.name]
            assert set(smaller) == expected[term.name] - columns[term.name]
            assert list(larger) == sorted(larger)


def test_a_spline_is_one_term(clinic: Any) -> None:
    design = clinic.design("rcs(age, 4) + rcs(age, 4):sex + age:sex")
    term = next(term for term in design.terms if term.name == "rcs(age, 4)")
    larger, smaller = restricted_columns(design, term)
    kept = {design.columns[column].term for column in larger}
    assert kept == {"Intercept", "rcs(age, 4)", "age:sex"}
    assert {design.columns[column].term for column in smaller} == {"Intercept", "age:sex"}
