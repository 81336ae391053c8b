"""Faults of renamed, plausible and derived columns in the plan alone."""

from __future__ import annotations

from pathlib import Path

import pytest

from oddsmodel.errors import Fault, InputFault
from oddsmodel.plan.band_names import band_names
from oddsmodel.plan.read import plan_from_values, read_plan

PLAN = """
[study]
title = "t"
design = "cohort"
[records]
source = "records.csv"
count = "n"
[outcome]
column = "died"
event = "yes"
[[models]]
name = "main"
formula = "smoker"
exposures = ["smoker"]
"""


def faults_of(folder: Path, more: str) -> list[Fault]:
    path = folder / "plan.toml"
    path.write_text(PLAN + more, encoding="utf-8")
    try:
        read_plan(path)
    except InputFault as found:
        return list(found.faults)
    return []


def test_all_rules_are_read(tmp_path: Path) -> None:
    more = """
[columns.parity]
from = "Parity (n)"
plausible = [0, 20]
[derived.age]
years_between = ["born", "admitted"]
plausible = [0, 110]
per = 10
[derived.age_band]
bands_of = "age"
edges = [40, 60.5]
reference = "40 to under 60.5"
[derived.score]
points = {diabetes = 1, cancer = 2.5}
if_part_missing = "zero"
[derived.side]
groups_of = "ward"
groups = {surgical = ["S1", 2], medical = ["M1"]}
other_levels = "exclude and count"
[derived.quarter]
quantile_groups_of = "age"
groups = 4
"""
    assert faults_of(tmp_path, more) == []
    plan = read_plan(tmp_path / "plan.toml").plan
    assert plan.columns["parity"].from_name == "Parity (n)"
    assert plan.derived["age"].sources == ("born", "admitted")
    assert plan.derived["side"].groups == {"surgical": ("S1", "2"), "medical": ("M1",)}
    assert plan.derived["score"].sources == ("diabetes", "cancer")


def test_band_names_hold_their_lower_edge() -> None:
    assert band_names([18.5, 25.0, 30.0]) == ("under 18.5", "18.5 to under 25", "25 to under 30", "30 or over")
    assert band_names([-5]) == ("under -5", "-5 or over")


