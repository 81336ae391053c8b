"""Progress drawn on a terminal; silent where nobody watches."""

from __future__ import annotations

import sys
from collections.abc import Iterator
from contextlib import contextmanager
from typing import TYPE_CHECKING

from oddsmodel.progress import Progress, Silent
from oddsmodel.wording import say

if TYPE_CHECKING:
    from rich.progress import Progress as Bars
    from rich.progress import TaskID

STAGES = ("reading", "gathering", "fitting", "counting outcomes", "profiling", "checking", "validating", "drawing")


class Drawn:
    """A line a stage: its name, a bar that fills where the number of steps is known, the time it took."""

    def __init__(self, bars: Bars) -> None:
        self._bars = bars
        self._task: TaskID | None = None
        self._name = ""

    def stage(self, name: str, total: int | None = None) -> None:
        if self._task is not None and name == self._name:
            self._bars.update(self._task, total=total or None, completed=0)
            return
        self.finish()
        self._name = name
        self._task = self._bars.add_task(say(f"stage-{name}") if name in STAGES else name, total=total or None)

    def advance(self, steps: int = 1) -> None:
        if self._task is not None:
            self._bars.advance(self._task, steps)

    def finish(self) -> None:
        """The present stage is over."""
        if self._task is not None:
            self._bars.update(self._task, total=1, completed=1)
            self._task = None


@contextmanager
def drawn_progress() -> Iterator[Progress]:
    """A progress drawn on standard error while a command works, and wiped away after it."""
    if not sys.stderr.isatty():
        yield Silent()
        return

    from rich.console import Console
    from rich.progress import BarColumn, TextColumn, TimeElapsedColumn
    from rich.progress import Progress as Bars

    console = Console(stderr=True)
    if console.is_dumb_terminal:
        yield Silent()
        return
    columns = (TextColumn("{task.description}", markup=False), BarColumn(bar_width=30), TimeElapsedColumn())
    with Bars(*columns, console=console, transient=True) as bars:
        progress = Drawn(bars)
        yield progress
        progress.finish()
