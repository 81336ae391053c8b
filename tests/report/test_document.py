"""The report as a file: self-contained, well-formed, escaped, the same each time."""

from __future__ import annotations

import re
import time
from collections import Counter
from dataclasses import dataclass, field, replace
from html.parser import HTMLParser
from types import ModuleType

import pytest

from oddsmodel.findings import Finding
from oddsmodel.report.document import render_report
from oddsmodel.report.notebook import notebook_summary

VOID = {"meta", "link", "br", "hr", "img", "input", "col", "wbr", "area", "base", "embed", "source", "track"}


@dataclass
class Element:
    tag: str
    attributes: dict[str, str]
    children: list[Element] = field(default_factory=list)
    text: str = ""

    def every(self) -> list[Element]:
        return [self, *(deeper for child in self.children for deeper in child.every())]

    def all(self, tag: str, class_: str = "") -> list[Element]:
        return [one for one in self.every() if one.tag == tag and class_ in one.attributes.get("class", "")]

    def words(self) -> str:
        return " ".join([self.text, *(child.words() for child in self.children)])


class Tree(HTMLParser):
    """A strict reading: every element that needs a closing tag has its own."""

    def __init__(self) -> None:
        super().__init__(convert_charrefs=True)
        self.root = Element("root", {})
        self.open = [self.root]

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        names = [name for name, _ in attrs]
        assert len(names) == len(set(names)), f"an attribute given twice in <{tag}>"
        element = Element(tag, {name: value or "" for name, value in attrs})
        self.open[-1].children.append(element)
        if tag not in VOID:
            self.open.append(element)

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.open[-1].children.append(Element(tag, {name: value or "" for name, value in attrs}))

    def handle_endtag(self, tag: str) -> None:
        assert self.open[-1].tag == tag, f"</{tag}> closes <{self.open[-1].tag}>"
        self.open.pop()

    def handle_data(self, data: str) -> None:
        self.open[-1].text += data


def parsed(page: str) -> Element:
    tree = Tree()
    tree.feed(page)
    tree.close()
    assert tree.open == [tree.root], "elements left open"
    return tree.root


@pytest.fixture(scope="module")
def root(page: str) -> Element:
    return parsed(page)


def section(root: Element, id_: str) -> Element:
    return next(one for one in root.every() if one.attributes.get("id") == id_)


def test_it_is_well_formed_and_its_ids_are_unique(root: Element) -> None:
    ids = Counter(one.attributes["id"] for one in root.every() if "id" in one.attributes)
    assert [name for name, times in ids.items() if times > 1] == []
    for one in root.every():
        for attribute in ("aria-labelledby", "aria-describedby"):
            assert set(one.attributes.get(attribute, "").split()) <= set(ids)
        target = one.attributes.get("href", "")
        assert not target or (target.startswith("#") and target[1:] in ids)
        for style in (one.attributes.get("style", ""), one.attributes.get("clip-path", "")):
            assert set(re.findall(r"url\(#([^)]+)\)", style)) <= set(ids)


def test_nothing_is_loaded_or_run(page: str, root: Element) -> None:
    tags = {one.tag for one in root.every()}
    assert not tags & {"script", "link", "img", "iframe", "object", "embed", "base", "form", "image", "foreignobject"}
    for one in root.every():
        assert not any(name.startswith("on") or name in ("src", "srcset") for name in one.attributes)
    assert not re.search(r"@import|@font-face|url\((?!#)", page)
    policy = next(one for one in root.all("meta") if "http-equiv" in one.attributes).attributes["content"]
    assert policy.startswith("default-src 'none'; style-src 'unsafe-inline'; img-src data:")


def test_hostile_labels_stay_text(sample: ModuleType, page: str, root: Element) -> None:
    assert "<script" not in page
    assert "&lt;script&gt;" in page
    labels = [one.words() for one in root.all("th")]
    assert any(sample.HOSTILE in label for label in labels)
    drawn = " ".join(text.words() for text in root.all("text"))
    assert "$x^2$" in drawn, "a label with dollar signs is drawn as it is written"
    assert "<script>alert" in drawn


