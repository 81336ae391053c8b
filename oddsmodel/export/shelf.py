"""The reports in a folder, found by what each run leaves in its own: the manifest and results.json."""

from __future__ import annotations

import hashlib
import json
import os
from collections import Counter
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

from oddsmodel.errors import Fault, InputFault
from oddsmodel.export.files import MANIFEST
from oddsmodel.export.read_results import LARGEST_MEGABYTES, read_bytes, read_results
from oddsmodel.export.saved import SavedModel, SavedResults
from oddsmodel.wording import say
from oddsmodel.wording.plain import plain

RESULTS = ("results.json", "results-INTERNAL.json")
REPORTS = ("report.html", "report-INTERNAL.html")
MOST_FOLDERS = 20_000
LARGEST_MANIFEST_MEGABYTES = 2


@dataclass(frozen=True, slots=True)
class ShelfEntry:
    """One report. report: None where the file is not there; changed: whether its results are as the run left them.

    read, analysed, events: counts as the results show them, None where they withhold them. answers: label and sentence.
    """

    folder: Path
    report: Path | None
    title: str
    question: str
    answers: tuple[tuple[str, str], ...]
    read: int | None
    analysed: int | None
    events: int | None
    stops: int
    cautions: int
    notes: int
    internal: bool
    changed: bool


@dataclass(frozen=True, slots=True)
class Shelf:
    """Reports by title, and the folders of a run that could not be listed, each with the reason in words."""

    entries: tuple[ShelfEntry, ...]
    left_out: tuple[tuple[str, str], ...]

    @property
    def internal(self) -> bool:
        return any(entry.internal for entry in self.entries)


def reports_in(folder: Path) -> Shelf:
    """The reports in a folder and in those within it, by title; links and hidden folders are not followed.

    Raises InputFault where there is no such folder, no report, or far too many folders.
    """
    if not folder.is_dir():
        raise InputFault(_fault("shelf-no-folder", folder))
    entries: list[tuple[tuple[str, str], ShelfEntry]] = []
    left_out: list[tuple[str, str]] = []
    for place in _folders(folder):
        name = place.relative_to(folder).as_posix()
        try:
            entry = _entry(place)
        except InputFault as fault:
            left_out.append((name, fault.faults[0].what))
            continue
        if isinstance(entry, str):
            left_out.append((name, entry))
        else:
            entries.append(((entry.title.casefold(), name), entry))
    if not entries and not left_out:
        raise InputFault(_fault("shelf-empty", folder))
    return Shelf(tuple(entry for _, entry in sorted(entries, key=lambda pair: pair[0])), tuple(left_out))


def _folders(folder: Path) -> Iterator[Path]:
    """Folders that a run wrote to, in the order of their names."""
    for number, (place, inner, files) in enumerate(os.walk(folder, followlinks=False)):
        if number >= MOST_FOLDERS:
            raise InputFault(_fault("shelf-too-large", folder, most=MOST_FOLDERS))
        inner[:] = sorted(name for name in inner if not name.startswith("."))
        if MANIFEST in files:
            inner.clear()
            yield Path(place)


def _entry(folder: Path) -> ShelfEntry | str:
    """The report of one folder, or why there is none."""
    digests = _manifest(folder / MANIFEST)
    if digests is None:
        return say("shelf-manifest")
    path = _own(folder, RESULTS, digests)
    if path is None:
        return say("shelf-unfinished")
    results = read_results(path)
    digest = hashlib.sha256(read_bytes(path, LARGEST_MEGABYTES)).hexdigest()
    lead = next((model for model in results.models if not model.added_by_program), None)
    found = _findings(results, lead)
    return ShelfEntry(
        folder=folder,
        report=_own(folder, REPORTS, digests),
        title=plain(results.study.title),
        question=plain(results.study.question),
        answers=tuple((plain(one.label), plain(one.sentence)) for one in results.study.answer),
        read=results.records.read,
        analysed=None if lead is None else lead.records,
        events=None if lead is None else lead.events,
        stops=found["stop"],
        cautions=found["caution"],
        notes=found["note"],
        internal=results.internal or path.name != RESULTS[0],
        changed=digest != digests[path.name],
    )


def _findings(results: SavedResults, lead: SavedModel | None) -> Counter[str]:
    """How many findings of each severity the study and the model that answers have, each counted once."""
    every = (*results.findings, *(() if lead is None else lead.findings))
    return Counter(severity for severity, _, _ in {(one.severity, one.code, one.message) for one in every})


def _manifest(path: Path) -> dict[str, object] | None:
    """The names of a run's files with their SHA-256; None where that cannot be read."""
    if path.is_symlink():
        return None
    try:
        files = json.loads(read_bytes(path, LARGEST_MANIFEST_MEGABYTES))["files"]
    except (InputFault, ValueError, LookupError, TypeError, RecursionError):
        return None
    return files if isinstance(files, dict) else None


def _own(folder: Path, names: tuple[str, ...], digests: dict[str, object]) -> Path | None:
    """The file of one of these names that the run wrote and that is there, no link."""
    for name in names:
        path = folder / name
        if name in digests and path.is_file() and not path.is_symlink():
            return path
    return None


def _fault(code: str, folder: Path, **facts: object) -> Fault:
    return Fault(what=say(code, **facts), where=plain(str(folder)), remedy=say(f"{code}-remedy"))
