"""Derived columns counted beside their sources: expected counts by hand and by pandas."""

from __future__ import annotations

import numpy as np
import pandas as pd

from oddsmodel.measures.derived_counts import derived_counts
from oddsmodel.plan.read import plan_from_values
from oddsmodel.records.load import records_from_frame
from oddsmodel.results.tables import Cell, Table


def tables_of(frame: pd.DataFrame, rule: dict[str, object], counts: list[float] | None = None) -> tuple[Table, ...]:
    values = {
        "study": {"title": "t", "design": "cohort"},
        "records": {"source": "data frame", "not_recorded": ["", "9"]},
        "outcome": {"column": "died", "event": "yes"},
        "derived": {"made": {"label": "Made", **rule}},
        "models": [{"name": "main", "formula": "made", "exposures": ["made"]}],
    }
    frame = frame.assign(died=np.where(np.arange(len(frame)) % 2 == 0, "yes", "no"))
    records = records_from_frame(frame, plan_from_values(values).plan)
    weights = None if counts is None else np.asarray(counts)
    return derived_counts(records.derived[0], records.frame, records.columns, weights)


def rows_of(frame: pd.DataFrame, rule: dict[str, object], counts: list[float] | None = None) -> list[tuple[Cell, ...]]:
    (table,) = tables_of(frame, rule, counts)
    return list(table.rows)


def test_bands_with_the_range_of_their_source() -> None:
    frame = pd.DataFrame({"bmi": [18.4, 18.5, 24.99, 25.0, 30.0, np.nan, 41.0]})
    assert rows_of(frame, {"bands_of": "bmi", "edges": [18.5, 25, 30, 50]}) == [
        ("Made: under 18.5", 1, 18.4, 18.4),
        ("Made: 18.5 to under 25", 2, 18.5, 24.99),
        ("Made: 25 to under 30", 1, 25.0, 25.0),
        ("Made: 30 to under 50", 2, 30.0, 41.0),
        ("Made: 50 or over", 0, None, None),
        ("Made: not recorded", 1, None, None),
    ]


def test_years_with_the_calendar_years_of_their_dates() -> None:
    frame = pd.DataFrame({"born": ["29/02/1960", "01/03/1950", None], "admitted": ["2024-02-29"] * 3})
    rows = rows_of(frame, {"years_between": ["born", "admitted"]}, counts=[2.0, 1.0, 4.0])
    assert rows[0][:2] == ("Made: recorded", 3)
    assert rows[0][2] == 64.0
    assert rows[1:] == [
        ("Made: not recorded", 4, None, None, None, None),
        ("born: recorded", 3, None, None, 1950.0, 1960.0),
        ("born: not recorded", 4, None, None, None, None),
        ("admitted: recorded", 7, None, None, 2024.0, 2024.0),
    ]


def test_points_with_their_parts() -> None:
    frame = pd.DataFrame({"diabetes": ["yes", "no", "yes", "9"], "cancer": [1, 0, 1, 1]})
    rule = {"points": {"diabetes": 1, "cancer": 2.5}, "if_part_missing": "zero"}
    assert rows_of(frame, rule) == [("Made: 0", 1, 0, 0), ("Made: 2.5", 1, 0, 1), ("Made: 3.5", 2, 2, 2)]


def test_a_score_of_many_parts_and_values_stays_readable() -> None:
    rng = np.random.default_rng(3)
    frame = pd.DataFrame({f"part{k}": rng.integers(0, 2, 400) for k in range(8)})
    rule = {"points": {f"part{k}": 2**k for k in range(8)}}
    first, second = tables_of(frame, rule)
    assert first.id != second.id
    assert first.rows == (("Made: recorded", 400, *[int(frame[f"part{k}"].sum()) for k in range(6)]),)
    assert second.rows == (("Made: recorded", 400, int(frame.part6.sum()), int(frame.part7.sum())),)
    assert first.columns[2].part_of == "records"


def test_groups_by_level_of_their_source() -> None:
    frame = pd.DataFrame({"ward": ["1", "2 ", "3", "9", "1", "7"]})
    rule = {
        "groups_of": "ward",
        "groups": {"surgical": [1, 2], "medical": ["3"]},
        "other_levels": "exclude and count",
    }
    (table,) = tables_of(frame, rule)
    assert table.rows == (
        ("Made: surgical", "1", 2),
        ("Made: surgical", "2", 1),
        ("Made: medical", "3", 1),
        ("Made: in no group", "other levels", 1),
        ("Made: in no group", "not recorded", 1),
    )
    assert table.blocks == (0, 0, 1, -1, -1)
