"""All counts of a study, in tables, flows and figures, as one system of sums."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from itertools import accumulate, combinations, pairwise

from oddsmodel.disclosure.calibration import merge_groups
from oddsmodel.disclosure.system import EVENTS, READ, RECORDS, SIDE, Counts, CountSystem, Place
from oddsmodel.disclosure.table_counts import Sighting, Sightings, TableCounts, count_cells, row_text, whole_number
from oddsmodel.results.figures import CalibrationFigure
from oddsmodel.results.lead import SEPARATED
from oddsmodel.results.study import CoefficientResult, ModelResult, StudyResults
from oddsmodel.results.tables import Table

Key = tuple[str, str, str]


@dataclass(slots=True)
class _Ordered:
    """Records in order of fitted probability, cut into groups: the groups' records and events as counts."""

    model: int
    records: list[int]
    events: list[int]


@dataclass(slots=True)
class _Gathered:
    system: CountSystem
    threshold: int
    sightings: Sightings = field(default_factory=Sightings)
    totals: list[tuple[int, list[int]]] = field(default_factory=list)
    """Each model's records, events and records without the event."""
    ordered: list[_Ordered] = field(default_factory=list)


def gather(study: StudyResults, threshold: int) -> Counts:
    """The counts of a study under a threshold of at least 2.

    Equal counts that stand in several places are recognised by the words of their row or by what they are a part of;
    where that is not certain they are tied, to be hidden together. Two models of which one's records hold the other's
    give away what lies between: with a small difference by level, `closed_models` leaves the later one's tables out.
    """
    found = _Gathered(CountSystem(), threshold)
    read = _enter_flows(found, study)
    closed = closed_models(study, threshold)
    scalars = [_enter_model(found, study, m, read, closed) for m in range(len(study.models))]
    main: Mapping[int, int] = scalars[0] if scalars else {}
    if study.characteristics is not None:
        _enter_table(found, study.characteristics, ("characteristics",), main, 0)
    for d, one in enumerate(study.derived):
        for t, table in enumerate(one.tables):
            _enter_table(found, table, ("derived", d, t), main, 0)
    if study.comparison is not None:
        everywhere = {value: number for known in reversed(scalars) for value, number in known.items()}
        cells = _enter_table(found, study.comparison, ("comparison",), {}, 0)
        for number in cells.cells.values():
            same = everywhere.get(found.system.value(number))
            if same is not None:
                found.system.merge(number, same)
    _lock_told(found, study)
    _enter_nested(found)
    _enter_ordered(found)
    _recognise(found)
    return found.system.freeze()


def _lock_told(found: _Gathered, study: StudyResults) -> None:
    """Zeros that a model without a finite estimate tells: nobody, or everybody, of a level had the event.

    Its report says which way the odds ratio goes, so such a zero protects nothing and is not hidden.
    """
    for model in study.models:
        separated = model.status == SEPARATED
        shown = [one for one in model.coefficients if one.shown and one.log_odds_ratio is None]
        infinite = [one for one in shown if separated or one.exact is not None]
        for signature, tables in found.sightings.by_signature.items():
            if signature[0] == "row" and len(signature) == 3 and signature[2] == 0:
                words = str(signature[1])
                if any(one.label.startswith(words) or _reference_of(one, words) for one in infinite):
                    for number in (number for numbers in tables.values() for number in numbers):
                        found.system.lock(number)


def _reference_of(one: CoefficientResult, words: str) -> bool:
    """Whether the words of a row ("Smoking: never") name the level that a coefficient is against."""
    start, _, level = words.rpartition(": ")
    return one.reference is not None and level == one.reference and one.label.startswith(f"{start}: ")


def _enter_flows(found: _Gathered, study: StudyResults) -> dict[int, int]:
    """Records read and left out, before the models; returns the counts of records read by size."""
    system = found.system
    read: dict[int, int] = {}
    sizes = [model.flow.read for model in study.models] + [study.records.read]
    for size in sizes:
        if size is not None and size not in read:
            read[size] = system.add(size, ("read", size), rank=READ)
    left_out: dict[tuple[str, str, int], int] = {}

    def enter(place: Place, code: str, reason: str, records: int | None, model: int) -> None:
        if records is None:
            return
        number = system.add(records, place, model=model)
        same = left_out.setdefault((code, reason, records), number)
        system.merge(same, number)
        found.sightings.wholes.setdefault(records, []).append(Sighting(("flow",), number, reason))

    for m, model in enumerate(study.models):
        for i, one in enumerate(model.flow.left_out):
            enter(("left out", m, i), one.code, one.reason, one.records, m)
    for i, one in enumerate(study.records.excluded):
        enter(("excluded", i), one.code, one.reason, one.records, 0)
    return read


