"""`changes`: results of the same study set side by side, on the terminal and as a page."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from oddsmodel.cli.ending import DONE
from oddsmodel.cli.progress import drawn_progress
from oddsmodel.cli.run import write_findings
from oddsmodel.cli.terminal import write
from oddsmodel.results.changes import Changes, ModelChanges, Step
from oddsmodel.results.tables import Cell, Hidden, Interval, Table
from oddsmodel.wording import numbers, say


def changes_command(paths: Sequence[Path], into: Path | None) -> int:
    """Print what changed between results, and write it as a page where one is asked for."""
    from oddsmodel.export.page import check_page, write_page
    from oddsmodel.report.changes import COMMAND, render_changes
    from oddsmodel.study.changes import changes

    found = changes(paths)
    page = None if into is None else _named(into, found.internal)
    if page is not None:
        check_page(page, COMMAND)
        with drawn_progress() as progress:
            text = render_changes(found, progress)
        write_page(page, text, COMMAND)
    _write_changes(found)
    if page is not None:
        write()
        write(say("changes-written", file=str(page)))
    return DONE


def _named(path: Path, internal: bool) -> Path:
    """The name of the page; an internal one says so, as the files of an internal run do."""
    if not internal or "INTERNAL" in path.name or not path.name:
        return path
    return path.with_name(f"{path.stem}-INTERNAL{path.suffix}")


def _write_changes(found: Changes) -> None:
    write(say("changes-title", title=found.title))
    if found.internal:
        write(say("banner-internal"))
    if found.question:
        write(found.question)
    for caution in found.cautions:
        write()
        write(f"{say('severity-caution')}: {caution}")
    for model in found.models:
        _write_series(model)
    write()
    write(say("changes-read"))
    _write_counts(found.counts)
    for step in found.steps:
        _write_step(step)


def _write_series(model: ModelChanges) -> None:
    write()
    write(say("series-title", model=model.name))
    if model.table is None:
        write(say("changes-none-estimated"), indent=2)
    else:
        contrast: Cell = None
        for label, refresh, odds_ratio, interval in model.table.rows:
            if label != contrast:
                write(str(label), indent=2)
                contrast = label
            words = str(interval)
            if isinstance(odds_ratio, float) and isinstance(interval, Interval):
                words = f"{numbers.ratio(odds_ratio)} ({numbers.interval(interval.lower, interval.upper)})"
            write(f"{refresh}: {words}", indent=4)
    for note in model.notes:
        write(note, indent=2)


def _write_counts(table: Table) -> None:
    write()
    write(table.title)
    for label, *counts in table.rows:
        write(f"{label}: {', then '.join(_count(cell) for cell in counts)}", indent=2)
    if table.note:
        write(table.note, indent=2)


def _count(cell: Cell) -> str:
    if isinstance(cell, Hidden):
        return say("cell-withheld")
    return numbers.count(cell) if isinstance(cell, int) else str(cell)


def _write_step(step: Step) -> None:
    write()
    write(say("changes-step", before=step.before, after=step.after))
    for text in (step.cause, step.programs, step.overlap):
        if text:
            write(text, indent=2)
    for heading, texts in (
        ("changes-plan", step.plan),
        ("changes-records", step.records),
        ("changes-models", step.models),
    ):
        if texts:
            write(f"{say(heading)}:", indent=2)
            for text in texts:
                write(f"- {text}", indent=4)
    write_findings(step.appeared, f"{say('changes-appeared')}:")
    write_findings(step.went, f"{say('changes-went')}:")
