"""results.json against its schema (jsonschema's validator), the fourth contract's keys, and what must not be there."""

from __future__ import annotations

import copy
import json
import math
import sys
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from jsonschema import Draft202012Validator

from oddsmodel.disclosure import disclose
from oddsmodel.export.results_json import results_document, results_schema, results_text
from oddsmodel.results.study import CheckResult, DisclosedResults, ProfileResult, WaldResult

sys.path.insert(0, str(Path(__file__).parent.parent / "disclosure"))
from joint_records import joint_table
from sample_study import sample_study

MODEL_KEYS = (
    *("id", "name", "formula", "method", "added_by_program", "variant", "records", "events", "patterns"),
    *("parameters", "log_likelihood", "null_log_likelihood", "coefficients", "terms", "checks", "certificate"),
    *("findings", "reasons"),
)
COEFFICIENT_KEYS = (
    *("term", "level", "reference", "role", "log_odds_ratio", "standard_error", "odds_ratio", "wald", "profile"),
    *("crude", "crude_all_records", "reasons"),
)
VALIDATOR = Draft202012Validator(results_schema())


@pytest.fixture(params=["shareable", "internal"])
def disclosed(request: pytest.FixtureRequest) -> DisclosedResults:
    return disclose(sample_study(joint_table(3)).study, audience=request.param, hide_counts_below=5)


def test_the_schema_is_one_and_every_document_follows_it(disclosed: DisclosedResults) -> None:
    Draft202012Validator.check_schema(results_schema())
    VALIDATOR.validate(json.loads(results_text(disclosed)))


def test_the_keys_of_the_contract_are_there_in_order(disclosed: DisclosedResults) -> None:
    document = json.loads(results_text(disclosed))
    model = document["models"][0]
    assert [key for key in model if key in MODEL_KEYS] == list(MODEL_KEYS)
    coefficient = model["coefficients"][1]
    assert [key for key in coefficient if key in COEFFICIENT_KEYS] == list(COEFFICIENT_KEYS)
    assert list(coefficient["wald"]) == ["lower", "upper", "p", "df"]
    assert list(coefficient["crude"]) == ["records", "odds_ratio", "wald", "profile"]
    assert list(coefficient["crude_all_records"]) == ["records", "odds_ratio"]
    assert (model["coefficients"][0]["term"], model["coefficients"][0]["role"]) == ("Intercept", "intercept")
    assert model["checks"]["hosmer_lemeshow"]["df"] == 7
    assert document["disclosure"]["audience"] == disclosed.audience


def numbers_without(document: Any, place: str = "") -> Iterator[tuple[str, str, dict[str, str]]]:
    """Each number that is null, by the object with `reasons` that it stands in and its key there."""
    if isinstance(document, list):
        for one in document:
            yield from numbers_without(one, place)
    if isinstance(document, dict):
        reasons = document.get("reasons")
        for key, value in document.items():
            if reasons is not None and value is None:
                yield place, key, reasons
            if reasons is not None and isinstance(value, dict) and "reasons" not in value:
                yield from ((place, f"{key}.{part}", reasons) for part, one in value.items() if one is None)
            yield from numbers_without(value, f"{place}/{key}")


def test_every_missing_number_has_its_reason(disclosed: DisclosedResults) -> None:
    no_numbers = {"level", "reference", "levels", "wald.df", "crude", "crude_all_records", "based_on", "planned"}
    missing = list(numbers_without(json.loads(results_text(disclosed))))
    for place, key, reasons in missing:
        if key not in no_numbers and "columns" not in place:
            assert key in reasons or key.split(".")[0] in reasons, (place, key)
    assert disclosed.audience == "internal" or any(key == "crude.odds_ratio" for _, key, _ in missing)


def test_text_is_plain_json_that_ends_with_a_line(disclosed: DisclosedResults) -> None:
    study = replace(disclosed.study, title="Größe – <b>µ</b>")
    text = results_text(replace(disclosed, study=study))
    assert "Größe – <b>µ</b>" in text
    assert text.endswith("}\n")
    assert text == results_text(replace(disclosed, study=study))

    def refuse(name: str) -> None:
        raise AssertionError(name)

    json.loads(text, parse_constant=refuse)


@pytest.mark.parametrize("value", [math.nan, math.inf])
def test_a_number_that_is_not_finite_is_never_written(disclosed: DisclosedResults, value: float) -> None:
    model = replace(disclosed.study.models[0], log_likelihood=value)
    with pytest.raises(ValueError, match="JSON"):
        results_text(replace(disclosed, study=replace(disclosed.study, models=(model,))))


