"""`demo`: the packaged example copied into a new folder; the package list that ships it."""

from __future__ import annotations

import tomllib
from collections.abc import Callable
from importlib.resources import files
from pathlib import Path
from typing import Any

import pytest

import oddsmodel.cli.demo

ROOT = Path(__file__).parents[2]
Command = Callable[..., Any]


@pytest.fixture
def ran(monkeypatch: pytest.MonkeyPatch) -> list[Path]:
    plans: list[Path] = []

    def run_command(plan: Path, into: Path | None, records: Path | None) -> int:
        plans.append(plan)
        return 0

    monkeypatch.setattr(oddsmodel.cli.demo, "run_command", run_command)
    return plans


def test_the_example_is_copied_and_run(command: Command, ran: list[Path], tmp_path: Path) -> None:
    folder = tmp_path / "new" / "demo"
    ended = command("demo", folder)
    assert ended.status == 0
    assert ran == [folder / "plan.toml"]
    for name in ("plan.toml", "records.csv"):
        assert (folder / name).read_bytes() == (ROOT / "examples" / "readmissions" / name).read_bytes()


def test_an_empty_folder_will_do_and_a_full_one_will_not(command: Command, ran: list[Path], tmp_path: Path) -> None:
    assert command("demo", tmp_path).status == 0
    ended = command("demo", tmp_path)
    assert ended.status == 2
    assert "not empty" in ended.err
    file = tmp_path / "plan.toml"
    assert command("demo", file).status == 2
    assert len(ran) == 1


def test_the_examples_are_found_in_the_package() -> None:
    assert (files("oddsmodel.examples") / "readmissions" / "records.csv").is_file()
    assert (files("oddsmodel.examples") / "workshop-asthma" / "plan.toml").is_file()


def test_every_package_is_listed_to_be_shipped() -> None:
    with (ROOT / "pyproject.toml").open("rb") as file:
        listed = set(tomllib.load(file)["tool"]["setuptools"]["packages"])
    inits = (ROOT / "oddsmodel").rglob("__init__.py")
    packages = {".".join(init.parent.relative_to(ROOT).parts) for init in inits}
    folders = {path.parent for path in (ROOT / "oddsmodel").rglob("*.py")}
    assert {".".join(folder.relative_to(ROOT).parts) for folder in folders} == packages, "a folder lacks __init__.py"
    assert listed == packages | {"oddsmodel.examples"}


def test_a_copy_that_fails_leaves_nothing(command: Command, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    write_bytes = Path.write_bytes

    def full(path: Path, data: bytes) -> int:
        if path.suffix == ".csv":
            raise OSError(28, "No space left on device")
        return write_bytes(path, data)

    monkeypatch.setattr(Path, "write_bytes", full)
    assert command("demo", tmp_path).status == 1
    assert list(tmp_path.iterdir()) == []
