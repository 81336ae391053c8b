"""What long work says about how far it is; the command line draws it, everything else is silent."""

from __future__ import annotations

from typing import Protocol


class Progress(Protocol):
    """Told of stages ("reading", "fitting", "profiling", "drawing") and of steps within them."""

    def stage(self, name: str, total: int | None = None) -> None:
        """A new stage starts; `total` is its number of steps where that is known."""

    def advance(self, steps: int = 1) -> None:
        """Steps of the present stage are done."""


class Silent:
    """A progress that says nothing."""

    def stage(self, name: str, total: int | None = None) -> None:
        return

    def advance(self, steps: int = 1) -> None:
        return
