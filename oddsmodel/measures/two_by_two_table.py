"""The 2×2 table of each exposure with two levels, counts above and odds ratios below, ready for disclosure."""

from __future__ import annotations

from oddsmodel.measures.counts import LevelCounts, exposure_counts
from oddsmodel.measures.designs import CASE_CONTROL
from oddsmodel.measures.two_by_two import TwoByTwo, two_by_two
from oddsmodel.model.fitted import FittedModel
from oddsmodel.results.tables import Cell, Interval, Table, TableColumn
from oddsmodel.wording import say


def two_by_two_tables(model: FittedModel) -> tuple[Table, ...]:
    """One table for each exposure of two levels, on the records analysed; none for other exposures."""
    tables: list[Table] = []
    for name in model.exposures:
        counted = exposure_counts(model, name)
        if counted is None or len(counted.levels) != 2:
            continue
        column = model.columns[name]
        # The formula may name another reference than the plan, and its odds ratio must not be the inverse of this one.
        named = (one.reference for one in model.design.columns if one.sources == (name,) and one.reference)
        if next(named, column.reference or counted.levels[0]) == counted.levels[0]:
            counted = LevelCounts(counted.levels[::-1], counted.records[::-1], counted.events[::-1])
        id_ = "two_by_two" if not tables else f"two_by_two_{len(tables) + 1}"
        tables.append(_table(id_, column.label, counted, model.level, model.study_design))
    return tuple(tables)


def _table(id_: str, label: str, counted: LevelCounts, level: float, design: str) -> Table:
    """The counts of both groups, the exposed first, then three odds ratios with their limits and p-values."""
    events, others = counted.events, counted.records - counted.events
    answer = two_by_two(int(events[0]), int(others[0]), int(events[1]), int(others[1]), level)
    case_control = design in CASE_CONTROL
    columns = [
        TableColumn("label", label),
        TableColumn("records", "Records", "count", sums_known=True),
        TableColumn("events", "Cases" if case_control else "Events", "count", part_of="records", sums_known=True),
        TableColumn("others", "Controls" if case_control else "No event", "count", part_of="records", sums_known=True),
        TableColumn("odds_ratio", "Odds ratio", "odds_ratio", hidden_with_block=True),
        TableColumn("interval", f"{round(100 * level, 1):g}% interval", "interval", hidden_with_block=True),
        TableColumn("p", "p-value", "p", hidden_with_block=True),
    ]
    rows: list[tuple[Cell, ...]] = [
        (f"{label}: {name}", int(counted.records[k]), int(events[k]), int(others[k]), None, None, None)
        for k, name in enumerate(counted.levels)
    ]
    rows += [
        ("Sample odds ratio, Woolf interval", None, None, None, answer.odds_ratio, _interval(answer, "woolf"), None),
        ("Conditional estimate, exact limits", *_conditional(answer, "exact"), answer.exact_p),
        ("Conditional estimate, mid-P limits", *_conditional(answer, "mid_p"), answer.mid_p_p),
    ]
    if answer.reasons:
        columns.append(TableColumn("remark", "Why a cell is empty", hidden_with_block=True))
        remarks = ["", "", _remark(answer, "odds_ratio", "woolf")]
        remarks += [_remark(answer, "conditional", name) for name in ("exact", "mid_p")]
        rows = [(*row, remark) for row, remark in zip(rows, remarks, strict=True)]
    title = say("two-by-two-title", label=label)
    return Table(id_, title, tuple(columns), tuple(rows), say("two-by-two-note"), (0,) * len(rows))


def _conditional(answer: TwoByTwo, name: str) -> tuple[Cell, ...]:
    return None, None, None, answer.conditional, _interval(answer, name)


def _interval(answer: TwoByTwo, name: str) -> Cell:
    """The interval, or an empty cell where the whole of it is withheld."""
    limits: Interval = getattr(answer, name)
    return None if limits.lower is None and limits.upper is None else limits


def _remark(answer: TwoByTwo, *names: str) -> str:
    """The reasons of these answers: in a column of their own, because they can tell a hidden count."""
    keys = [key for key in answer.reasons if key.split(".")[0] in names]
    return " ".join(dict.fromkeys(answer.reasons[key] for key in keys))
