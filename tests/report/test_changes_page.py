"""The pages of changes and of the shelf: self-contained, escaped, readable on a phone."""

from __future__ import annotations

import re
import shutil
from dataclasses import replace
from html.parser import HTMLParser
from pathlib import Path

import pytest
from playwright.sync_api import sync_playwright

from oddsmodel.export.shelf import Shelf, ShelfEntry
from oddsmodel.findings import Finding
from oddsmodel.report.changes import render_changes
from oddsmodel.report.shelf import render_shelf
from oddsmodel.results.changes import Changes, ModelChanges, Refresh, Step
from oddsmodel.results.figures import EstimateMark, EstimatesFigure
from oddsmodel.results.tables import Hidden, Interval, Table, TableColumn

HOSTILE = '<script>alert("x")</script> & \u202e\x1b[31m'
VOID = {"meta", "br"}


class Reader(HTMLParser):
    """Elements with their attributes, each closed by its own tag."""

    def __init__(self, page: str) -> None:
        super().__init__()
        self.open: list[str] = []
        self.met: list[tuple[str, dict[str, str]]] = []
        self.feed(page)
        self.close()
        assert self.open == []

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.met.append((tag, {name: value or "" for name, value in attrs}))
        if tag not in VOID:
            self.open.append(tag)

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.met.append((tag, {name: value or "" for name, value in attrs}))

    def handle_endtag(self, tag: str) -> None:
        assert self.open.pop() == tag


def self_contained(page: str) -> Reader:
    reader = Reader(page)
    assert not {tag for tag, _ in reader.met} & {"script", "link", "img", "iframe", "object", "base", "form"}
    assert not re.search(r"@import|@font-face|url\((?!#)", page)
    assert not re.search("[\u202a-\u202e\x1b]", page)
    for _, attributes in reader.met:
        assert not any(name.startswith("on") or name in ("src", "srcset") for name in attributes)
    ids = [attributes["id"] for _, attributes in reader.met if "id" in attributes]
    assert len(ids) == len(set(ids))
    for _, attributes in reader.met:
        assert set(attributes.get("aria-labelledby", "").split()) <= set(ids)
        if attributes.get("href", "").startswith("#"):
            assert attributes["href"][1:] in ids
    assert "default-src 'none'" in next(one["content"] for tag, one in reader.met if "http-equiv" in one)
    return reader


def model(name: str) -> ModelChanges:
    marks = (
        EstimateMark("Smoking: current against never", "1 (spring)", 1.5, 1.1, 2.0),
        EstimateMark("Smoking: current against never", "2 (autumn)", 1.6, 1.3, None),
        EstimateMark("Smoking: current against never", f"3 ({HOSTILE})", None, None, None, note="no such contrast"),
    )
    columns = (
        TableColumn("contrast", "Contrast"),
        TableColumn("refresh", "Refresh"),
        TableColumn("odds_ratio", "Odds ratio", "odds_ratio"),
        TableColumn("interval", "95% interval", "interval"),
    )
    rows = tuple((one.label, one.series, one.estimate, Interval(one.lower, one.upper)) for one in marks[:2])
    return ModelChanges(
        name,
        EstimatesFigure("series", f"{name}: series", f"{HOSTILE} told", marks),
        Table("series", "The numbers", columns, rows),
        ("A note.",),
    )


CHANGES = Changes(
    title=HOSTILE,
    question="Does it?",
    internal=False,
    threshold=5,
    refreshes=(Refresh("1 (spring)", "plan.toml", "a" * 64, "b" * 64, {"numpy": "2.0"}),) * 2,
    steps=(
        Step(
            "1 (spring)",
            "2 (autumn)",
            "The cause.",
            (f"[columns.x] per was {HOSTILE}",),
            ("A level.",),
            "Other versions.",
            "Overlap.",
            ("A model is new.",),
            (Finding("caution", "c", HOSTILE),),
            (),
        ),
    ),
    counts=Table(
        "counts",
        "Records",
        (TableColumn("what", "Records"), TableColumn("1", "1", "count"), TableColumn("2", "2", "count")),
        (("Read", 4000, "fewer than 5 apart"), ("Left out", 9, Hidden())),
    ),
    models=(model("main"), model("other")),
    cautions=("They differ.",),
)
ENTRY = ShelfEntry(
    folder=Path("shelf/one"),
    report=Path("shelf/one/report.html"),
    title="Coffee and sleep",
    question=HOSTILE,
    answers=(("Coffee: some against none", "The odds were higher."),),
    read=4000,
    analysed=3900,
    events=120,
    stops=0,
    cautions=1,
    notes=2,
    internal=False,
    changed=False,
)


