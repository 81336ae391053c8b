"""Faults of models that build upon others, and of keys that only some columns can have."""

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
[outcome]
column = "died"
event = "yes"
"""
MAIN = '[[models]]\nname = "main"\nformula = "smoker + age"\nexposures = ["smoker"]\n'


def faults_of(text: str) -> list[Fault]:
    try:
        plan_from_values(parse(HEAD + text, "plan.toml"), "plan.toml")
    except InputFault as found:
        return list(found.faults)
    return []


def second(*lines: str) -> str:
    return "\n".join([MAIN, "[[models]]", 'name = "second"', *lines])


def test_a_model_upon_another_inherits_and_may_say_why() -> None:
    lines = ('based_on = "main"', 'add = ["ward"]', 'leave_out = ["age"]', 'keep = "age > 30"')
    notes = ('role = "subgroup"', 'why = "asked by a reviewer"', "planned = false", 'trend = ["smoker"]')
    assert faults_of(second(*lines, *notes)) == []


@pytest.mark.parametrize(
    ("lines", "key", "words"),
    [
        (('based_on = "mian"',), "based_on", "no model called “mian”"),
        (('based_on = "second"',), "based_on", "upon itself"),
        (('add = ["ward"]', 'formula = "age"', 'exposures = ["age"]'), "add", "names none"),
        (('based_on = "main"', 'formula = "smoker"', 'leave_out = ["age"]'), "leave_out", "formula of its own"),
        (('based_on = "main"', 'add = ["ward", "ward"]'), "add", "listed twice"),
        (('based_on = "main"', 'trend = ["age", "age"]'), "trend", "listed twice"),
    ],
)
def test_what_is_wrong_with_a_model_upon_another(lines: tuple[str, ...], key: str, words: str) -> None:
    (fault,) = faults_of(second(*lines))
    assert fault.where == f"plan.toml, [[models]] number 2 (“second”) {key}"
    assert words in fault.what


def test_the_nearest_model_is_offered() -> None:
    (fault,) = faults_of(second('based_on = "mian"'))
    assert fault.remedy == "Did you mean “main”? Choose from “main”."


def test_a_model_without_a_base_needs_a_formula_and_exposures() -> None:
    found = faults_of(second())
    assert [fault.what for fault in found] == ["formula is missing.", "exposures is missing."]


def test_a_base_that_is_of_the_wrong_kind_is_told_once() -> None:
    (fault,) = faults_of(second("based_on = 1"))
    assert fault.where.endswith("based_on")


def test_a_later_base_and_a_circle_are_told_apart() -> None:
    later = '[[models]]\nname = "first"\nbased_on = "main"\n' + MAIN
    (fault,) = faults_of(later)
    assert fault.what == "“main” stands further down in the plan."
    circle = MAIN + '[[models]]\nname = "a"\nbased_on = "b"\n[[models]]\nname = "b"\nbased_on = "a"\n'
    (fault,) = faults_of(circle)
    assert "“a” → “b” → “a”" in fault.what


def test_the_first_model_has_no_other_role() -> None:
    (fault,) = faults_of(MAIN + 'role = "subgroup"\n')
    assert fault.where == "plan.toml, [[models]] number 1 (“main”) role"


@pytest.mark.parametrize(
    ("lines", "words"),
    [
        ('kind = "ordered"\nlevels = ["a", "b", "c"]\nscores = [0, 1]', "2 scores for 3 levels"),
        ('kind = "ordered"\nlevels = ["a", "b", "c"]\nscores = [0, 2, 1]', "rise from level to level"),
        ('kind = "ordered"\nlevels = ["a", "b"]\nscores = [0, inf]', "finite numbers"),
        ('kind = "category"\nlevels = ["a", "b"]\nscores = [0, 1]', "ordered column"),
        ('kind = "ordered"\nlevels = ["a", "b"]\ncompare_with = "network average"', "levels of a category"),
        ('kind = "category"\ncompare_with = "network average"', "No model has"),
        ('kind = "category"\ncompare_with = "average"', "“average” is not one of"),
        ('kind = "ordered"\nlevels = ["a", "b"]\nscores = ["0", "1"]', "the text “0”"),
    ],
)
def test_keys_that_only_some_columns_can_have(lines: str, words: str) -> None:
    found = faults_of(MAIN + f"[columns.dose]\n{lines}\n")
    assert found
    assert words in found[0].what


def test_scores_and_averages_where_they_belong() -> None:
    dose = '[columns.dose]\nkind = "ordered"\nlevels = ["a", "b", "c"]\nscores = [0, 1, 2.5]\n'
    smoker = '[columns.smoker]\nkind = "category"\ncompare_with = "network average"\n'
    assert faults_of(MAIN + dose + smoker) == []
