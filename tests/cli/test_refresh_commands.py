"""`changes` and `shelf` as they are typed: what is printed, what is written, and how they end."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from oddsmodel.study.run import run_plan

Command = Callable[..., Any]
PLAN = """
[study]
title = "Tea and sleep"
question = "Do people who drink tea sleep badly more often?"
design = "cross-sectional"
[records]
source = "records.csv"
count = "people"
[outcome]
column = "slept"
event = "badly"
[[models]]
name = "main"
formula = "slept ~ tea"
exposures = ["tea"]
"""


def written(folder: Path, counts: tuple[int, int, int, int], audience: str = "shareable") -> Path:
    rows = zip(("some", "some", "none", "none"), ("badly", "well", "badly", "well"), counts, strict=True)
    lines = [f"{tea},{slept},{people}" for tea, slept, people in rows]
    folder.mkdir()
    (folder / "records.csv").write_text("\n".join(["tea,slept,people", *lines]) + "\n", encoding="utf-8")
    (folder / "plan.toml").write_text(f'{PLAN}\n[report]\naudience = "{audience}"\n', encoding="utf-8")
    made = run_plan(folder / "plan.toml", into=folder / f"{folder.name}-report")
    return made.files[-1]


@pytest.fixture(scope="module")
def results(tmp_path_factory: pytest.TempPathFactory) -> list[Path]:
    folder = tmp_path_factory.mktemp("shelf")
    return [
        written(folder / "may", (60, 140, 40, 160)),
        written(folder / "june", (62, 141, 90, 210)),
        written(folder / "july", (80, 160, 90, 213), "internal"),
    ]


def test_changes_prints_the_series_the_counts_and_the_causes(
    command: Command, results: list[Path], tmp_path: Path
) -> None:
    page = tmp_path / "changes.html"
    ended = command("changes", *results[:2], "--into", page)
    assert ended.status == 0
    assert ended.err == ""
    for told in (
        "Changes: Tea and sleep",
        "Do people who drink tea sleep badly more often?",
        "  tea: some against none\n    1 (may): 1.71 (",
        "Read: 400, then 503",
        "What differs comes from the records.",
        "each extract may hold records of the one before",
        f"The page is in {page}",
    ):
        assert told in ended.out
    # 60 * 160 / (140 * 40) = 1.714; 62 * 210 / (141 * 90) = 1.026: the sample odds ratios, by hand.
    assert "2 (june): 1.03 (" in ended.out
    text = page.read_text(encoding="utf-8")
    assert "Tea and sleep" in text
    assert "INTERNAL" not in text
    assert command("changes", *results[:2], "--into", page).status == 0


def test_an_internal_comparison_carries_it_in_its_name(command: Command, results: list[Path], tmp_path: Path) -> None:
    ended = command("changes", *results, "--into", tmp_path / "all.html")
    assert ended.status == 0
    assert [path.name for path in tmp_path.iterdir()] == ["all-INTERNAL.html"]
    assert "INTERNAL. This copy shows every count" in ended.out
    assert "all-INTERNAL.html" in ended.out


def test_without_into_nothing_is_written(command: Command, results: list[Path], tmp_path: Path) -> None:
    before = sorted(results[0].parent.parent.parent.rglob("*"))
    assert command("changes", *results[:2]).status == 0
    assert sorted(results[0].parent.parent.parent.rglob("*")) == before


def test_what_is_wrong_ends_in_2_with_one_clear_message(command: Command, results: list[Path], tmp_path: Path) -> None:
    alone = command("changes", results[0])
    assert alone.status == 2
    assert "name at least two results" in alone.err
    other = tmp_path / "other.json"
    document = json.loads(results[0].read_text(encoding="utf-8"))
    other.write_text(json.dumps(document | {"schema_version": "2.0"}), encoding="utf-8")
    refused = command("changes", results[0], other)
    assert refused.status == 2
    assert "1 thing to put right" in refused.err
    assert "version 2.0" in refused.err
    mine = tmp_path / "mine.html"
    mine.write_text("mine", encoding="utf-8")
    kept = command("changes", *results[:2], "--into", mine)
    assert kept.status == 2
    assert mine.read_text(encoding="utf-8") == "mine"
    assert command("changes", *results[:2], "--into", tmp_path / "page.txt").status == 2
    assert command("changes").status == 2


def test_the_shelf_is_written_into_its_folder_and_again(command: Command, results: list[Path], tmp_path: Path) -> None:
    folder = results[0].parent.parent.parent
    for _ in range(2):
        ended = command("shelf", folder)
        assert ended.status == 0
        assert ended.out == f"The index of 3 reports is in {folder / 'index.html'}\n"
        assert ended.err == ""
    text = (folder / "index.html").read_text(encoding="utf-8")
    for told in (
        'href="may/may-report/report.html"',
        'href="july/july-report/report-INTERNAL.html"',
        "Do people who drink tea sleep badly more often?",
        "times those with “none”",
        "INTERNAL",
    ):
        assert told in text
    elsewhere = command("shelf", folder, "--into", tmp_path / "list.html")
    assert elsewhere.status == 0
    assert "may-report/report.html" in (tmp_path / "list.html").read_text(encoding="utf-8")


def test_the_shelf_overwrites_nothing_of_anybody_else(command: Command, results: list[Path], tmp_path: Path) -> None:
    mine = tmp_path / "index.html"
    mine.write_text("<html>mine</html>", encoding="utf-8")
    ended = command("shelf", results[0].parent, "--into", mine)
    assert ended.status == 2
    assert mine.read_text(encoding="utf-8") == "<html>mine</html>"
    assert command("shelf", tmp_path).status == 2
    assert command("shelf", tmp_path / "nowhere").status == 2


def test_the_shelf_tells_what_it_could_not_list(command: Command, results: list[Path], tmp_path: Path) -> None:
    folder = tmp_path / "shelf"
    folder.mkdir()
    for name in ("good", "bad"):
        (folder / name).mkdir()
        for file in results[0].parent.iterdir():
            if file.is_file():
                (folder / name / file.name).write_bytes(file.read_bytes())
    (folder / "bad" / "results.json").write_text("[", encoding="utf-8")
    ended = command("shelf", folder)
    assert ended.status == 0
    assert "1 report is in" in ended.out
    assert "bad: The file cannot be read as JSON" in ended.err
