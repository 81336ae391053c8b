"""Several models of one study side by side: each exposure's odds ratio under each model."""

from __future__ import annotations

from collections.abc import Sequence

from oddsmodel.measures.intervals import interval_of
from oddsmodel.results.figures import EstimateMark, EstimatesFigure
from oddsmodel.results.lead import exposures_shown
from oddsmodel.results.study import CoefficientResult, ModelResult
from oddsmodel.results.tables import Cell, Interval, Table, TableColumn
from oddsmodel.wording import say

Key = tuple[str, str | None, str | None, str]


def compare_models(models: Sequence[ModelResult]) -> Table | None:
    """A row for each exposure coefficient and model, coefficients in blocks; None with fewer than two models.

    Where the plan says what a model builds upon, its role or whether it was planned, the models stand in blocks, with
    that and what sets them apart in words. A model that was not estimated, or that has no such coefficient, has a row
    with its records and an empty estimate; the note says why.
    """
    if len(models) < 2:
        return None
    described = any(map(_is_described, models))
    exposures = _exposures(models)
    pairs = [(key, model) for key in exposures for model in models]
    if described:
        pairs = [(key, model) for model in models for key in exposures]
    rows: list[tuple[Cell, ...]] = []
    notes: dict[str, None] = {}
    for key, model in pairs:
        label, coefficient = exposures[key], _keyed(model).get(key)
        start = (model.name, _description(model), label) if described else (label, model.name)
        limits = None if coefficient is None else interval_of(coefficient)
        odds_ratio = None if coefficient is None else coefficient.odds_ratio
        if odds_ratio is None:
            notes[_why_missing(model, exposures, key)] = None
        rows.append((*start, model.records, model.events, odds_ratio, limits))
    levels = sorted({round(100 * model.level, 1) for model in models})
    text = " and ".join(f"{level:g}%" for level in levels)
    if any(model.role == "subgroup" for model in models):
        notes[say("compare-models-subgroups")] = None
    if any(model.planned is False for model in models):
        notes[say("compare-models-not-planned")] = None
    if len({model.records for model in models}) > 1:
        notes[say("compare-models-different-records")] = None
    exact = any(one.exact is not None for model in models for one in model.coefficients)
    note = " ".join([say("compare-models-note", levels=text, exact=exact), *notes])
    size = len(exposures) if described else len(models)
    blocks = tuple(place // size for place in range(len(rows)))
    return Table("models", "The models side by side", _columns(described), tuple(rows), note, blocks)


def _columns(described: bool) -> tuple[TableColumn, ...]:
    exposure, model = TableColumn("exposure", "Exposure"), TableColumn("model", "Model")
    what = TableColumn("description", "What it is", said_once=True)
    return (
        *((model, what, exposure) if described else (exposure, model)),
        TableColumn("records", "Records", "count"),
        TableColumn("events", "Events", "count", part_of="records"),
        TableColumn("odds_ratio", "Odds ratio", "odds_ratio", hidden_with=("records", "events")),
        TableColumn("interval", "Interval", "interval", hidden_with=("records", "events")),
    )


def models_figure(models: Sequence[ModelResult]) -> EstimatesFigure | None:
    """The same odds ratios on one axis, a series for each model; None with fewer than two models."""
    if len(models) < 2:
        return None
    marks = []
    for key, label in _exposures(models).items():
        for model in models:
            coefficient = _keyed(model).get(key)
            limits = None if coefficient is None else interval_of(coefficient)
            lower, upper = (limits.lower, limits.upper) if isinstance(limits, Interval) else (None, None)
            if coefficient is None or (coefficient.odds_ratio, lower, upper) == (None, None, None):
                continue
            marks.append(EstimateMark(label, model.name, coefficient.odds_ratio, lower, upper))
    if not marks:
        return None
    title = "Odds ratios under each model"
    return EstimatesFigure("models", title, say("compare-models-alt", models=[m.name for m in models]), tuple(marks))


def _is_described(model: ModelResult) -> bool:
    """Whether the plan says more of a model than its formula: a base, a role, whether it was planned."""
    stated = model.role in ("sensitivity", "subgroup")
    return stated or model.based_on is not None or model.planned is not None


def _description(model: ModelResult) -> str:
    """The model's role, whether it was planned, and what sets it apart from the others."""
    parts = [say("model-role-said", role=model.role, planned=model.planned)]
    if model.added_by_program:
        parts = [say("model-added-said")]
    if model.based_on is None:
        parts.append(f"{say('model-adjusted-for', adjustment=list(model.adjustment_labels))}.")
    if model.differs:
        parts.append(f"{model.differs}.")
    return " ".join(parts)


def _keyed(model: ModelResult) -> dict[Key, CoefficientResult]:
    """The exposure coefficients that are shown, by what tells them apart."""
    return {(one.term, one.level, one.reference, one.label): one for one in exposures_shown(model)}


def _exposures(models: Sequence[ModelResult]) -> dict[Key, str]:
    """Every exposure coefficient that some model shows, in the order of the models, with its label."""
    return {key: one.label for model in models for key, one in _keyed(model).items()}


def _why_missing(model: ModelResult, exposures: dict[Key, str], key: Key) -> str:
    """Why the model's row is empty; of all the exposures that the model does not have, one sentence."""
    keyed = _keyed(model)
    label, coefficient = exposures[key], keyed.get(key)
    if coefficient is not None and interval_of(coefficient) is not None:
        # without its limit, which stands in the row and may be withheld there
        return say("compare-models-one-sided", model=model.name, label=label)
    if coefficient is not None:
        reason = coefficient.reasons.get("odds_ratio", say("odds-ratio-out-of-range"))
        return say("compare-models-withheld", model=model.name, label=label, reason=reason)
    if model.status != "converged":
        return say("compare-models-not-estimated", model=model.name, status=model.status)
    labels = [one for other, one in exposures.items() if other not in keyed]
    return say("compare-models-not-in-model", model=model.name, labels=labels)
