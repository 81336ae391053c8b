"""What every rule takes and gives, and the parts that several rules share."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.errors import InputFault
from oddsmodel.plan.faults import heading
from oddsmodel.plan.nearest import nearest
from oddsmodel.plan.schema import DerivedSection
from oddsmodel.records.coding import CodedColumn
from oddsmodel.records.faults import fault
from oddsmodel.records.plausible import within_plausible
from oddsmodel.records.rows import Rows
from oddsmodel.records.types import Column
from oddsmodel.wording import finding
from oddsmodel.wording.plain import quoted

Array = NDArray[np.float64]
Mask = NDArray[np.bool_]
Codes = NDArray[np.intp]


@dataclass(frozen=True, slots=True)
class Source:
    """A column that another is made from. where: its place in the file; rows: those behind its values."""

    coded: CodedColumn
    where: str
    rows: Rows

    @property
    def column(self) -> Column:
        return self.coded.column

    @property
    def outside(self) -> Mask:
        """Rows (n,) whose level is not in the plan."""
        coded = self.coded
        return np.zeros(len(coded.values), dtype=np.bool_) if coded.outside is None else coded.outside


@dataclass(frozen=True, slots=True)
class Making:
    """What is to be made.

    name, section: of the plan. sources: in its order. kept: rows (n,) that the plan's `keep` holds for; weights (n,):
    records that each row stands for.
    """

    name: str
    section: DerivedSection
    sources: tuple[Source, ...]
    kept: Mask
    weights: Array

    @property
    def where(self) -> str:
        return place(self.name)

    def number(self, rows: Mask) -> int:
        """How many records some rows stand for."""
        return int(self.weights[rows].sum())


@dataclass(frozen=True, slots=True)
class Made:
    """The column, and cut points that were found in the records."""

    coded: CodedColumn
    cut_points: tuple[float, ...] = ()


def place(name: str, key: str = "") -> str:
    """The place of a derived column's section, or of a key in it, in the plan."""
    return f"the plan, {heading('derived', name)} {key}".rstrip()


def described(making: Making, kind: str) -> Column:
    """The column as the plan describes it; its label is otherwise its name."""
    section = making.section
    return Column(
        making.name,
        kind,
        section.label or making.name,
        units=section.units,
        per=section.per if section.per is not None else 1.0,
        timing=section.timing,
        why=section.why,
        other_levels=section.other_levels,
    )


def with_levels(
    making: Making, kind: str, levels: Sequence[str], codes: Codes, outside: Mask | None = None
) -> CodedColumn:
    """A column of levels; codes (n,): position of each row's level, -1 not recorded.

    The reference is the plan's, else the first level that is met.

    Raises: InputFault for a reference that no record has.
    """
    column = described(making, kind)
    met = np.bincount(codes[codes >= 0], minlength=len(levels)) > 0
    found = [level for level, here in zip(levels, met, strict=True) if here]
    absent = [level for level, here in zip(levels, met, strict=True) if not here]
    reference = making.section.reference
    if reference is not None and reference not in found:
        near = nearest(reference, found)
        shown = [quoted(level) for level in found]
        facts = {"reference": quoted(reference), "levels": shown, "nearest": "" if near is None else quoted(near)}
        raise InputFault(fault("reference-not-met", place(making.name, "reference"), **facts))
    if reference is None and found:
        reference = found[0]
    categories = pd.Index(list(levels), dtype=object)
    values = pd.Series(pd.Categorical.from_codes(codes, categories=categories, ordered=kind == "ordered"))
    return CodedColumn(
        values,
        Column(
            column.name,
            kind,
            column.label,
            levels=tuple(levels),
            reference=reference,
            timing=column.timing,
            why=column.why,
            other_levels=column.other_levels,
        ),
        outside if outside is not None and outside.any() else None,
        (finding("note", "level-absent", column=making.name, levels=absent),) if absent and found else (),
    )


def of_numbers(making: Making, numbers: Array) -> CodedColumn:
    """A column of numbers (n,), those outside the plausible range set aside."""
    numbers, outside = within_plausible(numbers, making.section.plausible)
    return CodedColumn(pd.Series(numbers), described(making, "number"), implausible=outside)


def number_values(making: Making, source: Source) -> Array:
    """The numbers (n,) of a source. Raises: InputFault where it is of another kind."""
    if source.column.kind != "number":
        raise InputFault(
            fault("derived-needs-number", making.where, source=quoted(source.column.name), kind=source.column.kind)
        )
    return source.coded.values.to_numpy(dtype=np.float64)
