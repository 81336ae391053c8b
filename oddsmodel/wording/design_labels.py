"""What a coefficient is called: "Smoking: current against never", "Age, per 10 years"."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from oddsmodel.wording.say import Sentence

SINGULAR = {
    "years": "year",
    "months": "month",
    "weeks": "week",
    "days": "day",
    "hours": "hour",
    "minutes": "minute",
    "points": "point",
    "units": "unit",
    "cigarettes": "cigarette",
    "packs": "pack",
    "drinks": "drink",
    "steps": "step",
    "visits": "visit",
    "grams": "gram",
    "kilograms": "kilogram",
    "metres": "metre",
    "centimetres": "centimetre",
    "millimetres": "millimetre",
}
PARTS = ("constant", "linear", "quadratic", "cubic")


def _step(per: float, units: str | None) -> str:
    """ "10 years", "1 year", "0.5 kg/m²", "1 unit", "5 units"."""
    size = f"{per:.6g}"
    if not units:
        return f"{size} unit" if per == 1 else f"{size} units"
    return f"{size} {SINGULAR.get(units, units) if per == 1 else units}"


def _number(facts: Mapping[str, Any]) -> str:
    return f"{facts['label']}, per {_step(facts['per'], facts['units'])}"


def _deviation(facts: Mapping[str, Any]) -> str:
    deviation = float(f"{facts['deviation']:.3g}")
    return f"{facts['label']}, per standard deviation ({_step(deviation, facts['units'])})"


def _level(facts: Mapping[str, Any]) -> str:
    against = f" against {facts['reference']}" if facts["reference"] is not None else ""
    return f"{facts['label']}: {facts['level']}{against}"


def _polynomial(facts: Mapping[str, Any]) -> str:
    degree = facts["degree"]
    return f"{facts['label']} ({PARTS[degree] + ' part' if degree < len(PARTS) else f'part of degree {degree}'})"


LABELS: dict[str, Sentence] = {
    "label-intercept": "Intercept",
    "label-number": _number,
    "label-deviation": _deviation,
    "label-level": _level,
    "label-against-mean": "{label}: {level} against the mean of all levels",
    "label-mean": "{label}: mean of all levels",
    "label-polynomial": _polynomial,
    "label-spline-part": "{label} (spline part {part})",
    "label-log": "{label}, per unit of its natural logarithm",
    "label-log2": "{label}, per doubling",
    "label-log10": "{label}, per tenfold increase",
    "label-computed": "{term}, per 1",
}
