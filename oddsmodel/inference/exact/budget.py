"""How much time and memory an exact calculation may take, and what is said when that does not suffice."""

from __future__ import annotations

import time
from dataclasses import dataclass
from typing import Literal

from oddsmodel.errors import OddsmodelError

Limit = Literal["states", "bytes", "seconds", "work"]


@dataclass(frozen=True, slots=True)
class Budget:
    """The most that one exact calculation may take.

    states: pairs of sums (of the nuisance columns, of the column of interest) held at once. bytes: memory for them.
    seconds: by the clock; None for no limit, so that whether there is an answer does not depend on the machine. work:
    states held, added up over all covariate patterns, which bounds the time on any machine; None for no limit.
    """

    states: int = 60_000_000
    bytes: int = 1_500_000_000
    seconds: float | None = 60.0
    work: int | None = None


class BeyondBudget(OddsmodelError):
    """The calculation was given up: `limit` says which part of the budget did not suffice.

    patterns_done of patterns covariate patterns were worked off; states: those held, or the number that would have
    been needed for the next step where memory was the limit, or in all where work was; seconds: time taken until then.
    """

    def __init__(self, limit: Limit, patterns_done: int, patterns: int, states: int, seconds: float) -> None:
        self.limit, self.patterns_done, self.patterns = limit, patterns_done, patterns
        self.states, self.seconds = states, seconds
        super().__init__(f"beyond the budget of {limit} after {patterns_done} of {patterns} covariate patterns")


class Meter:
    """Watches a budget while covariate patterns are worked off; `elsewhere` are bytes held by the other end."""

    def __init__(self, budget: Budget, patterns: int) -> None:
        self.budget, self.patterns = budget, patterns
        self.patterns_done = 0
        self.most_states = 1
        self.elsewhere = 0
        self.work = 0
        self._start = time.monotonic()

    def hold(self, states: int, size: int) -> None:
        """Before `states` are held that take `size` bytes. Raises BeyondBudget."""
        if states > self.budget.states:
            self._give_up("states", states)
        if size + self.elsewhere > self.budget.bytes:
            self._give_up("bytes", states)
        self.most_states = max(self.most_states, states)
        self.work += states
        if self.budget.work is not None and self.work > self.budget.work:
            self._give_up("work", self.work)
        self.look()

    def look(self) -> None:
        """Look at the clock. Raises BeyondBudget."""
        if self.budget.seconds is not None and self._elapsed() > self.budget.seconds:
            self._give_up("seconds", self.most_states)

    def _elapsed(self) -> float:
        return time.monotonic() - self._start

    def _give_up(self, limit: Limit, states: int) -> None:
        raise BeyondBudget(limit, self.patterns_done, self.patterns, states, self._elapsed())
