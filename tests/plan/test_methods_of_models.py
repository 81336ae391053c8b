"""Faults of a model's method and of the prior that one of the methods needs."""

from __future__ import annotations

import pytest

from oddsmodel.errors import Fault, InputFault
from oddsmodel.plan.read import plan_from_values
from oddsmodel.plan.syntax import parse

HEAD = """
[study]
title = "t"
design = "cohort"
[records]
source = "r.csv"
{records}
[outcome]
column = "died"
event = "yes"
[[models]]
name = "main"
formula = "smoker + age"
exposures = ["smoker"]
"""


def faults_of(*lines: str, records: str = "") -> list[Fault]:
    text = "\n".join([HEAD.format(records=records), *lines])
    try:
        plan_from_values(parse(text, "plan.toml"), "plan.toml")
    except InputFault as found:
        return list(found.faults)
    return []


PRIOR = 'prior = {m = 2, columns = ["smoker"]}'
SECOND = ("[[models]]", 'name = "second"', 'based_on = "main"')


@pytest.mark.parametrize(
    "lines",
    [
        ('method = "maximum likelihood"',),
        ('method = "penalised"',),
        ('method = "exact"',),
        ('method = "log-F"', PRIOR),
        ('method = "log-F"', PRIOR, *SECOND),
        ('method = "log-F"', PRIOR, *SECOND, 'prior = {m = 1, columns = ["age"]}'),
        ('method = "log-F"', PRIOR, *SECOND, 'method = "penalised"'),
        ('method = "penalised"', *SECOND, 'method = "log-F"', PRIOR),
    ],
)
def test_methods_and_priors_that_go_together(lines: tuple[str, ...]) -> None:
    assert faults_of(*lines) == []


@pytest.mark.parametrize(
    ("lines", "where", "words"),
    [
        (('method = "firth"',), "number 1 (“main”) method", "“firth” is not one of"),
        (('method = "penalized"',), "number 1 (“main”) method", "Did you mean “penalised”?"),
        (('method = "log-F"',), "number 1 (“main”) method", "needs a prior"),
        ((PRIOR,), "number 1 (“main”) prior", "used by the method log-F alone"),
        (('method = "exact"', PRIOR), "number 1 (“main”) prior", "used by the method log-F alone"),
        ((*SECOND, PRIOR), "number 2 (“second”) prior", "used by the method log-F alone"),
        ((*SECOND, 'method = "log-F"'), "number 2 (“second”) method", "needs a prior"),
        (
            ('method = "log-F"', PRIOR, *SECOND, 'method = "penalised"', PRIOR),
            "number 2 (“second”) prior",
            "used by the method log-F alone",
        ),
        (('method = "log-F"', "prior = {m = 2, columns = []}"), "number 1 (“main”) prior", "names no column"),
        (
            ('method = "log-F"', 'prior = {m = 2, columns = ["age", "age"]}'),
            "number 1 (“main”) prior",
            "“age” is listed twice",
        ),
        (('method = "log-F"', 'prior = {columns = ["age"]}'), "number 1 (“main”) prior", "m is missing"),
        (('method = "log-F"', "prior = {m = 2}"), "number 1 (“main”) prior", "columns is missing"),
        (('method = "log-F"', 'prior = {m = 0, columns = ["age"]}'), "number 1 (“main”) prior, m", "from 0.01 to 1000"),
        (
            ('method = "log-F"', 'prior = {m = inf, columns = ["age"]}'),
            "number 1 (“main”) prior, m",
            "from 0.01 to 1000",
        ),
        (('method = "log-F"', 'prior = {m = "2", columns = ["age"]}'), "number 1 (“main”) prior, m", "a number"),
        (('method = "log-F"', 'prior = {m = 2, column = ["age"]}'), "prior", "columns"),
        (('method = "log-F"', "prior = 2"), "number 1 (“main”) prior", "m and columns"),
    ],
)
def test_what_is_wrong_with_a_method_or_a_prior(lines: tuple[str, ...], where: str, words: str) -> None:
    found = faults_of(*lines)
    assert found
    assert any(where in one.where for one in found), found
    assert words in " ".join(f"{one.what} {one.remedy}" for one in found)


def test_a_prior_upon_a_base_that_does_not_exist_is_told_once() -> None:
    found = faults_of("[[models]]", 'name = "second"', 'based_on = "mian"')
    assert [one.where.split()[-1] for one in found] == ["based_on"]


def test_records_of_groups_have_no_other_method() -> None:
    grouped = 'grouped_by = "patient"'
    assert faults_of('method = "maximum likelihood"', records=grouped) == []
    for lines in (('method = "penalised"',), ('method = "exact"',), ('method = "log-F"', PRIOR)):
        (fault,) = faults_of(*lines, records=grouped)
        assert fault.where.endswith("method")
        assert "Records that belong to groups have no likelihood" in fault.what
