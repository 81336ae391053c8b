"""Renamed, plausible and derived columns against pandas, numpy and Python's calendar."""

from __future__ import annotations

import datetime
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from oddsmodel.errors import InputFault
from oddsmodel.plan.read import plan_from_values
from oddsmodel.progress import Silent
from oddsmodel.records.derived.quantile_groups import cut_points
from oddsmodel.records.load import load_records, records_from_frame
from oddsmodel.records.types import Records


def coded(
    frame: pd.DataFrame,
    derived: dict[str, object],
    *,
    columns: dict[str, object] | None = None,
    records: dict[str, object] | None = None,
    formula: str | None = None,
) -> Records:
    frame = frame.assign(died=np.where(np.arange(len(frame)) % 2 == 0, "yes", "no"))
    name = formula or next(iter(derived), None) or "x"
    values = {
        "study": {"title": "t", "design": "cohort"},
        "records": {"source": "data frame", "not_recorded": ["", "9"], **(records or {})},
        "outcome": {"column": "died", "event": "yes"},
        "columns": columns or {},
        "derived": derived,
        "models": [{"name": "main", "formula": name, "exposures": [name]}],
    }
    return records_from_frame(frame, plan_from_values(values).plan)


def fault_of(frame: pd.DataFrame, derived: dict[str, object], **more: dict[str, object]) -> str:
    with pytest.raises(InputFault) as caught:
        coded(frame, derived, **more)  # type: ignore[arg-type]
    return str(caught.value)


def codes_of(records: Records) -> dict[str, str]:
    return {one.code: one.message for one in records.findings}


# Bands.


def test_a_band_holds_its_lower_edge() -> None:
    frame = pd.DataFrame({"bmi": [18.4, 18.5, 24.99, 25.0, 30.0, np.nan, 41.0]})
    records = coded(frame, {"band": {"bands_of": "bmi", "edges": [18.5, 25, 30], "label": "BMI band"}})
    levels = ["under 18.5", "18.5 to under 25", "25 to under 30", "30 or over"]
    assert list(records.frame.band.astype(object)[:5]) == [levels[0], levels[1], levels[1], levels[2], levels[3]]
    assert records.frame.band.isna().tolist() == [False] * 5 + [True, False]
    column = records.columns["band"]
    assert (column.kind, column.levels, column.reference, column.label) == (
        "ordered",
        tuple(levels),
        "under 18.5",
        "BMI band",
    )


@settings(deadline=None, derandomize=True, max_examples=50)
@given(
    st.lists(st.floats(-50, 50) | st.sampled_from([0.0, 10.0, 20.0]), min_size=2, max_size=40),
    st.lists(st.integers(-40, 40), min_size=1, max_size=5, unique=True),
)
def test_bands_are_those_of_pandas(values: list[float], edges: list[int]) -> None:
    edges = sorted(edges)
    records = coded(pd.DataFrame({"x": values}), {"band": {"bands_of": "x", "edges": edges}})
    wanted = pd.cut(pd.Series(values), [-np.inf, *edges, np.inf], right=False, labels=False)
    assert records.frame.band.cat.codes.tolist() == wanted.tolist()


def test_bands_of_a_category_are_refused() -> None:
    told = fault_of(pd.DataFrame({"ward": ["a", "b"] * 4}), {"band": {"bands_of": "ward", "edges": [1]}})
    assert "[derived.band]" in told
    assert "“ward” is of the kind category" in told


def test_a_reference_that_no_record_has() -> None:
    derived = {"band": {"bands_of": "x", "edges": [10, 20], "reference": "20 or over"}}
    assert "No record has the reference" in fault_of(pd.DataFrame({"x": [1.0, 12.0]}), derived)


def test_a_band_without_records_is_told() -> None:
    records = coded(pd.DataFrame({"x": [1.0, 2.0, 25.0]}), {"band": {"bands_of": "x", "edges": [10, 20]}})
    assert "“10 to under 20”" in codes_of(records)["level-absent"]


# Years.


