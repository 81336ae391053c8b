"""Models that build upon others, written out: each becomes a plain model with its own formula and conditions."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass

from oddsmodel.design.formula import VettedFormula, vet_formula
from oddsmodel.errors import Fault, InputFault
from oddsmodel.plan.faults import fault
from oddsmodel.plan.nearest import nearest
from oddsmodel.plan.schema import Method, ModelSection
from oddsmodel.records.types import Column
from oddsmodel.wording import say
from oddsmodel.wording.plain import quoted

ON_THEIR_OWN_RECORDS = ("sensitivity", "subgroup")
INHERITED = ("exposures", "level", "same_records", "method")
LIKELIHOOD: Method = "maximum likelihood"

Terms = dict[frozenset[str], str]
"""The terms of a formula in order: their factors, and the term in the formula's own words."""


@dataclass(frozen=True)
class WrittenOut:
    """A model without a base: `section` says all of it. differs: what sets it apart from its base, in words."""

    section: ModelSection
    differs: str


def write_out(
    sections: Sequence[ModelSection], columns: Mapping[str, Column], outcome: str
) -> tuple[tuple[WrittenOut, ...], list[Fault]]:
    """The models of a plan with nothing left to look up, and the faults of those that cannot be written out.

    sections: in the plan's order, bases before what builds upon them. A model has its base's formula, exposures, level
    and `keep`; its own formula, exposures and level stand in their place, its own `keep` must hold beside the base's,
    and `add` and `leave_out` take effect on the base's formula term by term. A sensitivity or subgroup model, and one
    with a `keep` of its own beside the base's, is on its own complete records unless it says otherwise
    (`same_records`): what it asks for then leaves out no record of the other models. Roles, reasons and trends are
    not inherited.
    """
    found: dict[str, ModelSection] = {}
    told: list[WrittenOut] = []
    faults: list[Fault] = []
    for section in sections:
        base = None if section.based_on is None else found.get(section.based_on)
        # The base has faults of its own.
        if base is None and section.based_on is not None:
            continue
        try:
            formula, added, taken = _formula(section, base, columns, outcome)
        except InputFault as caught:
            faults.extend(caught.faults)
            continue
        whole = _inheriting(section, base, formula)
        found[section.name] = whole
        told.append(WrittenOut(whole, _differs(section, base, whole, columns, added, taken)))
    return tuple(told), faults


def _inheriting(section: ModelSection, base: ModelSection | None, formula: str) -> ModelSection:
    given = section.model_fields_set
    changes: dict[str, object] = {"formula": formula, "based_on": section.based_on, "add": (), "leave_out": ()}
    if base is not None:
        changes |= {key: getattr(base, key) for key in INHERITED if key not in given}
        # a prior belongs to the method log-F alone
        if "prior" not in given and "log-F" in (section.method, changes.get("method")):
            changes["prior"] = base.prior
        if base.keep is not None:
            changes["keep"] = base.keep if section.keep is None else f"({base.keep}) and ({section.keep})"
    apart = section.role in ON_THEIR_OWN_RECORDS or (base is not None and section.keep is not None)
    if apart and "same_records" not in given:
        changes["same_records"] = False
    return section.model_copy(update=changes)