def test_marks_that_turn_the_reading_direction_are_left_out(sample: ModuleType) -> None:
    turned = render_report(sample.disclosed(title="Safe\u202etxt.exe\x00\x1b[31m", question="One\nline"))
    assert not re.search("[\u202a-\u202e\u2066-\u2069\x00\x1b]", turned)
    assert "<title>Safetxt.exe[31m</title>" in turned


def test_every_figure_has_a_name_and_a_description(root: Element) -> None:
    drawings = root.all("svg", "drawing")
    assert len(drawings) == 9
    for drawing in drawings:
        assert drawing.attributes["role"] == "img"
        title, desc = drawing.children[:2]
        assert (title.tag, desc.tag) == ("title", "desc")
        assert len(title.text) > 5
        assert len(desc.text) > 15
        named = drawing.attributes["aria-labelledby"].split()
        assert named == [title.attributes["id"], desc.attributes["id"]]
    for mark in root.all("svg", "mark"):
        assert mark.attributes["aria-hidden"] == "true"


def test_figures_and_tables_are_numbered_in_the_order_of_the_page(root: Element) -> None:
    for kind, word in (("picture", "Figure"), ("tabular", "Table")):
        captions = [one.all("span", "number")[0].text for one in root.all("figure", kind)]
        assert captions == [f"{word} {number + 1}" for number in range(len(captions))]


def test_sections_come_in_reading_order(root: Element) -> None:
    headings = [one.words() for one in root.all("h2") if "quiet" not in one.attributes.get("class", "")]
    assert headings[:4] == ["From crude to adjusted", "Who was counted", "Who they were", "The estimates"]
    assert headings[-5:] == [
        "Can this be relied on?",
        "How it was done",
        "Is this causal?",
        "Before you use this",
        "What it was made from",
    ]
    linked = [one.attributes["href"][1:] for one in root.all("nav")[0].all("a")]
    order = [one.attributes["id"] for one in root.every() if one.attributes.get("id") in linked]
    assert linked == order


def test_at_most_seven_checks_have_a_line_and_a_word_for_their_verdict(root: Element) -> None:
    lines = section(root, "reliance").all("li", "check")
    assert len(lines) == 6, "one line for each family that has something to say"
    for line in lines:
        verdict = line.all("span", "verdict")[0]
        assert verdict.text.strip() in ("Fine", "Look", "Caution")
    verdicts = [line.all("span", "verdict")[0].text.strip() for line in lines]
    assert verdicts.count("Caution") == 1
    assert verdicts.count("Look") == 1, "the first of equals speaks for its family"


def test_adjustment_columns_are_folded_with_their_caution(root: Element) -> None:
    estimates = section(root, "estimates")
    up_front = next(one for one in estimates.children if one.attributes.get("class") == "tabular").words()
    assert "Smoking:" in up_front
    assert "Age, per 10 years" not in up_front
    fold = next(one for one in estimates.all("details") if "Age, per 10 years" in one.words()).words()
    assert "Westreich & Greenland, 2013" in fold
    assert "column 1" not in estimates.words(), "a column of a spline never shows its own odds ratio"
    assert "rcs(bmi, 4)" in fold, "but it is said to be there"


def test_p_values_are_plain(root: Element) -> None:
    estimates = section(root, "estimates").words()
    assert "under 0.001" in estimates
    assert "*" not in estimates


def test_hidden_cells_and_missing_limits_are_said(root: Element, page: str) -> None:
    crude = section(root, "crude-adjusted")
    assert [one.text for one in crude.all("td", "withheld")] == ["withheld"] * 4
    assert "“withheld” stands for a count under 5" in crude.words()
    assert "no upper limit" in section(root, "estimates").words()
    told = root.all("main")[0].words().lower().replace("none given", "")
    assert not re.search(r"\b(nan|inf|none|null)\b", told)


