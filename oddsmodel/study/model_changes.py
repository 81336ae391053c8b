"""The exposure's odds ratios of each model over the results compared: a series a contrast."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from itertools import pairwise

from oddsmodel.export.saved import SavedCoefficient, SavedLimits, SavedModel, SavedResults
from oddsmodel.results.changes import ModelChanges
from oddsmodel.results.figures import EstimateMark, EstimatesFigure
from oddsmodel.results.tables import Cell, Interval, Table, TableColumn
from oddsmodel.wording import numbers, say
from oddsmodel.wording.plain import plain

CONVERGED = "converged"
MOST_FIGURES = 8
MOST_MARKS = 120
LARGEST_DRAWN = 1e12
"""An odds ratio beyond this, or under one over it, is not drawn: its axis would show nothing else."""

ModelKey = tuple[object, ...]
ContrastKey = tuple[object, ...]


@dataclass(frozen=True, slots=True)
class _Estimate:
    """One contrast in one refresh. why: why there is no odds ratio, where there is none."""

    label: str
    odds_ratio: float | None
    limits: SavedLimits | None
    why: str


def is_estimated(model: SavedModel) -> bool:
    return model.status == CONVERGED


def models_by_key(results: Sequence[SavedResults]) -> dict[ModelKey, tuple[str, list[SavedModel | None]]]:
    """The models asked for, by name, method and variant: what each is called, and what it is in each of the results."""
    found: dict[ModelKey, list[SavedModel | None]] = {}
    for place, one in enumerate(results):
        for model in one.models:
            if not model.added_by_program:
                key = (model.name, model.method, *sorted(model.variant.items()))
                found.setdefault(key, [None] * len(results))[place] = model
    times = Counter(key[0] for key in found)
    return {key: (_called(key, times[key[0]] > 1, models), models) for key, models in found.items()}


def _called(key: ModelKey, several: bool, models: Sequence[SavedModel | None]) -> str:
    """The model's name; with its method and variant where it has several."""
    model = next(one for one in models if one is not None)
    told = [model.name, model.method, *model.variant.values()] if several else [model.name]
    return plain(", ".join(told), 200)


def model_changes(results: Sequence[SavedResults], named: Sequence[str]) -> tuple[ModelChanges, ...]:
    """Each model's series, those of very many models and contrasts without a picture."""
    found = []
    for place, (name, models) in enumerate(models_by_key(results).values()):
        series = _series(results, models)
        shown = {key: one for key, one in series.items() if any(e and e.odds_ratio is not None for e in one)}
        notes = [*_cannot_be_compared(models), *_notes_on_series(results, series, shown, named)]
        figure = _figure(place, name, shown, models, named) if place < MOST_FIGURES else None
        if shown and figure is None:
            notes.append(say("series-not-drawn"))
        found.append(ModelChanges(name, figure, _table(name, shown, models, named), tuple(notes)))
    return tuple(found)


def _series(
    results: Sequence[SavedResults], models: Sequence[SavedModel | None]
) -> dict[ContrastKey, list[_Estimate | None]]:
    """The exposure's contrasts: the same term, level, reference and unit is the same contrast."""
    units = [
        {column.name: column.per for column in one.columns or ()} if all(r.columns is not None for r in results) else {}
        for one in results
    ]
    series: dict[ContrastKey, list[_Estimate | None]] = {}
    for place, model in enumerate(models):
        if model is None or not is_estimated(model):
            continue
        averaged = {one.term for one in model.averages}
        for one in (*model.coefficients, *model.averages):
            if one.role == "exposure" and (one.term not in averaged or one in model.averages):
                unit = units[place].get(one.term) if one.level is None else None
                levels = tuple(sorted((one.levels or {}).items()))
                key = (one.term, one.level, one.reference, levels, unit)
                series.setdefault(key, [None] * len(models))[place] = _estimate(model, one)
    return series


def _estimate(model: SavedModel, one: SavedCoefficient) -> _Estimate:
    why = "" if one.odds_ratio is not None else one.reasons.get("odds_ratio", say("series-no-reason"))
    limits = one.exact or (one.profile if _has_profile(model) else one.wald)
    return _Estimate(plain(one.label), one.odds_ratio, limits if one.odds_ratio is not None else None, plain(why, 300))


def _has_profile(model: SavedModel) -> bool:
    return any(limit is not None for one in model.coefficients for limit in (one.profile.lower, one.profile.upper))


def _label(series: Sequence[_Estimate | None]) -> str:
    """What the contrast was called last."""
    return next(one.label for one in reversed(series) if one is not None)


