"""Files put into a folder all together: staged beside it, then renamed, the results last; undone on any failure."""

from __future__ import annotations

import hashlib
import json
import os
import re
import shutil
import tempfile
from collections.abc import Iterable, Mapping
from contextlib import suppress
from dataclasses import dataclass, field
from pathlib import Path, PurePosixPath

from oddsmodel.errors import Fault, InputFault
from oddsmodel.wording import say

MANIFEST = "oddsmodel-manifest.json"
LAST = "results"
_NAME = re.compile(r"[A-Za-z0-9_][A-Za-z0-9_.-]*(?:/[A-Za-z0-9_][A-Za-z0-9_.-]*)*")


def check_folder(folder: Path) -> None:
    """Whether an output folder can be used; InputFault where it holds anything that an earlier run did not write."""
    _earlier_files(Path(folder))


def write_outputs(folder: Path, files: Mapping[str, str | bytes], *, internal: bool) -> list[Path]:
    """Write a run's files, named relative to the folder ("report.html", "tables/levels.csv"), and the manifest.

    A folder that is not empty must hold our manifest, which lists the files of the last run with their SHA-256 and no
    time, so that the same results are the same bytes. Files are staged in a temporary folder beside this one and
    renamed one by one, `results.json` last; files of the last run that this one does not have are removed, and nothing
    else is. After any exception, also an interruption, the folder is as it was before. `internal` puts INTERNAL into
    each file name. Returns the paths written, the manifest not among them.

    Raises InputFault for a folder that must not be used, ValueError for a file name that leaves it.
    """
    folder = Path(folder)
    contents = {
        _own_name(name, internal): data.encode("utf-8") if isinstance(data, str) else data
        for name, data in files.items()
    }
    if len(contents) < len(files):
        raise ValueError("two files have the same name")
    earlier = _earlier_files(folder)
    _check_targets(folder, contents, earlier)
    parents = _make_folder(folder)
    try:
        staging = Path(tempfile.mkdtemp(prefix=f".{folder.name}-", suffix=".partial", dir=folder.parent))
    except OSError as error:
        _remove_empty(parents)
        raise _fault(folder, "folder-not-writable", reason=error.strerror or str(error)) from error
    moves = _Moves(folder, staging, parents)
    try:
        moves.stage(contents)
        order = sorted(contents, key=lambda name: (PurePosixPath(name).name.startswith(LAST), name))
        results = [name for name in order if PurePosixPath(name).name.startswith(LAST)]
        # Without results the folder does not look finished; until the end the manifest names the old files too.
        moves.put_manifest({**dict.fromkeys(earlier, ""), **_digests(contents)})
        for name in earlier:
            if PurePosixPath(name).name.startswith(LAST):
                moves.take_away(name)
        for name in order[: len(order) - len(results)]:
            moves.put(name)
        for name in earlier:
            if name not in contents:
                moves.take_away(name)
        moves.put_manifest(_digests(contents))
        for name in results:
            moves.put(name)
    except BaseException:
        moves.undo()
        raise
    finally:
        shutil.rmtree(staging, ignore_errors=True)
    for name in earlier:
        if name not in contents and (parent := (folder / name).parent) != folder:
            _remove_empty([parent])
    return [folder / name for name in order]


def write_text(path: Path, text: str) -> None:
    """Write one UTF-8 file whole or not at all, in the place of whatever file was there."""
    path = Path(path)
    try:
        with tempfile.TemporaryDirectory(prefix=f".{path.name}-", suffix=".partial", dir=path.parent) as staging:
            staged = Path(staging) / path.name
            staged.write_bytes(text.encode("utf-8"))
            os.replace(staged, path)
    except OSError as error:
        raise _fault(path, "folder-not-writable", reason=error.strerror or str(error)) from error


