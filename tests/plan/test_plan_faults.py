"""Every fault of a plan alone: named by key path, in plain words, with the nearest right key or value."""

from __future__ import annotations

import datetime
import re
from pathlib import Path
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from oddsmodel.errors import Fault, InputFault
from oddsmodel.plan.examples import EXAMPLES
from oddsmodel.plan.later import LATER_KEYS, LATER_SECTIONS
from oddsmodel.plan.read import plan_from_values, read_plan
from oddsmodel.plan.schema import SECTIONS, keys_of
from oddsmodel.plan.syntax import parse

PARTS = {
    "study": 'title = "t"\ndesign = "cohort"',
    "records": 'source = "r.csv"',
    "columns": "",
    "outcome": 'column = "died"\nevent = "yes"',
    "models": 'name = "main"\nformula = "smoker + age"\nexposures = ["smoker"]',
    "report": "",
    "checks": "",
    "run": "",
}


def faults_of(text: str) -> list[Fault]:
    try:
        plan_from_values(parse(text, "plan.toml"), "plan.toml")
    except InputFault as found:
        return list(found.faults)
    return []


def plan(more: str = "", **replaced: str) -> str:
    """A plan that is right, with sections replaced or lines added at the end."""
    parts = PARTS | replaced
    heads = {"models": "[[models]]"}
    sections = [f"{heads.get(name, f'[{name}]')}\n{text}" for name, text in parts.items() if text]
    return "\n".join([*sections, more, ""])


def only(text: str) -> Fault:
    (fault,) = faults_of(text)
    return fault


def test_the_plan_of_these_tests_is_right() -> None:
    assert faults_of(plan()) == []


# Unknown, misplaced and missing keys.


def test_an_unknown_key_near_a_known_one() -> None:
    fault = only(plan(study='title = "t"\ndesign = "cohort"\nquestoin = "?"'))
    assert fault.where == "plan.toml, [study] questoin"
    assert "Did you mean question?" in fault.remedy


def test_an_unknown_section_near_a_known_one() -> None:
    fault = only(plan("[colums.age]\nper = 10"))
    assert fault.where == "plan.toml, colums"
    assert "Did you mean columns?" in fault.remedy


def test_an_unknown_key_near_nothing_lists_what_there_is() -> None:
    fault = only(plan(outcome='column = "died"\nzzzz = 1'))
    assert fault.remedy.startswith("Its keys are column, event, label")


def test_a_key_in_the_wrong_section_is_sent_to_its_own() -> None:
    fault = only(plan(study='title = "t"\ndesign = "cohort"\nhide_counts_below = 3'))
    assert "[report]" in fault.remedy
    fault = only(plan(models=PARTS["models"] + "\nper = 10"))
    assert fault.where == "plan.toml, [[models]] number 1 (“main”) per"
    assert "[columns.age]" in fault.remedy


def test_missing_keys_are_asked_for_with_an_example() -> None:
    fault = only(plan(study='title = "t"'))
    assert (fault.where, fault.what) == ("plan.toml, [study]", "design is missing.")
    assert 'design = "cohort"' in fault.remedy
    fault = only(plan(models='name = "main"\nformula = "smoker"'))
    assert fault.where == "plan.toml, [[models]] number 1 (“main”)"


def test_a_file_name_with_commas_stays_whole() -> None:
    with pytest.raises(InputFault) as caught:
        plan_from_values({}, "a, b, c.toml")
    assert {fault.where for fault in caught.value.faults} == {"a, b, c.toml"}


def test_a_column_name_with_a_full_stop_needs_quotes() -> None:
    fault = only(plan('[columns.blood.pressure]\nkind = "number"'))
    assert '[columns."blood.pressure"]' in fault.remedy


# Keys that come later.


@pytest.mark.parametrize(("section", "key"), [(section, key) for section, keys in LATER_KEYS.items() for key in keys])
def test_later_keys_are_not_unknown(section: str, key: str) -> None:
    line = f'{key} = "x"'
    fault = only(
        plan(f"[columns.age]\n{line}") if section == "columns" else plan(**{section: f"{PARTS[section]}\n{line}"})
    )
    assert "This version" in fault.what
    assert "Until then, " in fault.remedy
    assert fault.where.endswith(key)


@pytest.mark.parametrize("section", LATER_SECTIONS)
def test_later_sections_are_not_unknown(section: str) -> None:
    fault = only(plan(f"[{section}.x]\nmethod = 1"))
    assert fault.where == f"plan.toml, {section}"
    assert "This version" in fault.what


