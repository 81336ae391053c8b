"""CSV tables, read again with Python's csv module and with pandas."""

from __future__ import annotations

import csv
import io
import math
import sys
from dataclasses import replace
from pathlib import Path

import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from oddsmodel.disclosure import disclose
from oddsmodel.export.csv_tables import csv_files, neutral
from oddsmodel.findings import Finding
from oddsmodel.results.study import DisclosedResults
from oddsmodel.results.tables import Hidden, Interval, Table, TableColumn

sys.path.insert(0, str(Path(__file__).parent.parent / "disclosure"))
from joint_records import joint_table
from sample_study import sample_study

NAMES = {
    *("estimates.csv", "terms.csv", "flow.csv", "checks.csv", "findings.csv"),
    *("levels.csv", "characteristics.csv", "comparison.csv"),
}


@pytest.fixture(scope="module")
def disclosed() -> DisclosedResults:
    return disclose(sample_study(joint_table(3)).study, audience="shareable", hide_counts_below=5)


def frame(text: str) -> pd.DataFrame:
    return pd.read_csv(io.StringIO(text), keep_default_na=False, na_values=[""])


def test_names_are_fixed_and_rows_are_even(disclosed: DisclosedResults) -> None:
    files = csv_files(disclosed)
    assert set(files) == NAMES
    for text in files.values():
        rows = list(csv.reader(io.StringIO(text)))
        assert len({len(row) for row in rows}) == 1
        assert len(rows[0]) == len(set(rows[0]))
        assert text.endswith("\n")
    bare = replace(disclosed.study, characteristics=None, comparison=None, models=())
    assert set(csv_files(replace(disclosed, study=bare))) == NAMES - {
        "characteristics.csv",
        "comparison.csv",
        "levels.csv",
    }


def test_estimates_come_back_to_the_last_digit(disclosed: DisclosedResults) -> None:
    table = frame(csv_files(disclosed)["estimates.csv"])
    assert table["model"].tolist() == ["main"] * 4 + ["smoking alone"] * 3
    for model in disclosed.study.models:
        for one, (_, row) in zip(model.coefficients, table[table["model"] == model.name].iterrows(), strict=True):
            assert row["term"] == one.term
            for name, value in (
                ("log_odds_ratio", one.log_odds_ratio),
                ("odds_ratio", one.odds_ratio),
                ("wald_lower", one.wald.lower),
                ("profile_upper", one.profile.upper),
                ("crude_odds_ratio", one.crude.odds_ratio if one.crude else None),
            ):
                assert row[name] == value or (value is None and math.isnan(row[name]))
    hidden = table[table["crude_odds_ratio"].isna() & (table["role"] == "exposure")]
    assert hidden["reasons"].str.contains("give away").all()


def test_hidden_cells_are_empty_with_a_note_and_intervals_have_two_columns(disclosed: DisclosedResults) -> None:
    table = frame(csv_files(disclosed)["levels.csv"])
    assert {"crude_interval_lower", "crude_interval_upper"} <= set(table.columns)
    rows = [(model.name, row) for model in disclosed.study.models for row in model.tables[0].rows]
    assert len(table) == len(rows)
    keys = [column.key for column in disclosed.study.models[0].tables[0].columns]
    for (model, row), (_, read) in zip(rows, table.iterrows(), strict=True):
        assert read["model"] == model
        for key, cell in zip(keys, row, strict=True):
            if isinstance(cell, Hidden):
                assert key in read["note"].removeprefix("hidden: ").split(", ")
                names = [key] if key in read else [f"{key}_lower", f"{key}_upper"]
                assert all(pd.isna(read[name]) for name in names)
            elif isinstance(cell, int):
                assert read[key] == cell
            elif isinstance(cell, Interval):
                assert (read[f"{key}_lower"], read[f"{key}_upper"]) == (cell.lower, cell.upper)
    flow = frame(csv_files(disclosed)["flow.csv"])
    assert set(flow["step"]) == {"read", "left out", "analysed", "events"}
    assert (flow["note"] == "hidden").equals(flow["records"].isna())


def test_numbers_stay_numbers_and_text_stays_text(disclosed: DisclosedResults) -> None:
    column = TableColumn
    columns = (column("label", "L"), column("number", "N", "number"), column("text", "T"))
    table = Table("characteristics", "", columns, (("a", -1.5, "-1.5"), ("b", None, "1"), ("c", 3, "=1+1")))
    study = replace(disclosed.study, characteristics=table)
    text = csv_files(replace(disclosed, study=study))["characteristics.csv"]
    assert text.splitlines() == [
        '"label","number","text","note"',
        '"a",-1.5,"\'-1.5",',
        '"b",,"1",',
        '"c",3,"\'=1+1",',
    ]


def test_a_number_that_is_not_finite_is_never_written(disclosed: DisclosedResults) -> None:
    table = Table("characteristics", "", (TableColumn("x", "X", "number"),), ((math.nan,),))
    with pytest.raises(ValueError, match="not finite"):
        csv_files(replace(disclosed, study=replace(disclosed.study, characteristics=table)))


@pytest.mark.parametrize("start", list("=+-@\t\r\n＝＋－＠"))
def test_what_a_spreadsheet_would_run_is_told_to_be_text(disclosed: DisclosedResults, start: str) -> None:
    text = f'{start}HYPERLINK("http://example.org")'
    finding = Finding("note", "invented", text, {})
    files = csv_files(replace(disclosed, study=replace(disclosed.study, findings=(finding,))))
    (row, *_) = list(csv.reader(io.StringIO(files["findings.csv"], newline="")))[1:]
    assert row[3] == f"'{text}"


@settings(deadline=None, derandomize=True)
@given(st.text(alphabet=st.sampled_from("=+-@;\t\r\n\" ,'a1\x00＝"), max_size=12))
def test_no_cell_starts_with_what_a_spreadsheet_runs_whatever_the_separator(text: str) -> None:
    for separator in (";", "\t"):
        for line in neutral(text).splitlines():
            for cell in line.split(separator):
                assert not cell.lstrip(' "').startswith(("=", "+", "-", "@", "＝"))
    assert "\x00" not in neutral(text)
    assert neutral("plain, text - as it is") == "plain, text - as it is"


def test_groups_are_named_and_their_names_run_nothing(disclosed: DisclosedResults) -> None:
    columns = (TableColumn("label", "Characteristic"), TableColumn("group_1_records", "=1+1, records", "count"))
    table = Table("characteristics", "Who they were", columns, (("All", 7),))
    study = replace(disclosed.study, characteristics=table)
    header = csv_files(replace(disclosed, study=study))["characteristics.csv"].splitlines()[0]
    assert header == '"label","\'=1+1, records","note"'
