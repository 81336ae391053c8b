"""The reports in the repository are those that the examples give today."""

from __future__ import annotations

import html
import json
import re
from pathlib import Path
from typing import Any

import pytest

from oddsmodel.study.run import run_plan

ROOT = Path(__file__).resolve().parent.parent
EXAMPLES = sorted(path.parent.name for path in (ROOT / "examples").glob("*/plan.toml"))


def assert_alike(one: Any, other: Any, where: str = "") -> None:
    """The same JSON, numbers to 1e-9 (another processor may round otherwise)."""
    assert type(one) is type(other), where
    if isinstance(one, dict):
        assert one.keys() == other.keys(), where
        for key in one:
            assert_alike(one[key], other[key], f"{where}.{key}")
    elif isinstance(one, list):
        assert len(one) == len(other), where
        for position, (a, b) in enumerate(zip(one, other, strict=True)):
            assert_alike(a, b, f"{where}[{position}]")
    elif isinstance(one, float):
        assert one == pytest.approx(other, rel=1e-9, abs=1e-12), where
    else:
        assert one == other, where


def words(document: str) -> list[str]:
    """The text a reader sees, without drawings and without versions of packages."""
    text = re.sub(r"<style.*?</style>|<svg.*?</svg>", " ", document, flags=re.DOTALL)
    text = html.unescape(re.sub(r"<[^>]+>", " ", text))
    return [word for word in text.split() if not re.fullmatch(r"[\d.]+(rc\d+|post\d+|dev\d+)?[,;]?", word)]


@pytest.mark.parametrize("name", EXAMPLES)
def test_reports_are_in_step(name: str, tmp_path: Path) -> None:
    outcome = run_plan(ROOT / "examples" / name / "plan.toml", into=tmp_path / "report")
    kept = ROOT / "reports" / name
    fresh = {str(path.relative_to(outcome.folder)) for path in outcome.folder.rglob("*") if path.is_file()}
    assert fresh == {
        str(path.relative_to(kept)) for path in kept.rglob("*") if path.suffix != ".png" and path.is_file()
    }
    results = [json.loads((folder / "results.json").read_text(encoding="utf-8")) for folder in (outcome.folder, kept)]
    assert_alike(*results)
    documents = [(folder / "report.html").read_text(encoding="utf-8") for folder in (outcome.folder, kept)]
    assert words(documents[0]) == words(documents[1]), "run examples/write_reports.py"