def test_no_key_is_both_known_and_later() -> None:
    for section, keys in LATER_KEYS.items():
        assert not keys.keys() & keys_of(SECTIONS[section]).keys()


def test_every_key_has_an_example() -> None:
    assert {section: set(lines) for section, lines in EXAMPLES.items()} == {
        section: set(keys_of(kind)) for section, kind in SECTIONS.items()
    }


def test_several_outcomes_are_not_also_told_as_a_missing_outcome() -> None:
    fault = only(plan('[[outcomes]]\ncolumn = "died"', outcome=""))
    assert fault.where == "plan.toml, outcomes"


def test_a_model_based_on_another_needs_no_formula_of_its_own() -> None:
    assert faults_of(plan('[[models]]\nname = "second"\nbased_on = "main"')) == []


def test_a_prior_below_a_model_is_told_at_that_model() -> None:
    assert only(plan("[models.prior]\nm = 2")).where == "plan.toml, [[models]] number 1 (“main”) prior"


def test_matched_designs_come_later_and_checks_are_known() -> None:
    assert "matched" in only(plan(study='title = "t"\ndesign = "matched case-control"')).what
    assert "no check called" in only(plan(checks='also = ["star_chart"]')).what
    assert "no check called" in only(plan(checks='also = ["magic"]')).what


# Values of the wrong kind.


@pytest.mark.parametrize(
    ("text", "where", "what"),
    [
        (plan("[columns.age]\nper = true"), "[columns.age] per", "The value true"),
        (plan("[columns.age]\nper = 0"), "[columns.age] per", "The number 0"),
        (plan("[columns.age]\nper = -2.5"), "[columns.age] per", "The number -2.5"),
        (plan("[columns.age]\nper = nan"), "[columns.age] per", "The number nan"),
        (plan("[columns.age]\nper = inf"), "[columns.age] per", "The number inf"),
        (plan("[columns.age]\nper = 'sd'"), "[columns.age] per", "“sd”"),
        (plan("[columns.age]\nper = [1]"), "[columns.age] per", "A list"),
        (plan(f"[columns.age]\nper = 0x{'f' * 400}"), "[columns.age] per", "A number of more than 30 digits"),
        (plan(study='title = 2026-01-31\ndesign = "cohort"'), "[study] title", "a date"),
        (plan(study='title = 2026-01-31T10:00:00\ndesign = "cohort"'), "[study] title", "a date"),
        (plan(study='title = 10:00:00\ndesign = "cohort"'), "[study] title", "a time of day"),
        (plan(study='title = " "\ndesign = "cohort"'), "[study] title", "empty"),
        (plan(study='title = "t"\ndesign = 3'), "[study] design", "The number 3"),
        (plan(records='source = "r.csv"\nnot_recorded = "NA"'), "[records] not_recorded", "the text “NA”"),
        (plan(records='source = "r.csv"\nnot_recorded = [["NA"]]'), "[records] not_recorded, item 1", "a list"),
        (plan(models=PARTS["models"] + "\nlevel = 95"), "level", "95 is outside"),
        (plan(models=PARTS["models"] + "\nlevel = true"), "level", "the value true"),
        (plan(models=PARTS["models"] + "\nlevel = nan"), "level", "nan"),
        (plan(models=PARTS["models"] + f"\nlevel = 0x{'f' * 400}"), "level", "30 digits"),
        (plan(models=PARTS["models"] + "\nsame_records = 1"), "same_records", "the number 1"),
        (plan(models=PARTS["models"] + '\nsame_records = "no"'), "same_records", "the text “no”"),
        (plan(report="hide_counts_below = 2.5"), "hide_counts_below", "the number 2.5"),
        (plan(report="hide_counts_below = -1"), "hide_counts_below", "-1 is outside"),
        (plan(report="hide_counts_below = true"), "hide_counts_below", "the value true"),
        (plan(run="seed = 1e3"), "[run] seed", "the number 1000.0"),
        (plan(run=f"seed = {10**40}"), "[run] seed", "30 digits"),
        (plan("[columns]\nage = 3"), "[columns.age]", "the number 3"),
    ],
)
def test_wrong_values(text: str, where: str, what: str) -> None:
    fault = only(text)
    assert where in fault.where
    assert what in fault.what
    assert fault.remedy


def test_the_nearest_of_a_few_values_is_offered() -> None:
    fault = only(plan(study='title = "t"\ndesign = "cohrt"'))
    assert "Did you mean “cohort”?" in fault.remedy
    fault = only(plan("[columns.age]\nkind = 'Numbers'"))
    assert "Did you mean “number”?" in fault.remedy