def test_years_are_days_by_365_25() -> None:
    frame = pd.DataFrame({"born": ["29/02/1960", "01/03/1960", None], "admitted": ["2024-02-29"] * 3})
    records = coded(frame, {"age": {"years_between": ["born", "admitted"], "units": "years", "per": 10}})
    wanted = (datetime.date(2024, 2, 29) - datetime.date(1960, 2, 29)).days / 365.25
    assert wanted == 64.0
    assert records.frame.age.tolist()[:2] == [64.0, 64.0 - 1 / 365.25]
    assert np.isnan(records.frame.age[2])
    assert (records.columns["age"].kind, records.columns["age"].per, records.columns["age"].units) == (
        "number",
        10.0,
        "years",
    )


def test_an_ambiguous_order_names_the_column_and_what_to_do() -> None:
    frame = pd.DataFrame({"born": ["03/04/1960", "05/06/1961"], "admitted": ["2024-01-31"] * 2})
    told = fault_of(frame, {"age": {"years_between": ["born", "admitted"]}})
    assert "data frame, column “born”" in told
    assert "whether day or month comes first" in told
    assert "Write the dates as year-month-day" in told


def test_years_between_numbers_are_refused() -> None:
    frame = pd.DataFrame({"born": [1960.0, 1970.5], "admitted": ["2024-01-31"] * 2})
    assert "dates" in fault_of(
        frame, {"age": {"years_between": ["born", "admitted"]}}, columns={"born": {"kind": "number"}}
    )


def test_negative_years_are_a_caution_and_can_be_set_aside() -> None:
    frame = pd.DataFrame({"born": ["2025-01-31", "1990-01-31"], "admitted": ["2024-01-31"] * 2})
    rule = {"years_between": ["born", "admitted"]}
    assert "1 record" in codes_of(coded(frame, {"age": rule}))["years-negative"]
    records = coded(frame, {"age": {**rule, "plausible": [0, 110]}})
    assert "years-negative" not in codes_of(records)
    assert "in 1 record" in codes_of(records)["implausible-values"]
    assert records.frame.age.isna().tolist() == [True, False]


# Points.


def test_points_are_summed_and_parts_not_recorded() -> None:
    frame = pd.DataFrame({"diabetes": ["yes", "no", "yes", "9"], "cancer": [1, 0, 1, 1]})
    rule = {"points": {"diabetes": 1, "cancer": 2.5}}
    found = coded(frame, {"score": rule}).frame.score
    assert found.tolist()[:3] == [3.5, 0.0, 3.5]
    assert np.isnan(found[3])
    zero = coded(frame, {"score": {**rule, "if_part_missing": "zero"}})
    assert zero.frame.score.tolist() == [3.5, 0.0, 3.5, 2.5]


def test_a_part_with_other_values_is_refused() -> None:
    frame = pd.DataFrame({"diabetes": ["yes", "no", "maybe", "no"], "cancer": [1, 0, 2, 3]})
    told = fault_of(frame, {"score": {"points": {"diabetes": 1, "cancer": 2}}})
    assert "column “diabetes”: “score” counts points where “diabetes” is yes, but it also holds “maybe”" in told
    assert "“2” and “3”" in told


def test_points_of_groups_named_yes_and_no() -> None:
    derived = {
        "old": {"groups_of": "band", "groups": {"yes": ["80 or over"], "no": ["under 80"]}},
        "band": {"bands_of": "age", "edges": [80]},
        "score": {"points": {"old": 3}},
    }
    records = coded(pd.DataFrame({"age": [79.0, 80.0, 95.0]}), derived, formula="score")
    assert records.frame.score.tolist() == [0.0, 3.0, 3.0]


# Groups.


def test_groups_of_levels_in_any_spelling_of_numbers() -> None:
    frame = pd.DataFrame({"ward": ["1", "2 ", "3", "9", "1"]})
    derived = {"side": {"groups_of": "ward", "groups": {"surgical": [1, 2], "medical": ["3"]}, "reference": "medical"}}
    records = coded(frame, derived)
    assert records.frame.side.astype(object).tolist()[:3] == ["surgical", "surgical", "medical"]
    assert records.frame.side.isna().tolist() == [False, False, False, True, False]
    assert (records.columns["side"].kind, records.columns["side"].reference) == ("category", "medical")