def test_a_model_without_an_answer_has_words_and_no_number(root: Element) -> None:
    words = section(root, "model-3").words()
    assert "Not estimated: with hospital" in words
    assert "No finite estimate exists" in words
    assert not re.search(r"\d\.\d", words)


def test_no_other_model_takes_the_place_of_one_that_failed(sample: ModuleType) -> None:
    whole = sample.study()
    failed = replace(whole.models[2], id="main", name="main", added_by_program=False)
    page = render_report(sample.disclosed(models=(failed, whole.models[1])))
    root = parsed(page)
    opening = section(root, "answer").words()
    assert "“main”, could not be estimated" in opening
    assert not re.search(r"\d\.\d\d", opening)
    assert not [one for one in root.every() if one.attributes.get("id") in ("estimates", "reliance", "crude-adjusted")]
    assert "minimally adjusted" in section(root, "other-models").words()


def test_cautions_stand_in_front_and_stops_before_the_answer(sample: ModuleType) -> None:
    stop = Finding("stop", "identifier-repeats", "The identifier “patient” repeats.")
    more = tuple(Finding("caution", f"c{k}", f"Caution number {k}.") for k in range(6))
    opening = section(parsed(render_report(sample.disclosed(findings=(*more, stop)))), "answer")
    words = opening.words()
    assert words.index("repeats.") < words.index("The answer") < words.index("Caution number 0.")
    folded = " ".join(one.words() for one in opening.all("details"))
    assert "Caution number 5." in folded
    assert "Caution number 0." not in folded


def test_an_internal_report_says_so(sample: ModuleType, page: str) -> None:
    internal = render_report(sample.disclosed("internal"))
    assert parsed(internal).all("header", "banner")[0].words().startswith("INTERNAL.")
    assert 'content: "INTERNAL"' in internal
    assert "INTERNAL" not in page


def test_the_same_results_give_the_same_bytes(sample: ModuleType, page: str) -> None:
    assert render_report(sample.disclosed()) == page


def test_it_is_small_and_quick(sample: ModuleType, page: str) -> None:
    assert len(page.encode()) < 1_500_000
    start = time.perf_counter()
    render_report(sample.disclosed())
    assert time.perf_counter() - start < 1.0


def test_progress_is_told_of_each_figure(sample: ModuleType) -> None:
    class Told:
        total = 0
        steps = 0

        def stage(self, name: str, total: int | None = None) -> None:
            assert name == "drawing"
            self.total = total or 0

        def advance(self, steps: int = 1) -> None:
            self.steps += steps

    told = Told()
    render_report(sample.disclosed(), told)
    assert told.steps == told.total == 9


def test_bare_results_are_enough(sample: ModuleType) -> None:
    """One model with an exposure and nothing else: no adjustment, no tables, no checks, no figures."""
    bare = replace(
        sample.model(),
        adjustment=(),
        adjustment_labels=(),
        coefficients=sample.EXPOSURES[:1],
        terms=(),
        checks=(),
        tables=(),
        figures=(),
        findings=(),
        certificate=replace(sample.model().certificate, digits=None, condition_number=None),
    )
    page = render_report(
        sample.disclosed(
            models=(bare,), characteristics=None, comparison=None, comparison_figure=None, findings=(), question=""
        )
    )
    words = parsed(page).words()
    assert "Not adjusted for anything" in words
    assert "No check of this model could be done." in words
    assert parsed(render_report(sample.disclosed(models=()))).words().count("No model was estimated") == 1


def test_the_notebook_form_is_a_fragment_with_the_answer(sample: ModuleType) -> None:
    fragment = notebook_summary(sample.disclosed())
    root = parsed(fragment)
    assert [one.tag for one in root.children] == ["div"]
    assert "1.14 to 1.74" in root.words()
    assert "<script" not in fragment
