"""A draft reads back as a plan, whatever the columns and levels are called."""

from __future__ import annotations

import ast
import tomllib
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from oddsmodel.errors import InputFault
from oddsmodel.plan.read import PlanFile, read_plan
from oddsmodel.plan.schema import Kind
from oddsmodel.plan.toml_text import formula_name, key, text_list, text_value
from oddsmodel.plan.write import DraftColumn, DraftRecords, draft_plan

SMOKING = DraftColumn(
    "smoking",
    "category",
    (("never", 2003), ("former", 1203), ("current", 8)),
    not_recorded=33,
    suspected=("NA",),
    questions=("Is it smoking now or ever?",),
)
DIED = DraftColumn("died", "yes-no", (("no", 3500), ("yes", 512)))
HOSTILE = st.text(max_size=12) | st.sampled_from(
    ['"]]\n[run]\nseed = 1', "'''", '"""', "\\", "a#b", "\x1b[31m", "\u202e", "\u2028", "é", "Q(x)", "log", "a b", "#"]
)
KINDS: list[Kind] = ["number", "category", "ordered", "yes-no", "identifier", "date"]


def read_back(text: str, folder: Path) -> PlanFile:
    path = folder / "plan.toml"
    path.write_text(text, encoding="utf-8", newline="")
    return read_plan(path)


def test_a_draft_says_what_was_found(tmp_path: Path) -> None:
    records = DraftRecords(
        "records.csv",
        4012,
        DIED,
        [DraftColumn("id", "identifier"), SMOKING, DraftColumn("age", "number", suspected=("999",)), DIED],
        event="yes",
    )
    text = draft_plan(records)
    plan = read_back(text, tmp_path).plan
    assert plan.outcome.event == "yes"
    assert plan.columns["id"].kind == "identifier"
    assert plan.columns["smoking"].levels == ("never", "former", "current")
    assert plan.columns["smoking"].reference == "never"
    assert plan.columns["age"].per == 1.0
    assert "died" not in plan.columns
    assert plan.models[0].exposures == ("smoking",)
    assert 'formula = "smoking + age"' in text
    assert "# To settle: Is it smoking now or ever?" in text
    assert plan.columns["smoking"].not_recorded == ("", "NA")
    assert plan.columns["age"].not_recorded is None
    assert '# not_recorded = ["", "999"]' in text


def test_no_small_count_stands_in_a_draft() -> None:
    text = draft_plan(DraftRecords("records.csv", 4012, DIED, [SMOKING]))
    assert '"current" (under 10)' in text
    for exact in ("2003", "1203", "512", "33", "2 003"):
        assert exact not in text


def test_an_open_event_is_not_guessed(tmp_path: Path) -> None:
    records = DraftRecords("r.csv", 40, DraftColumn("state", "category", (("a", 21), ("b", 20))), [SMOKING])
    text = draft_plan(records)
    assert read_back(text, tmp_path).plan.outcome.event is None
    assert '# event = "b"' in text
    assert "Which value of “state” is the event?" in text


def test_columns_that_cannot_be_compared_are_kept_out_of_the_model(tmp_path: Path) -> None:
    columns = [
        DraftColumn("constant", "category", (("x", 40),)),
        DraftColumn("free text", "category", tuple((f"t{n}", 1) for n in range(31))),
        DraftColumn("empty", "category", ()),
        DraftColumn("rank", "ordered", ()),
        DraftColumn("seen", "date"),
        SMOKING,
    ]
    text = draft_plan(DraftRecords("r.csv", 40, DIED, columns))
    plan = read_back(text, tmp_path).plan
    assert plan.models[0].exposures == ("smoking",)
    assert plan.columns["constant"].levels is None
    with pytest.raises(InputFault, match="No column besides the outcome"):
        draft_plan(DraftRecords("r.csv", 40, DIED, columns[:-1]))


def test_a_draft_of_very_many_columns_stays_a_plan(tmp_path: Path) -> None:
    levels = tuple((f"\x07level {n} {'é' * 100}", n) for n in range(30))
    columns = [DraftColumn(f"column {n}", "category", levels) for n in range(300)]
    text = draft_plan(DraftRecords("r.csv", 40, DIED, columns))
    assert len(text.encode()) < 1_000_000
    assert "Not described here" in text
    read_back(text, tmp_path)


@settings(max_examples=200, deadline=None, derandomize=True)
@given(HOSTILE)
def test_texts_and_keys_read_back(text: str) -> None:
    read = tomllib.loads(f"[{key(text)}]\n{key(text)} = {text_value(text)}\nlist = {text_list([text, text])}")
    inner = read[text]
    assert inner[text] == (text if text != "list" else [text, text])
    assert inner["list"] == [text, text]
    assert "\n" not in text_value(text)


@settings(max_examples=200, deadline=None, derandomize=True)
@given(HOSTILE)
def test_formula_names_are_one_name(name: str) -> None:
    tree = ast.parse(formula_name(name), mode="eval").body
    if isinstance(tree, ast.Name):
        assert tree.id == name
    else:
        assert isinstance(tree, ast.Call)
        assert isinstance(tree.args[0], ast.Constant)
        assert tree.args[0].value == name


@settings(max_examples=150, deadline=None, derandomize=True)
@given(
    outcome=HOSTILE.filter(bool),
    names=st.lists(HOSTILE, min_size=1, max_size=5, unique=True),
    kinds=st.lists(st.sampled_from(KINDS), min_size=5, max_size=5),
    levels=st.lists(st.tuples(HOSTILE, st.integers(0, 10**7)), max_size=5),
    source=HOSTILE.filter(str.strip).filter(lambda text: "://" not in text),
    suspected=st.lists(HOSTILE, max_size=3),
    event=st.none() | HOSTILE,
    question=HOSTILE,
)
def test_whatever_things_are_called_a_draft_reads_back(
    tmp_path_factory: pytest.TempPathFactory,
    outcome: str,
    names: list[str],
    kinds: list[Kind],
    levels: list[tuple[str, int]],
    source: str,
    suspected: list[str],
    event: str | None,
    question: str,
) -> None:
    more = {"levels": tuple(levels), "suspected": tuple(suspected), "questions": (question,)}
    columns = [DraftColumn(name, kind, **more) for name, kind in zip(names, kinds, strict=False)]
    columns.append(SMOKING if outcome != "smoking" else DraftColumn("age", "number"))
    event = None if event in suspected or event == "" else event
    found = DraftRecords(source, 100, DraftColumn(outcome, "yes-no", **more), columns, event=event)
    plan = read_back(draft_plan(found), tmp_path_factory.mktemp("draft")).plan
    assert plan.outcome.column == outcome
    assert plan.outcome.event == event
    assert plan.records.source == source
    for column in columns:
        if column.name and column.name != outcome:
            assert plan.columns[column.name].kind in (column.kind, "category")
