"""Where the rows are: a pass runs any number of kernels over all rows once."""

from oddsmodel.passes.base import LEAF_ROWS, TASK_ROWS, Kernel, Leaf, Made, Passes, Work
from oddsmodel.passes.memory import MemoryPasses

__all__ = ["LEAF_ROWS", "TASK_ROWS", "Kernel", "Leaf", "Made", "MemoryPasses", "Passes", "Work"]
