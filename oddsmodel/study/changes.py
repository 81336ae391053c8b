"""Results of the same study set side by side: what changed in plan, records, models and numbers."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import replace
from itertools import pairwise
from pathlib import Path
from typing import Any, Literal

from oddsmodel.disclosure.differences import CountRow, Withheld, withheld_differences
from oddsmodel.disclosure.words import without_counts
from oddsmodel.errors import Fault, InputFault
from oddsmodel.export.read_results import read_results
from oddsmodel.export.saved import SavedFinding, SavedResults
from oddsmodel.findings import Finding
from oddsmodel.results.changes import Changes, Refresh, Step
from oddsmodel.results.tables import Cell, Hidden, Table, TableColumn
from oddsmodel.study.model_changes import is_estimated, model_changes, models_by_key
from oddsmodel.study.plan_changes import plan_changes
from oddsmodel.wording import say
from oddsmodel.wording.plain import plain

MOST_RESULTS = 24
MOST_FINDINGS = 20
LONGEST_NAME = 24
TOGETHER = "other-reasons-together"
Counts = tuple[int | None, ...]


def changes(paths: Sequence[Path]) -> Changes:
    """What changed between two or more results.json, in the order given.

    Raises InputFault where there are too few or too many of them, or any is not what it should be.
    """
    if len(paths) < 2:
        raise InputFault(_fault("changes-too-few"))
    if len(paths) > MOST_RESULTS:
        raise InputFault(_fault("changes-too-many", most=MOST_RESULTS))
    faults: list[Fault] = []
    results: list[SavedResults] = []
    for path in paths:
        try:
            results.append(read_results(path))
        except InputFault as fault:
            faults.extend(fault.faults)
    if faults:
        raise InputFault(faults)
    return compare(results, names(paths))


def compare(results: Sequence[SavedResults], named: Sequence[str]) -> Changes:
    """What changed between two or more results. named: what each is called, no two alike.

    If any of them is internal the comparison is too, and withholds nothing. Else it withholds counts whose difference
    from another is under the largest of their thresholds.
    """
    internal = any(one.internal for one in results)
    threshold = 0 if internal else max(one.disclosure.hide_counts_below for one in results)
    rows = _count_rows(results)
    withheld = _withheld(results, rows, threshold)
    unsaid = frozenset(count for r, c in withheld if (count := rows[r].counts[c]))
    last = results[-1].study
    return Changes(
        title=last.title,
        question=last.question,
        internal=internal,
        threshold=threshold,
        refreshes=tuple(
            Refresh(
                name,
                one.provenance.plan,
                one.provenance.plan_sha256,
                one.records.sha256,
                one.provenance.versions,
            )
            for one, name in zip(results, named, strict=True)
        ),
        steps=tuple(
            _step(before, after, names_, threshold, unsaid)
            for (before, after), names_ in zip(pairwise(results), pairwise(named), strict=True)
        ),
        counts=_counts_table(rows, withheld, named, threshold),
        models=model_changes(results, named),
        cautions=tuple(_cautions(results)),
    )


def _withheld(
    results: Sequence[SavedResults], rows: Sequence[CountRow], threshold: int
) -> dict[tuple[int, int], Withheld]:
    """Counts that are not shown; one run done twice, on the same plan and records, is compared with others once."""
    same = [
        (one.provenance.plan_sha256, one.records.sha256, tuple(row.counts[c] for row in rows))
        for c, one in enumerate(results)
    ]
    distinct = list(dict.fromkeys(same))
    first = [same.index(one) for one in distinct]
    found = withheld_differences([replace(row, counts=tuple(row.counts[c] for c in first)) for row in rows], threshold)
    return {
        (r, c): found[r, distinct.index(one)]
        for r in range(len(rows))
        for c, one in enumerate(same)
        if (r, distinct.index(one)) in found
    }


def names(paths: Sequence[Path]) -> list[str]:
    """ "1 (autumn)" for the first of the results, from its folder, or from its own name where that says more."""
    found = []
    for path in paths:
        own = path.stem.removesuffix("-INTERNAL")
        folder = path.resolve().parent.name.removesuffix("-report")
        found.append(plain(folder if own == "results" and folder else own, LONGEST_NAME))
    return [f"{number} ({name})" if name else str(number) for number, name in enumerate(found, 1)]


def _count_rows(results: Sequence[SavedResults]) -> list[CountRow]:
    """Records read, left out by reason and analysed; events; in each of the results."""
    rows = [CountRow(say("count-read"), tuple(one.records.read for one in results), role="total")]
    left_out = [_by_reason(one) for one in results]
    for key in dict.fromkeys(key for one in left_out for key in one):
        reason = next(one[key][0] for one in reversed(left_out) if key in one)
        counts = tuple(
            one[key][1] if key in one else (None if any(code == TOGETHER for code, _ in one) else 0) for one in left_out
        )
        rows.append(CountRow(say("count-left-out", reason=plain(reason)), counts, role="summand"))
    for place, (models, (records, events)) in enumerate(_analysed(results)):
        # The first model's accounting is that of the study: with those left out its records are all that were read.
        role: Literal["", "summand"] = "summand" if place == 0 else ""
        rows.append(CountRow(say("count-analysed", models=models), records, role=role))
        rows.append(CountRow(say("count-events", models=models), events, part_of=len(rows) - 1))
    return rows


def _analysed(results: Sequence[SavedResults]) -> list[tuple[list[str], tuple[Counts, Counts]]]:
    """Records and events of the models, those that share them together; nobody named where all do."""
    sharing: dict[tuple[Counts, Counts], list[str]] = {}
    for name, models in models_by_key(results).values():
        records = tuple(None if one is None else one.records for one in models)
        events = tuple(None if one is None else one.events for one in models)
        sharing.setdefault((records, events), []).append(name)
    return [(names_ if len(sharing) > 1 else [], counts) for counts, names_ in sharing.items()]


def _by_reason(results: SavedResults) -> dict[tuple[str, int], tuple[str, int | None]]:
    """The records left out by the code of the reason and which of that code it is."""
    met: Counter[str] = Counter()
    found = {}
    for one in results.records.excluded:
        code = one.code or one.reason
        found[code, met[code]] = (one.reason, one.records)
        met[code] += 1
    return found


def _counts_table(
    rows: Sequence[CountRow], withheld: Mapping[tuple[int, int], Withheld], named: Sequence[str], threshold: int
) -> Table:
    columns = (
        TableColumn("what", say("column-count")),
        *(TableColumn(f"refresh-{number}", name, "count") for number, name in enumerate(named, 1)),
    )
    near = say("fewer-apart", threshold=threshold)
    cells: list[tuple[Cell, ...]] = []
    for r, row in enumerate(rows):
        shown: list[Cell] = []
        for c, count in enumerate(row.counts):
            if (r, c) in withheld:
                shown.append(near if withheld[r, c] == "near" else Hidden())
            else:
                shown.append(Hidden() if count is None else count)
        cells.append((row.label, *shown))
    note = say("fewer-apart-note", threshold=threshold) if "near" in withheld.values() else ""
    return Table("counts", say("table-counts"), columns, tuple(cells), note)


def _step(
    before: SavedResults, after: SavedResults, named: tuple[str, str], threshold: int, unsaid: frozenset[int]
) -> Step:
    same_records = before.records.sha256 == after.records.sha256
    same_text = before.provenance.plan_sha256 == after.provenance.plan_sha256
    plan = () if same_text else plan_changes(before, after)
    code = "same" if same_text else "changed" if plan else "unseen"
    first, second = _serious(before), _serious(after)
    return Step(
        before=named[0],
        after=named[1],
        cause=say(f"cause-plan-{code}-records-{'same' if same_records else 'other'}"),
        plan=plan,
        records=tuple(_columns_taken(before, after)),
        programs=_programs(before, after),
        overlap=_overlap(before, after, threshold, same_records),
        models=tuple(_estimated(before, after)),
        appeared=_only_in(second, first, threshold, unsaid),
        went=_only_in(first, second, threshold, unsaid),
    )


def _columns_taken(before: SavedResults, after: SavedResults) -> Iterator[str]:
    """Levels, references and kinds that changed because the records did, the plan having left them open."""
    first, second = ({column.name: column for column in one.columns or ()} for one in (before, after))
    for name, now in second.items():
        was, said = first.get(name), _said_of(after, name)
        # Where the plan says something else of the column now, a change of it is the plan's.
        if was is None or said != _said_of(before, name):
            continue
        label = plain(now.label)
        if was.kind != now.kind and "kind" not in said:
            yield say("column-kind", label=label, before=plain(was.kind), after=plain(now.kind))
        if "levels" not in said:
            new = [plain(level) for level in now.levels if level not in was.levels]
            gone = [plain(level) for level in was.levels if level not in now.levels]
            if new:
                yield say("column-levels-new", label=label, levels=new)
            if gone:
                yield say("column-levels-gone", label=label, levels=gone)
        if was.reference != now.reference and "reference" not in said:
            yield say(
                "column-reference", label=label, before=plain(was.reference or ""), after=plain(now.reference or "")
            )


def _said_of(results: SavedResults, column: str) -> dict[str, Any]:
    """What the plan says of a column, under its own name or as one that is made from others."""
    said: dict[str, Any] = {}
    for section in ("columns", "derived"):
        entries = (results.plan or {}).get(section)
        entry = entries.get(column) if isinstance(entries, dict) else None
        said |= entry if isinstance(entry, dict) else {}
    return said


def _programs(before: SavedResults, after: SavedResults) -> str:
    first, second = before.provenance.versions, after.provenance.versions
    changed = [
        (plain(name, 60), plain(first.get(name, ""), 60), plain(second.get(name, ""), 60))
        for name in dict.fromkeys([*first, *second])
        if first.get(name) != second.get(name)
    ]
    return say("programs-changed", changed=changed) if changed else ""


def _overlap(before: SavedResults, after: SavedResults, threshold: int, same_records: bool) -> str:
    """What can be known of records that are in both, from two fingerprints and two numbers."""
    if same_records:
        return say("overlap-same")
    first, second = before.records.read, after.records.read
    if first is None or second is None:
        return say("overlap-unknown")
    if abs(second - first) < max(threshold, 1):
        return say("overlap-about-as-many")
    return say("overlap-larger" if second > first else "overlap-smaller")


def _estimated(before: SavedResults, after: SavedResults) -> Iterator[str]:
    for name, (was, now) in models_by_key((before, after)).values():
        if was is None or now is None:
            yield say("model-new" if was is None else "model-gone", name=name)
        elif is_estimated(was) != is_estimated(now):
            code = "model-now-estimated" if is_estimated(now) else "model-not-estimated-now"
            yield say(code, name=name, status=plain(now.status))


def _serious(results: SavedResults) -> dict[tuple[str, str], tuple[str, SavedFinding]]:
    """Cautions and stops by model and code, the first of each."""
    found: dict[tuple[str, str], tuple[str, SavedFinding]] = {}
    for name, findings in (("", results.findings), *((model.name, model.findings) for model in results.models)):
        for one in findings:
            if one.severity != "note":
                found.setdefault((name, one.code), (name, one))
    return found


def _only_in(
    these: dict[tuple[str, str], tuple[str, SavedFinding]],
    those: dict[tuple[str, str], tuple[str, SavedFinding]],
    threshold: int,
    unsaid: frozenset[int],
) -> tuple[Finding, ...]:
    """Findings of one refresh that the other does not have, without counts that are withheld here."""
    told = []
    for key, (name, one) in these.items():
        if key not in those:
            message = plain(one.message)
            message = without_counts(message, threshold, unsaid) if threshold else message
            message = say("finding-of-model", name=plain(name), message=message) if name else message
            told.append(Finding(one.severity, one.code, message))
    return tuple(told[:MOST_FINDINGS])


def _cautions(results: Sequence[SavedResults]) -> Iterator[str]:
    if len({(one.study.outcome, one.study.event) for one in results}) > 1:
        yield say("other-outcome")
    if len({one.study.design for one in results}) > 1:
        yield say("other-design")
    if len({one.study.title for one in results}) > 1:
        yield say("other-title")
    if len({one.internal for one in results}) > 1:
        yield say("internal-among-them")


def _fault(code: str, **facts: object) -> Fault:
    return Fault(what=say(code, **facts), where="oddsmodel changes", remedy=say(f"{code}-remedy"))
