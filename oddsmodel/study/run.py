"""The whole job: a plan in, a folder with the report, results.json and tables out."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from oddsmodel.disclosure import disclose
from oddsmodel.export.csv_tables import csv_files
from oddsmodel.export.files import check_folder, write_outputs
from oddsmodel.export.results_json import results_text
from oddsmodel.progress import Progress, Silent
from oddsmodel.results.study import StudyResults
from oddsmodel.study.answer import answer
from oddsmodel.study.check import opened_plan


@dataclass(frozen=True)
class RunOutcome:
    """Where the files are, the results as written (after disclosure), and whether a model could not be estimated."""

    folder: Path
    files: tuple[Path, ...]
    results: StudyResults
    not_estimated: bool


def run_plan(
    plan_path: Path,
    *,
    into: Path | None = None,
    records: Path | None = None,
    workers: str | None = None,
    progress: Progress | None = None,
) -> RunOutcome:
    """Read, vet, fit, check, disclose, write. InputFault where the plan, records or formula is at fault.

    Nothing is written before everything is there to be written. workers: the address of a scheduler, or "local".
    """
    from oddsmodel.report.document import render_report

    progress = progress or Silent()
    folder = into if into is not None else plan_path.parent / f"{plan_path.stem}-report"
    check_folder(folder)
    with opened_plan(plan_path, progress, records=records, workers=workers) as checked:
        study, _ = answer(checked, progress)
    plan = checked.file.plan
    disclosed = disclose(study, audience=plan.report.audience, hide_counts_below=plan.report.hide_counts_below)
    files = {
        "report.html": render_report(disclosed, progress),
        **{f"tables/{name}": text for name, text in csv_files(disclosed).items()},
        "results.json": results_text(disclosed),
    }
    written = write_outputs(folder, files, internal=plan.report.audience == "internal")
    not_estimated = any(model.status != "converged" for model in study.models)
    return RunOutcome(folder, tuple(written), disclosed.study, not_estimated)