def test_the_page_of_changes_is_self_contained_and_the_same_each_time() -> None:
    page = render_changes(CHANGES)
    self_contained(page)
    assert "&lt;script&gt;" in page
    assert page == render_changes(CHANGES)
    for told in ("The cause.", "Overlap.", "fewer than 5 apart", "withheld", "They differ.", "no such contrast"):
        assert told in page
    assert page.count("<svg viewBox") >= 2
    assert "INTERNAL" not in page


def test_an_internal_comparison_says_so() -> None:
    assert "INTERNAL. This copy shows every count" in render_changes(replace(CHANGES, internal=True))


def test_a_comparison_without_any_estimate_is_said_in_words() -> None:
    page = render_changes(replace(CHANGES, models=(ModelChanges("main", None, None, ()),)))
    self_contained(page)
    assert "No odds ratio of the exposure stands in any of the results." in page
    assert "No odds ratio" in render_changes(replace(CHANGES, models=()))


def test_the_shelf_links_to_each_report_and_says_what_it_answers(tmp_path: Path) -> None:
    shelf = tmp_path / "shelf"
    odd = shelf / 'q"1 <b>' / "javascript:x?#%"
    entries = (
        replace(ENTRY, folder=shelf / "one", report=shelf / "one" / "report.html"),
        replace(ENTRY, title=HOSTILE, folder=odd, report=odd / "report-INTERNAL.html", internal=True, changed=True),
        replace(ENTRY, folder=shelf / "gone", report=None, answers=(), read=None, analysed=None, events=None),
    )
    page = render_shelf(Shelf(entries, (("broken <i>", "its results are not there."),)), shelf)
    reader = self_contained(page)
    links = [one["href"] for tag, one in reader.met if tag == "a" and not one["href"].startswith("#")]
    odd_link = "q%221%20%3Cb%3E/javascript%3Ax%3F%23%25/report-INTERNAL.html"
    assert links == ["one/report.html"] * 2 + [odd_link] * 2
    for told in (
        "3 reports, by title.",
        "The odds were higher.",
        "4\u202f000 records read, 3\u202f900 analysed, 120 with the event. Findings: 1 caution and 2 notes.",
        "INTERNAL. At least one report listed here",
        "Its results were changed after the run.",
        "The answer is in the report.",
        "Its report is not there.",
        "How many records is not shown.",
        "broken &lt;i&gt;: its results are not there.",
    ):
        assert told in page
    assert "../shelf/one/report.html" in render_shelf(Shelf(entries[:1], ()), tmp_path / "pages")
    assert "INTERNAL" not in render_shelf(Shelf(entries[:1], ()), shelf)


@pytest.mark.parametrize("width", [360, 1280])
def test_nothing_runs_over_the_edge_or_speaks_up(tmp_path: Path, width: int) -> None:
    executable = shutil.which("chromium") or shutil.which("chromium-browser") or shutil.which("google-chrome")
    if executable is None:
        pytest.fail("This test needs Chromium. On Debian or Ubuntu: apt-get install chromium")
    pages = {"changes.html": render_changes(CHANGES), "index.html": render_shelf(Shelf((ENTRY,), ()), tmp_path)}
    with sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=executable, args=["--no-sandbox", "--disable-gpu"])
        for name, page in pages.items():
            (tmp_path / name).write_text(page, encoding="utf-8")
            tab = browser.new_page(viewport={"width": width, "height": 800})
            said: list[str] = []
            tab.on("console", lambda message, said=said: said.append(message.text))  # type: ignore[misc]
            tab.goto((tmp_path / name).as_uri())
            tab.evaluate("document.querySelectorAll('details').forEach(fold => { fold.open = true })")
            assert tab.evaluate("document.documentElement.scrollWidth") <= width
            assert said == []
        browser.close()
