"""Terms of a formula: what + - : * / ** make of factors (Wilkinson & Rogers 1973), as patsy has it, within bounds."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from oddsmodel.design.factors import Factor
from oddsmodel.design.faults import formula_fault, piece
from oddsmodel.design.syntax import Binary, Node, Number, Sign, Sum
from oddsmodel.design.vetting import Vetter
from oddsmodel.errors import Fault, InputFault

MOST_TERMS = 500
MOST_FACTORS_IN_TERM = 6
MOST_COMBINATIONS = 100_000
MOST_FAULTS = 10

Term = tuple[int, ...]
"""Numbers of factors in the order written, each once; two terms are the same when they hold the same factors."""


@dataclass(frozen=True, slots=True)
class Expansion:
    """intercept: 1 stands in it. removed: 0 or - 1 stands in it. terms: in order, each once."""

    terms: tuple[Term, ...]
    intercept: bool = False
    removed: bool = False


class Expander:
    """Walks the tree of a formula's right side. Every step is bounded before it is taken.

    numbers: each factor met and its number.
    """

    def __init__(self, vetter: Vetter) -> None:
        self.vetter, self.where = vetter, vetter.where
        self.numbers: dict[Factor, int] = {}
        self.combinations = 0

    def expand(self, node: Node) -> Expansion:
        """The terms of a node; InputFault with the faults of every item of the outermost sum together."""
        if isinstance(node, Sum):
            return self.sum(node)
        if isinstance(node, Number):
            return self.constant("+", node)
        if isinstance(node, Sign):
            raise self.fault("formula-sign", node)
        if isinstance(node, Binary):
            return self.power(node) if node.operator == "**" else self.product(node)
        number = self.numbers.setdefault(self.vetter.factor(node), len(self.numbers))
        return Expansion(((number,),))

    def words(self, term: Term) -> str:
        """The term in the formula's own words."""
        factors = tuple(self.numbers)
        return piece(":".join(factors[number].text for number in term))

    def sum(self, node: Sum) -> Expansion:
        items: list[tuple[str, Node, Expansion]] = []
        faults: list[Fault] = []
        for sign, item in node.items:
            try:
                constant = isinstance(item, Number)
                items.append((sign, item, self.constant(sign, item) if constant else self.expand(item)))
            except InputFault as fault:
                faults.extend(fault.faults)
                if len(faults) >= MOST_FAULTS:
                    break
        if faults:
            raise InputFault(faults)
        return self.added(items)

    def added(self, items: list[tuple[str, Node, Expansion]]) -> Expansion:
        terms: dict[frozenset[int], Term] = {}
        intercept = removed = False
        for place, (sign, node, found) in enumerate(items):
            constant = isinstance(node, Number)
            if found.removed and not constant and place:
                raise self.fault("formula-zero-in-parentheses", node)
            if sign == "-" and not constant:
                if not place:
                    raise self.fault("formula-sign", node)
                self.take_away(terms, found, node)
                removed, intercept = removed or found.intercept, intercept and not found.intercept
                continue
            if found.intercept or found.removed:
                intercept, removed = found.intercept, found.removed
            for term in found.terms:
                terms.setdefault(frozenset(term), term)
        return Expansion(self.bounded(terms.values(), items[-1][1]), intercept, removed)

    def take_away(self, terms: dict[frozenset[int], Term], found: Expansion, node: Node) -> None:
        for term in found.terms:
            if frozenset(term) not in terms:
                raise self.fault("formula-not-there-to-take", node, term=self.words(term))
            del terms[frozenset(term)]

    def constant(self, sign: str, node: Node) -> Expansion:
        """0 and 1 in a sum: whether there is an intercept."""
        assert isinstance(node, Number)
        if node.written not in ("0", "1"):
            raise self.fault("formula-number-as-term", node, written=node.written)
        present = (node.written == "1") == (sign == "+")
        return Expansion((), intercept=present, removed=not present)

    def product(self, node: Binary) -> Expansion:
        """left:right, left*right = left + right + left:right, and left/right = left + (all factors of left):right."""
        left, right = self.operand(node.left), self.operand(node.right)
        if left == right and len(left) == 1:
            raise self.fault("formula-with-itself", node, term=self.words(left[0]))
        if node.operator == ":":
            return Expansion(self.crossed(left, right, node))
        if node.operator == "*":
            return Expansion(self.bounded((*left, *right, *self.crossed(left, right, node)), node))
        nest = tuple(dict.fromkeys(number for term in left for number in term))
        return Expansion(self.bounded((*left, *self.crossed((nest,), right, node)), node))

    def power(self, node: Binary) -> Expansion:
        """(a + b + c)**k: all products of up to k of the terms."""
        terms = self.operand(node.left)
        exponent = node.right
        if not isinstance(exponent, Number) or not exponent.written.isdigit():
            raise self.fault("formula-power", exponent, most=MOST_FACTORS_IN_TERM)
        if not 1 <= exponent.value <= MOST_FACTORS_IN_TERM:
            raise self.fault("formula-power", exponent, most=MOST_FACTORS_IN_TERM)
        if len(terms) == 1 and exponent.value > 1:
            raise self.fault("formula-power-of-one", node, term=self.words(terms[0]))
        found = products = terms
        for _ in range(1, min(int(exponent.value), len(terms))):
            products = self.crossed(terms, products, node)
            found = self.bounded((*found, *products), node)
        return Expansion(found)

    def operand(self, node: Node) -> tuple[Term, ...]:
        found = self.expand(node)
        if found.intercept or found.removed:
            raise self.fault("formula-constant-in-product", node)
        return found.terms

    def crossed(self, left: tuple[Term, ...], right: tuple[Term, ...], node: Node) -> tuple[Term, ...]:
        self.combinations += len(left) * len(right)
        if self.combinations > MOST_COMBINATIONS:
            raise self.fault("formula-too-many-terms", node, most=MOST_TERMS)
        return self.bounded((tuple(dict.fromkeys((*one, *other))) for one in left for other in right), node)

    def bounded(self, terms: Iterable[Term], node: Node) -> tuple[Term, ...]:
        """The terms, each once; InputFault where there are too many of them or too many factors in one."""
        kept: dict[frozenset[int], Term] = {}
        for term in terms:
            if len(term) > MOST_FACTORS_IN_TERM:
                raise self.fault("formula-too-many-factors", node, most=MOST_FACTORS_IN_TERM)
            kept.setdefault(frozenset(term), term)
            if len(kept) > MOST_TERMS:
                raise self.fault("formula-too-many-terms", node, most=MOST_TERMS)
        return tuple(kept.values())

    def fault(self, code: str, node: Node, **facts: object) -> InputFault:
        return formula_fault(code, self.where, node.at, **facts)