@pytest.mark.parametrize(
    ("more", "where", "what"),
    [
        ('[derived.x]\nlabel = "X"', "[derived.x]", "Nothing says how"),
        ('[derived.x]\nbands_of = "a"\nedges = [1]\npoints = {b = 1}', "[derived.x]", "made in one way"),
        ('[derived.x]\nbands_of = "a"', "[derived.x]", "edges is missing"),
        ('[derived.x]\nbands_of = "a"\nedges = [3, 3]', "[derived.x] edges", "larger than the one before"),
        ('[derived.x]\nbands_of = "a"\nedges = [inf]', "[derived.x] edges", "larger than the one before"),
        ('[derived.x]\nbands_of = "a"\nedges = []', "[derived.x] edges", "at least one"),
        ('[derived.x]\nbands_of = "a"\nedges = [1]\nper = 2', "[derived.x] per", "only for numbers"),
        ('[derived.x]\nbands_of = "a"\nedges = [1]\ngroups = 2', "[derived.x] groups", "no meaning beside bands_of"),
        (
            '[derived.x]\nbands_of = "a"\nedges = [1]\nreference = "under 2"',
            "[derived.x] reference",
            "among the levels",
        ),
        ('[derived.x]\nyears_between = ["born"]', "[derived.x] years_between", "two different columns"),
        ('[derived.x]\nyears_between = ["a", "b"]\nreference = "c"', "[derived.x] reference", "no reference"),
        ("[derived.x]\npoints = {}", "[derived.x] points", "number of points"),
        ("[derived.x]\npoints = {a = nan}", "[derived.x] points", "number of points"),
        ("[derived.x]\npoints = {a = true}", "[derived.x] points, a", "a number is wanted"),
        ("[derived.x]\npoints = 2", "[derived.x] points", "a number for each column"),
        ('[derived.x]\npoints = {a = 1}\nif_part_missing = "no"', "[derived.x] if_part_missing", "not one of"),
        ('[derived.x]\ngroups_of = "w"\ngroups = 3', "[derived.x] groups", "which level belongs"),
        ('[derived.x]\ngroups_of = "w"\ngroups = {a = ["1"]}', "[derived.x] groups", "At least two groups"),
        ('[derived.x]\ngroups_of = "w"\ngroups = {a = ["1"], b = []}', "[derived.x] groups", "has no level"),
        ('[derived.x]\ngroups_of = "w"\ngroups = {a = ["1"], b = [1]}', "[derived.x] groups", "listed twice"),
        ('[derived.x]\ngroups_of = "w"\ngroups = {a = "1"}', "[derived.x] groups", "levels of each group"),
        (
            '[derived.x]\nquantile_groups_of = "w"\ngroups = {a = ["1"], b = ["2"]}',
            "[derived.x] groups",
            "need their number",
        ),
        ('[derived.x]\nquantile_groups_of = "w"\ngroups = 1', "[derived.x] groups", "outside the range from 2 to 20"),
        ('[derived.x]\nquantile_groups_of = "w"\ngroups = true', "[derived.x] groups", "the value true"),
        ('[columns.x]\n[derived.x]\nbands_of = "a"\nedges = [1]', "[derived.x]", "both of a derived column and"),
        ('[derived.n]\nbands_of = "a"\nedges = [1]', "[derived.n]", "cannot be derived"),
        ('[derived.x]\ngroups_of = "died"\ngroups = {a = ["yes"], b = ["no"]}', "[derived.x]", "made from the outcome"),
        ('[derived.x]\nbands_of = "x"\nedges = [1]', "[derived.x]", "made from itself"),
        ('[derived.x]\nband_of = "a"', "[derived.x] band_of", "no key called “band_of”"),
        ("derived = 3", "[derived]", "a section for each column"),
        ("[columns.a]\nplausible = [3, 1]", "[columns.a] plausible", "the lower first"),
        ('[columns.a]\nkind = "category"\nplausible = [0, 1]', "[columns.a] plausible", "only for numbers"),
        ('[columns.a]\nlevels = ["a", "b"]\nplausible = [0, 1]', "[columns.a] plausible", "no plausible range"),
        ("[columns.died]\nplausible = [0, 1]", "[columns.died] plausible", "is the outcome"),
        ('[columns.a]\nfrom = "A"\n[columns.b]\nfrom = "A"', "[columns.b] from", "already what"),
    ],
)
def test_what_cannot_be(tmp_path: Path, more: str, where: str, what: str) -> None:
    if more == "derived = 3":
        (tmp_path / "plan.toml").write_text(more + PLAN, encoding="utf-8")
        with pytest.raises(InputFault) as caught:
            read_plan(tmp_path / "plan.toml")
        found = list(caught.value.faults)
    else:
        found = faults_of(tmp_path, more)
    told = [one for one in found if what in one.what or what in one.remedy]
    assert told, [str(one) for one in found]
    assert told[0].where == f"plan.toml, {where}"
    assert told[0].remedy


def test_a_circle_of_two_is_told_once(tmp_path: Path) -> None:
    more = '[derived.x]\nbands_of = "y"\nedges = [1]\n[derived.y]\nquantile_groups_of = "x"\ngroups = 2'
    assert [one.where for one in faults_of(tmp_path, more)] == ["plan.toml, [derived.x]"]


def test_the_nearest_band_is_offered(tmp_path: Path) -> None:
    (found,) = faults_of(tmp_path, '[derived.x]\nbands_of = "a"\nedges = [40, 60]\nreference = "40 to 60"')
    assert "“40 to under 60”" in found.remedy


def test_a_plan_from_values_knows_derived_columns() -> None:
    values = {
        "study": {"title": "t", "design": "cohort"},
        "records": {"source": "data frame"},
        "outcome": {"column": "died"},
        "columns": {"bmi": {"from": "BMI"}},
        "derived": {"side": {"groups_of": "ward", "groups": {"a": ["1"], "b": ["2"]}}},
        "models": [{"name": "main", "formula": "died ~ side", "exposures": ["side"]}],
    }
    assert plan_from_values(values).plan.derived["side"].groups_of == "ward"
