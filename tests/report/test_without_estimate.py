"""What the report says and draws of an odds ratio that has one limit and no estimate."""

from __future__ import annotations

import itertools
from dataclasses import replace
from types import ModuleType
from xml.etree import ElementTree

import pytest

from oddsmodel.disclosure import disclose
from oddsmodel.export.answer import answers
from oddsmodel.report.document import render_report
from oddsmodel.report.figures import svg
from oddsmodel.results.figures import EstimateMark, EstimatesFigure
from oddsmodel.results.lead import companion, is_told
from oddsmodel.results.study import CoefficientResult, ExactResult, ModelResult, ProfileResult, StudyResults, WaldResult
from oddsmodel.wording import say

DESIGNS = ("cohort", "cross-sectional", "case-control", "matched case-control", "trial")


def answer(lower: float | None, upper: float | None, **facts: object) -> str:
    given: dict[str, object] = {
        "design": "cohort",
        "outcome": "“Died”",
        "level": "current",
        "reference": "never",
        "percent": "95%",
        "adjusted": True,
        "median": None,
    }
    return say("answer-no-finite", lower=lower, upper=upper, **{**given, **facts})


def test_the_one_limit_is_told_with_its_direction() -> None:
    assert answer(None, 0.082) == (
        "The odds of “Died” were lower: at most 0.082 times those with “never” (the one limit of the 95% interval). "
        "There is no finite estimate: the lower the odds ratio is taken to be, the better it fits these records."
    )
    assert answer(3.2, None, median=9.1) == (
        "The odds of “Died” were higher: at least 3.20 times those with “never” (the one limit of the 95% interval). "
        "There is no finite estimate: the higher the odds ratio is taken to be, the better it fits these records. The "
        "median-unbiased estimate is 9.10."
    )


def test_a_limit_on_the_other_side_of_one_settles_no_direction() -> None:
    assert answer(None, 1.7).startswith("The odds of “Died” were at most 1.70 times those with “never”")
    assert answer(0.6, None, adjusted=False).startswith("The odds of “Died” were at least 0.60 times those")
    assert "interval, not adjusted)" in answer(0.6, None, adjusted=False)


def test_the_design_governs_the_words() -> None:
    assert "among cases were higher: at least 3.20 times those among controls" in answer(
        3.2, None, design="case-control"
    )
    assert "at least 3.20 times as high for each such step" in answer(3.2, None, level=None, reference=None)
    assert "at the time of recording" in answer(None, 0.3, design="cross-sectional")


def test_no_sentence_gives_a_verdict() -> None:
    for design, limit, above in itertools.product(DESIGNS, (0.001, 0.9, 1.0, 1.1, 500.0), (True, False)):
        words = answer(limit if above else None, None if above else limit, design=design).lower()
        assert "significant" not in words
        assert "no effect" not in words


# The figure


def drawn(mark: EstimateMark) -> tuple[str, int, int]:
    """All words of the figure, the heads of its arrows and its marks of estimates."""
    root = ElementTree.fromstring(svg(EstimatesFigure("f", "Odds ratios", "The odds ratios.", (mark,)), "f"))
    heads = sum("stroke-width:2;" in element.get("style", "") for element in root.iter("path"))
    words = " ".join("".join(element.itertext()) for element in root.iter("text"))
    return words, heads, sum(1 for _ in root.iter("circle"))


def test_one_limit_is_drawn_as_an_arrow_without_a_mark() -> None:
    assert drawn(EstimateMark("Smoking", "adjusted", 0.08, 0.05, 0.12))[1:] == (0, 1)
    words, heads, marks = drawn(EstimateMark("Smoking", "adjusted", None, None, 0.08))
    assert (heads, marks) == (1, 0)
    assert "at most 0.080" in words
    assert "no estimate" not in words
    words, heads, marks = drawn(EstimateMark("Smoking", "adjusted", None, 4.0, None))
    assert (heads, marks) == (1, 0)
    assert "at least 4.00" in words
    assert drawn(EstimateMark("Smoking", "adjusted", None, None, None))[1:] == (0, 0)


def test_the_text_alternative_tells_the_limit() -> None:
    marks = [("Smoking", "crude", None, None, None), ("Smoking", "adjusted", None, None, 0.08)]
    assert say("estimates-alt", marks=marks, percent=95.0) == (
        "Odds ratios with 95% intervals. Smoking, adjusted: at most 0.080."
    )