def test_a_level_without_a_group_stops_or_is_counted() -> None:
    frame = pd.DataFrame({"ward": ["S1", "M1", "S1x", "S1x", "Q"]})
    rule = {"groups_of": "ward", "groups": {"surgical": ["S1"], "medical": ["M1"]}}
    told = fault_of(frame, {"side": rule})
    assert "[derived.side] groups: No group has “S1x” (2 records) and “Q” (1 record) of “ward”" in told
    assert "“S1x” may be meant for “S1”" in told
    records = coded(frame, {"side": {**rule, "other_levels": "exclude and count"}})
    assert records.outside_levels["side"].tolist() == [False, False, True, True, True]


# Quantile groups.


@settings(deadline=None, derandomize=True, max_examples=80)
@given(
    st.lists(st.tuples(st.integers(0, 400), st.integers(1, 6)), min_size=8, max_size=60),
    st.integers(2, 6),
)
def test_cut_points_are_the_quantiles_of_numpy(rows: list[tuple[int, int]], groups: int) -> None:
    values = np.asarray([value / 4 for value, _ in rows])
    weights = np.asarray([float(count) for _, count in rows])
    found = cut_points(values, weights, groups)
    # numpy's default quantile is definition 7 of Hyndman & Fan; frequencies are written out as repeated values.
    wanted = np.quantile(np.repeat(values, weights.astype(int)), np.arange(1, groups) / groups)
    spread = np.subtract(*np.quantile(np.repeat(values, weights.astype(int)), [0.95, 0.05]))
    near = np.unique([np.abs(np.asarray(found) - one).argmin() for one in wanted if found])
    for one in wanted:
        if one > values.min() + spread / 1000:
            assert np.abs(np.asarray(found) - one).min() <= spread / 1000 + 1e-12
    assert len(near) >= len(found) - 1
    assert list(found) == sorted(set(found))


def test_quantile_groups_rest_on_the_records_kept_and_on_counts() -> None:
    frame = pd.DataFrame({"age": [10.0, 20.0, 30.0, 40.0, 50.0, 9.0], "n": [1, 3, 1, 2, 1, 50]})
    derived = {"half": {"quantile_groups_of": "age", "groups": 2}}
    records = coded(frame, derived, records={"count": "n", "keep": "age >= 18"})
    # The kept records are 20, 20, 20, 30, 40, 40, 50 with the median 30; the 50 records of age 9 are not recorded.
    assert records.derived[0].cut_points == (30.0,)
    assert records.columns["half"].levels == ("under 30", "30 or over")
    assert "cut at 30 to make “half”" in codes_of(records)["quantile-cuts"]


def test_ties_make_fewer_groups_and_say_so() -> None:
    frame = pd.DataFrame({"x": [0.0] * 60 + [float(value) for value in range(101, 141)]})
    records = coded(frame, {"quarter": {"quantile_groups_of": "x", "groups": 4}})
    assert records.derived[0].cut_points == (115.2,)
    assert "2 groups and not the 4 asked for" in codes_of(records)["quantile-fewer-groups"]
    told = fault_of(pd.DataFrame({"x": [1.0] * 9}), {"half": {"quantile_groups_of": "x", "groups": 2}})
    assert "too few different values" in told


def test_keep_by_its_own_quantile_groups_is_a_circle() -> None:
    derived = {"half": {"quantile_groups_of": "x", "groups": 2}}
    frame = pd.DataFrame({"x": [1.0, 2.0, 3.0, 4.0]})
    told = fault_of(frame, derived, records={"keep": 'half == "under 2.5"'})
    assert "made from itself, by way of other derived columns or of keep" in told
    assert told.count("\n") == 0


def test_a_condition_at_fault_is_told_once() -> None:
    derived = {"half": {"quantile_groups_of": "x", "groups": 2}}
    told = fault_of(pd.DataFrame({"x": [1.0, 2.0, 3.0, 4.0]}), derived, records={"keep": "y > 1"})
    assert told.count("\n") == 0
    assert "[records] keep, character 1: The records have no column “y”" in told


def test_keep_by_another_derived_column() -> None:
    frame = pd.DataFrame({"x": [1.0, 2.0, 3.0, 4.0, 5.0, 6.0]})
    derived = {
        "half": {"quantile_groups_of": "x", "groups": 2},
        "band": {"bands_of": "x", "edges": [3]},
    }
    records = coded(frame, derived, records={"keep": 'band == "3 or over"'})
    assert records.derived[0].cut_points == (4.5,)


# Names, ranges, and what is at fault together.


