"""Files of a run: all of them or none, nothing that is not ours touched, the same bytes each time."""

from __future__ import annotations

import hashlib
import json
import os
from pathlib import Path

import pytest

from oddsmodel.errors import InputFault
from oddsmodel.export.files import MANIFEST, check_folder, write_outputs, write_text

FIRST = {"report.html": "<p>one</p>", "results.json": "{}\n", "tables/flow.csv": "a\n", "tables/levels.csv": "b\n"}
SECOND = {"report.html": "<p>two</p>", "results.json": "[]\n", "tables/flow.csv": "c\n", "tables/terms.csv": "d\n"}


def content(folder: Path) -> dict[str, bytes]:
    return {str(path.relative_to(folder)): path.read_bytes() for path in folder.rglob("*") if path.is_file()}


def test_a_run_writes_its_files_and_a_manifest_without_a_time(tmp_path: Path) -> None:
    paths = write_outputs(tmp_path / "deep" / "out", FIRST, internal=False)
    folder = tmp_path / "deep" / "out"
    assert {str(path.relative_to(folder)) for path in paths} == set(FIRST)
    assert paths[-1].name == "results.json"
    manifest = json.loads((folder / MANIFEST).read_text())
    assert manifest == {
        "files": {name: hashlib.sha256(text.encode()).hexdigest() for name, text in sorted(FIRST.items())}
    }
    other = tmp_path / "other"
    write_outputs(other, dict(reversed(FIRST.items())), internal=False)
    assert content(other) == content(folder)
    assert sorted(path.name for path in tmp_path.iterdir()) == ["deep", "other"]


def test_internal_files_say_so_in_their_names(tmp_path: Path) -> None:
    paths = write_outputs(tmp_path, FIRST, internal=True)
    assert sorted(str(path.relative_to(tmp_path)) for path in paths) == [
        "report-INTERNAL.html",
        "results-INTERNAL.json",
        "tables/flow-INTERNAL.csv",
        "tables/levels-INTERNAL.csv",
    ]
    # The next run is for sharing: nothing internal is left behind.
    write_outputs(tmp_path, FIRST, internal=False)
    assert not any("INTERNAL" in name for name in content(tmp_path))


def test_the_next_run_replaces_its_files_and_leaves_others_alone(tmp_path: Path) -> None:
    write_outputs(tmp_path, FIRST, internal=False)
    (tmp_path / "notes.txt").write_text("mine")
    (tmp_path / "tables" / "mine.csv").write_text("mine")
    write_outputs(tmp_path, SECOND, internal=False)
    found = content(tmp_path)
    manifest = found.pop(MANIFEST)
    assert set(json.loads(manifest)["files"]) == set(SECOND)
    assert found == {name: text.encode() for name, text in SECOND.items()} | {
        "notes.txt": b"mine",
        "tables/mine.csv": b"mine",
    }


def test_a_folder_that_loses_its_tables_loses_the_empty_folder(tmp_path: Path) -> None:
    write_outputs(tmp_path, FIRST, internal=False)
    write_outputs(tmp_path, {"results.json": "{}"}, internal=False)
    assert sorted(path.name for path in tmp_path.iterdir()) == [MANIFEST, "results.json"]


def refused(folder: Path) -> str:
    before = content(folder) if folder.is_dir() else None
    with pytest.raises(InputFault) as caught:
        write_outputs(folder, FIRST, internal=False)
    if before is not None:
        assert content(folder) == before
    (fault,) = caught.value.faults
    assert str(folder) == fault.where
    assert fault.remedy
    assert not list(folder.parent.glob("*.partial"))
    return fault.what


def test_folders_that_must_not_be_used_are_refused(tmp_path: Path) -> None:
    folder = tmp_path / "out"
    folder.mkdir()
    (folder / "letter.txt").write_text("mine")
    assert "not from an earlier run" in refused(folder)
    with pytest.raises(InputFault):
        check_folder(folder)
    file = tmp_path / "file"
    file.write_text("mine")
    assert "not a folder" in refused(file)
    (folder / MANIFEST).write_text("{")
    assert MANIFEST in refused(folder)
    (folder / MANIFEST).write_text('{"files": {"../letter.txt": "", "/etc/hosts": ""}}')
    assert MANIFEST in refused(folder)
    (folder / MANIFEST).write_text('{"files": {}}')
    (folder / "report.html").write_text("mine")
    assert "report.html" in refused(folder)