@dataclass(slots=True)
class _Moves:
    """Renames into a folder that can be undone; what they replace is kept in the staging folder until the end."""

    folder: Path
    staging: Path
    made: list[Path] = field(default_factory=list)
    done: list[tuple[Path | None, Path]] = field(default_factory=list)
    """Where what was replaced is kept (None where nothing was), and the place that was changed."""

    def stage(self, contents: Mapping[str, bytes]) -> None:
        for name, data in contents.items():
            path = self.staging / "new" / name
            path.parent.mkdir(parents=True, exist_ok=True)
            path.write_bytes(data)

    def put_manifest(self, digests: Mapping[str, str]) -> None:
        text = json.dumps({"files": dict(sorted(digests.items()))}, indent=1) + "\n"
        path = self.staging / "new" / MANIFEST
        path.parent.mkdir(exist_ok=True)
        path.write_text(text, "utf-8")
        self.put(MANIFEST)

    def put(self, name: str) -> None:
        """Rename a staged file into its place, in one step over an earlier one."""
        target = self.folder / name
        for parent in reversed([path for path in target.parents if not path.exists()]):
            parent.mkdir()
            self.made.append(parent)
        kept = None
        if os.path.lexists(target):
            kept = self.staging / f"old-{len(self.done)}"
            shutil.copyfile(target, kept)
        self.done.append((kept, target))
        os.replace(self.staging / "new" / name, target)

    def take_away(self, name: str) -> None:
        target = self.folder / name
        if not os.path.lexists(target):
            return
        kept = self.staging / f"old-{len(self.done)}"
        self.done.append((kept, target))
        os.replace(target, kept)

    def undo(self) -> None:
        """Put everything back, the last change first."""
        for kept, target in reversed(self.done):
            if kept is None:
                with suppress(FileNotFoundError):
                    target.unlink()
            elif os.path.lexists(kept):
                os.replace(kept, target)
        _remove_empty(self.made)


def _own_name(name: str, internal: bool) -> str:
    if not _NAME.fullmatch(name):
        raise ValueError(f"{name!r} is not a name for a file within the folder")
    path = PurePosixPath(name)
    return str(path.with_name(f"{path.stem}-INTERNAL{path.suffix}")) if internal else str(path)


def _digests(contents: Mapping[str, bytes]) -> dict[str, str]:
    return {name: hashlib.sha256(data).hexdigest() for name, data in contents.items()}


def _earlier_files(folder: Path) -> list[str]:
    """The files of the last run, from its manifest; an empty list for a folder that is new or empty."""
    if not folder.exists():
        if folder.is_symlink():
            raise _fault(folder, "folder-holds-a-link", name=folder.name)
        return []
    if not folder.is_dir():
        raise _fault(folder, "folder-is-a-file")
    manifest = folder / MANIFEST
    if not os.path.lexists(manifest):
        if any(folder.iterdir()):
            raise _fault(folder, "folder-holds-other-files")
        return []
    if manifest.is_symlink():
        raise _fault(folder, "folder-holds-a-link", name=MANIFEST)
    try:
        names = list(json.loads(manifest.read_text("utf-8"))["files"])
    except (OSError, ValueError, LookupError, TypeError) as error:
        raise _fault(folder, "folder-manifest-unreadable", manifest=MANIFEST) from error
    # A manifest that someone has changed must not make us remove a file elsewhere.
    if not all(isinstance(name, str) and _NAME.fullmatch(name) and name != MANIFEST for name in names):
        raise _fault(folder, "folder-manifest-unreadable", manifest=MANIFEST)
    for name in names:
        for parent in PurePosixPath(name).parents:
            if (folder / parent).is_symlink() and parent != PurePosixPath("."):
                raise _fault(folder, "folder-holds-a-link", name=str(parent))
        if (folder / name).is_symlink():
            raise _fault(folder, "folder-holds-a-link", name=name)
    return [name for name in names if os.path.lexists(folder / name)]


def _check_targets(folder: Path, contents: Iterable[str], earlier: Iterable[str]) -> None:
    """Nothing that is not ours may be replaced, and nothing be written through a link."""
    ours = set(earlier)
    for name in contents:
        target = folder / name
        for parent in PurePosixPath(name).parents:
            place = folder / parent
            if parent != PurePosixPath(".") and (place.is_symlink() or (place.exists() and not place.is_dir())):
                raise _fault(folder, "folder-holds-a-link", name=str(parent))
        if os.path.lexists(target) and (name not in ours or target.is_dir()):
            raise _fault(folder, "folder-name-taken", name=name)
    for name in ours:
        if (folder / name).is_dir():
            raise _fault(folder, "folder-name-taken", name=name)


def _make_folder(folder: Path) -> list[Path]:
    """The folder with its parents; returns those that had to be made."""
    missing = [path for path in (folder, *folder.parents) if not path.exists()]
    made: list[Path] = []
    try:
        for path in reversed(missing):
            path.mkdir()
            made.append(path)
    except OSError as error:
        _remove_empty(made)
        raise _fault(folder, "folder-not-writable", reason=error.strerror or str(error)) from error
    return made


def _remove_empty(folders: Iterable[Path]) -> None:
    for path in reversed(list(folders)):
        with suppress(OSError):
            path.rmdir()


def _fault(place: Path, code: str, **facts: str) -> InputFault:
    return InputFault(Fault(say(code, **facts), str(place), say("choose-another-folder")))
