"""What is hidden in a study, once it is settled, and how many values have been taken out."""

from __future__ import annotations

from dataclasses import dataclass, field

from oddsmodel.disclosure.findings import Withheld
from oddsmodel.disclosure.system import Place


@dataclass(slots=True)
class Hiding:
    """threshold: counts between 0 and this are small. places: where hidden counts stand. withheld: what text must not
    say. taken: number of values hidden so far, counts and what hangs on them."""

    threshold: int
    places: frozenset[Place] = frozenset()
    withheld: Withheld = field(default_factory=lambda: Withheld(0))
    taken: int = 0

    def hides(self, *place: object) -> bool:
        return place in self.places

    def count(self, value: int | None, *place: object) -> int | None:
        """The count, or None where it is hidden."""
        if value is None or not self.hides(*place):
            return value
        self.taken += 1
        return None

    @property
    def marks(self) -> int:
        """The fewest records that a mark of a figure may stand for: never a single one."""
        return max(self.threshold, 2)
