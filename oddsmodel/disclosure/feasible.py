"""What a reader can work out: the smallest and largest value each unknown count can have, given what is shown."""

from __future__ import annotations

from collections.abc import Callable, Collection, Iterator, Mapping, Sequence
from dataclasses import dataclass, field

Bounds = tuple[int, int]


@dataclass(frozen=True, slots=True)
class Equation:
    """Sum of coefficient·unknown = constant."""

    terms: Mapping[int, int]
    constant: int


@dataclass(slots=True)
class _Narrowed:
    """Bounds narrowed by equations of one or two unknowns, the equations left, and unknowns that follow from others."""

    bounds: dict[int, Bounds]
    equations: list[Equation] = field(default_factory=list)
    follows: list[tuple[int, int, Equation]] = field(default_factory=list)


def feasible_bounds(
    equations: list[Equation],
    bounds: Callable[[int], Bounds],
    wanted: Collection[int],
    truth: Sequence[int],
    enough: Callable[[int, Bounds], bool],
) -> dict[int, Bounds]:
    """What values the unknowns `wanted` can have under linear equations between non-negative whole counts.

    `bounds` gives what is known of one unknown by itself. `truth` are the true counts, which satisfy all equations.
    Equations of one or two unknowns are resolved by hand, one equation that is left has its bounds in closed form, and
    more are given to integer linear programming. That search ends for an unknown once the values found for it are
    `enough`; where they never are, its bounds are exact.
    """
    unknowns = {number for equation in equations for number in equation.terms} | set(wanted)
    narrowed = _narrow(equations, {number: bounds(number) for number in unknowns})
    # An unknown that follows from another needs that one's bounds first, and these to be exact.
    sources: set[int] = set()
    for dependent, source, _ in narrowed.follows:
        if dependent in wanted or dependent in sources:
            sources.add(source)
    left = {number for equation in narrowed.equations for number in equation.terms}
    if len(narrowed.equations) == 1:
        narrowed.bounds |= _closed_form(narrowed.equations[0], narrowed.bounds)
    elif needed := left & (set(wanted) | sources):
        search = _Search(narrowed.equations, narrowed.bounds, truth)

        def ends(number: int, found: Bounds) -> bool:
            return number not in sources and enough(number, found)

        narrowed.bounds |= search.run(sorted(needed), ends)
    for dependent, source, equation in reversed(narrowed.follows):
        narrowed.bounds[dependent] = _other(equation, source, dependent, narrowed.bounds)
    return {number: narrowed.bounds[number] for number in wanted}


def components(equations: Collection[Equation]) -> Iterator[tuple[frozenset[int], list[Equation]]]:
    """Groups of unknowns that have nothing to do with one another, each with its equations."""
    parent: dict[int, int] = {}

    def root(number: int) -> int:
        while parent.setdefault(number, number) != number:
            parent[number] = parent[parent[number]]
            number = parent[number]
        return number

    for equation in equations:
        first, *others = equation.terms
        for other in others:
            parent[root(other)] = root(first)
        root(first)
    members: dict[int, set[int]] = {}
    for number in parent:
        members.setdefault(root(number), set()).add(number)
    own: dict[int, list[Equation]] = {}
    for equation in equations:
        own.setdefault(root(next(iter(equation.terms))), []).append(equation)
    for key, unknowns in members.items():
        yield frozenset(unknowns), own[key]


def _narrow(equations: list[Equation], bounds: dict[int, Bounds]) -> _Narrowed:
    """Resolve equations of one unknown, and of two where the second occurs nowhere else, until none is left."""
    found = _Narrowed(bounds, list(equations))
    uses: dict[int, int] = {}
    for equation in equations:
        for number in equation.terms:
            uses[number] = uses.get(number, 0) + 1
    changed = True
    while changed:
        changed = False
        for equation in list(found.equations):
            solved = _solve_one(equation, found)
            if solved is not None:
                found.equations = [_without(one, solved, found.bounds[solved][0]) for one in found.equations]
                found.equations = [one for one in found.equations if one.terms]
                changed = True
                break
            if len(equation.terms) == 2:
                leaf = next((number for number in equation.terms if uses[number] == 1), None)
                if leaf is not None:
                    source = next(number for number in equation.terms if number != leaf)
                    found.bounds[source] = _meet(found.bounds[source], _other(equation, leaf, source, found.bounds))
                    found.follows.append((leaf, source, equation))
                    found.equations.remove(equation)
                    uses[source] -= 1
                    changed = True
    return found


