"""The second pass over a source: what its columns come to side by side, which none of them tells alone."""

from __future__ import annotations

import contextlib
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field, replace

import numpy as np
import pandas as pd

from oddsmodel.errors import InputFault
from oddsmodel.plan.schema import StudyPlan
from oddsmodel.progress import Progress
from oddsmodel.records.coding import CodedColumn
from oddsmodel.records.condition import vet_condition
from oddsmodel.records.derived.making import Mask, place
from oddsmodel.records.derived.quantile_groups import cut_points
from oddsmodel.records.faults import fault
from oddsmodel.records.made_outcome import outcome_by_row
from oddsmodel.records.mentions import mentioned
from oddsmodel.records.plan_use import plausible_ranges
from oddsmodel.records.stream.blocks import Blocks, CodedBlock, row_by_row
from oddsmodel.records.stream.met import Met
from oddsmodel.records.stream.tally import NumberTally


@dataclass
class Together:
    """implausible: rows and records that were set aside, by column; recorded: columns that hold something beside them.
    backwards: records of years below 0. met: the values of columns with their records. kept: of sources of quantile
    groups the numbers among the records kept, by the column made of them; cuts: its cut points. events, event_free,
    late: records of an outcome that the plan makes.
    """

    implausible: dict[str, tuple[int, int]] = field(default_factory=dict)
    recorded: set[str] = field(default_factory=set)
    backwards: dict[str, int] = field(default_factory=dict)
    met: dict[str, Met] = field(default_factory=dict)
    kept: dict[str, NumberTally] = field(default_factory=dict)
    cuts: dict[str, tuple[float, ...]] = field(default_factory=dict)
    events: int = 0
    event_free: int = 0
    late: int = 0


def is_needed(plan: StudyPlan) -> bool:
    """Whether a plan asks for anything that columns tell only side by side."""
    return bool(plan.records.count or plan.derived or plan.outcome.column is None or plausible_ranges(plan))


def look_together(blocks: Blocks, plan: StudyPlan, progress: Progress, *, memory: int) -> tuple[Together, Blocks]:
    """What the columns of the plan come to, and the blocks with its derived columns, quantile groups included.

    The source is read once more, and again for columns that are made of quantile groups. memory: bytes for what is met.

    Raises: InputFault for numbers in quantile groups, and values of a source, that do not fit.
    """
    kept: dict[str, NumberTally] = {}
    cuts: dict[str, tuple[float, ...]] = {}
    while True:
        blocks = replace(blocks, plan=row_by_row(plan, cuts))
        together = _one_look(blocks, plan, cuts, progress, memory)
        kept.update(together.kept)
        found = {name: _cuts(tally, plan, name) for name, tally in together.kept.items()}
        new = {name: points for name, points in found.items() if points}
        if not new:
            return replace(together, kept=kept, cuts=cuts), blocks
        cuts.update(new)


def _cuts(tally: NumberTally, plan: StudyPlan, name: str) -> tuple[float, ...]:
    groups = plan.derived[name].groups
    numbers, weights = tally.all()
    return cut_points(numbers, weights.astype(np.float64), groups) if isinstance(groups, int) else ()


def _one_look(
    blocks: Blocks, plan: StudyPlan, cuts: Mapping[str, tuple[float, ...]], progress: Progress, memory: int
) -> Together:
    together, needed = Together(), _columns_needed(plan, blocks)
    if not needed:
        return together
    progress.stage("reading", blocks.source.blocks)
    for block in blocks.read(needed):
        _note_numbers(block, plan, together)
        for name in _watched(plan):
            if name in block.columns:
                column = block.columns[name]
                together.met.setdefault(name, Met(column.column)).add(column, block.weights)
        for name, numbers, weights in _numbers_kept(block, plan, cuts):
            together.kept.setdefault(name, NumberTally(keep_all=True)).add_counted(numbers, weights)
        _note_outcome(block, blocks, plan, together)
        _keep_to(memory, together, blocks)
        progress.advance()
    return together


