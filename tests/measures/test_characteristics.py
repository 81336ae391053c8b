"""Who they were: against pandas and numpy on expanded records."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Any

import numpy as np
import pandas as pd
import pytest
from scipy.stats import skew
from statsmodels.stats.weightstats import DescrStatsW

from oddsmodel.measures.characteristics import characteristics, quartiles, study_characteristics
from oddsmodel.measures.groups import Groups, groups_of_study
from oddsmodel.model.kept import KeptRecords
from oddsmodel.records.types import Column
from oddsmodel.results.tables import Table


def rows_of(table: Table) -> dict[str, dict[str, Any]]:
    keys = [column.key for column in table.columns]
    return {str(row[0]): dict(zip(keys, row, strict=True)) for row in table.rows}


def smoking(frame: pd.DataFrame) -> Groups:
    column = Column("smoke", "yes-no", "Smoking", levels=("no", "yes"), reference="no")
    return groups_of_study("cohort", column, frame, np.zeros(len(frame), dtype=bool))


def test_numbers_and_levels(birthwt: pd.DataFrame, describing: Callable[..., Any]) -> None:
    columns = describing(birthwt[["smoke", "race", "age", "lwt"]], age={"label": "Age", "units": "years"})
    table = characteristics(birthwt, columns, ["smoke", "race", "age", "lwt"], smoking(birthwt))
    rows = rows_of(table)
    no, yes = (birthwt[birthwt["smoke"] == level] for level in ("no", "yes"))
    assert rows["Records analysed"]["group_1_records"] == len(no)
    assert not any(label.startswith("smoke") for label in rows)

    # pandas: mean and standard deviation of the raw columns; Austin 2009 written out.
    age = rows["Age, years: mean (standard deviation)"]
    assert age["group_2"] == f"{yes['age'].mean():.2f} ({yes['age'].std():.2f})"
    assert age["group_2_records"] == 74
    spread = math.sqrt((no["age"].var() + yes["age"].var()) / 2)
    assert age["difference"] == pytest.approx(abs(no["age"].mean() - yes["age"].mean()) / spread)

    # lwt is skewed above 1 (scipy), so it is told by its median and quartiles (numpy).
    assert skew(birthwt["lwt"]) > 1
    lower, middle, upper = np.quantile(no["lwt"], [0.25, 0.5, 0.75])
    assert rows["lwt: median (quartiles)"]["group_1"] == f"{middle:.1f} ({lower:.1f} to {upper:.1f})"

    shares = [part["race"].value_counts(normalize=True, sort=False).to_numpy() for part in (no, yes)]
    black = rows["race: black"]
    assert black["group_2_records"] == int((yes["race"] == "black").sum())
    assert black["group_2"] == f"{100 * shares[1][1]:.1f}%"
    spread = sum(np.diag(p) - np.outer(p, p) for p in shares) / 2
    wanted = math.sqrt((shares[0] - shares[1]) @ np.linalg.pinv(spread) @ (shares[0] - shares[1]))
    assert rows["race: white"]["difference"] == pytest.approx(wanted)
    assert black["difference"] is None


def test_true_frequencies(birthwt: pd.DataFrame, describing: Callable[..., Any]) -> None:
    counts = np.random.default_rng(2).integers(1, 5, size=len(birthwt)).astype(float)
    columns = describing(birthwt)
    names = ["race", "age", "lwt"]
    grouped = characteristics(birthwt, columns, names, smoking(birthwt), counts=counts)
    longer = birthwt.loc[birthwt.index.repeat(counts.astype(int))].reset_index(drop=True)
    single = characteristics(longer, columns, names, smoking(longer))
    for one, other in zip(grouped.rows, single.rows, strict=True):
        assert one[:-1] == other[:-1]
        assert one[-1] == pytest.approx(other[-1]) if one[-1] is not None else other[-1] is None
    described = DescrStatsW(birthwt["age"], weights=counts, ddof=1)  # statsmodels
    assert quartiles(birthwt["age"].to_numpy(), counts) == pytest.approx(np.quantile(longer["age"], [0.25, 0.5, 0.75]))
    assert described.std == pytest.approx(longer["age"].std())


def test_not_recorded_and_analysed(birthwt: pd.DataFrame, describing: Callable[..., Any]) -> None:
    frame = birthwt.copy()
    frame.loc[frame.index[:20], "age"] = np.nan
    frame.loc[frame.index[15:27], "race"] = np.nan
    analysed = frame.notna().all(axis=1).to_numpy()
    table = characteristics(frame, describing(frame), ["race", "age"], smoking(frame), analysed=analysed)
    rows = rows_of(table)
    missing = frame[frame["age"].isna()].groupby("smoke", observed=False).size()
    total = frame.groupby("smoke", observed=False).size()
    assert rows["age: not recorded"]["group_1_records"] == missing["no"]
    assert rows["age: not recorded"]["group_1"] == f"{100 * missing['no'] / total['no']:.1f}%"
    complete = frame[analysed & (frame["smoke"] == "yes").to_numpy()]
    assert rows["Records analysed"]["group_2_records"] == len(complete)
    assert rows["race: other"]["group_2_records"] == int((complete["race"] == "other").sum())
    # The levels of a block add up to the records analysed, which are printed; "not recorded" is a block of its own.
    blocks = {str(row[0]): block for row, block in zip(table.rows, table.blocks, strict=True)}
    assert blocks["race: white"] == blocks["race: other"] != blocks["race: not recorded"]
    columns = {column.key: column for column in table.columns}
    assert columns["group_1_records"].sums_known
    assert columns["group_1"].hidden_with == ("group_1_records",)
    assert columns["difference"].hidden_with_block


def test_more_than_two_groups_give_the_largest_difference(
    birthwt: pd.DataFrame, describing: Callable[..., Any]
) -> None:
    column = Column("race", "category", "Race", levels=("white", "black", "other"))
    groups = groups_of_study("cohort", column, birthwt, np.zeros(189, dtype=bool))
    table = characteristics(birthwt, describing(birthwt), ["age"], groups)
    parts = [birthwt.loc[birthwt["race"] == level, "age"] for level in column.levels]
    wanted = max(
        abs(one.mean() - other.mean()) / math.sqrt((one.var() + other.var()) / 2)
        for one in parts
        for other in parts
        if one is not other
    )
    assert table.rows[-1][-1] == pytest.approx(wanted)
    assert "largest between any two" in table.note


def test_case_control_by_case_status(birthwt: pd.DataFrame, describing: Callable[..., Any]) -> None:
    kept = KeptRecords(birthwt, birthwt["low"].to_numpy())
    everybody = np.ones(189, dtype=bool)
    table = study_characteristics("case-control", kept, describing(birthwt), ["smoke"], ["age"], everybody)
    rows = rows_of(table)
    assert rows["Records analysed"]["group_1_records"] == 59
    assert rows["smoke: yes"]["group_1_records"] == 30
    assert table.columns[1].heading == "Cases, records"


def test_thirds_of_a_number() -> None:
    values = np.arange(1.0, 10.0)
    column = Column("dose", "number", "Dose", units="mg")
    groups = groups_of_study("cohort", column, pd.DataFrame({"dose": values}), np.zeros(9, dtype=bool))
    assert groups.labels == ("up to 3 mg", "above 3, up to 6 mg", "above 6 mg")
    assert groups.codes.tolist() == [0, 0, 0, 1, 1, 1, 2, 2, 2]
    # With true frequencies, half of the records at the least value: two groups.
    counts = np.array([9.0, *[1.0] * 8])
    groups = groups_of_study("cohort", column, pd.DataFrame({"dose": values}), np.zeros(9, dtype=bool), counts)
    assert groups.labels == ("up to 1 mg", "above 1, up to 4 mg", "above 4 mg")
    constant = groups_of_study("cohort", column, pd.DataFrame({"dose": np.ones(4)}), np.zeros(4, dtype=bool))
    assert constant.labels == ("Dose",)
    missing = groups_of_study("cohort", column, pd.DataFrame({"dose": [np.nan, 1.0, 2.0]}), np.zeros(3, dtype=bool))
    assert missing.codes.tolist() == [-1, 0, 1]


def test_empty_groups_and_columns_without_spread(describing: Callable[..., Any]) -> None:
    frame = pd.DataFrame(
        {
            "smoke": pd.Categorical(["yes"] * 3, categories=["no", "yes"]),
            "age": [40.0, 40.0, 40.0],
            "ward": pd.Categorical(["a", "a", "b"]),
        }
    )
    table = characteristics(frame, describing(frame), ["age", "ward"], smoking(frame))
    rows = rows_of(table)
    assert rows["age: mean (standard deviation)"]["group_1"] is None
    assert rows["age: mean (standard deviation)"]["group_1_records"] == 0
    assert rows["age: mean (standard deviation)"]["group_2"] == "40.0 (0.0)"
    assert rows["ward: a"]["difference"] is None
    assert "No standardised difference for age and ward" in table.note
