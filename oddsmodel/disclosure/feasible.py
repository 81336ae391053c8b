"""What a reader can work out: the smallest and largest value each unknown count can have, given what is shown."""

from __future__ import annotations

import math
from collections.abc import Callable, Collection, Iterator, Mapping
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
    equations: list[Equation], bounds: Callable[[int], Bounds], wanted: Collection[int]
) -> dict[int, Bounds]:
    """The integer bounds of the unknowns `wanted` under linear equations between non-negative whole counts.

    `bounds` gives what is known of one unknown by itself. Equations of one or two unknowns are resolved by hand, one
    equation that is left has its bounds in closed form, and more are given to integer linear programming, one
    smallest and one largest value for each unknown wanted.
    """
    unknowns = {number for equation in equations for number in equation.terms} | set(wanted)
    narrowed = _narrow(equations, {number: bounds(number) for number in unknowns})
    left = {number for equation in narrowed.equations for number in equation.terms}
    # An unknown that follows from another needs that one's bounds first.
    needed = set(wanted)
    for dependent, source, _ in narrowed.follows:
        if dependent in needed:
            needed.add(source)
    if len(narrowed.equations) == 1:
        narrowed.bounds |= _closed_form(narrowed.equations[0], narrowed.bounds)
    elif left & needed:
        narrowed.bounds |= _integer_programs(narrowed.equations, narrowed.bounds, sorted(left & needed))
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


def _integer_programs(equations: list[Equation], bounds: Mapping[int, Bounds], wanted: list[int]) -> dict[int, Bounds]:
    import numpy as np
    from scipy.optimize import Bounds as Box
    from scipy.optimize import LinearConstraint, milp
    from scipy.sparse import csr_array

    unknowns = sorted({number for equation in equations for number in equation.terms})
    position = {number: k for k, number in enumerate(unknowns)}
    entries = [
        (row, position[number], float(coefficient))
        for row, equation in enumerate(equations)
        for number, coefficient in equation.terms.items()
    ]
    rows, columns, data = (np.array(values) for values in zip(*entries, strict=True))
    matrix = csr_array((data, (rows, columns)), shape=(len(equations), len(unknowns)))
    constants = np.array([float(equation.constant) for equation in equations])
    box = Box(*(np.array([float(bounds[number][side]) for number in unknowns]) for side in (0, 1)))
    found = {}
    for number in wanted:
        ends = []
        for sign in (1.0, -1.0):
            objective = np.zeros(len(unknowns))
            objective[position[number]] = sign
            answer = milp(
                objective,
                constraints=LinearConstraint(matrix, constants, constants),
                bounds=box,
                integrality=np.ones(len(unknowns), dtype=np.uint8),
            )
            # The true counts satisfy every equation, so a program without an answer is a failure of the solver:
            # the count is then taken as worked out, and more is hidden.
            ends.append(sign * answer.fun if answer.x is not None else math.nan)
        found[number] = (0, 0) if any(map(math.isnan, ends)) else (round(ends[0]), round(ends[1]))
    return found
