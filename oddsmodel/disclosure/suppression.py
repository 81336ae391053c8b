"""Which counts to hide: the small ones, and others with them until no small one can be worked out."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass, field

from oddsmodel.disclosure.feasible import Bounds, Equation, components, feasible_bounds
from oddsmodel.disclosure.system import Counts, Relation

MOST_WORK = 200_000
"""Equations looked at, over all questions, before the search for the fewest counts to hide gives way: some seconds."""

HINTED = 3
"""With a threshold under 3 a reader who knows that a count is small knows it is 1: nothing can hide that."""


@dataclass(frozen=True, slots=True)
class _Reader:
    """What a reader knows beside the counts shown.

    known: sums printed elsewhere. links: whether the equalities that may hold are seen. hinted: whether of each hidden
    count it is known to be under the threshold or not.
    """

    relations: tuple[Relation, ...]
    known: frozenset[int]
    links: bool
    hinted: bool


@dataclass(slots=True)
class Suppression:
    """Chooses the counts to hide.

    A count between 0 and the threshold is hidden wherever it stands; zero stays unless it would give one away. Then,
    for two readers, the feasible bounds of every hidden count are worked out from everything shown:

    1. one who knows the counts shown and how they add up must find at least two values for each hidden count, and for
       a small one at least one value that is not under the threshold (so that it cannot be told to be small);
    2. one who knows in addition which hidden counts are under the threshold (a finding may say so) must still find
       at least two values for each.

    Counts that only follow from others (records without the event, the difference of two models' records) are
    protected as if they were shown. While a count fails, the smallest count beside it whose hiding helps is hidden
    too; totals come last.
    """

    counts: Counts
    threshold: int
    hidden: set[int] = field(default_factory=set)
    unprotected: set[int] = field(default_factory=set)
    """Counts that nothing in the output could protect further: all that stands beside them is hidden."""
    _bounds: dict[tuple[int, frozenset[int]], dict[int, Bounds]] = field(default_factory=dict)
    _work: int = 0
    _readers: tuple[_Reader, ...] = ()
    _touching: dict[int, list[Relation]] = field(default_factory=dict)

    def run(self) -> frozenset[int]:
        """The numbers of the counts to hide."""
        values, shown = self.counts.values, self.counts.shown
        self._readers = tuple(self._all_readers())
        for relation in self.counts.relations:
            for number in relation.terms:
                self._touching.setdefault(number, []).append(relation)
        self._hide(number for number in range(len(values)) if shown[number] and self._small(number))
        while failing := sorted(self._failing(), key=self._by_size):
            helper = self._helper(failing)
            if self._work > MOST_WORK:
                self._hide_the_family(failing)
                return frozenset(self.hidden)
            if helper is None:
                self.unprotected |= set(failing)
            else:
                self._hide([helper])
        self._show_again()
        return frozenset(self.hidden)

    def _by_size(self, number: int) -> tuple[int, int]:
        return self.counts.values[number], number

    def _hide_the_family(self, failing: Iterable[int]) -> None:
        """Hide all that has to do with the failing counts, the totals only where the rest is not enough.

        The way out where the counts hang together too closely to find the fewest in time: more is hidden than need be.
        """
        family, waiting = set(failing), list(failing)
        while waiting:
            new = self._touching_counts(waiting.pop()) - family
            family |= new
            waiting += new
        totals = max(self.counts.ranks[number] for number in family)
        self._hide(n for n in sorted(family) if self.counts.ranks[n] < totals and self._can_hide(n))
        if self._failing():
            self._hide(n for n in sorted(family) if self._can_hide(n))

    def _show_again(self) -> None:
        """Show what turned out not to be needed, the most useful first."""
        order = sorted(self.hidden, key=lambda n: (self.counts.ranks[n], self.counts.values[n], n), reverse=True)
        for number in order:
            together = self._tied(number)
            if number in self.hidden and not any(map(self._small, together)):
                before = [self._standing(one) for one in self.unprotected]
                self.hidden -= together
                after = [self._standing(one) for one in self.unprotected]
                if self._failing() or any(new < old for new, old in zip(after, before, strict=True)):
                    self.hidden |= together

    def _tied(self, number: int) -> set[int]:
        """A count with all that must be hidden together with it."""
        found, waiting = {number}, [number]
        while waiting:
            one = waiting.pop()
            new = {other for tie in self.counts.ties if one in tie for other in tie} - found - self.counts.locked
            found |= new
            waiting += new
        return found

    def _all_readers(self) -> Iterable[_Reader]:
        counts = self.counts
        plain = tuple(relation for relation in counts.relations if not relation.link)
        linked = frozenset(number for relation in counts.relations if relation.link for number in relation.terms)
        # A sum under the threshold is a small count itself, not something to take as printed.
        printed = frozenset(number for number in counts.totals if not self._small(number))
        for hinted in (False, True) if self.threshold >= HINTED else (False,):
            yield _Reader(plain, printed, False, hinted)
            if linked:
                yield _Reader(counts.relations, printed - linked, True, hinted)

    def _small(self, number: int) -> bool:
        return 0 < self.counts.values[number] < self.threshold and number not in self.counts.locked

    def _hide(self, numbers: Iterable[int]) -> None:
        for number in numbers:
            self.hidden |= self._tied(number)

    def _known(self, number: int, reader: _Reader) -> bool:
        return number in reader.known or (self.counts.shown[number] and number not in self.hidden)

    def _equation(self, relation: Relation, reader: _Reader) -> Equation | None:
        terms, constant = {}, 0
        for number, sign in relation.terms.items():
            if self._known(number, reader):
                constant -= sign * self.counts.values[number]
            else:
                terms[number] = sign
        return Equation(terms, constant) if terms else None

    def _own_bounds(self, members: frozenset[int], reader: _Reader) -> Callable[[int], Bounds]:
        """What a reader knows of a count by itself; that a small one is not 0 where no 0 is hidden beside it."""
        values = self.counts.values
        most = 10 * max(values) + 10 * self.threshold
        least = 0 if any(values[number] == 0 and number in self.hidden for number in members) else 1

        def bounds(number: int) -> Bounds:
            if not reader.hinted or number in self.counts.unnamed:
                return 0, most
            if values[number] >= self.threshold:
                return self.threshold, most
            return min(values[number], least), self.threshold - 1

        return bounds

    def _protected(self, number: int) -> bool:
        return self._small(number) or number in self.hidden

    def _passes(self, number: int, bounds: Bounds, reader: _Reader) -> bool:
        lower, upper = bounds
        return upper > lower and (reader.hinted or not self._small(number) or upper >= self.threshold)

    def _component_bounds(
        self, which: int, members: frozenset[int], equations: list[Equation], only: int | None = None
    ) -> dict[int, Bounds]:
        """Bounds of the protected counts among unknowns that have to do with one another, or of `only` one of them."""
        key = (which, members)
        found = self._bounds.setdefault(key, {})
        wanted = [n for n in members if self._protected(n)] if only is None else [only]
        missing = [number for number in wanted if number not in found]
        if missing:
            self._work += len(equations)
            reader = self._readers[which]
            found |= feasible_bounds(
                equations,
                self._own_bounds(members, reader),
                missing,
                self.counts.values,
                lambda number, bounds: self._passes(number, bounds, reader),
            )
        return found

    def _failing(self) -> set[int]:
        """The counts that a reader could work out, without those that nothing can protect."""
        failing: set[int] = set()
        for which, reader in enumerate(self._readers):
            all_equations = (self._equation(relation, reader) for relation in reader.relations)
            for members, equations in components([one for one in all_equations if one is not None]):
                found = self._component_bounds(which, members, equations)
                for number in members:
                    if self._protected(number) and not self._passes(number, found[number], reader):
                        failing.add(number)
        return failing - self.unprotected

    def _around(self, number: int, reader: _Reader) -> tuple[frozenset[int], list[Equation], set[int]]:
        """The unknowns that have to do with a count, their equations, and the shown counts in these."""
        members, waiting = {number}, [number]
        equations, shown, seen = [], set(), set()
        while waiting:
            for relation in self._touching.get(waiting.pop(), ()):
                if id(relation) in seen or (relation.link and not reader.links):
                    continue
                seen.add(id(relation))
                equation = self._equation(relation, reader)
                if equation is not None:
                    equations.append(equation)
                    waiting += [other for other in equation.terms if other not in members]
                    members |= equation.terms.keys()
                shown |= {other for other in relation.terms if self._known(other, reader)}
        return frozenset(members), equations, shown

    def _judged(self, number: int) -> Iterator[tuple[bool, int]]:
        """For each reader whether they fail to work a count out, and how many values they are left with."""
        for which, reader in enumerate(self._readers):
            members, equations, _ = self._around(number, reader)
            lower, upper = self._component_bounds(which, members, equations, number)[number]
            yield self._passes(number, (lower, upper), reader), upper - lower

    def _standing(self, number: int) -> tuple[int, int]:
        """How many readers fail to work a count out, and how many values they are left with in all."""
        judged = list(self._judged(number))
        return sum(passed for passed, _ in judged), sum(width for _, width in judged)

    def _helper(self, failing: list[int]) -> int | None:
        """The count to hide next.

        The first that protects a failing count of which it is a part, a whole or a sister; else the one that helps one
        most; else one from a sum that gives a failing count away by itself: it helps together with others, for which
        it will ask itself, since it is not protected either. Counts further off come last.
        """
        beside = {number: self._choices(self._touching_counts(number)) for number in failing}
        found = self._best(beside)
        if found is not None:
            return found
        for number in failing:
            for relation in self._touching.get(number, ()):
                if not any(self._is_open(other) for other in relation.terms if other != number):
                    choices = self._choices(relation.terms)
                    if choices:
                        return choices[0]
        near = {
            number: self._choices(other for reader in self._readers for other in self._around(number, reader)[2])
            for number in failing
        }
        found = self._best(near)
        further = (choices[0] for choices in (*beside.values(), *near.values()) if choices)
        return found if found is not None else next(further, None)

    def _is_open(self, number: int) -> bool:
        """Whether a reader has to work a count out at all."""
        return number in self.hidden or not (self.counts.shown[number] or number in self.counts.totals)

    def _touching_counts(self, number: int) -> set[int]:
        return {other for relation in self._touching.get(number, ()) for other in relation.terms}

    def _choices(self, numbers: Iterable[int]) -> list[int]:
        hideable = {number for number in numbers if self._can_hide(number)}
        return sorted(hideable, key=lambda n: (self.counts.ranks[n], self._by_size(n)))

    def _best(self, choices: Mapping[int, list[int]]) -> int | None:
        """Of the choices for each failing count, the first that protects it, or else the one that helps most."""
        for failing, offered in choices.items():
            for choice in offered:
                if self._work > MOST_WORK:
                    return None
                with self._with_hidden(choice):
                    if all(passed for passed, _ in self._judged(failing)):
                        return choice
        best, found = 0, None
        for failing, offered in choices.items():
            passed, width = self._standing(failing)
            for choice in offered:
                if self._work > MOST_WORK:
                    return None
                with self._with_hidden(choice):
                    standing = self._standing(failing)
                gain = (standing[0] - passed) * 10**6 + min(standing[1] - width, 10**5)
                if gain > best:
                    best, found = gain, choice
        return found

    @contextmanager
    def _with_hidden(self, number: int) -> Iterator[None]:
        before = set(self.hidden)
        self._hide([number])
        try:
            yield
        finally:
            self.hidden = before

    def _can_hide(self, number: int) -> bool:
        return self.counts.shown[number] and number not in self.hidden and number not in self.counts.locked