def _columns_needed(plan: StudyPlan, blocks: Blocks) -> set[str]:
    """The columns of the file that anything here rests on."""
    sources = {source for section in plan.derived.values() for source in section.sources}
    asked = plan.outcome.column if plan.records.count is not None else None
    texts = [plan.outcome.event_when]
    if any(section.quantile_groups_of is not None for section in plan.derived.values()):
        texts.append(plan.records.keep)
    named = {name for text in texts for name in mentioned(blocks.codes, text)}
    ranges = set(plausible_ranges(plan))
    wanted = sources | named | ranges | {asked, blocks.count, *plan.outcome.dates}
    return {name for name in blocks.codes if name in wanted}


def _watched(plan: StudyPlan) -> set[str]:
    """The columns of which the values met are told with their records."""
    by_level = [one for one in plan.derived.values() if one.groups_of is not None or one.points is not None]
    watched = {source for section in by_level for source in section.sources}
    banded = ("bands_of", "quantile_groups_of")
    watched |= {name for name, one in plan.derived.items() if any(getattr(one, rule) is not None for rule in banded)}
    if plan.outcome.column is not None and (plan.records.count is not None or plan.outcome.column in plan.derived):
        watched.add(plan.outcome.column)
    return watched


def _note_numbers(block: CodedBlock, plan: StudyPlan, together: Together) -> None:
    for name in plausible_ranges(plan):
        if name in block.columns:
            column = block.columns[name]
            if column.values.notna().any():
                together.recorded.add(name)
            if column.implausible is not None:
                rows, records = together.implausible.get(name, (0, 0))
                number = int(block.weights[column.implausible].sum())
                together.implausible[name] = rows + int(column.implausible.sum()), records + number
    for name, section in plan.derived.items():
        if section.years_between is not None and name in block.columns:
            backwards = block.columns[name].values.to_numpy(dtype=np.float64) < 0
            number = int(block.weights[backwards].sum())
            together.backwards[name] = together.backwards.get(name, 0) + number


def _numbers_kept(
    block: CodedBlock, plan: StudyPlan, cuts: Mapping[str, tuple[float, ...]]
) -> Iterator[tuple[str, np.ndarray, np.ndarray]]:
    """By column of quantile groups whose cut points are not known the numbers that these rest on, and their records."""
    wanted = [
        (name, section.quantile_groups_of)
        for name, section in plan.derived.items()
        if section.quantile_groups_of in block.columns and name not in cuts
    ]
    kept = _kept(block, plan) if wanted else None
    for name, source in wanted:
        values = block.columns[str(source)].values
        if kept is not None and not isinstance(values.dtype, pd.CategoricalDtype):
            numbers = values.to_numpy(dtype=np.float64)
            used = kept & ~np.isnan(numbers) & (block.weights > 0)
            yield name, numbers[used], block.weights[used].astype(np.int64)


def _kept(block: CodedBlock, plan: StudyPlan) -> Mask | None:
    """Rows (n,) that the plan's condition holds for; None where it does not fit the columns, which is told later."""
    if plan.records.keep is None:
        return np.ones(len(block.weights), dtype=np.bool_)
    with contextlib.suppress(InputFault):
        condition = vet_condition(plan.records.keep, {name: one.column for name, one in block.columns.items()}, "")
        frame = pd.DataFrame({name: block.columns[name].values for name in condition.columns})
        holds, _ = condition.evaluate(frame, _outside(block.columns, condition.columns))
        return holds
    return None


def _outside(columns: Mapping[str, CodedColumn], names: tuple[str, ...]) -> dict[str, pd.Series]:
    masks = {name: columns[name].outside for name in names}
    return {name: pd.Series(mask) for name, mask in masks.items() if mask is not None}


def _note_outcome(block: CodedBlock, blocks: Blocks, plan: StudyPlan, together: Together) -> None:
    """Count an outcome that the plan makes; what it cannot be made from is told later."""
    if plan.outcome.column is not None or any(name not in block.columns for name in plan.outcome.dates):
        return
    with contextlib.suppress(InputFault):
        found = outcome_by_row(blocks.table(block), plan.outcome)
        together.events += int(block.weights[found.happened].sum())
        together.event_free += int(block.weights[found.event_free].sum())
        together.late += int(block.weights[found.after_follow_up].sum())


def _keep_to(memory: int, together: Together, blocks: Blocks) -> None:
    for name, tally in together.kept.items():
        if tally.size > memory:
            raise InputFault(fault("needs-memory", place(name, "quantile_groups_of")))
    for name, met in together.met.items():
        if met.size > memory:
            raise InputFault(fault("too-many-values", blocks.where(name)))
