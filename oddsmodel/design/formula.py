"""The door of every formula: vetted on its syntax tree, bounded in size, and never run."""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import dataclass

from oddsmodel.design.expansion import Expander, Term
from oddsmodel.design.factors import Factor
from oddsmodel.design.faults import formula_fault, piece
from oddsmodel.design.names import ColumnNames, same_text
from oddsmodel.design.syntax import Call, Name, Node, Text, parse
from oddsmodel.design.vetting import Vetter


@dataclass(frozen=True, slots=True)
class VettedFormula:
    """A formula that holds nothing but terms of record columns.

    text: as it was written. factors: those of the terms, in order. terms: in the order written, each the places of
    its factors. intercept: whether there is one. where: the place of the formula, for faults found later.
    """

    text: str
    factors: tuple[Factor, ...]
    terms: tuple[Term, ...]
    intercept: bool
    where: str

    @property
    def columns(self) -> tuple[str, ...]:
        """The record columns used, each once, in order."""
        return tuple(dict.fromkeys(column for factor in self.factors for column in factor.columns))


def vet_formula(text: str, *, columns: Collection[str], outcome: str, where: str) -> VettedFormula:
    """The formula as vetted terms, or InputFault with a fault for every term that is wrong.

    columns: the names of the records (the outcome may be among them). outcome: the only name that may stand on the
    left side. where: the key of the formula in the plan. The language is patsy's: names, Q("any name"),
    + - : * / ** and parentheses, 0 and 1, C with a contrast and levels, I of arithmetic, log log2 log10 exp sqrt
    (also as np.log and so on), center, standardize, bs, cr, cc, and beside them rcs(x, k) and cut(x, [edges]).
    Whatever text is given, the answer comes in bounded time and nothing in it is evaluated.
    """
    tree = parse(text, where, columns)
    if tree.left is not None:
        _left_side(tree.left, outcome, where)
    expander = Expander(Vetter(ColumnNames(columns, outcome, where)))
    expansion = expander.expand(tree.right)
    if not expansion.terms and expansion.removed:
        raise formula_fault("formula-no-terms", where, tree.at)
    met = tuple(expander.numbers)
    used = sorted({number for term in expansion.terms for number in term})
    place = {number: place for place, number in enumerate(used)}
    terms = tuple(tuple(place[number] for number in term) for term in expansion.terms)
    return VettedFormula(text, tuple(met[number] for number in used), terms, not expansion.removed, where)


def outcome_named(text: str, columns: Collection[str], where: str) -> str | None:
    """The column that stands left of the ~ of a formula; None where none does. InputFault as of `vet_formula`."""
    left = parse(text, where, columns).left
    return None if left is None else _column_name(left)


def _column_name(node: Node) -> str | None:
    """The name of a column, bare or in Q("..."); None for anything else."""
    if isinstance(node, Call) and node.function == "Q" and len(node.arguments) == 1 and not node.keywords:
        quoted = node.arguments[0]
        return quoted.value if isinstance(quoted, Text) else None
    return node.name if isinstance(node, Name) else None


def _left_side(node: Node, outcome: str, where: str) -> None:
    name = _column_name(node)
    if name is None or not same_text(name, outcome):
        written = piece(name) if name is not None else ""
        raise formula_fault("formula-left-side", where, node.at, written=written, outcome=piece(outcome))
