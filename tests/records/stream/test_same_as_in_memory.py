"""A stream of blocks gives what the whole file in memory gives: on the examples and on odd small files."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import Any

import pyarrow as pa
import pyarrow.parquet as pq
import pytest

from oddsmodel.errors import InputFault
from oddsmodel.plan.read import read_plan
from oddsmodel.plan.schema import StudyPlan
from oddsmodel.progress import Silent
from oddsmodel.records.accounting import account
from oddsmodel.records.delimited import read_delimited
from oddsmodel.records.load import load_records
from oddsmodel.records.outcome import code_outcome
from oddsmodel.records.plan_use import kept_as_written

sys.path.insert(0, str(Path(__file__).parent))
from same_records import assert_same, streamed

EXAMPLES = Path(__file__).parents[3] / "examples"
PLANS = sorted(path.relative_to(EXAMPLES).as_posix() for path in EXAMPLES.glob("*/*.toml"))


def example(name: str) -> tuple[StudyPlan, Path] | None:
    """The plan of an example without what needs all records at once, and its records; None for a database."""
    plan = read_plan(EXAMPLES / name).plan
    if "://" in plan.records.source:
        return None
    records = plan.records.model_copy(update={"repeats": None})
    return plan.model_copy(update={"records": records}), (EXAMPLES / name).parent / plan.records.source


def as_parquet(path: Path, plan: StudyPlan, folder: Path, *, dictionaries: bool) -> Path:
    """A CSV file as Parquet, its texts plain or in dictionaries, in row groups that do not fit the blocks."""
    content = path.read_bytes()
    table, _ = read_delimited(content, path.name, text_columns=kept_as_written(plan) if dictionaries else ())
    columns = {
        name: column if dictionaries or not pa.types.is_dictionary(column.type) else column.cast(pa.string())
        for name, column in zip(table.column_names, table.columns, strict=True)
    }
    pq.write_table(pa.table(columns), folder / "people.parquet", row_group_size=1700)
    return folder / "people.parquet"


@pytest.fixture
def blocks_of(monkeypatch: pytest.MonkeyPatch) -> Any:
    return lambda rows: monkeypatch.setattr("oddsmodel.records.stream.source.BLOCK", rows)


@pytest.mark.parametrize("kind", ["csv", "texts", "dictionaries"])
@pytest.mark.parametrize("name", PLANS)
def test_examples(name: str, kind: str, tmp_path: Path, blocks_of: Any) -> None:
    found = example(name)
    if found is None:
        return
    plan, path = found
    blocks_of(1000)
    if kind != "csv":
        path = as_parquet(path, plan, tmp_path, dictionaries=kind == "dictionaries")
    assert assert_same(path, plan) is not None


def test_the_accounting_of_blocks_adds_up_to_that_of_all_records(blocks_of: Any) -> None:
    found = example("readmissions/plan.toml")
    assert found is not None
    plan, path = found
    blocks_of(300)
    stream, records = streamed(path, plan), load_records(path, plan, Silent())
    model = {"keep": ["age >= 18"], "exposures": ["follow_up"], "adjustment": ["age", "ward", "smoking"]}
    whole = account(records, code_outcome(records, plan.outcome), **model).flow
    parts = [account(block, stream.outcome_of(block), **model).flow for block in stream.blocks()]
    assert sum(part.analysed for part in parts) == whole.analysed
    assert sum(part.events for part in parts) == whole.events
    assert sum(part.read for part in parts) == whole.read
    for one in whole.left_out:
        codes = [(other.code, other.records) for part in parts for other in part.left_out]
        assert sum(records for code, records in codes if code == one.code) == one.records


OUTCOME = ["no", "yes"] * 6


def plan_of(formula: str = "died ~ x", **sections: Any) -> StudyPlan:
    """A plan of one model; `columns`, `records`, `derived`, `outcome` as in its sections."""
    return StudyPlan.model_validate(
        {
            "study": {"title": "Falls", "design": "cohort"},
            "records": {"source": "people.csv", **sections.get("records", {})},
            "columns": sections.get("columns", {}),
            "derived": sections.get("derived", {}),
            "outcome": sections.get("outcome", {"column": "died"}),
            "models": ({"name": "main", "formula": formula, "exposures": ("x",) if "x" in formula else ()},),
        }
    )


def text_of(columns: dict[str, list[str]], delimiter: str = ",") -> str:
    rows = zip(*columns.values(), strict=True)
    return "\n".join([delimiter.join(columns), *(delimiter.join(row) for row in rows)]) + "\n"


def many(values: list[str], last: str) -> list[str]:
    """Twelve values, the last one another."""
    return [*(values * 12)[:11], last]


ODD_COLUMNS = {
    "a late text among numbers": many(["40", "41.5"], "old"),
    "whole numbers, late a fraction": many(["40", "41"], "41.5"),
    "whole numbers, late a yes": many(["0", "1"], "true"),
    "whole numbers and late one too large": many(["4", "5"], "9007199254740993"),
    "fractions and late a whole number too large": many(["4.5", "5"], "9007199254740993"),
    "large whole numbers, late a fraction": many(["9007199254740993", "5"], "0.5"),
    "late a leading zero": many(["4", "5"], "007"),
    "late a word that parsers take for a number": many(["4", "5"], "nan"),
    "late an infinite number": many(["4", "5"], "1e999"),
    "late a hexadecimal number": many(["4", "5"], "0x10"),
    "hexadecimal numbers, late a fraction": many(["0x10", "5"], "0.5"),
    "dates, late one with a time": many(["2020-01-01", "2020-01-02"], "2020-01-02 10:30:00"),
    "moments, late one with a zone": many(["2020-01-01 00:00:00"], "2020-01-02 10:30:00Z"),
    "midnights only": many(["2020-01-01 00:00:00", "2020-01-02 00:00:00"], "2020-01-05 00:00:00"),
    "late another spelling of a level": many(["a", "b"], "A"),
    "late spaces around a level": many(["a", "b"], " b "),
    "late a decomposed accent": many(["caf\u00e9", "b"], "cafe\u0301"),
    "late a level": many(["a", "b"], "c"),
    "nothing, late a number": many([""], "7"),
    "nothing at all": [""] * 12,
    "a code for not recorded": many(["1", "2", "3", "9"], "9"),
    "each text once": [f"P{number}" for number in range(12)],
    "identifiers with one twice": many([f"P{number}" for number in range(12)], "P3"),
    "true and false in several spellings": many(["TRUE", "true", "False"], "1"),
}


@pytest.mark.parametrize("rows", [1, 5, 262_144])
@pytest.mark.parametrize("cells", ODD_COLUMNS.values(), ids=ODD_COLUMNS.keys())
def test_odd_columns(cells: list[str], rows: int, tmp_path: Path, blocks_of: Any) -> None:
    blocks_of(rows)
    (tmp_path / "people.csv").write_text(text_of({"died": OUTCOME, "x": cells}))
    for columns in ({}, {"x": {"kind": "number"}}, {"x": {"kind": "category"}}, {"x": {"kind": "identifier"}}):
        assert_same(tmp_path / "people.csv", plan_of(columns=columns))


@pytest.mark.parametrize("cells", ODD_COLUMNS.values(), ids=ODD_COLUMNS.keys())
def test_odd_columns_of_texts_in_parquet(cells: list[str], tmp_path: Path, blocks_of: Any) -> None:
    blocks_of(5)
    x = pa.array([cell or None for cell in cells], pa.string())
    levels = pa.DictionaryArray.from_arrays(pa.array([1, 0] * 6, pa.int8()), pa.array(["yes", "no", "never met"]))
    path = tmp_path / "people.parquet"
    pq.write_table(pa.table({"died": levels, "x": x}), path, row_group_size=7)
    for columns in ({}, {"x": {"kind": "number"}}, {"x": {"kind": "category"}}, {"x": {"kind": "identifier"}}):
        assert_same(path, plan_of(columns=columns))


FAULTY = {
    "stray texts by their rows": ({"x": many(["1", "n/a"], "?")}, {"columns": {"x": {"kind": "number"}}}),
    "levels that the plan does not have": (
        {"x": many(["a", "b", "c"], "d")},
        {"columns": {"x": {"levels": ["a", "b"]}}},
    ),
    "a reference that nobody has": ({"x": many(["a", "b"], "b")}, {"columns": {"x": {"reference": "z"}}}),
    "an outcome of three values": ({"x": OUTCOME, "died": many(["no", "yes"], "maybe")}, {}),
    "a count that is not whole": ({"x": OUTCOME, "n": many(["1", "2"], "1.5")}, {"records": {"count": "n"}}),
    "a count that is not recorded": ({"x": OUTCOME, "n": many(["1", "2"], "")}, {"records": {"count": "n"}}),
    "a count of nobody": ({"x": OUTCOME, "n": ["0"] * 12}, {"records": {"count": "n"}}),
    "dates of which day and month cannot be told": (
        {"x": OUTCOME, "born": many(["1/2/2000"], "3/4/2001"), "seen": ["2020-01-01"] * 12},
        {"derived": {"age": {"years_between": ["born", "seen"]}}},
    ),
    "no dates": (
        {"x": OUTCOME, "born": many(["2000-01-01"], "once"), "seen": many(["2020-01-01"], "31.31.2020")},
        {"derived": {"age": {"years_between": ["born", "seen"]}}},
    ),
    "an outcome after extraction": (
        {"x": OUTCOME, "born": ["2000-01-01"] * 12, "seen": many(["2000-02-01"], "2031-01-01")},
        {"outcome": {"start": "born", "event_date": "seen", "within_days": 90, "extracted": "2020-01-01"}},
    ),
    "an outcome that nobody has": (
        {"x": OUTCOME, "born": ["2000-01-01"] * 12, "seen": [""] * 11 + ["2010-01-01"]},
        {"outcome": {"start": "born", "event_date": "seen", "within_days": 90, "extracted": "2020-01-01"}},
    ),
    "levels without a group, by their records": (
        {"x": many(["a", "b", "c"], "d"), "n": many(["2"], "5")},
        {"derived": {"g": {"groups_of": "x", "groups": {"one": ["a"]}}}, "records": {"count": "n"}},
    ),
    "parts of a score that are no yes and no": (
        {"x": many(["yes", "no"], "perhaps")},
        {"derived": {"score": {"points": {"x": 2}}}},
    ),
    "quantile groups without a cut point": (
        {"x": OUTCOME, "z": ["5"] * 12},
        {"derived": {"q": {"quantile_groups_of": "z", "groups": 4}}},
    ),
    "a column that is not there": ({"x": OUTCOME}, {"derived": {"q": {"bands_of": "weight", "edges": [1]}}}),
    "a condition with a level that is not there": ({"x": many(["a"], "b")}, {"records": {"keep": "x == 'c'"}}),
}


@pytest.mark.parametrize(("columns", "sections"), FAULTY.values(), ids=FAULTY.keys())
def test_faults_are_the_same(
    columns: dict[str, list[str]], sections: dict[str, Any], tmp_path: Path, blocks_of: Any
) -> None:
    blocks_of(5)
    (tmp_path / "people.csv").write_text(text_of({"died": OUTCOME} | columns))
    assert assert_same(tmp_path / "people.csv", plan_of(**sections)) is None


NUMBERS = [str(number) for number in (3, 8, 1, 9, 4, 4, 7, 2, 6, 5, 10, 12)]
TOGETHER: dict[str, dict[str, Any]] = {
    "bands": {"derived": {"d": {"bands_of": "z", "edges": [4, 8], "reference": "4 to under 8"}}},
    "quantile groups": {"derived": {"d": {"quantile_groups_of": "z", "groups": 3}}},
    "quantile groups of those kept": {
        "derived": {"d": {"quantile_groups_of": "z", "groups": 3}},
        "records": {"keep": "x != 'c'"},
    },
    "groups of quantile groups of years": {
        "derived": {
            "years": {"years_between": ["born", "seen"], "plausible": [1, 30]},
            "halves": {"quantile_groups_of": "years", "groups": 2},
            "g": {"groups_of": "halves", "groups": {"all": ["under 6"]}, "other_levels": "exclude and count"},
        },
    },
    "a score, and an outcome of it": {
        "derived": {"s": {"points": {"p": 1, "q": 2}, "if_part_missing": "zero"}},
        "outcome": {"name": "high", "event_when": "s >= 2"},
    },
    "an outcome that is derived": {
        "derived": {"d": {"groups_of": "x", "groups": {"yes": ["a"], "no": ["b", "c"]}}},
        "outcome": {"column": "d", "event": "yes"},
    },
    "an outcome from dates": {
        "outcome": {
            "start": "born",
            "event_date": "seen",
            "followed_to": "left",
            "within_days": 2000,
            "extracted": "2030-01-01",
        },
    },
    "implausible numbers": {"columns": {"z": {"plausible": [2, 9]}}},
    "groups": {"records": {"grouped_by": "x"}, "columns": {"x": {"label": "Ward"}}},
    "levels outside the plan": {"columns": {"x": {"levels": ["a", "b"], "other_levels": "exclude and count"}}},
    "columns called otherwise": {"columns": {"place": {"from": "x", "kind": "category"}}},
}


@pytest.mark.parametrize("counted", [False, True], ids=["rows", "counts"])
@pytest.mark.parametrize("sections", TOGETHER.values(), ids=TOGETHER.keys())
def test_what_columns_come_to_together(sections: dict[str, Any], counted: bool, tmp_path: Path, blocks_of: Any) -> None:
    blocks_of(5)
    columns = {
        "died": OUTCOME,
        "x": many(["a", "b", "c"], ""),
        "z": NUMBERS,
        "born": [f"{day}/01/2000" for day in range(8, 20)],
        "seen": [f"20{year:02d}-02-01" for year in range(0, 12)],
        "left": many(["2012-01-01"], ""),
        "p": many(["yes", "no"], ""),
        "q": many(["1", "1", "0"], "0"),
        "n": many(["3", "1", "0", "2"], "4"),
    }
    if counted:
        sections = sections | {"records": sections.get("records", {}) | {"count": "n"}}
    (tmp_path / "people.csv").write_text(text_of(columns))
    formula = "died ~ x + z" if "place" not in sections.get("columns", {}) else "died ~ place + z"
    stream = assert_same(tmp_path / "people.csv", plan_of(formula, **sections))
    assert stream is not None
    assert stream.blocks_number == 3


@pytest.mark.parametrize("delimiter", [",", ";", "\t", "|"])
@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "cp1252", "utf-16"])
def test_delimiters_and_encodings(delimiter: str, encoding: str, tmp_path: Path, blocks_of: Any) -> None:
    blocks_of(5)
    text = text_of({"died": OUTCOME, "x": many(["Li\u00e8ge", "K\u00f6ln"], "Gen\u00e8ve"), "z": NUMBERS}, delimiter)
    (tmp_path / "people.csv").write_bytes(text.encode(encoding))
    assert assert_same(tmp_path / "people.csv", plan_of("died ~ x + z")) is not None


@pytest.mark.parametrize(
    "cells",
    [
        many(["24,5", "31"], "27,25"),
        many(["24.5", "31"], "27,25"),
        many(["1,234", "2,345"], "3,456"),
        many(["24", "31"], "27,25"),
        many(["24,5", "31"], "a"),
    ],
)
def test_the_decimal_comma(cells: list[str], tmp_path: Path, blocks_of: Any) -> None:
    (tmp_path / "people.csv").write_text(text_of({"died": OUTCOME, "x": cells}, ";"))
    for rows in (5, 262_144):
        blocks_of(rows)
        assert_same(tmp_path / "people.csv", plan_of())


def test_a_folder_of_parquet_with_columns_in_its_names(tmp_path: Path, blocks_of: Any) -> None:
    blocks_of(5)
    whole, texts = pa.array([1, 2, 3, 4], pa.int32()), pa.array(["a", "b", "b", None])
    for number, column in enumerate([whole, whole.cast(pa.int64()), whole.cast(pa.float64())]):
        folder = tmp_path / "people" / f"year={2020 + number}"
        folder.mkdir(parents=True)
        wards = texts if number != 1 else texts.dictionary_encode()
        table = pa.table({"died": ["no", "yes"] * 2, "x": column, "ward": wards, "notes": [["a"], ["b"], [], None]})
        pq.write_table(table, folder / "part.parquet")
    stream = assert_same(tmp_path / "people", plan_of("died ~ x + ward + year"))
    assert stream is not None
    assert stream.columns["year"].kind == "number"
    assert stream.rows == 12


def test_repeats_need_all_records_at_once(tmp_path: Path) -> None:
    (tmp_path / "people.csv").write_text(text_of({"died": OUTCOME, "x": NUMBERS}))
    repeats = {"of": "x", "use": "first", "ordered_by": "x"}
    with pytest.raises(InputFault, match=r"repeats.*memory"):
        streamed(tmp_path / "people.csv", plan_of(records={"repeats": repeats}))