def test_remedies_show_the_line_as_it_should_be() -> None:
    assert 'exposures = ["smoker"]' in only(plan(models='name = "m"\nformula = "smoker"\nexposures = "smoker"')).remedy
    assert 'title = "5"' in only(plan(study='title = 5\ndesign = "cohort"')).remedy
    assert "level = 0.95" in only(plan(models=PARTS["models"] + "\nlevel = 95")).remedy
    assert "without quotes" in only(plan(run='seed = "1"')).remedy


@pytest.mark.parametrize("written", ['models = "main"', "models = 1"])
def test_models_that_are_no_list(written: str) -> None:
    fault = only(f"{written}\n{plan(models='')}")
    assert "[[models]]" in fault.remedy


def test_one_model_in_single_brackets() -> None:
    fault = only(plan(models="").replace("[outcome]", "[models]\n" + PARTS["models"] + "\n[outcome]"))
    assert "double brackets" in fault.remedy


def test_sections_that_are_no_sections() -> None:
    fault = only("study = 3\n" + plan(study=""))
    assert "[study]" in fault.remedy
    fault = only(plan(columns="", study="").replace("[records]", "[[study]]\ntitle='t'\n[records]"))
    assert fault.where == "plan.toml, [study]"
    fault = only('columns = ["age"]\n' + plan())
    assert fault.where == "plan.toml, [columns]"


# Keys against one another.


@pytest.mark.parametrize(
    ("text", "where", "what"),
    [
        (plan("[columns.a]\nkind='number'\nlevels=['x', 'y']"), "[columns.a] levels", "column with levels"),
        (plan("[columns.a]\nkind='number'\nreference='x'"), "[columns.a] reference", "column with levels"),
        (plan("[columns.a]\nkind='identifier'\nother_levels='stop'"), "[columns.a] other_levels", "column with levels"),
        (plan("[columns.a]\nkind='category'\nper=2"), "[columns.a] per", "only for numbers"),
        (plan("[columns.a]\nkind='yes-no'\nunits='kg'"), "[columns.a] units", "only for numbers"),
        (plan("[columns.a]\nlevels=['x', 'y']\nper=2"), "[columns.a] per", "has no step"),
        (plan("[columns.a]\nkind='ordered'"), "[columns.a]", "needs its levels"),
        (plan("[columns.a]\nkind='yes-no'\nlevels=['x', 'y', 'z']"), "[columns.a] levels", "two levels, and 3"),
        (plan("[columns.a]\nlevels=['x']"), "[columns.a] levels", "At least two levels"),
        (plan("[columns.a]\nlevels=[]"), "[columns.a] levels", "At least two levels"),
        (plan("[columns.a]\nlevels=['x', 'y', 'x', 'x']"), "[columns.a] levels", "“x” is listed twice"),
        (plan("[columns.a]\nlevels=['x', '']"), "[columns.a] levels", "“” is both a level"),
        (plan("[columns.a]\nlevels=['x', 'NA']\nnot_recorded=['NA']"), "[columns.a] levels", "“NA” is both a level"),
        (plan("[columns.died]\nper=1"), "[columns.died] per", "is the outcome"),
        (plan("[columns.died]\ntiming='unknown'"), "[columns.died] timing", "is the outcome"),
        (plan("[columns.died]\nreference='no'"), "[columns.died] reference", "is the outcome"),
        (plan("[columns.died]\nkind='date'"), "[columns.died] kind", "cannot be the outcome"),
        (plan("[columns.died]\nlevels=['yes', 'no', 'lost']"), "[columns.died] levels", "exactly two"),
        (plan("[columns.died]\nlevels=['Dead', 'alive']"), "[outcome] event", "“yes” is not among"),
        (plan(outcome='column = "died"\nevent = ""'), "[outcome] event", "both the event"),
        (plan(records='source="r"\ncount="died"'), "[records] count", "both as the outcome"),
        (plan("[columns.n]\nper=2", records='source="r"\ncount="n"'), "[columns.n] per", "counts records"),
        (plan("[columns.n]\nkind='date'", records='source="r"\ncount="n"'), "[columns.n] kind", "cannot count"),
        (plan(models='name="m"\nformula="a"\nexposures=[]'), "exposures", "list is empty"),
        (plan(models='name="m"\nformula="a"\nexposures=["a","a"]'), "exposures", "“a” is listed twice"),
        (plan(models='name="m"\nformula="a"\nexposures=["died"]'), "exposures", "is the outcome"),
        (plan(models='name=" "\nformula="a"\nexposures=["a"]'), "name", "empty"),
        (plan(models=f'name="{"x" * 121}"\nformula="a"\nexposures=["a"]'), "name", "longer than 120"),
        (plan(models='name="a\\nb"\nformula="a"\nexposures=["a"]'), "name", "control character"),
        (plan("[[models]]\nname='MAIN '\nformula='a'\nexposures=['a']"), "number 2", "the same name"),
        ("models = []\n" + plan(models=""), "plan.toml", "no model"),
    ],
)
def test_keys_that_contradict_one_another(text: str, where: str, what: str) -> None:
    fault = only(text)
    assert where in fault.where
    assert what in fault.what