def closed_models(study: StudyResults, threshold: int) -> frozenset[int]:
    """Models of whose counts, but for their totals, nothing may be shown.

    These are the later ones of two models whose records seem to hold one another (no count of one is smaller, or none
    is larger, than the same count of the other). What lies between them are records left out by one of them, so that
    this holds only where a difference, a number of records left out or a characteristic is a small count.
    """
    keyed = [_keyed(model) for model in study.models]
    described = study.characteristics
    parts = [described.rows[r][k] for r, k in count_cells(described)] if described is not None else []
    parts += [one.records for model in study.models for one in model.flow.left_out]
    any_small = any(isinstance(part, int) and 0 < part < threshold for part in parts)
    closed: set[int] = set()
    for (i, first), (j, second) in combinations(enumerate(keyed), 2):
        differences = [first[key] - second[key] for key in first.keys() & second.keys()]
        nested = min(differences, default=0) >= 0 or max(differences, default=0) <= 0
        small = any(0 < abs(difference) < threshold for difference in differences)
        if i not in closed and nested and (small or (any_small and any(differences))):
            closed.add(j)
    return frozenset(closed)


def _keyed(model: ModelResult) -> dict[Key, int]:
    """The counts of a model's tables under what tells the same count of another model."""
    found: dict[Key, int] = {}
    for table in model.tables:
        for row in table.rows:
            words = row_text(table, row)
            for column, cell in zip(table.columns, row, strict=True):
                value = whole_number(cell) if column.kind == "count" else None
                if value is not None:
                    found.setdefault((table.id, words, column.key), value)
    return found


def _enter_model(
    found: _Gathered, study: StudyResults, m: int, read: Mapping[int, int], closed: frozenset[int]
) -> dict[int, int]:
    """A model's totals, flow, tables and checks; returns its totals by size."""
    system, model = found.system, study.models[m]
    scalars: dict[int, int] = {}
    analysed, happened = analysed_and_events(model)
    if analysed is not None:
        records = system.add(analysed, ("records", m), rank=RECORDS, model=m)
        totals = [records]
        _enter_flow_sum(found, model, m, read, records)
        if happened is not None:
            events = system.add(happened, ("events", m), rank=EVENTS, model=m)
            others = system.add(analysed - happened, rank=EVENTS, model=m)
            system.relate([events, others], records)
            scalars = {analysed - happened: others, happened: events}
            totals += [events, others]
        scalars[analysed] = records
        found.totals.append((m, totals))
        for c, coefficient in enumerate(model.coefficients):
            everyone = coefficient.crude_all_records
            if everyone is not None and everyone.records is not None:
                number = system.add(everyone.records, ("crude all", m, c), rank=SIDE, model=m)
                _enter_difference(found, number, records, m)
    if m in closed:
        return scalars
    for t, table in enumerate(model.tables):
        cells = _enter_table(found, table, ("model", m, t), scalars, m)
        for (_, k), number in cells.cells.items():
            if analysed is not None and table.columns[k].part_of is None:
                _enter_difference(found, number, scalars[analysed], m)
    for c, check in enumerate(model.checks):
        for t, table in enumerate(check.tables):
            cells = _enter_table(found, table, ("check", m, c, t), scalars, m)
            _see_ordered(found, table, cells, m)
        for f, figure in enumerate(check.figures):
            if isinstance(figure, CalibrationFigure):
                _enter_calibration(found, figure, ("figure", m, c, f), m)
    return scalars


def analysed_and_events(model: ModelResult) -> tuple[int | None, int | None]:
    """A model's records and events, from its accounting where it was not estimated."""
    records = model.records if model.records is not None else model.flow.analysed
    return records, model.events if model.events is not None else model.flow.events


def _enter_flow_sum(found: _Gathered, model: ModelResult, m: int, read: Mapping[int, int], analysed: int) -> None:
    flow, system = model.flow, found.system
    if flow.read is None or any(one.records is None for one in flow.left_out):
        return
    if sum(one.records or 0 for one in flow.left_out) + system.value(analysed) != flow.read:
        return
    system.relate([*(system.at(("left out", m, i)) for i in range(len(flow.left_out))), analysed], read[flow.read])


def _enter_difference(found: _Gathered, larger: int, smaller: int, model: int) -> None:
    """Two counts of which one holds the other: what lies between them, where it is small, is a count to protect."""
    difference = found.system.value(larger) - found.system.value(smaller)
    if 0 < difference < found.threshold:
        between = found.system.add(difference, model=model, unnamed=True)
        found.system.relate([smaller, between], larger)


def _enter_table(found: _Gathered, table: Table, owner: Place, scalars: Mapping[int, int], model: int) -> TableCounts:
    cells = TableCounts(found.system, found.sightings, table, owner, scalars, model)
    cells.enter()
    return cells