def _formula(
    section: ModelSection, base: ModelSection | None, columns: Mapping[str, Column], outcome: str
) -> tuple[str, Terms, Terms]:
    """The formula in full, with the terms added to the base's and those taken from it."""
    if base is None or section.formula:
        return section.formula, {}, {}
    if not (section.add or section.leave_out):
        return base.formula, {}, {}
    start = vet_formula(base.formula, columns=columns, outcome=outcome, where=_where(base, "formula"))
    before = _terms(start)
    added: Terms = {}
    taken: Terms = {}
    faults: list[Fault] = []
    for key, texts, change in (("add", section.add, added), ("leave_out", section.leave_out, taken)):
        for number, text in enumerate(texts):
            where = f"{_where(section, key)}, item {number + 1}"
            try:
                asked = vet_formula(text, columns=columns, outcome=outcome, where=where)
            except InputFault as caught:
                faults.extend(caught.faults)
                continue
            found = list(_faults_of_change(key, text, asked, before, where))
            faults.extend(found)
            if not found:
                change.update({factors: words for factors, words in _terms(asked).items() if factors not in change})
    kept = {factors: words for factors, words in before.items() if factors not in taken}
    added = {factors: words for factors, words in added.items() if factors not in kept}
    faults.extend(_left_within(taken, kept | added, _where(section, "leave_out")))
    if faults:
        raise InputFault(faults)
    return _written(base.formula, start.intercept, [*kept.values(), *added.values()]), added, taken


def _faults_of_change(key: str, text: str, asked: VettedFormula, before: Terms, where: str) -> Iterator[Fault]:
    terms = _terms(asked)
    if not asked.intercept:
        yield fault("change-of-the-intercept", where, term=quoted(text))
    elif not terms:
        yield fault("add-nothing", where, term=quoted(text))
    elif key == "add" and terms.keys() <= before.keys():
        yield fault("add-already-there", where, term=quoted(text))
    elif key == "leave_out":
        for factors, words in terms.items():
            if factors not in before:
                near = _nearest_term(words, asked.columns, before)
                yield fault(
                    "leave-out-not-there",
                    where,
                    term=quoted(words),
                    nearest=None if near is None else quoted(near),
                    valid=[quoted(term) for term in before.values()],
                    otherwise="It holds no term.",
                )


def _nearest_term(words: str, sources: Sequence[str], terms: Terms) -> str | None:
    """The term most like some words, or else the first that is made of the same columns."""
    near = nearest(words, terms.values())
    if near is None:
        near = next((term for term in terms.values() if any(source in term for source in sources)), None)
    return near


def _left_within(taken: Terms, left: Terms, where: str) -> Iterator[Fault]:
    for factors, words in taken.items():
        product = next((term for larger, term in left.items() if factors < larger), None)
        if product is not None:
            yield fault("leave-out-within-product", where, term=quoted(words), product=quoted(product))


def _terms(formula: VettedFormula) -> Terms:
    texts = [factor.text for factor in formula.factors]
    return {
        frozenset(texts[place] for place in term): ":".join(texts[place] for place in term) for term in formula.terms
    }


def _written(base: str, intercept: bool, terms: Sequence[str]) -> str:
    left, tilde, _ = base.partition("~")
    right = " + ".join([*([] if intercept else ["0"]), *terms]) or "1"
    return f"{left.strip()} ~ {right}" if tilde else right


def _differs(
    section: ModelSection,
    base: ModelSection | None,
    whole: ModelSection,
    columns: Mapping[str, Column],
    added: Terms,
    taken: Terms,
) -> str:
    def named(names: Sequence[str]) -> list[str]:
        return [columns[name].label if name in columns else name for name in names]

    return say(
        "what-differs",
        base=None if base is None else base.name,
        added=named(list(added.values())),
        taken=named(list(taken.values())),
        keep=section.keep,
        exposures=named(whole.exposures) if base is not None and whole.exposures != base.exposures else [],
        formula=section.formula if base is not None else "",
        percent=f"{100 * whole.level:g}%" if base is not None and whole.level != base.level else "",
        method=_way(whole) if base is not None and _way(whole) != _way(base) else "",
        prior=_prior_named(whole, named) if base is not None and whole.prior != base.prior else None,
    )


def _way(section: ModelSection) -> Method:
    return section.method or LIKELIHOOD


def _prior_named(section: ModelSection, named: Callable[[Sequence[str]], list[str]]) -> tuple[float, list[str]] | None:
    return None if section.prior is None else (section.prior.m, named(section.prior.columns))


def _where(section: ModelSection, key: str) -> str:
    return f"the plan, [[models]] {quoted(section.name)} {key}"
