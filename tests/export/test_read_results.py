"""results.json read again: anyone may have written it, so every value is vetted and every fault has its place."""

from __future__ import annotations

import copy
import json
import os
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from oddsmodel.errors import InputFault
from oddsmodel.export import read_results as reading
from oddsmodel.export.read_results import read_results

SMALL: dict[str, Any] = {
    "schema_version": "1.0",
    "study": {"title": "T", "question": "", "design": "cohort", "aim": "association", "outcome": "o", "event": "yes"},
    "disclosure": {"audience": "shareable", "hide_counts_below": 5, "hidden_cells": 0},
    "records": {"read": 100, "excluded": [{"reason": "why", "records": 10}], "sha256": "0" * 64},
    "models": [
        {
            "name": "main",
            "formula": "o ~ x",
            "method": "maximum likelihood",
            "added_by_program": False,
            "variant": {"outcome": "o", "missing": "complete records", "covariance": "model"},
            "records": 90,
            "events": 30,
            "coefficients": [
                {
                    "term": "x",
                    "level": "yes",
                    "reference": "no",
                    "levels": None,
                    "role": "exposure",
                    "label": "X: yes against no",
                    "odds_ratio": 2,
                    "wald": {"lower": 1.0, "upper": 4.0, "p": 0.05, "df": None},
                    "profile": {"lower": 1.1, "upper": 4.1},
                    "reasons": {},
                }
            ],
            "findings": [],
        }
    ],
    "findings": [],
    "provenance": {"plan": "plan.toml", "plan_sha256": "1" * 64, "versions": {"numpy": "2"}, "seed": 1},
    "a key of a later minor version": {"deep": [1, None, {}]},
}


def written(folder: Path, content: str | bytes | dict[str, Any]) -> Path:
    path = folder / "results.json"
    if isinstance(content, dict):
        content = json.dumps(content)
    path.write_bytes(content if isinstance(content, bytes) else content.encode("utf-8"))
    return path


def fault_of(path: Path) -> str:
    with pytest.raises(InputFault) as raised:
        read_results(path)
    for fault in raised.value.faults:
        assert fault.what
        assert fault.remedy
        assert "results.json" in fault.where
    return str(raised.value)


@pytest.mark.parametrize("version", ["1.0", "1.1", "1.250"])
def test_every_minor_version_is_read_and_its_new_keys_passed_over(tmp_path: Path, version: str) -> None:
    results = read_results(written(tmp_path, SMALL | {"schema_version": version}))
    assert results.models[0].coefficients[0].odds_ratio == 2.0
    assert results.study.answer == ()
    assert results.plan is None
    assert not results.internal


@pytest.mark.parametrize("version", ["2.0", "0.9", "10.1"])
def test_other_major_versions_are_refused(tmp_path: Path, version: str) -> None:
    assert f"version {version}" in fault_of(written(tmp_path, SMALL | {"schema_version": version}))


@pytest.mark.parametrize(
    ("raw", "told"),
    [
        ("", "line 1"),
        ('{"schema_version": "1.0",\n\n', "line 3"),
        ("[" * 100_000, "deeper"),
        ('{"a":' * 41 + "1" + "}" * 41, "deeper"),
        ('{"schema_version": "1.0", "x": NaN}', "not finite"),
        ('{"schema_version": "1.0", "x": -Infinity}', "not finite"),
        ('{"schema_version": "1.0", "x": 1e999}', "not finite"),
        ('{"schema_version": "1.0", "x": ' + "7" * 5000 + "}", "digits"),
        ('{"schema_version": "1.0", "schema_version": "1.0"}', "twice"),
        (b'{"schema_version": "\xff"}', "UTF-8"),
        ("[]", "no schema_version"),
        ("{}", "no schema_version"),
        ('{"schema_version": 1.0}', "no schema_version"),
        ('{"schema_version": "one"}', "no schema_version"),
        ('{"schema_version": "1.0\\n"}', "no schema_version"),
    ],
)
def test_what_is_not_json_of_ours_is_refused_with_the_reason(tmp_path: Path, raw: str | bytes, told: str) -> None:
    assert told in fault_of(written(tmp_path, raw))


def set_at(*way: str | int, value: Any) -> Callable[[dict[str, Any]], None]:
    def change(document: Any) -> None:
        for part in way[:-1]:
            document = document[part]
        document[way[-1]] = value

    return change


COEFFICIENT = ("models", 0, "coefficients", 0)


@pytest.mark.parametrize(
    ("change", "place"),
    [
        (set_at("study", value=[]), "study"),
        (set_at("study", "title", value=None), "study, title"),
        (set_at("study", "title", value="\ud800"), "study, title"),
        (set_at("study", "title", value="x" * 30_000), "study, title"),
        (set_at("records", "read", value=True), "records, read"),
        (set_at("records", "read", value=-1), "records, read"),
        (set_at("records", "read", value=1.5), "records, read"),
        (set_at("records", "read", value=10**30), "records, read"),
        (set_at("disclosure", "hide_counts_below", value=-5), "disclosure, hide_counts_below"),
        (set_at("disclosure", "audience", value="everyone"), "disclosure, audience"),
        (set_at(*COEFFICIENT, "odds_ratio", value="2"), "models, item 1, coefficients, item 1, odds_ratio"),
        (set_at(*COEFFICIENT, "odds_ratio", value=0), "models, item 1, coefficients, item 1, odds_ratio"),
        (set_at(*COEFFICIENT, "odds_ratio", value=10**400), "models, item 1, coefficients, item 1, odds_ratio"),
        (set_at(*COEFFICIENT, "wald", value={"lower": -1, "upper": 2}), "wald, lower"),
        (set_at(*COEFFICIENT, "role", value="hero"), "role"),
        (set_at("models", 0, "findings", value=[{"severity": "shout"}]), "findings, item 1"),
        (set_at("models", value={}), "models"),
        (set_at("plan", value={"records": 5}), "plan, records"),
        (set_at("plan", value=[]), "plan"),
        (set_at("columns", value=[{"per": "metre"}]), "columns, item 1, per"),
    ],
)
def test_every_wrong_value_is_told_with_its_place(
    tmp_path: Path, change: Callable[[dict[str, Any]], None], place: str
) -> None:
    document = copy.deepcopy(SMALL)
    change(document)
    assert place in fault_of(written(tmp_path, document))


def test_a_missing_key_is_told_and_very_many_faults_are_counted(tmp_path: Path) -> None:
    document = {key: value for key, value in SMALL.items() if key == "schema_version"}
    told = fault_of(written(tmp_path, document))
    assert "study: This key is not there." in told
    assert "2 more" in told or "1 more" in told


def test_what_is_no_ordinary_file_or_too_large_is_refused(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    with pytest.raises(InputFault, match="folder"):
        read_results(tmp_path)
    with pytest.raises(InputFault, match="no such file"):
        read_results(tmp_path / "nowhere.json")
    with pytest.raises(InputFault, match="no such file"):
        read_results(tmp_path / "null\x00.json")
    os.mkfifo(tmp_path / "pipe")
    with pytest.raises(InputFault, match="ordinary file"):
        read_results(tmp_path / "pipe")
    monkeypatch.setattr(reading, "LARGEST_MEGABYTES", 0)
    assert "larger than 0 MB" in fault_of(written(tmp_path, SMALL))