def _enter_nested(found: _Gathered) -> None:
    """Differences between the totals of two models, where the records of one seem to hold those of the other."""
    for (_, first), (j, second) in combinations(found.totals, 2):
        pairs = list(zip(first, second, strict=False))
        differences = [found.system.value(one) - found.system.value(other) for one, other in pairs]
        if min(differences) < 0 < max(differences):
            continue
        for (one, other), difference in zip(pairs, differences, strict=True):
            if difference == 0:
                found.system.merge(one, other)
            else:
                _enter_difference(found, *((one, other) if difference > 0 else (other, one)), j)


def _see_ordered(found: _Gathered, table: Table, cells: TableCounts, model: int) -> None:
    """A table of groups numbered 1, 2, ... with records and events may cut the same order as another one."""
    numbered = [row[0] for row in table.rows] == [str(k + 1) for k in range(len(table.rows))]
    if not numbered or not {"records", "events"} <= cells.positions.keys():
        return
    columns = [[cells.cells.get((r, cells.positions[key])) for r in range(len(table.rows))] for key in _PAIR]
    records, events = ([number for number in column if number is not None] for column in columns)
    if len(records) == len(events) == len(table.rows):
        found.ordered.append(_Ordered(model, records, events))


_PAIR = ("records", "events")


def _enter_calibration(found: _Gathered, figure: CalibrationFigure, place: Place, model: int) -> None:
    """The groups as they will be drawn: their counts can be read off the figure, which is shown whole or not at all."""
    groups = merge_groups(figure.groups, found.threshold)
    if not groups:
        return
    counts = [[group.records for group in groups], [group.events for group in groups]]
    records, events = (
        [found.system.add(count, (*place, kind, k), rank=SIDE, model=model) for k, count in enumerate(values)]
        for kind, values in zip(_PAIR, counts, strict=True)
    )
    found.system.tie([*records, *events])
    found.ordered.append(_Ordered(model, records, events))


def _enter_ordered(found: _Gathered) -> None:
    """Several ways to cut the same order: what lies between two neighbouring cuts of any is a part of a group of each.

    Cuts of the same order rise together in records and events; others have nothing to do with one another.
    """
    system = found.system
    for model in {groups.model for groups in found.ordered}:
        own = [groups for groups in found.ordered if groups.model == model]
        cuts = [_cuts(system, groups) for groups in own]
        every = sorted({cut for one in cuts for cut in one})
        rising = all(before[1] <= after[1] and before[0] < after[0] for before, after in pairwise(every))
        if len(own) < 2 or not rising or len({one[-1] for one in cuts}) > 1:
            continue
        between: list[tuple[int, ...]] = []
        for before, after in pairwise([(0, 0), *every]):
            records, events = after[0] - before[0], after[1] - before[1]
            parts = tuple(system.add(number, unnamed=True) for number in (records, events, records - events))
            system.relate(parts[1:], parts[0])
            between.append(parts)
        for groups, ends in zip(own, cuts, strict=True):
            places = [0, *(every.index(cut) + 1 for cut in ends)]
            for (start, stop), records, events in zip(pairwise(places), groups.records, groups.events, strict=True):
                system.relate([parts[0] for parts in between[start:stop]], records)
                system.relate([parts[1] for parts in between[start:stop]], events)


def _cuts(system: CountSystem, groups: _Ordered) -> list[tuple[int, int]]:
    """Records and events up to each cut."""
    records = accumulate(map(system.value, groups.records))
    return list(zip(records, accumulate(map(system.value, groups.events)), strict=True))


def _recognise(found: _Gathered) -> None:
    """Merge counts that are certainly the same, tie those that may be, link sums to the cells they may be."""
    system, sightings = found.system, found.sightings
    for signature, seen in sightings.by_signature.items():
        if len(seen) < 2:
            continue
        tables = [sorted({system.root(number) for number in numbers}) for numbers in seen.values()]
        if all(len(numbers) == 1 for numbers in tables):
            for (number,) in tables[1:]:
                system.merge(tables[0][0], number)
        elif signature[0] != "row" and isinstance(signature[1], int) and signature[1] >= found.threshold:
            system.tie(number for numbers in tables for number in numbers)
    for total in sightings.totals:
        value = system.value(total.number)
        for cell in _likely(system, total, sightings.wholes.get(value, ())) if value >= found.threshold else ():
            system.link(total.number, cell)


def _likely(system: CountSystem, total: Sighting, wholes: Sequence[Sighting]) -> list[int]:
    """The counts elsewhere that a sum may be: of several of its size those whose words are most like its own."""
    likeness: dict[int, int] = {}
    for one in wholes:
        cell = system.root(one.number)
        if one.owner != total.owner and cell != system.root(total.number):
            likeness[cell] = max(likeness.get(cell, 0), len(_words(total.words) & _words(one.words)))
    most = max(likeness.values(), default=0)
    return [cell for cell, shared in likeness.items() if shared == most]


def _words(text: str) -> set[str]:
    return set(re.findall(r"\w+", text.lower()))
