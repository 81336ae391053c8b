"""Sentences that answer the question: direction, size, interval, and what the records are compatible with."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from oddsmodel.wording.numbers import count, interval, listed, plural, ratio
from oddsmodel.wording.say import Sentence

YES = frozenset({"yes", "y", "true", "1", "event", "case"})
CASE_CONTROL = ("case-control", "matched case-control")
AVERAGE = "the network average"
WIDE = 3.0
NARROW = 1.25


def outcome_words(label: str, event: str) -> str:
    """The outcome as it stands in a sentence; its value is told unless it only says "yes"."""
    return f"“{label}”" if event.strip().lower() in YES or event == label else f"“{label}: {event}”"


def _as_change(value: float) -> str:
    """An odds ratio between a half and two as a change of the odds: "13% lower", "52% higher"."""
    percent = round(100 * (value - 1.0))
    if percent == 0:
        return "about the same"
    return f"{abs(percent)}% {'higher' if percent > 0 else 'lower'}"


def _span(lower: float, upper: float) -> str:
    """Both limits told alike: as changes where both are between a half and two, else as times."""
    if lower > 0.5 and upper < 2.0:
        return f"from {_as_change(lower)} to {_as_change(upper)}"
    return f"from {ratio(lower)} to {ratio(upper)} times as high"


def _direction(value: float) -> str:
    if ratio(value) == "1.00":
        return "about the same"
    return "higher" if value > 1.0 else "lower"


def _who(facts: Mapping[str, Any]) -> str:
    """Whose odds, of what, compared with whom: the beginning of the sentence, by design."""
    outcome, design = facts["outcome"], facts["design"]
    stepwise = facts["reference"] in (None, AVERAGE)
    if design in CASE_CONTROL and not stepwise:
        return f"the odds of “{facts['level']}” rather than “{facts['reference']}” among cases were"
    if design in CASE_CONTROL:
        return f"the odds of being a case ({outcome}) were"
    if design == "cross-sectional":
        return f"the odds of {outcome} at the time of recording were"
    if design == "trial":
        return f"the odds of {outcome} after allocation were"
    return f"the odds of {outcome} were"


def _compared(facts: Mapping[str, Any]) -> str:
    if facts["reference"] is None:
        return "for each such step"
    if facts["reference"] == AVERAGE:
        return AVERAGE
    return "those among controls" if facts["design"] in CASE_CONTROL else f"those with “{facts['reference']}”"


def _answer(facts: Mapping[str, Any]) -> str:
    value = facts["odds_ratio"]
    limits = f"{facts['percent']} interval {interval(facts['lower'], facts['upper'])}"
    adjusted = "" if facts["adjusted"] else ", not adjusted"
    start = _who(facts)
    start = start[0].upper() + start[1:]
    direction = _direction(value)
    if direction == "about the same":
        compared = "for each such step" if facts["reference"] is None else f"as {_compared(facts)}"
        return f"{start} about the same {compared}: odds ratio {ratio(value)} ({limits}{adjusted})."
    times = f"{ratio(value)} times {_compared(facts)}"
    if facts["reference"] is None:
        times = f"{ratio(value)} times as high {_compared(facts)}"
    return f"{start} {direction}: {times} ({limits}{adjusted})."


def one_sided(lower: float | None, upper: float | None) -> str:
    """The one limit there is of an odds ratio without an estimate."""
    if lower is None:
        return "no estimate" if upper is None else f"at most {ratio(upper)}"
    return f"at least {ratio(lower)}"


def _answer_no_finite(facts: Mapping[str, Any]) -> str:
    """One limit, and no estimate."""
    above = facts["lower"] is not None
    limit = facts["lower"] if above else facts["upper"]
    start = _who(facts)
    settled = limit > 1.0 if above else limit < 1.0
    direction = f" {'higher' if above else 'lower'}:" if settled else ""
    size = "times as high for each such step" if facts["reference"] is None else f"times {_compared(facts)}"
    adjusted = "" if facts["adjusted"] else ", not adjusted"
    limited = one_sided(facts["lower"], facts["upper"])
    middle = "" if facts["median"] is None else f" The median-unbiased estimate is {ratio(facts['median'])}."
    return (
        f"{start[0].upper()}{start[1:]}{direction} {limited} {size} (the one limit of the {facts['percent']} "
        f"interval{adjusted}). There is no finite estimate: the {'higher' if above else 'lower'} the odds ratio is "
        f"taken to be, the better it fits these records.{middle}"
    )


def _beside(facts: Mapping[str, Any]) -> str:
    limits = f"{facts['percent']} interval {interval(facts['lower'], facts['upper'])}"
    value = ratio(facts["odds_ratio"])
    return f"By penalised likelihood, which always has an answer, the odds ratio is {value} ({limits})."


def _compatible(facts: Mapping[str, Any]) -> str:
    lower, upper = facts["lower"], facts["upper"]
    if lower is None and upper is None:
        return "No limits can be given, so the records leave the size open."
    if upper is None:
        return f"The records are compatible with odds ratios from {ratio(lower)} upwards; they set no upper limit."
    if lower is None:
        return f"The records are compatible with odds ratios up to {ratio(upper)}; they set no lower limit."
    span = _span(lower, upper)
    if lower <= 1.0 <= upper:
        if upper / lower <= NARROW:
            return f"The odds that the records are compatible with lie close together, {span}; the direction is open."
        words = f"The records are compatible with odds {span}: they leave the direction open."
        if upper / lower > WIDE:
            words += " The interval is wide; it is no evidence that the odds are alike."
        return words
    words = f"The records are compatible with odds {span}"
    return f"{words}; the interval is wide, so the size is uncertain." if upper / lower > WIDE else f"{words}."


def _basis(facts: Mapping[str, Any]) -> str:
    nothing = "Adjusted for nothing else" if facts["mutually"] else "Not adjusted for anything"
    words = f"Adjusted for {listed(facts['adjustment'])}" if facts["adjustment"] else nothing
    if facts["mutually"]:
        words += "; the exposures are mutually adjusted, each for the others"
    if facts["records"] is not None:
        words += f". {plural(facts['records'], 'record')}"
        if facts["events"] is not None:
            many = "cases" if facts["design"] in CASE_CONTROL else "with the event"
            words += f", {count(facts['events'])} {many}"
    return f"{words}."


def _several_columns(facts: Mapping[str, Any]) -> str:
    words = (
        f"{facts['labels']} enters the model through several columns that change together, so no single odds ratio "
        "stands for it"
    )
    p = facts["p"]
    if not p:
        return f"{words}."
    p = p if p.startswith(("under", "over")) else f"= {p}"
    return f"{words}. The likelihood-ratio test of all exposure columns together gives p {p}."


SENTENCES: dict[str, Sentence] = {
    "answer": _answer,
    "answer-no-finite": _answer_no_finite,
    "answer-beside": _beside,
    "at-limit": lambda facts: one_sided(facts["lower"], facts["upper"]),
    "answer-beside-link": "All of that model",
    "measure-no-finite": "{measure}, without a finite estimate",
    "compatible": _compatible,
    "answer-basis": _basis,
    "answer-no-estimate": "No odds ratio can be shown: {reason}",
    "answer-several-columns": _several_columns,
    "answer-not-estimated": (
        "The model that was to answer this question, “{name}”, could not be estimated. No number stands in its place; "
        "what stood in the way is told below."
    ),
    "answer-no-model": "No model was estimated, so the question is not answered here.",
    "answer-more": "The other contrasts, {number} in all, are in the picture and among the estimates.",
    "answer-case-control": (
        "Cases and controls were sampled apart, so this report says nothing of how common {outcome} is."
    ),
    "answer-no-reason": "it was withheld.",
    "measure-adjusted": "adjusted odds ratio",
    "measure-unadjusted": "odds ratio, not adjusted",
}