def test_renamed_columns_are_told_and_messages_name_the_file(tmp_path: Path) -> None:
    path = tmp_path / "records.csv"
    path.write_text("died,Parity (n),Ward\n" + "yes,1,01\nno,99,02\nyes,three,01\nno,2,02\n" * 9, encoding="utf-8")
    values = {
        "study": {"title": "t", "design": "cohort"},
        "records": {"source": "records.csv"},
        "outcome": {"column": "died", "event": "yes"},
        "columns": {
            "parity": {"from": "Parity (n)", "kind": "number", "plausible": [0, 20], "not_recorded": ["three"]},
            "ward": {"from": "Ward", "kind": "category"},
        },
        "models": [{"name": "main", "formula": "parity + ward", "exposures": ["parity"]}],
    }
    records = load_records(path, plan_from_values(values).plan, Silent())
    assert records.frame.parity.tolist()[0] == 1.0
    assert records.columns["ward"].levels == ("01", "02")
    assert "“Parity (n)” in the file is “parity”" in codes_of(records)["columns-renamed"]
    assert "in 9 records" in codes_of(records)["implausible-values"]
    assert "suspected-codes" not in codes_of(records)
    values["columns"]["parity"]["not_recorded"] = [""]  # type: ignore[index]
    with pytest.raises(InputFault) as caught:
        load_records(path, plan_from_values(values).plan, Silent())
    assert "records.csv, column “Parity (n)”" in str(caught.value)
    values["columns"]["parity"]["from"] = "parity (n)"  # type: ignore[index]
    with pytest.raises(InputFault) as caught:
        load_records(path, plan_from_values(values).plan, Silent())
    assert "[columns.parity] from: The records have no column “parity (n)”. Did you mean “Parity (n)”?" in str(
        caught.value
    )


def test_names_may_be_exchanged_but_not_taken() -> None:
    frame = pd.DataFrame({"a": [1.0, 2.0, 30.5], "b": [4.0, 5.0, 60.5]})
    records = coded(frame, {}, columns={"a": {"from": "b"}, "b": {"from": "a"}}, formula="a")
    assert records.frame.a.tolist() == [4.0, 5.0, 60.5]
    told = fault_of(frame, {}, columns={"a": {"from": "b"}}, formula="a")  # type: ignore[arg-type]
    assert "The file has a column “a” besides “b”" in told


def test_a_derived_name_that_the_file_has() -> None:
    told = fault_of(pd.DataFrame({"x": [1.0, 2.0]}), {"x": {"bands_of": "y", "edges": [1]}})
    assert "The file has a column “x” of its own" in told
    assert "no column “y”" in told


def test_a_source_at_fault_is_told_once() -> None:
    frame = pd.DataFrame({"x": ["1", "2", "about 3", *map(str, range(4, 30))]})
    derived = {
        "band": {"bands_of": "x", "edges": [2]},
        "side": {"groups_of": "band", "groups": {"a": ["1"], "b": ["2"]}},
    }
    told = fault_of(frame, derived, records={"keep": 'band == "2 or over" and side == "a"'})
    assert told.count("\n") == 0
    assert "about 3" in told


def test_references_of_sources_alone_are_not_told() -> None:
    frame = pd.DataFrame({"ward": ["S1", "M1", "S1", "M1"]})
    derived = {"side": {"groups_of": "ward", "groups": {"surgical": ["S1"], "medical": ["M1"]}}}
    assert codes_of(coded(frame, derived))["references-taken"].endswith(
        "with the first one: “side” against “surgical”."
    )


def test_a_million_records_take_seconds() -> None:
    n = 1_000_000
    rng = np.random.default_rng(1)
    days = pd.Series(rng.integers(-9000, 9000, n)).map(lambda day: day)
    born = (np.datetime64("1970-01-01") + days.to_numpy().astype("timedelta64[D]")).astype(str)
    frame = pd.DataFrame({"born": pd.Categorical(born), "admitted": "2024-01-31", "x": rng.normal(size=n)})
    derived = {
        "age": {"years_between": ["born", "admitted"]},
        "band": {"bands_of": "age", "edges": [40, 60]},
        "fifth": {"quantile_groups_of": "x", "groups": 5},
    }
    records = coded(frame, derived)
    assert np.allclose(records.frame.fifth.value_counts(normalize=True), 0.2, atol=0.001)