def test_numbers_are_written_to_the_last_digit() -> None:
    """Python's shortest form that reads back as the same number."""
    study = sample_study(joint_table(3)).study
    model = replace(study.models[0], log_likelihood=-math.pi * 100)
    document = json.loads(results_text(DisclosedResults(replace(study, models=(model,)), 5, "internal", 0)))
    assert document["models"][0]["log_likelihood"] == -math.pi * 100


def test_numbers_of_arrays_become_plain_ones() -> None:
    study = sample_study(joint_table(3)).study
    check = CheckResult("invented", "fit", "", "fine", "", {"number": np.float64(1.5), "records": np.int64(40)})  # type: ignore[dict-item]
    document = results_document(
        DisclosedResults(replace(study, models=(replace(study.models[0], checks=(check,)),)), 5, "internal", 0)
    )
    found = document["models"][0]["checks"]["invented"]
    assert found == {"number": 1.5, "records": 40, "verdict": "fine", "reasons": {}}
    assert (type(found["number"]), type(found["records"])) == (float, int)


def test_a_column_of_a_spline_shows_no_odds_ratio_of_its_own() -> None:
    study = sample_study(joint_table(3)).study
    one = replace(study.models[0].coefficients[1], shown=False, crude=None)
    model = replace(study.models[0], coefficients=(one,))
    document = results_document(DisclosedResults(replace(study, models=(model,)), 5, "internal", 0))
    (found,) = document["models"][0]["coefficients"]
    assert found["log_odds_ratio"] == one.log_odds_ratio
    assert found["odds_ratio"] is found["wald"]["lower"] is found["wald"]["upper"] is None
    assert found["profile"] == {"lower": None, "upper": None}
    assert found["wald"]["p"] == one.wald.p
    assert {"odds_ratio", "wald.lower", "wald.upper", "profile"} <= found["reasons"].keys()


def test_an_interaction_lists_its_columns_and_levels() -> None:
    study = sample_study(joint_table(3)).study
    one = replace(study.models[0].coefficients[1], level=None, levels={"smoking": "current", "age": None})
    model = replace(study.models[0], coefficients=(one,))
    text = results_text(DisclosedResults(replace(study, models=(model,)), 5, "internal", 0))
    assert json.loads(text)["models"][0]["coefficients"][0]["levels"] == {"smoking": "current", "age": None}
    VALIDATOR.validate(json.loads(text))


def test_a_model_that_could_not_be_estimated_follows_the_schema() -> None:
    study = sample_study(joint_table(3)).study
    nothing = replace(
        study.models[0].coefficients[1],
        log_odds_ratio=None,
        standard_error=None,
        odds_ratio=None,
        wald=WaldResult(None, None, None),
        profile=ProfileResult(None, None),
        crude=None,
        crude_all_records=None,
        reasons={},
    )
    model = replace(
        study.models[0],
        status="no finite maximum",
        log_likelihood=None,
        null_log_likelihood=None,
        coefficients=(nothing,),
        terms=(),
        checks=(),
    )
    document = json.loads(results_text(DisclosedResults(replace(study, models=(model,)), 5, "internal", 0)))
    VALIDATOR.validate(document)
    reasons = document["models"][0]["coefficients"][0]["reasons"]
    assert {"log_odds_ratio", "wald.p", "profile.lower"} <= reasons.keys()
    assert {"log_likelihood", "null_log_likelihood"} <= document["models"][0]["reasons"].keys()


def test_the_schema_is_strict_about_what_it_knows_and_lets_keys_be_added(disclosed: DisclosedResults) -> None:
    document = results_document(disclosed)
    added = copy.deepcopy(document)
    added["new"] = added["models"][0]["new"] = added["models"][0]["coefficients"][0]["new"] = {"a": 1}
    VALIDATOR.validate(added)

    def broken(change: Any) -> bool:
        other = copy.deepcopy(document)
        change(other)
        return not VALIDATOR.is_valid(other)

    assert broken(lambda d: d.pop("schema_version"))
    assert broken(lambda d: d.update(schema_version="2.0"))
    assert broken(lambda d: d["models"][0].pop("reasons"))
    assert broken(lambda d: d["models"][0].update(records=1.5))
    assert broken(lambda d: d["models"][0].update(records="12"))
    assert broken(lambda d: d["models"][0]["coefficients"][1].pop("crude_all_records"))
    assert broken(lambda d: d["models"][0]["coefficients"][1].update(odds_ratio=0))
    assert broken(lambda d: d["models"][0]["coefficients"][1]["wald"].pop("df"))
    assert broken(lambda d: d["models"][0]["coefficients"][1].update(role="confounder"))
    assert broken(lambda d: d["models"][0]["variant"].pop("missing"))