# The page


def separated(sample: ModuleType, **changes: object) -> StudyResults:
    """The sample study with a lead model that is separated and one that the program added beside it."""
    study: StudyResults = sample.study()
    lead = study.models[0]

    def without(one: CoefficientResult) -> CoefficientResult:
        if one.role != "exposure" or not one.shown:
            return one
        none = WaldResult(None, None, None)
        reasons = {"odds_ratio": "No finite estimate: at or below 0.44."}
        limits = ProfileResult(None, 0.44)
        return replace(
            one, odds_ratio=None, log_odds_ratio=None, standard_error=None, wald=none, profile=limits, reasons=reasons
        )

    first = replace(lead, status="no finite maximum", coefficients=tuple(map(without, lead.coefficients)))
    added = replace(lead, id=f"{lead.id}-penalised", name="beside", method="penalised", added_by_program=True)
    return replace(study, models=(replace(first, **changes), added, *study.models[1:]))  # type: ignore[arg-type]


def test_a_separated_model_that_leads_is_answered_with_its_limit(sample: ModuleType) -> None:
    study = separated(sample)
    lead = study.models[0]
    assert is_told(lead)
    assert companion(study, lead) is study.models[1]
    first = answers(study, lead)[0]
    assert first.odds_ratio == "at most 0.44"
    assert first.measure == "adjusted odds ratio, without a finite estimate"
    assert first.beside.startswith("By penalised likelihood, which always has an answer, the odds ratio is 1.41")


def test_without_a_limit_or_a_model_beside_the_reason_stands(sample: ModuleType) -> None:
    study = separated(sample)
    lead = replace(
        study.models[0],
        coefficients=tuple(replace(one, profile=ProfileResult(None, None)) for one in study.models[0].coefficients),
    )
    other = replace(study, models=(lead, replace(study.models[1], status="not converged"), *study.models[2:]))
    assert companion(other, lead) is None
    first = answers(other, lead)[0]
    assert first.sentence == "No odds ratio can be shown: No finite estimate: at or below 0.44."
    assert first.beside == ""


def test_the_page_of_a_separated_model(sample: ModuleType) -> None:
    disclosed = disclose(separated(sample), audience="internal", hide_counts_below=5)
    page = render_report(disclosed)
    assert '<a href="#model-2">All of that model</a>' in page
    assert '<details id="model-2" open>' in page
    assert "The likelihood has no maximum." in page
    for cited in ("Albert A, Anderson JA", "Santner TJ", "Konis K", "Firth D", "Heinze G"):
        assert cited in page
    assert "decided by linear programming" in page
    assert f"Not estimated: {sample.study().models[0].name}" not in page


def test_the_page_of_an_exact_model(sample: ModuleType) -> None:
    study: StudyResults = sample.study()

    def exactly(one: CoefficientResult) -> CoefficientResult:
        if one.role != "exposure":
            return one
        return replace(
            one, exact=ExactResult(1.33, 0.9, 2.4, 1.0, 2.2, 0.06, 0.05, 0.04), profile=ProfileResult(None, None)
        )

    lead: ModelResult = study.models[0]
    model = replace(lead, method="exact", coefficients=tuple(map(exactly, lead.coefficients)))
    page = render_report(
        disclose(replace(study, models=(model, *study.models[1:])), audience="internal", hide_counts_below=5)
    )
    for words in (
        "95% exact interval",
        "95% mid-P interval",
        "0.90 to 2.40",
        "1.00 to 2.20",
        "Odds ratio, median unbiased",
    ):
        assert words in page
    assert "Hirji KF" in page
    assert "by exact conditional inference</span>" in page


@pytest.mark.parametrize(
    ("method", "cited"), [("penalised", "Heinze &amp; Schemper"), ("log-F", "Greenland &amp; Mansournia")]
)
def test_the_methods_of_other_likelihoods(sample: ModuleType, method: str, cited: str) -> None:
    study: StudyResults = sample.study()
    model = replace(study.models[0], method=method)
    page = render_report(
        disclose(replace(study, models=(model, *study.models[1:])), audience="internal", hide_counts_below=5)
    )
    assert cited in page.partition('<section id="methods"')[2]
    assert "profile of the" in page.partition('<section id="methods"')[2]
