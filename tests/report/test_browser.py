"""The report in a real browser: it opens, asks for nothing, unfolds, prints, and fits a phone."""

from __future__ import annotations

import shutil
from collections.abc import Iterator
from pathlib import Path

import pytest
from playwright.sync_api import Browser, Page, sync_playwright

WIDTHS = (360, 768, 1280)
FLAGS = ["--no-sandbox", "--disable-gpu", "--no-first-run", "--disable-background-networking", "--disable-sync"]


@pytest.fixture(scope="module")
def browser() -> Iterator[Browser]:
    executable = shutil.which("chromium") or shutil.which("chromium-browser") or shutil.which("google-chrome")
    if executable is None:
        pytest.fail("This test needs Chromium. On Debian or Ubuntu: apt-get install chromium")
    with sync_playwright() as playwright:
        opened = playwright.chromium.launch(executable_path=executable, args=FLAGS)
        yield opened
        opened.close()


@pytest.fixture(scope="module")
def file(page: str, tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("report") / "report.html"
    path.write_text(page, encoding="utf-8")
    return path


@pytest.fixture
def tab(browser: Browser, file: Path) -> Iterator[Page]:
    opened = browser.new_page()
    opened.goto(file.as_uri())
    yield opened
    opened.close()


def test_it_opens_without_an_error_and_asks_for_nothing_else(browser: Browser, file: Path) -> None:
    tab = browser.new_page()
    said: list[str] = []
    asked: list[str] = []
    tab.on("console", lambda message: said.append(message.text))
    tab.on("pageerror", lambda error: said.append(str(error)))
    tab.on("request", lambda request: asked.append(request.url))
    tab.goto(file.as_uri())
    tab.wait_for_load_state("networkidle")
    assert said == []
    assert asked == [file.as_uri()]
    assert tab.title() == "Smoking and readmission in a hospital network"
    tab.close()


def test_it_works_with_scripts_off(browser: Browser, file: Path) -> None:
    context = browser.new_context(java_script_enabled=False)
    tab = context.new_page()
    tab.goto(file.as_uri())
    fold = tab.locator("#reliance li.check").nth(3)
    assert not fold.locator("figure").is_visible()
    fold.locator("summary").click()
    assert fold.locator("figure svg").is_visible()
    context.close()


def test_folds_open_from_the_keyboard(tab: Page) -> None:
    summary = tab.locator("#provenance summary")
    summary.focus()
    tab.keyboard.press("Enter")
    assert tab.locator("#provenance pre").is_visible()


@pytest.mark.parametrize("scheme", ["light", "dark"])
def test_it_follows_light_and_dark(browser: Browser, file: Path, scheme: str) -> None:
    context = browser.new_context(color_scheme=scheme)  # type: ignore[arg-type]
    tab = context.new_page()
    tab.goto(file.as_uri())
    brightness = "e => getComputedStyle(e).COLOUR.match(/\\d+/g).slice(0, 3).reduce((a, b) => a + +b, 0)"
    paper = tab.locator("body").evaluate(brightness.replace("COLOUR", "backgroundColor"))
    drawn = tab.locator("svg.drawing text").first.evaluate(brightness.replace("COLOUR", "fill"))
    assert (paper > 600 > 200 > drawn) if scheme == "light" else (paper < 200 < 600 < drawn)
    context.close()


@pytest.mark.parametrize("width", WIDTHS)
def test_nothing_runs_over_the_edge(browser: Browser, file: Path, width: int) -> None:
    tab = browser.new_page(viewport={"width": width, "height": 800})
    tab.goto(file.as_uri())
    tab.evaluate("document.querySelectorAll('details').forEach(fold => { fold.open = true })")
    assert tab.evaluate("document.documentElement.scrollWidth") <= width
    over = tab.evaluate(
        """width => [...document.querySelectorAll('svg.drawing text')]
            .filter(one => one.getBoundingClientRect().right > width || one.getBoundingClientRect().left < 0)
            .map(one => one.textContent)""",
        width,
    )
    assert over == []
    tab.close()


def test_text_in_figures_is_readable_on_a_phone(browser: Browser, file: Path) -> None:
    tab = browser.new_page(viewport={"width": 360, "height": 800})
    tab.goto(file.as_uri())
    smallest = tab.evaluate(
        """Math.min(...[...document.querySelectorAll('svg.drawing text')].map(
            one => parseFloat(getComputedStyle(one).fontSize) * one.getScreenCTM().a))"""
    )
    assert smallest >= 10.9
    tab.close()


def test_labels_in_figures_do_not_lie_on_each_other(tab: Page) -> None:
    tab.evaluate("document.querySelectorAll('details').forEach(fold => { fold.open = true })")
    crossed = tab.evaluate(
        """() => [...document.querySelectorAll('svg.drawing')].flatMap(drawing => {
            const texts = [...drawing.querySelectorAll('text')];
            const boxes = texts.map(one => [one.textContent, one.getBoundingClientRect()]);
            return boxes.flatMap(([a, p], i) => boxes.slice(i + 1)
                .filter(([b, q]) => Math.min(p.right, q.right) - Math.max(p.left, q.left) > 1
                    && Math.min(p.bottom, q.bottom) - Math.max(p.top, q.top) > 5)
                .map(([b]) => `${a} / ${b}`));
        })"""
    )
    assert crossed == []


@pytest.mark.parametrize("paper", ["A4", "Letter"])
def test_it_prints_with_its_folds_open(tab: Page, paper: str) -> None:
    printed = tab.pdf(format=paper)
    assert printed.startswith(b"%PDF")
    tab.emulate_media(media="print")
    folded = tab.locator("#reliance li.check figure").first
    assert folded.bounding_box() is not None
    assert (folded.bounding_box() or {"height": 0})["height"] > 100
