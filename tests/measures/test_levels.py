"""The table by exposure level, against counts made with pandas."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pandas as pd
import pytest

from oddsmodel.measures.levels import common_outcome, levels
from oddsmodel.results.tables import Interval

RECORDS = ["smoke", "race", "age", "lwt"]


def test_counts_shares_and_reference(birthwt: pd.DataFrame, fitting: Callable[..., Any]) -> None:
    model, found = fitting(birthwt[RECORDS], birthwt["low"], "race + smoke + age", ["race", "smoke"])
    table = levels(model, found)
    keys = [column.key for column in table.columns]
    rows = {row[0]: dict(zip(keys, row, strict=True)) for row in table.rows}
    assert list(rows) == ["race: white", "race: black", "race: other", "smoke: no", "smoke: yes"]
    assert table.blocks == (0, 0, 0, 1, 1)
    wanted = birthwt.groupby("race", observed=False)["low"].agg(["size", "sum"])  # pandas
    for level in ("white", "black", "other"):
        row = rows[f"race: {level}"]
        assert (row["records"], row["events"]) == tuple(wanted.loc[level])
        assert row["per_100"] == pytest.approx(100 * wanted.loc[level, "sum"] / wanted.loc[level, "size"])
    assert rows["race: white"]["crude"] == rows["race: white"]["adjusted"] == "1 (reference)"
    black = next(one for one in found if one.level == "black")
    assert rows["race: black"]["adjusted"] == black.odds_ratio
    assert rows["race: black"]["crude"] == black.crude.odds_ratio
    assert rows["race: black"]["adjusted_interval"] == Interval(black.profile.lower, black.profile.upper)


def test_what_disclosure_needs_to_know(birthwt: pd.DataFrame, fitting: Callable[..., Any]) -> None:
    model, found = fitting(birthwt[RECORDS], birthwt["low"], "smoke + age", ["smoke"])
    columns = {column.key: column for column in levels(model, found).columns}
    assert columns["events"].part_of == "records"
    assert columns["records"].sums_known
    assert columns["events"].sums_known
    assert columns["per_100"].hidden_with == ("records", "events")
    assert columns["crude"].hidden_with_block
    assert columns["crude_interval"].hidden_with_block
    assert not columns["adjusted"].hidden_with_block


def test_nothing_is_called_adjusted_that_is_not(birthwt: pd.DataFrame, fitting: Callable[..., Any]) -> None:
    model, found = fitting(birthwt[RECORDS], birthwt["low"], "smoke", ["smoke"])
    table = levels(model, found)
    assert not [column.key for column in table.columns if column.key.startswith("adjusted")]
    assert "adjusts for nothing" in table.note
    # Two exposures are adjusted for each other; their odds ratios are hidden as crude ones are.
    model, found = fitting(birthwt[RECORDS], birthwt["low"], "smoke + race", ["smoke", "race"])
    assert {column.key: column for column in levels(model, found).columns}["adjusted"].hidden_with_block


def test_a_case_control_study_has_cases_and_no_share(birthwt: pd.DataFrame, fitting: Callable[..., Any]) -> None:
    for design in ("case-control", "matched case-control"):
        model, found = fitting(birthwt[RECORDS], birthwt["low"], "smoke + age", ["smoke"], design=design)
        columns = {column.key: column for column in levels(model, found).columns}
        assert "per_100" not in columns
        assert columns["events"].heading == "Cases"
        assert common_outcome(model) == ()


def test_common_outcome(birthwt: pd.DataFrame, fitting: Callable[..., Any]) -> None:
    model, _ = fitting(birthwt[RECORDS], birthwt["low"], "smoke", ["smoke"], design="cross-sectional")
    (found,) = common_outcome(model)
    assert found.severity == "caution"
    assert "31.2%" in found.message  # 59 of 189
    assert "prevalence ratio" in found.message
    rare = (birthwt["low"] & (birthwt["age"] < 19)).to_numpy()
    assert rare.mean() <= 0.10
    model, _ = fitting(birthwt[RECORDS], rare, "smoke", ["smoke"])
    assert common_outcome(model) == ()


def test_a_number_exposure_has_one_row(birthwt: pd.DataFrame, fitting: Callable[..., Any]) -> None:
    model, found = fitting(birthwt[RECORDS], birthwt["low"], "lwt + smoke", ["lwt"])
    (row,) = levels(model, found).rows
    assert row[:3] == (found[1].label if found[1].term == "lwt" else found[2].label, 189, 59)
    model, found = fitting(birthwt[RECORDS], birthwt["low"], "rcs(lwt, 3) + smoke", ["lwt"])
    (row,) = levels(model, found).rows
    assert row[4:] == (None, None, None, None)


def test_an_interaction_leaves_its_odds_ratios_empty(birthwt: pd.DataFrame, fitting: Callable[..., Any]) -> None:
    model, found = fitting(birthwt[RECORDS], birthwt["low"], "smoke * age", ["smoke"])
    assert [row[4:] for row in levels(model, found).rows] == [(None, None, None, None)] * 2


def test_bands_and_numbers_as_levels(birthwt: pd.DataFrame, fitting: Callable[..., Any]) -> None:
    model, found = fitting(birthwt[RECORDS], birthwt["low"], "cut(age, [20, 30]) + lwt", ["age"])
    rows = levels(model, found).rows
    wanted = birthwt["low"].groupby(pd.cut(birthwt["age"], [0, 20, 30, 99], right=False), observed=False)  # pandas
    assert [row[1] for row in rows] == wanted.size().tolist()
    assert [row[2] for row in rows] == wanted.sum().tolist()
    assert rows[0][4] == "1 (reference)"

    frame = birthwt[["lwt"]].assign(smoke=(birthwt["smoke"] == "yes").astype(float))
    model, found = fitting(frame, birthwt["low"], "C(smoke) + lwt", ["smoke"])
    assert [row[:3] for row in levels(model, found).rows] == [("smoke: 0", 115, 29), ("smoke: 1", 74, 30)]
