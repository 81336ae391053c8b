"""The reports in a folder: found by what a run leaves, whatever else lies there."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest

from oddsmodel.errors import InputFault
from oddsmodel.export.files import MANIFEST, write_outputs
from oddsmodel.export.page import mark, write_page
from oddsmodel.export.shelf import reports_in

OURS = f'<!doctype html><meta name="generator" content="{mark("shelf")}">'


def results(title: str, audience: str = "shareable") -> dict[str, Any]:
    caution = {"severity": "caution", "code": "c", "facts": {}, "message": "Careful."}
    model: dict[str, Any] = {
        "name": "main",
        "formula": "o ~ x",
        "method": "maximum likelihood",
        "added_by_program": False,
        "variant": {},
        "records": 90,
        "events": None,
        "coefficients": [],
        "findings": [caution, caution | {"severity": "stop"}],
    }
    return {
        "schema_version": "1.1",
        "study": {
            "title": title,
            "question": "Is it?",
            "design": "cohort",
            "outcome": "o",
            "event": "yes",
            "answer": [{"label": "X", "sentence": "It is."}],
        },
        "disclosure": {"audience": audience, "hide_counts_below": 5},
        "records": {"read": 100, "excluded": [], "sha256": "0" * 64},
        "models": [model],
        "findings": [caution],
        "provenance": {"plan": "plan.toml", "plan_sha256": "1" * 64, "versions": {}, "seed": 1},
    }


def report(folder: Path, title: str, audience: str = "shareable") -> Path:
    files = {"results.json": json.dumps(results(title, audience)), "report.html": "<!doctype html>"}
    write_outputs(folder, files, internal=audience == "internal")
    return folder


def test_reports_stand_by_title_wherever_they_are(tmp_path: Path) -> None:
    report(tmp_path / "z", "apples")
    report(tmp_path / "deep" / "er", "Bananas", "internal")
    report(tmp_path / "a", "cherries")
    (tmp_path / "notes.txt").write_text("mine", encoding="utf-8")
    (tmp_path / "empty").mkdir()
    shelf = reports_in(tmp_path)
    assert [entry.title for entry in shelf.entries] == ["apples", "Bananas", "cherries"]
    assert [entry.internal for entry in shelf.entries] == [False, True, False]
    assert shelf.internal
    assert shelf.left_out == ()
    banana = shelf.entries[1]
    assert banana.report == tmp_path / "deep" / "er" / "report-INTERNAL.html"
    assert banana.answers == (("X", "It is."),)
    assert (banana.read, banana.analysed, banana.events) == (100, 90, None)
    assert (banana.stops, banana.cautions, banana.notes) == (1, 1, 0)
    assert not banana.changed


def test_the_folder_of_one_report_is_a_shelf_of_one(tmp_path: Path) -> None:
    assert len(reports_in(report(tmp_path / "one", "T")).entries) == 1


def test_what_cannot_be_listed_is_told_with_its_reason(tmp_path: Path) -> None:
    report(tmp_path / "good", "Good")
    (report(tmp_path / "unfinished", "U") / "results.json").unlink()
    (report(tmp_path / "broken", "B") / "results.json").write_text("{", encoding="utf-8")
    (report(tmp_path / "manifest", "M") / MANIFEST).write_text("[]", encoding="utf-8")
    linked = report(tmp_path / "linked", "L")
    (linked / "results.json").unlink()
    (linked / "results.json").symlink_to(tmp_path / "good" / "results.json")
    shelf = reports_in(tmp_path)
    assert [entry.title for entry in shelf.entries] == ["Good"]
    reasons = dict(shelf.left_out)
    assert reasons.keys() == {"unfinished", "broken", "manifest", "linked"}
    assert "not there" in reasons["unfinished"]
    assert "not there" in reasons["linked"]
    assert "JSON" in reasons["broken"]
    assert MANIFEST in reasons["manifest"]


def test_results_changed_after_the_run_and_a_missing_report_are_seen(tmp_path: Path) -> None:
    folder = report(tmp_path / "one", "Before")
    (folder / "results.json").write_text(json.dumps(results("After")), encoding="utf-8")
    (folder / "report.html").unlink()
    (entry,) = reports_in(tmp_path).entries
    assert entry.changed
    assert entry.report is None


def test_links_and_hidden_folders_are_not_followed(tmp_path: Path) -> None:
    elsewhere = tmp_path / "elsewhere"
    report(elsewhere / "one", "T")
    shelf = tmp_path / "shelf"
    report(shelf / ".hidden", "H")
    (shelf / "link").symlink_to(elsewhere)
    (shelf / "loop").symlink_to(shelf)
    with pytest.raises(InputFault, match="No report was found"):
        reports_in(shelf)
    with pytest.raises(InputFault, match="no such folder"):
        reports_in(tmp_path / "nowhere")


def test_a_page_replaces_only_an_earlier_one_of_its_own(tmp_path: Path) -> None:
    page = tmp_path / "index.html"
    write_page(page, OURS, "shelf")
    write_page(page, f"{OURS} again", "shelf")
    assert page.read_text(encoding="utf-8").endswith("again")
    with pytest.raises(InputFault, match="did not write"):
        write_page(page, "x", "changes")
    page.write_text("<!doctype html> mine", encoding="utf-8")
    with pytest.raises(InputFault, match="did not write"):
        write_page(page, OURS, "shelf")
    assert page.read_text(encoding="utf-8") == "<!doctype html> mine"
    link = tmp_path / "link.html"
    link.symlink_to(tmp_path / "nowhere.html")
    (tmp_path / "folder.html").mkdir()
    for taken in (link, tmp_path / "folder.html"):
        with pytest.raises(InputFault, match="did not write"):
            write_page(taken, OURS, "shelf")
    with pytest.raises(InputFault, match=r"no \.html file"):
        write_page(tmp_path / "results.json", OURS, "shelf")
    with pytest.raises(InputFault, match="does not exist"):
        write_page(tmp_path / "no" / "index.html", OURS, "shelf")
