"""Passes over arrays in memory."""

from __future__ import annotations

from typing import Any

from numpy.typing import NDArray

from oddsmodel.passes.local import LocalPasses, MemorySource


class MemoryPasses(LocalPasses):
    """Named arrays that share their first axis."""

    def __init__(self, arrays: dict[str, NDArray[Any]]) -> None:
        super().__init__(MemorySource(arrays))
        self.arrays = arrays