def test_a_reference_that_is_no_level_offers_the_nearest() -> None:
    fault = only(plan("[columns.sex]\nlevels=['female', 'male']\nreference='femal'"))
    assert "Did you mean “female”?" in fault.remedy


@pytest.mark.parametrize("event", ["1", "1.0", "true", "Yes"])
def test_another_spelling_of_the_event_is_left_to_the_records(event: str) -> None:
    text = plan("[columns.died]\nlevels=['no', 'yes']", outcome=f'column = "died"\nevent = "{event}"')
    assert faults_of(text) == []


# Several at once, and hostile ones.


def test_all_faults_are_told_together(tmp_path: Path) -> None:
    text = plan(
        "[columns.sex]\nlevels = ['f', 'm', 'm']\nreference = 'x'\nper = true\ncolour = 1",
        study='title = 3\ndesign = "cohrt"\nprevalence = 0.1',
        models='name = "main"\nformula = 7\nexposures = ["died", "died"]',
    )
    path = tmp_path / "plan.toml"
    path.write_text(text, encoding="utf-8")
    with pytest.raises(InputFault) as caught:
        read_plan(path)
    wheres = [fault.where.removeprefix("plan.toml, ") for fault in caught.value.faults]
    assert wheres == [
        "[study] title",
        "[study] design",
        "[study] prevalence",
        "[columns.sex] per",
        "[columns.sex] colour",
        "[[models]] number 1 (“main”) formula",
        "[columns.sex] levels",
        "[columns.sex] reference",
        "[[models]] number 1 (“main”) exposures",
        "[[models]] number 1 (“main”) exposures",
    ]


def test_very_many_faults_are_counted() -> None:
    faults = faults_of(
        plan("[zzz]\n", study='title = "t"\ndesign = "cohort"\n' + "\n".join(f"q{n} = 1" for n in range(5000)))
    )
    assert len(faults) == 41
    assert faults[-1].what == "4961 more faults were found."


def test_names_from_the_plan_are_shown_without_control_characters() -> None:
    faults = faults_of(plan('[columns."a\\u001b[31m\\nb\\u202e"]\nper = 0\n"k\\u0007" = 1'))
    assert len(faults) == 2
    assert not re.search("[\x00-\x1f\u202e]", "".join(str(fault) for fault in faults))


JUNK: st.SearchStrategy[Any] = st.recursive(
    st.none().map(lambda _: True)
    | st.integers()
    | st.floats()
    | st.text(max_size=8)
    | st.sampled_from([datetime.date(2026, 1, 31), datetime.datetime(2026, 1, 31, 9), datetime.time(9)]),
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(st.text(max_size=8), inner, max_size=3),
    max_leaves=6,
)
KNOWN = st.sampled_from(sorted({key for kind in SECTIONS.values() for key in keys_of(kind)} | {"start"}))
SECTION = st.dictionaries(KNOWN | st.text(max_size=6), JUNK, max_size=6) | JUNK


@settings(max_examples=300, deadline=None, derandomize=True)
@given(
    st.dictionaries(st.sampled_from([*SECTIONS, "derived", "outcomes"]) | st.text(max_size=6), SECTION, max_size=9),
    st.dictionaries(st.text(max_size=6), SECTION, max_size=3),
    st.lists(SECTION, max_size=3),
)
def test_whatever_stands_in_a_plan_is_told_in_our_words(data: dict[str, Any], columns: Any, models: list[Any]) -> None:
    data = {"columns": columns, "models": models} | data
    with pytest.raises(InputFault) as caught:
        plan_from_values(data, "plan.toml")
    for fault in caught.value.faults:
        assert fault.what
        assert fault.where.startswith("plan.toml")
        assert "cannot be used here" not in fault.what, "told in words of the parser"


def test_memory_is_a_size() -> None:
    for line in ('memory = "2 parrots"', "memory = 2000000000", 'memory = "20 MB"'):
        told = only(plan(f"[run]\n{line}"))
        assert told.where == "plan.toml, [run] memory"
        assert "1 GB or more" in told.what
        assert 'memory = "2 GB"' in told.remedy
