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

STAGES = ("reading", "fitting", "profiling", "checking", "drawing")


class Drawn:
    """A line a stage: its name, a bar where the number of steps is known, the time it took."""

    def __init__(self, bars: Bars) -> None:
        self._bars = bars
        self._task: int | None = None

    def stage(self, name: str, total: int | None = None) -> None:
        self.finish()
        words = say(f"stage-{name}") if name in STAGES else name
        self._task = self._bars.add_task(words, total=total or None)

    def advance(self, steps: int = 1) -> None:
        if self._task is not None:
            self._bars.advance(self._bars.task_ids[-1], steps)

    def finish(self) -> None:
        """The present stage is over."""
        if self._task is not None:
            task = self._bars.tasks[-1]
            self._bars.update(task.id, total=task.total or 1, completed=task.total or 1)
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