def test_nothing_is_written_or_removed_through_a_link(tmp_path: Path) -> None:
    outside = tmp_path / "outside"
    outside.mkdir()
    (outside / "flow.csv").write_text("precious")
    folder = tmp_path / "out"
    write_outputs(folder, {"results.json": "{}"}, internal=False)
    (folder / "tables").symlink_to(outside)
    assert "link" in refused(folder)
    (folder / MANIFEST).write_text('{"files": {"results.json": "", "tables/flow.csv": ""}}')
    assert "link" in refused(folder)
    (folder / "tables").unlink()
    (folder / "report.html").symlink_to(outside / "flow.csv")
    (folder / MANIFEST).write_text('{"files": {"report.html": ""}}')
    assert "link" in refused(folder)
    assert (outside / "flow.csv").read_text() == "precious"


@pytest.mark.parametrize("name", ["../x", "/x", "a/../b", ".hidden", "", "a//b", "a\\b", "a b"])
def test_names_that_leave_the_folder_are_an_error_of_the_program(tmp_path: Path, name: str) -> None:
    with pytest.raises(ValueError, match="not a name"):
        write_outputs(tmp_path / "out", {name: "x"}, internal=False)
    assert not (tmp_path / "out").exists()


class Interrupt:
    """Lets so many renames pass and then raises."""

    def __init__(self, passes: int, error: type[BaseException]) -> None:
        self.left, self.error = passes, error
        self.real = os.replace

    def __call__(self, source: object, target: object) -> None:
        if self.left == 0:
            self.left = -1
            raise self.error("stopped")
        self.left -= 1
        self.real(source, target)  # type: ignore[arg-type]


@pytest.mark.parametrize("error", [KeyboardInterrupt, OSError, RuntimeError])
@pytest.mark.parametrize("earlier", [False, True])
def test_interrupted_at_any_step_the_folder_is_as_it_was(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, earlier: bool, error: type[BaseException]
) -> None:
    folder = tmp_path / "out"
    if earlier:
        write_outputs(folder, FIRST, internal=False)
    before = content(tmp_path)
    steps = 0
    while True:
        interrupt = Interrupt(steps, error)
        monkeypatch.setattr(os, "replace", interrupt)
        try:
            write_outputs(folder, SECOND, internal=False)
        except error:
            monkeypatch.undo()
            assert content(tmp_path) == before
            assert folder.exists() == earlier
            assert not list(tmp_path.glob(".*"))
        else:
            monkeypatch.undo()
            break
        steps += 1
    assert steps >= 6
    assert set(content(folder)) == {*SECOND, MANIFEST}


def test_the_order_of_renames_puts_results_last(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """At each step every file is whole; the manifest names all that is ours; old results never stand by new files."""
    folder = tmp_path / "out"
    write_outputs(folder, FIRST, internal=False)
    real = os.replace
    whole = {text.encode() for text in (*FIRST.values(), *SECOND.values())}
    states: list[dict[str, bytes]] = []

    def watched(source: object, target: object) -> None:
        real(source, target)  # type: ignore[arg-type]
        found = content(folder)
        assert set(found) - {MANIFEST} <= set(json.loads(found.pop(MANIFEST))["files"])
        assert set(found.values()) <= whole
        states.append(found)

    monkeypatch.setattr(os, "replace", watched)
    write_outputs(folder, SECOND, internal=False)
    assert states[-1] == {name: text.encode() for name, text in SECOND.items()}
    for state in states[:-1]:
        changed = any(state.get(name) == SECOND[name].encode() for name in SECOND)
        assert not (changed and "results.json" in state)


def test_a_failure_while_staging_leaves_nothing(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    real = Path.write_bytes

    def full(path: Path, data: bytes) -> int:
        if path.name == "results.json":
            raise OSError(28, "No space left on device")
        return real(path, data)

    monkeypatch.setattr(Path, "write_bytes", full)
    with pytest.raises(OSError, match="No space"):
        write_outputs(tmp_path / "out", FIRST, internal=False)
    assert list(tmp_path.iterdir()) == []


def test_a_parent_that_is_a_file_cannot_hold_a_folder(tmp_path: Path) -> None:
    (tmp_path / "file").write_text("mine")
    with pytest.raises(InputFault):
        write_outputs(tmp_path / "file" / "out", FIRST, internal=False)
    assert (tmp_path / "file").read_text() == "mine"


def test_one_file_is_written_whole_or_not_at_all(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    path = tmp_path / "report.html"
    write_text(path, "Größe")
    assert path.read_bytes() == "Größe".encode()
    monkeypatch.setattr(os, "replace", Interrupt(0, KeyboardInterrupt))
    with pytest.raises(KeyboardInterrupt):
        write_text(path, "new")
    assert content(tmp_path) == {"report.html": "Größe".encode()}
    monkeypatch.undo()
    with pytest.raises(InputFault):
        write_text(tmp_path / "nowhere" / "report.html", "new")