def _solve_one(equation: Equation, found: _Narrowed) -> int | None:
    if len(equation.terms) != 1:
        return None
    ((number, coefficient),) = equation.terms.items()
    value = equation.constant // coefficient
    found.bounds[number] = (value, value)
    return number


def _without(equation: Equation, number: int, value: int) -> Equation:
    if number not in equation.terms:
        return equation
    terms = {other: coefficient for other, coefficient in equation.terms.items() if other != number}
    return Equation(terms, equation.constant - equation.terms[number] * value)


def _meet(first: Bounds, second: Bounds) -> Bounds:
    return max(first[0], second[0]), min(first[1], second[1])


def _quotients(lower: int, upper: int, coefficient: int) -> Bounds:
    """The whole x with lower <= coefficient·x <= upper."""
    if coefficient < 0:
        lower, upper, coefficient = -upper, -lower, -coefficient
    return -(-lower // coefficient), upper // coefficient


def _other(equation: Equation, known: int, unknown: int, bounds: Mapping[int, Bounds]) -> Bounds:
    """Bounds of one unknown of an equation of two, from those of the other and its own."""
    products = sorted(equation.terms[known] * end for end in bounds[known])
    found = _quotients(equation.constant - products[1], equation.constant - products[0], equation.terms[unknown])
    return _meet(bounds[unknown], found)


def _closed_form(equation: Equation, bounds: Mapping[int, Bounds]) -> dict[int, Bounds]:
    spans = {number: sorted(c * end for end in bounds[number]) for number, c in equation.terms.items()}
    lowest, highest = sum(span[0] for span in spans.values()), sum(span[1] for span in spans.values())
    found = {}
    for number, coefficient in equation.terms.items():
        least, most = lowest - spans[number][0], highest - spans[number][1]
        rest = _quotients(equation.constant - most, equation.constant - least, coefficient)
        found[number] = _meet(bounds[number], rest)
    return found


class _Search:
    """Integer points that satisfy several equations, found by pushing one unknown at a time to its ends.

    Each point found is a possible value of every unknown, so that few unknowns need programs of their own.
    """

    def __init__(self, equations: list[Equation], bounds: Mapping[int, Bounds], truth: Sequence[int]) -> None:
        import numpy as np
        from scipy.optimize import Bounds as Box
        from scipy.optimize import LinearConstraint
        from scipy.sparse import csr_array

        self.unknowns = sorted({number for equation in equations for number in equation.terms})
        position = {number: k for k, number in enumerate(self.unknowns)}
        entries = [
            (row, position[number], float(coefficient))
            for row, equation in enumerate(equations)
            for number, coefficient in equation.terms.items()
        ]
        rows, columns, data = (np.array(values) for values in zip(*entries, strict=True))
        matrix = csr_array((data, (rows, columns)), shape=(len(equations), len(self.unknowns)))
        constants = np.array([float(equation.constant) for equation in equations])
        self.constraint = LinearConstraint(matrix, constants, constants)
        self.box = Box(*(np.array([float(bounds[number][side]) for number in self.unknowns]) for side in (0, 1)))
        self.found = {number: (truth[number], truth[number]) for number in self.unknowns}

    def run(self, wanted: Sequence[int], ends: Callable[[int, Bounds], bool]) -> dict[int, Bounds]:
        for number in wanted:
            for sign in (-1.0, 1.0):
                if not ends(number, self.found[number]):
                    self._push(number, sign)
        return {number: self.found[number] for number in wanted}

    def _push(self, number: int, sign: float) -> None:
        """Towards the largest value of an unknown (sign −1) or its smallest (sign 1).

        The true counts are a solution, so a program that finds none has failed: what is known by then stands, and the
        unknown is the more protected.
        """
        import numpy as np
        from scipy.optimize import milp

        objective = np.zeros(len(self.unknowns))
        objective[self.unknowns.index(number)] = sign
        whole = np.ones(len(self.unknowns), dtype=np.uint8)
        answer = milp(objective, constraints=self.constraint, bounds=self.box, integrality=whole)
        if answer.x is None:
            return
        for other, value in zip(self.unknowns, np.rint(answer.x).astype(int).tolist(), strict=True):
            lower, upper = self.found[other]
            self.found[other] = (min(lower, value), max(upper, value))
