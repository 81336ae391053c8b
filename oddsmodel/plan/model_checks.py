"""What must hold between the models of a plan: which builds upon which, and what only some columns can be asked for."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from itertools import pairwise
from typing import Any

from oddsmodel.errors import Fault
from oddsmodel.plan.examples import example
from oddsmodel.plan.faults import fault
from oddsmodel.plan.nearest import nearest
from oddsmodel.plan.schema import ColumnSection, Method, ModelSection, Prior
from oddsmodel.wording.plain import quoted

At = Any
"""Where a key stands, from its location: `Parts.at`."""

WRITTEN_OUT = ("formula", "exposures")
CHANGES = ("add", "leave_out")


def check_models(models: Mapping[int, ModelSection], written: Sequence[Any], at: At) -> Iterator[Fault]:
    """The faults of models that build upon others. written: all models as the plan has them, valid or not."""
    names = [model.get("name") if isinstance(model, dict) else None for model in written]
    settled = methods(models)
    for position, model in models.items():
        given = written[position] if isinstance(written[position], dict) else {}
        if model.based_on is None:
            yield from _alone(position, given, at)
        else:
            yield from _base(position, model.based_on, names, written, at)
            if "formula" in given:
                for key in CHANGES:
                    if key in given:
                        yield fault("changes-beside-formula", at("models", position, key), key=key)
        for key, terms in (("add", model.add), ("leave_out", model.leave_out)):
            yield from _repeated(terms, at("models", position, key), "change-repeated", "term")
        yield from _repeated(model.trend, at("models", position, "trend"), "trend-repeated", "column")
        yield from _method(position, model, given, settled, at)
        if position == 0 and model.role is not None:
            yield fault("role-of-the-first", at("models", position, "role"))


def methods(models: Mapping[int, ModelSection]) -> dict[int, tuple[Method | None, Prior | None]]:
    """Each model's method and prior with what it takes from its base; a base that is no earlier model gives nothing.

    A prior belongs to the method log-F and is inherited with it alone.
    """
    places = {model.name: position for position, model in sorted(models.items(), reverse=True)}
    found: dict[int, tuple[Method | None, Prior | None]] = {}
    for position, model in sorted(models.items()):
        base = found.get(places.get(model.based_on, -1), (None, None)) if model.based_on else (None, None)
        method = model.method or base[0]
        prior = model.prior if model.prior is not None or method != "log-F" else base[1]
        found[position] = method, prior
    return found


def _method(
    position: int,
    model: ModelSection,
    given: Mapping[str, Any],
    settled: Mapping[int, tuple[Method | None, Prior | None]],
    at: At,
) -> Iterator[Fault]:
    """A prior and the method that uses it belong together. given: the model as written, with keys at fault."""
    method, prior = settled[position]
    if model.method == "log-F" and prior is None and "prior" not in given:
        yield fault("log-f-without-prior", at("models", position, "method"))
    if model.prior is not None:
        where = at("models", position, "prior")
        if method != "log-F":
            yield fault("prior-without-log-f", where)
        if not model.prior.columns:
            yield fault("prior-of-no-column", where)
        yield from _repeated(model.prior.columns, where, "trend-repeated", "column")


def _alone(position: int, given: Mapping[str, Any], at: At) -> Iterator[Fault]:
    """A model without a base needs all of its own, unless a key that is at fault itself was to give it."""
    if "based_on" not in given:
        for key in WRITTEN_OUT:
            if key not in given:
                yield fault("key-missing", at("models", position), key=key, example=example(("models", position, key)))
        for key in CHANGES:
            if key in given:
                yield fault("changes-without-base", at("models", position, key), key=key)


def _base(position: int, base: str, names: Sequence[Any], written: Sequence[Any], at: At) -> Iterator[Fault]:
    where = at("models", position, "based_on")
    if base == names[position]:
        yield fault("based-on-itself", where)
    elif base not in names:
        others = [name for name in names[:position] if isinstance(name, str)]
        near = nearest(base, others)
        facts = {"nearest": None if near is None else quoted(near), "valid": [quoted(name) for name in others]}
        yield fault("based-on-unknown", where, base=quoted(base), otherwise="No model stands before it.", **facts)
    elif names.index(base) > position:
        circle = _circle(position, names, written)
        if circle:
            yield fault("based-on-circle", where, names=" → ".join(quoted(name) for name in circle))
        else:
            yield fault("based-on-later", where, base=quoted(base))


def _circle(position: int, names: Sequence[Any], written: Sequence[Any]) -> list[str]:
    """The names of the models that lead back to this one, itself first and last; empty where they do not."""
    way = [position]
    while True:
        model = written[way[-1]]
        base = model.get("based_on") if isinstance(model, dict) else None
        if not isinstance(base, str) or base not in names:
            return []
        following = names.index(base)
        if following == position:
            return [names[place] for place in (*way, position)]
        if following in way:
            return []
        way.append(following)


def _repeated(words: Sequence[str], where: str, code: str, fact: str) -> Iterator[Fault]:
    for word in dict.fromkeys(word for word in words if words.count(word) > 1):
        yield fault(code, where, **{fact: quoted(word)})


def check_column(name: str, column: ColumnSection, models: Mapping[int, ModelSection], at: At) -> Iterator[Fault]:
    """The faults of a column's scores and of what its levels are compared with."""
    if column.scores is not None:
        where = at("columns", name, "scores")
        scores = column.scores
        if column.kind not in (None, "ordered"):
            yield fault("scores-kind", where, kind=column.kind)
        elif column.levels is not None and len(scores) != len(column.levels):
            yield fault("scores-number", where, scores=len(scores), levels=len(column.levels))
        if not all(map(math.isfinite, scores)) or any(after <= before for before, after in pairwise(scores)):
            yield fault("scores-not-rising", where)
    if column.compare_with == "network average":
        where = at("columns", name, "compare_with")
        if column.kind not in (None, "category"):
            yield fault("average-kind", where, kind=column.kind)
        elif not any(name in model.exposures for model in models.values()):
            yield fault("average-not-an-exposure", where, column=quoted(name))
