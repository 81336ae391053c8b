"""The sentences that answer: direction, size, interval, design, and what they never say."""

from __future__ import annotations

import itertools
import re
from dataclasses import replace
from types import ModuleType

import pytest

from oddsmodel.export.answer import answers
from oddsmodel.results.study import ProfileResult
from oddsmodel.wording import say
from oddsmodel.wording.report_answer import outcome_words

DESIGNS = ("cohort", "cross-sectional", "case-control", "matched case-control", "trial")


def answer(odds_ratio: float, lower: float | None, upper: float | None, **facts: object) -> str:
    given: dict[str, object] = {
        "design": "cohort",
        "outcome": "“Died”",
        "level": "current",
        "reference": "never",
        "percent": "95%",
        "adjusted": True,
    }
    return say("answer", odds_ratio=odds_ratio, lower=lower, upper=upper, **{**given, **facts})


def test_direction_size_and_interval() -> None:
    assert answer(1.41, 1.14, 1.74) == (
        "The odds of “Died” were higher: 1.41 times those with “never” (95% interval 1.14 to 1.74)."
    )
    assert answer(0.62, 0.4, 0.9) == (
        "The odds of “Died” were lower: 0.62 times those with “never” (95% interval 0.40 to 0.90)."
    )
    assert answer(1.001, 0.5, 2.0) == (
        "The odds of “Died” were about the same as those with “never”: odds ratio 1.00 (95% interval 0.50 to 2.00)."
    )
    assert answer(1.3, 1.1, 1.5, level=None, reference=None, adjusted=False) == (
        "The odds of “Died” were higher: 1.30 times as high for each such step (95% interval 1.10 to 1.50, "
        "not adjusted)."
    )


def test_the_design_governs_the_words() -> None:
    assert "among cases were higher: 1.41 times those among controls" in answer(1.41, 1.1, 1.7, design="case-control")
    assert "odds of being a case" in answer(1.41, 1.1, 1.7, design="case-control", level=None, reference=None)
    assert "at the time of recording" in answer(1.41, 1.1, 1.7, design="cross-sectional")
    assert "after allocation" in answer(1.41, 1.1, 1.7, design="trial")


@pytest.mark.parametrize(
    ("lower", "upper", "told"),
    [
        (1.14, 1.74, "from 14% higher to 74% higher."),
        (0.6, 0.9, "from 40% lower to 10% lower."),
        (0.88, 1.32, "from 12% lower to 32% higher: they leave the direction open."),
        (0.2, 5.0, "it is no evidence that the odds are alike"),
        (0.98, 1.03, "lie close together, from 2% lower to 3% higher; the direction is open."),
        (1.42, 2.07, "odds from 1.42 to 2.07 times as high."),
        (0.996, 1.6, "from about the same to 60% higher: they leave the direction open."),
        (1.2, 9.0, "from 1.20 to 9.00 times as high; the interval is wide, so the size is uncertain."),
        (0.9, None, "from 0.90 upwards; they set no upper limit"),
        (None, 3.0, "up to 3.00; they set no lower limit"),
        (None, None, "No limits can be given"),
    ],
)
def test_what_the_records_are_compatible_with(lower: float | None, upper: float | None, told: str) -> None:
    assert told in say("compatible", lower=lower, upper=upper)


def test_no_sentence_gives_a_verdict() -> None:
    values = (0.0001, 0.004, 0.3, 0.97, 1.0, 1.02, 2.0, 40.0, 1e5)
    for low, middle, high in itertools.combinations_with_replacement(values, 3):
        for design, stepwise in itertools.product(DESIGNS, (True, False)):
            reference = None if stepwise else "never"
            words = answer(middle, low, high, design=design, reference=reference, level=reference)
            words += say("compatible", lower=low, upper=high)
            assert not re.search(r"significan|no effect|no association|no difference|proves|causes", words)


def test_the_outcome_is_quoted_and_its_value_told_where_it_says_more_than_yes() -> None:
    assert outcome_words("Died", "yes") == "“Died”"
    assert outcome_words("Discharge", "care home") == "“Discharge: care home”"


def test_several_exposures_are_mutually_adjusted() -> None:
    facts = {"adjustment": ["Age", "Sex"], "records": 3871, "events": 612}
    assert say("answer-basis", mutually=True, design="cohort", **facts) == (
        "Adjusted for Age and Sex; the exposures are mutually adjusted, each for the others. "
        "3\u202f871 records, 612 with the event."
    )
    assert say("answer-basis", mutually=False, design="case-control", **facts).endswith("612 cases.")
    withheld = {"adjustment": [], "records": 40, "events": None}
    assert say("answer-basis", mutually=False, design="cohort", **withheld) == "Not adjusted for anything. 40 records."


def test_profile_limits_lead_and_one_sided_ones_stay(sample: ModuleType) -> None:
    told = answers(sample.study(), sample.model())
    assert "(95% interval 1.14 to 1.74)" in told[0].sentence
    assert "0.90 and above, no upper limit" in told[2].sentence


def test_wald_limits_lead_where_there_is_no_profile(sample: ModuleType) -> None:
    main = sample.model()
    without = tuple(replace(one, profile=ProfileResult(None, None)) for one in main.coefficients)
    told = answers(sample.study(), replace(main, coefficients=without))
    assert "(95% interval 1.13 to 1.73)" in told[0].sentence


def test_an_exposure_in_several_columns_shows_no_odds_ratio(sample: ModuleType) -> None:
    main = sample.model()
    spline = tuple(
        sample.coefficient(f"rcs(dose, 4), column {k}", 1.5, 1.2, 1.9, term="rcs(dose, 4)", shown=False) for k in (1, 2)
    )
    (only,) = answers(sample.study(), replace(main, coefficients=spline))
    assert only.odds_ratio == ""
    assert only.sentence == (
        "rcs(dose, 4) enters the model through several columns that change together, so no single odds ratio stands "
        "for it. The likelihood-ratio test of all exposure columns together gives p = 0.005."
    )
