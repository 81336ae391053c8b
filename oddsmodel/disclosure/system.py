"""Every count that a report could show, as unknowns of one system of sums that a reader could write down."""

from __future__ import annotations

from collections.abc import Hashable, Iterable, Mapping, Sequence
from dataclasses import dataclass

Place = tuple[Hashable, ...]
Rank = tuple[int, int]

ASIDE, CELL, ZERO, SIDE, READ, EVENTS, RECORDS = range(7)
"""How readily a count is hidden to protect another: first cells of tables that stand aside, then of other tables, last
a model's number of records."""


@dataclass(frozen=True, slots=True)
class Relation:
    """Sum of coefficient·count = 0. `link` is an equality that a reader may or may not see: see `Counts`."""

    terms: Mapping[int, int]
    link: bool = False


@dataclass(frozen=True, slots=True)
class Counts:
    """The system, with equal counts made one.

    values: (v,) the true counts. shown: (v,) whether a count has a place in the output at all; the others follow
        from shown ones only (the complement of events, the difference of two models).
    locked: counts that stay, whatever happens. ranks: (v,) how readily each is hidden.
    unnamed: counts that nothing in the output names: no reader is told whether they are small.
    totals: sums that are printed somewhere outside the system. Two readers are guarded against: one who knows these
        sums and has nothing to do with the links, and one who knows only the counts shown but sees the links.
    ties: counts that must be hidden together, since they may be one and the same.
    places: where each count stands in the output.
    """

    values: tuple[int, ...]
    shown: tuple[bool, ...]
    locked: frozenset[int]
    unnamed: frozenset[int]
    ranks: tuple[Rank, ...]
    relations: tuple[Relation, ...]
    totals: frozenset[int]
    ties: tuple[frozenset[int], ...]
    places: Mapping[Place, int]


class CountSystem:
    """Collects counts and the sums between them; `freeze` hands the system over."""

    def __init__(self) -> None:
        self._values: list[int] = []
        self._shown: list[bool] = []
        self._locked: list[bool] = []
        self._ranks: list[Rank] = []
        self._parent: list[int] = []
        self._relations: list[tuple[tuple[int, ...], int, bool]] = []
        self._unnamed: set[int] = set()
        self._totals: set[int] = set()
        self._ties: list[frozenset[int]] = []
        self._places: dict[Place, int] = {}

    def add(
        self,
        value: int,
        place: Place | None = None,
        *,
        rank: int = CELL,
        model: int = 0,
        locked: bool = False,
        total: bool = False,
        unnamed: bool = False,
    ) -> int:
        """A count; without a place it is one that only follows from others. Later models are hidden first."""
        number = len(self._values)
        self._values.append(value)
        self._shown.append(place is not None or locked)
        self._locked.append(locked)
        self._ranks.append((ZERO if value == 0 and rank in (ASIDE, CELL) else rank, -model))
        self._parent.append(number)
        if place is not None:
            self._places[place] = number
        if total:
            self._totals.add(number)
        if unnamed:
            self._unnamed.add(number)
        return number

    def value(self, number: int) -> int:
        return self._values[number]

    def at(self, place: Place) -> int:
        return self._places[place]

    def root(self, number: int) -> int:
        while self._parent[number] != number:
            self._parent[number] = self._parent[self._parent[number]]
            number = self._parent[number]
        return number

    def merge(self, first: int, second: int) -> None:
        """Two counts are one and the same."""
        first, second = self.root(first), self.root(second)
        if self._values[first] != self._values[second]:
            raise ValueError("two different counts cannot be the same")
        self._parent[max(first, second)] = min(first, second)

    def lock(self, number: int) -> None:
        """The count stays, whatever happens: a reader knows it."""
        self._shown[number] = self._locked[number] = True

    def relate(self, parts: Sequence[int], whole: int) -> None:
        """The parts add up to the whole."""
        if sum(self._values[part] for part in parts) != self._values[whole]:
            raise ValueError("the parts do not add up to the whole")
        self._relations.append((tuple(parts), whole, False))

    def link(self, total: int, cell: int) -> None:
        """A sum that may be the same count as a cell elsewhere."""
        self._relations.append(((cell,), total, True))

    def tie(self, members: Iterable[int]) -> None:
        """Counts to be hidden together."""
        self._ties.append(frozenset(members))

    def freeze(self) -> Counts:
        roots = sorted({self.root(number) for number in range(len(self._values))})
        index = {root: k for k, root in enumerate(roots)}
        own = [index[self.root(number)] for number in range(len(self._values))]
        shown, locked, ranks = [False] * len(roots), set(), [(ASIDE, -(10**6))] * len(roots)
        for number, k in enumerate(own):
            shown[k] |= self._shown[number]
            ranks[k] = max(ranks[k], self._ranks[number])
            if self._locked[number]:
                locked.add(k)
        relations: dict[tuple[tuple[tuple[int, int], ...], bool], Relation] = {}
        for parts, whole, link in self._relations:
            terms: dict[int, int] = {}
            for number, sign in (*((part, 1) for part in parts), (whole, -1)):
                terms[own[number]] = terms.get(own[number], 0) + sign
            terms = {k: sign for k, sign in terms.items() if sign}
            if terms:
                relations[tuple(sorted(terms.items())), link] = Relation(terms, link)
        ties = (frozenset(own[number] for number in members) for members in self._ties)
        return Counts(
            values=tuple(self._values[root] for root in roots),
            shown=tuple(shown),
            locked=frozenset(locked),
            unnamed=frozenset(own[number] for number in self._unnamed),
            ranks=tuple(ranks),
            relations=tuple(relations.values()),
            totals=frozenset(own[number] for number in self._totals),
            ties=tuple(members for members in ties if len(members) > 1),
            places={place: own[number] for place, number in self._places.items()},
        )
