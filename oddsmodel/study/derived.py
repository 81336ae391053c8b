"""Derived columns with their counts beside what they were made from."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

from oddsmodel.measures.derived_counts import derived_counts
from oddsmodel.results.derived import DerivedColumn
from oddsmodel.study.prepare import Prepared


def with_counts(derived: Sequence[DerivedColumn], main: Prepared) -> tuple[DerivedColumn, ...]:
    """Each derived column with its tables, among the records that a model analyses."""
    held = main.in_memory
    return tuple(replace(one, tables=derived_counts(one, held.frame, main.columns, held.counts)) for one in derived)
