"""Records coded by a plan: kinds, levels, numbers, counts, and the faults reported together."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from oddsmodel.errors import Fault, InputFault
from oddsmodel.plan.schema import StudyPlan
from oddsmodel.progress import Silent
from oddsmodel.records.load import load_records, records_from_frame
from oddsmodel.records.plan_use import columns_used
from oddsmodel.records.types import Records
from oddsmodel.records.usable import unusable_in_formula

DIED = "no,yes,no,yes,no,yes"


def plan(formula: str = "died ~ x", exposures: tuple[str, ...] = ("x",), **sections: Any) -> StudyPlan:
    """A plan of one model; `columns`, `records`, `outcome` as in its sections."""
    return StudyPlan.model_validate(
        {
            "study": {"title": "Falls", "design": "cohort"},
            "records": {"source": "people.csv", **sections.get("records", {})},
            "columns": sections.get("columns", {}),
            "outcome": {"column": "died", **sections.get("outcome", {})},
            "models": ({"name": "main", "formula": formula, "exposures": exposures, **sections.get("model", {})},),
        }
    )


def load(tmp_path: Path, columns: dict[str, str], study: StudyPlan) -> Records:
    """Records from a CSV file whose columns are given as comma-separated cells."""
    cells = {name: text.split(",") for name, text in columns.items()}
    rows = [",".join(cells), *(",".join(row) for row in zip(*cells.values(), strict=True))]
    (tmp_path / "people.csv").write_text("\n".join(rows))
    return load_records(tmp_path / "people.csv", study, Silent())


def faults(tmp_path: Path, columns: dict[str, str], study: StudyPlan) -> tuple[Fault, ...]:
    with pytest.raises(InputFault) as caught:
        load(tmp_path, columns, study)
    assert all(fault.what and fault.where and fault.remedy for fault in caught.value.faults)
    return caught.value.faults


def messages(records: Records) -> dict[str, str]:
    return {finding.code: finding.message for finding in records.findings}


def cells(records: Records, column: str) -> list[object]:
    return [None if pd.isna(value) else value for value in records.frame[column]]


def test_a_number_keeps_what_the_plan_says_of_it(tmp_path: Path) -> None:
    study = plan(columns={"x": {"kind": "number", "per": 10, "units": "years", "label": "Age", "why": "older"}})
    records = load(tmp_path, {"died": DIED, "x": "40,,42,43,44.5,45"}, study)
    column = records.columns["x"]
    assert (column.kind, column.per, column.units, column.label, column.why) == (
        "number",
        10.0,
        "years",
        "Age",
        "older",
    )
    assert cells(records, "x") == [40, None, 42, 43, 44.5, 45]
    assert records.frame["x"].dtype == np.float64
    assert (records.read, records.source) == (6, "people.csv")
    assert len(records.sha256) == 64


def test_texts_that_mean_not_recorded_by_plan_and_by_column(tmp_path: Path) -> None:
    study = plan(
        "died ~ x + ward",
        records={"not_recorded": ["", "NA"]},
        columns={"x": {"kind": "number", "not_recorded": ["999", "unknown"]}, "ward": {"kind": "category"}},
    )
    columns = {"died": DIED, "x": "40,999,unknown,43,999.0,", "ward": "NA,a,b,a,b,a"}
    records = load(tmp_path, columns, study)
    assert cells(records, "x") == [40, None, None, 43, None, None]
    assert cells(records, "ward") == [None, "a", "b", "a", "b", "a"]
    (fault,) = faults(tmp_path, columns | {"x": "40,NA,1,2,3,4"}, study)
    assert "row 3 has “NA”" in fault.what


def test_stray_texts_in_a_number_column_name_their_first_rows(tmp_path: Path) -> None:
    study = plan(columns={"x": {"kind": "number"}})
    (fault,) = faults(tmp_path, {"died": DIED, "x": "40,n/a,?,43,4O,<b>"}, study)
    assert "row 3 has “n/a”, row 4 has “?”, row 6 has “4O” and row 7 has “<b>”" in fault.what
    assert "column “x”" in fault.where
    assert "not_recorded" in fault.remedy


def test_many_stray_texts_are_counted(tmp_path: Path) -> None:
    n = 200
    columns = {"died": ",".join(["no", "yes"] * (n // 2)), "x": ",".join(["40"] * 100 + ["old"] * 100)}
    (fault,) = faults(tmp_path, columns, plan(columns={"x": {"kind": "number"}}))
    assert "row 102 has" in fault.what
    assert "95 more rows hold text" in fault.what


def test_an_undeclared_column_that_is_mostly_numbers_is_a_number_with_stray_texts(tmp_path: Path) -> None:
    numbers = ",".join([str(20 + i) for i in range(39)] + ["old"])
    columns = {"died": ",".join(["no", "yes"] * 20), "x": numbers}
    (fault,) = faults(tmp_path, columns, plan())
    assert "row 41 has “old”" in fault.what
    columns = {"died": ",".join(["no", "yes"] * 20), "x": "3," * 39 + "4", "spare": numbers}
    assert load(tmp_path, columns, plan()).columns["spare"].kind == "category"


@pytest.mark.parametrize("word", ["nan", "inf", "-Infinity"])
def test_words_that_parsers_take_for_numbers_are_stray_texts(tmp_path: Path, word: str) -> None:
    (fault,) = faults(tmp_path, {"died": DIED, "x": f"40,{word},42,43,44,45"}, plan(columns={"x": {"kind": "number"}}))
    assert f"row 3 has “{word}”" in fault.what


def test_numbers_too_large_to_tell_apart(tmp_path: Path) -> None:
    study = plan(columns={"x": {"kind": "number"}})
    (fault,) = faults(tmp_path, {"died": DIED, "x": "1,9007199254740993,3,4,5,6"}, study)
    assert "row 3" in fault.what
    assert "identifier" in fault.remedy
    (fault,) = faults(tmp_path, {"died": DIED, "x": "1,1e999,3,4,5,6"}, study)
    assert "infinite" in fault.what
    records = load(tmp_path, {"died": DIED, "x": "1,1e20,3,4,5,6"}, study)
    assert cells(records, "x")[1] == 1e20


def test_a_decimal_comma_in_a_quoted_field_is_pointed_out(tmp_path: Path) -> None:
    (tmp_path / "people.csv").write_text('died,x\nno,"1,5"\nyes,2\n')
    with pytest.raises(InputFault, match="decimal point"):
        load_records(tmp_path / "people.csv", plan(columns={"x": {"kind": "number"}}), Silent())


def test_few_whole_numbers_are_asked_about_unless_the_plan_speaks(tmp_path: Path) -> None:
    columns = {"died": DIED, "x": "1,2,3,1,2,3"}
    records = load(tmp_path, columns, plan())
    assert "1, 2 and 3" in messages(records)["few-whole-numbers"]
    assert records.columns["x"].kind == "number"
    assert "few-whole-numbers" not in messages(load(tmp_path, columns, plan(columns={"x": {"kind": "number"}})))
    assert "few-whole-numbers" not in messages(load(tmp_path, columns, plan(columns={"x": {"kind": "category"}})))


def test_suspected_codes_are_asked_about_and_stay_values(tmp_path: Path) -> None:
    records = load(tmp_path, {"died": DIED, "x": "1,2,3,9,2,9"}, plan(columns={"x": {"kind": "number"}}))
    message = messages(records)["suspected-codes"]
    assert "“9” (2 records)" in message
    assert cells(records, "x") == [1, 2, 3, 9, 2, 9]
    records = load(tmp_path, {"died": DIED, "x": "a,b,unknown,a,b,a"}, plan())
    assert "“unknown” (1 record)" in messages(records)["suspected-codes"]
    records = load(tmp_path, {"died": DIED, "x": "1,2,3,9,2,9"}, plan(columns={"x": {"kind": "category"}}))
    assert "“9” (2 records)" in messages(records)["suspected-codes"]


def test_levels_in_every_spelling(tmp_path: Path) -> None:
    study = plan(columns={"x": {"kind": "category", "levels": ["2", "1.0", "b"], "reference": "1"}})
    records = load(tmp_path, {"died": DIED, "x": "1, 2.0,b,true,,1.00"}, study)
    assert cells(records, "x") == ["1.0", "2", "b", "1.0", None, "1.0"]
    assert list(records.frame["x"].cat.categories) == ["2", "1.0", "b"]
    assert records.columns["x"].levels == ("2", "1.0", "b")
    assert records.columns["x"].reference == "1.0"


def test_leading_zeros_are_levels_of_their_own(tmp_path: Path) -> None:
    records = load(tmp_path, {"died": DIED, "x": "01,1,02,2,01,1"}, plan(columns={"x": {"kind": "category"}}))
    assert records.columns["x"].levels == ("01", "1", "02", "2")


def test_levels_found_are_sorted_numbers_first_by_size(tmp_path: Path) -> None:
    records = load(tmp_path, {"died": DIED, "x": "10,9,b,B,é,2"}, plan(columns={"x": {"kind": "category"}}))
    assert records.columns["x"].levels == ("2", "9", "10", "B", "b", "é")
    assert records.columns["x"].reference == "2"
    assert "“x” against “2”" in messages(records)["references-taken"]
    assert "“B” and “b”" in messages(records)["levels-differ-by-case"]


def test_the_plainest_or_most_frequent_spelling_is_kept(tmp_path: Path) -> None:
    records = load(tmp_path, {"died": DIED, "x": "1.0,1,1.0,1.0,a,a"}, plan(columns={"x": {"kind": "category"}}))
    assert records.columns["x"].levels == ("1", "a")
    records = load(tmp_path, {"died": DIED, "x": "TRUE,true,true,b,b,b"}, plan(columns={"x": {"kind": "category"}}))
    assert records.columns["x"].levels == ("b", "true")


def test_a_level_that_is_not_in_the_plan_stops(tmp_path: Path) -> None:
    study = plan(columns={"x": {"kind": "category", "levels": ["never", "current"]}})
    (fault,) = faults(tmp_path, {"died": DIED, "x": "never,curent,current,never,past,past"}, study)
    assert "“past” (2 records) and “curent” (1 record)" in fault.what
    assert "“curent” may be meant for “current”" in fault.remedy
    assert "exclude and count" in fault.remedy


def test_a_level_that_is_not_in_the_plan_can_be_left_out(tmp_path: Path) -> None:
    section = {"kind": "category", "levels": ["never", "current"], "other_levels": "exclude and count"}
    records = load(tmp_path, {"died": DIED, "x": "never,past,current,,past,never"}, plan(columns={"x": section}))
    assert cells(records, "x") == ["never", None, "current", None, None, "never"]
    assert records.outside_levels["x"].tolist() == [False, True, False, False, True, False]


def test_a_level_that_is_absent_is_a_note_and_no_default_reference(tmp_path: Path) -> None:
    study = plan(columns={"x": {"kind": "ordered", "levels": ["low", "mid", "top"]}})
    records = load(tmp_path, {"died": DIED, "x": "mid,top,mid,top,mid,top"}, study)
    assert "No record has “low”" in messages(records)["level-absent"]
    assert records.columns["x"].levels == ("low", "mid", "top")
    assert records.columns["x"].reference == "mid"
    assert records.frame["x"].cat.ordered


def test_a_reference_that_no_record_has_is_a_fault(tmp_path: Path) -> None:
    study = plan(columns={"x": {"kind": "category", "reference": "nevr"}})
    (fault,) = faults(tmp_path, {"died": DIED, "x": "never,past,never,past,never,past"}, study)
    assert fault.where == "the plan, [columns.x] reference"
    assert "Did you mean “never”?" in fault.remedy


@pytest.mark.parametrize("spelt", ["yes,no,,yes,no,yes", "Y,n,,y,N,Y", "1,0,,1,0,1", "TRUE,False,,true,FALSE,True"])
@pytest.mark.parametrize("reference", [None, "0", "no", "false"])
def test_yes_and_no_in_every_spelling(tmp_path: Path, spelt: str, reference: str | None) -> None:
    section = {"kind": "yes-no"} | ({} if reference is None else {"reference": reference})
    records = load(tmp_path, {"died": DIED, "x": spelt}, plan(columns={"x": section}))
    assert cells(records, "x") == ["yes", "no", None, "yes", "no", "yes"]
    assert (records.columns["x"].levels, records.columns["x"].reference) == (("no", "yes"), "no")


def test_yes_no_columns_are_inferred_and_have_levels_of_the_plan(tmp_path: Path) -> None:
    columns = {"died": DIED, "x": "Yes,no,No,YES,no,yes"}
    assert load(tmp_path, columns, plan()).columns["x"].kind == "yes-no"
    study = plan(columns={"x": {"kind": "yes-no", "levels": ["0", "1"]}})
    assert cells(load(tmp_path, columns, study), "x") == ["1", "0", "0", "1", "0", "1"]
    study = plan(columns={"x": {"kind": "yes-no", "levels": ["nein", "ja"]}})
    assert cells(load(tmp_path, {"died": DIED, "x": "ja,nein,ja,nein,ja,ja"}, study), "x")[0] == "ja"


def test_a_third_value_in_a_yes_no_column_is_a_fault(tmp_path: Path) -> None:
    study = plan(columns={"x": {"kind": "yes-no"}})
    (fault,) = faults(tmp_path, {"died": DIED, "x": "yes,no,maybe,no,maybe,yes"}, study)
    assert "“maybe” (2 records)" in fault.what


def test_dates_and_identifiers_are_texts_and_have_no_place_in_a_formula(tmp_path: Path) -> None:
    columns = {"died": DIED, "x": "1.5,2,3,4,5,6.5", "id": "007,8,9,10,11,", "seen": "2020-01-02,,2020-01-03,,,"}
    study = plan(columns={"id": {"kind": "identifier"}, "seen": {"kind": "date"}})
    records = load(tmp_path, columns, study)
    assert cells(records, "id") == ["007", "8", "9", "10", "11", None]
    assert cells(records, "seen")[:2] == ["2020-01-02", None]
    assert load(tmp_path, columns, plan()).columns["seen"].kind == "date"
    found = unusable_in_formula(records.columns, ["x", "id", "seen", "absent"], 'the plan, [[models]] "main" formula')
    assert [fault.what.split(" ")[0] for fault in found] == ["“id”", "“seen”"]
    assert messages(records) == {}


def test_an_identifier_that_repeats_is_a_finding_that_stops(tmp_path: Path) -> None:
    columns = {"died": DIED, "x": "1.5,2,3,4,5,6.5", "id": "a,a,b,c,,"}
    (found,) = load(tmp_path, columns, plan(columns={"id": {"kind": "identifier"}})).findings
    assert (found.code, found.severity) == ("identifier-repeats", "stop")
    assert found.facts == {"column": "id", "records": 4, "different": 3}


def test_counts_multiply_and_rows_of_none_are_dropped(tmp_path: Path) -> None:
    study = plan(
        records={"count": "n"},
        columns={"x": {"kind": "category", "levels": ["a", "b"], "other_levels": "exclude and count"}},
    )
    records = load(tmp_path, {"died": DIED, "x": "a,b,c,a,b,c", "n": "10,0,3,4,5,6"}, study)
    assert records.read == 28
    assert records.counts is not None
    assert records.counts.tolist() == [10, 3, 4, 5, 6]
    assert records.counts.dtype == np.float64
    assert cells(records, "x") == ["a", None, "a", "b", None]
    assert records.outside_levels["x"].tolist() == [False, True, False, False, True]
    assert "rows-of-no-record" in messages(records)


@pytest.mark.parametrize(
    ("counts", "word"),
    [("1,2,3,4,5,", "row 7"), ("1,2,-3,4,5,6", "row 4"), ("1,2.5,3,x,5,6", "row 5"),
     ("0,0,0,0,0,0", "All counts are 0"), ("1,2.5,3,4,5,6", "row 3"),
     ("1,9007199254740991,3,4,5,6", "counted exactly")],
)  # fmt: skip
def test_faulty_counts(tmp_path: Path, counts: str, word: str) -> None:
    (fault,) = faults(
        tmp_path,
        {"died": DIED, "x": "1.5,2,3,4,5,6", "n": counts},
        plan(records={"count": "n"}, columns={"n": {"kind": "number"}}),
    )
    assert word in fault.what


def test_counts_that_are_no_numbers(tmp_path: Path) -> None:
    columns = {"died": DIED, "x": "1.5,2,3,4,5,6", "n": "a,b,c,d,e,f"}
    (fault,) = faults(tmp_path, columns, plan(records={"count": "n"}))
    assert "does not hold numbers" in fault.what


def test_all_faults_are_reported_together_each_with_the_nearest_name(tmp_path: Path) -> None:
    study = plan(
        "dead ~ smokr",
        ("smokr",),
        records={"count": "number", "keep": "agee >= 18"},
        columns={
            "age": {"kind": "number"},
            "ward": {"kind": "category", "levels": ["a", "b"]},
            "hieght": {"kind": "number"},
        },
        outcome={"column": "dead"},
        model={"keep": 'ward == "a" and age > "x"'},
    )
    columns = {"died": DIED, "smoker": DIED, "age": "40,old,1,2,3,4", "ward": "a,b,c,a,b,a", "height": "1,2,3,4,5,6"}
    found = faults(tmp_path, columns, study)
    text = "\n".join(str(fault) for fault in found)
    for wanted in (
        "[outcome] column: The records have no column “dead”. Did you mean “died”?",
        "[records] count: The records have no column “number”.",
        "[columns.hieght]: The records have no column “hieght”. Did you mean “height”?",
        "exposures: The records have no column “smokr”. Did you mean “smoker”?",
        "row 3 has “old”",
        "levels do not have “c” (1 record)",
        "[records] keep, character 1: The records have no column “agee”. Did you mean “age”?",
    ):
        assert wanted in text, wanted
    assert len(found) == 7


def test_columns_without_use_are_coded_in_silence(tmp_path: Path) -> None:
    odd = {
        "died": DIED,
        "x": "1.5,2,3,4,5,6",
        "grade": "1,2,9,1,2,9",
        "words": "a,A,unknown,b,b,b",
        "empty": ",,,,,",
        "flag": "true,false,,true,true,true",
        "big": "99999999999999999999,2,3,4,5,6",
    }
    records = load(tmp_path, odd, plan())
    assert records.findings == ()
    assert cells(records, "words") == ["a", "A", "unknown", "b", "b", "b"]
    assert records.columns["flag"].levels == ("no", "yes")
    assert records.columns["grade"].kind == "number"
    assert set(records.frame.columns) == set(odd)


def test_an_empty_column_in_use_is_a_caution(tmp_path: Path) -> None:
    for section in ({}, {"x": {"kind": "number"}}, {"x": {"kind": "category"}}):
        records = load(tmp_path, {"died": DIED, "x": ",,,,,"}, plan(columns=section))
        assert "no recorded value" in messages(records)["column-empty"]
        assert records.frame["x"].isna().all()


def test_columns_used_are_found_in_formulas_and_conditions() -> None:
    study = plan(
        "died ~ rcs(age, 4) + log(dose) + Q('blood pressure')",
        ("ward",),
        records={"keep": "seen is recorded", "count": "n"},
        columns={"site": {}},
    )
    names = ["died", "age", "log", "dose", "blood pressure", "ward", "seen", "n", "site", "spare", "ag", "rcs"]
    assert columns_used(study, names) == set(names) - {"log", "spare", "ag", "rcs"}


def test_a_column_of_lists_is_a_fault_only_where_it_is_used(tmp_path: Path) -> None:
    frame = pd.DataFrame({"died": [0, 1], "x": [[1], [2]], "y": [1.5, 2.5]})
    assert [finding.code for finding in records_from_frame(frame, plan("died ~ y", ("y",))).findings] == [
        "columns-left-out"
    ]
    with pytest.raises(InputFault, match="no place in a model"):
        records_from_frame(frame, plan())


def test_a_data_frame_keeps_the_order_of_its_categories() -> None:
    frame = pd.DataFrame(
        {
            "died": [0, 1, 0],
            "x": pd.Categorical(["top", None, "low"], categories=["top", "mid", "low"]),
            "stage": pd.Categorical(["II", "I", "II"], categories=["I", "II"], ordered=True),
            "flag": [True, False, True],
        }
    )
    records = records_from_frame(frame, plan("died ~ x + stage + flag"))
    assert records.columns["x"].levels == ("top", "low")
    assert records.columns["stage"].kind == "ordered"
    assert records.columns["flag"].levels == ("no", "yes")
    assert records.source == "data frame"
    again = records_from_frame(
        frame, plan(columns={"x": {"levels": ["low", "mid", "top"]}, "died": {"kind": "category"}})
    )
    assert again.columns["x"].levels == ("low", "mid", "top")
    assert list(again.frame["died"]) == ["0", "1", "0"]


def test_rows_of_a_data_frame_are_counted_from_one() -> None:
    with pytest.raises(InputFault, match="row 2 has “x”"):
        records_from_frame(pd.DataFrame({"died": [0, 1], "x": [1, "x"]}), plan(columns={"x": {"kind": "number"}}))


@settings(deadline=None, derandomize=True, max_examples=60)
@given(
    st.lists(
        st.tuples(
            st.sampled_from(["yes", "no", ""]),
            st.text(st.characters(codec="utf-8", exclude_categories=["Cs"]), max_size=6),
            st.one_of(st.none(), st.floats(allow_nan=False, allow_infinity=False)),
        ),
        min_size=1,
        max_size=30,
    )
)
def test_any_texts_come_out_as_plain_types_or_as_a_fault(rows: list[tuple[str, str, float | None]]) -> None:
    frame = pd.DataFrame(
        {
            "died": ["yes", "no", *(row[0] for row in rows)],
            "x": ["a", "b", *(row[1] for row in rows)],
            "z": [0.0, 1.0, *(row[2] for row in rows)],
        }
    )
    records = records_from_frame(frame, plan("died ~ x + z", columns={"x": {"kind": "category"}}))
    assert len(records.frame) == records.read == len(rows) + 2
    assert records.frame["z"].dtype == np.float64
    assert isinstance(records.frame["x"].dtype, pd.CategoricalDtype)
    assert list(records.frame["x"].cat.categories) == list(records.columns["x"].levels)
    assert all(level == level.strip() and level for level in records.columns["x"].levels)
    assert records.frame["died"].isna().sum() == sum(row[0] == "" for row in rows)