def _figure(
    place: int,
    name: str,
    shown: Mapping[ContrastKey, Sequence[_Estimate | None]],
    models: Sequence[SavedModel | None],
    named: Sequence[str],
) -> EstimatesFigure | None:
    marks = [
        _mark(_label(one), refresh, estimate, model)
        for one in shown.values()
        for estimate, refresh, model in zip(one, named, models, strict=True)
    ]
    if not marks or len(marks) > MOST_MARKS:
        return None
    told = [(mark.label, mark.series, mark.estimate, mark.lower, mark.upper) for mark in marks]
    return EstimatesFigure(
        id=f"model-{place + 1}-series",
        title=say("series-title", model=name),
        alt=say("estimates-as-shown", marks=told),
        marks=tuple(marks),
    )


def _mark(label: str, refresh: str, one: _Estimate | None, model: SavedModel | None) -> EstimateMark:
    if one is None:
        return EstimateMark(label, refresh, None, None, None, note=_missing(model))
    if one.odds_ratio is None or one.limits is None:
        return EstimateMark(label, refresh, None, None, None, note=one.why)
    if not 1 / LARGEST_DRAWN < one.odds_ratio < LARGEST_DRAWN:
        return EstimateMark(label, refresh, None, None, None, note=say("series-too-large"))
    return EstimateMark(label, refresh, one.odds_ratio, one.limits.lower or None, one.limits.upper)


def _missing(model: SavedModel | None) -> str:
    """Why a refresh has no such contrast."""
    if model is None:
        return say("series-no-model")
    return say("series-no-contrast" if is_estimated(model) else "series-not-estimated")


def _table(
    name: str,
    shown: Mapping[ContrastKey, Sequence[_Estimate | None]],
    models: Sequence[SavedModel | None],
    named: Sequence[str],
) -> Table | None:
    """A row a refresh of each contrast."""
    if not shown:
        return None
    levels = list(dict.fromkeys(model.level for model in models if model is not None))
    percent = numbers.listed([say("level", level=level) for level in levels], "or")
    columns = (
        TableColumn("contrast", say("column-exposure")),
        TableColumn("refresh", say("column-refresh")),
        TableColumn("odds_ratio", say("column-odds-ratio"), "odds_ratio"),
        TableColumn("interval", say("column-interval", percent=percent), "interval"),
    )
    rows: list[tuple[Cell, ...]] = []
    blocks: list[int] = []
    for number, one in enumerate(shown.values()):
        for estimate, refresh, model in zip(one, named, models, strict=True):
            if estimate is None:
                cells: tuple[Cell, ...] = (None, _missing(model))
            elif estimate.odds_ratio is None or estimate.limits is None:
                cells = (None, estimate.why)
            else:
                cells = (estimate.odds_ratio, Interval(estimate.limits.lower, estimate.limits.upper))
            rows.append((_label(one), refresh, *cells))
            blocks.append(number)
    return Table("series", say("series-table", model=name), columns, tuple(rows), blocks=tuple(blocks))


def _cannot_be_compared(models: Sequence[SavedModel | None]) -> Iterator[str]:
    met = [one for one in models if one is not None]
    if any(set(one.adjustment) != set(other.adjustment) for one, other in pairwise(met)):
        yield say("series-other-adjustment")
    elif any(one.formula != other.formula for one, other in pairwise(met)):
        yield say("series-other-formula")
    if any(one.level != other.level for one, other in pairwise(met)):
        yield say("series-other-level")


def _notes_on_series(
    results: Sequence[SavedResults],
    series: Mapping[ContrastKey, Sequence[_Estimate | None]],
    shown: Mapping[ContrastKey, Sequence[_Estimate | None]],
    named: Sequence[str],
) -> Iterator[str]:
    hidden = [_label(one) for key, one in series.items() if key not in shown]
    if hidden:
        yield say("series-none", labels=hidden)
    if any(key[-1] == "SD" for key in shown):
        yield say("series-own-deviation")
    if len({one.schema_version for one in results}) > 1 and any(one.columns is None for one in results):
        yield say("series-units-unknown")
    for one in shown.values():
        for (earlier, later), (before, after) in zip(pairwise(one), pairwise(named), strict=True):
            if earlier is not None and later is not None and _outside(later.odds_ratio, earlier.limits):
                yield say("series-moved", label=_label(one), before=before, after=after)


def _outside(odds_ratio: float | None, limits: SavedLimits | None) -> bool:
    """Whether an estimate lies beyond the limits that an earlier interval has."""
    if odds_ratio is None or limits is None:
        return False
    below = limits.lower is not None and odds_ratio < limits.lower
    return below or (limits.upper is not None and odds_ratio > limits.upper)
