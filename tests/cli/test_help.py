"""Help that a newcomer can follow, in well under half a second."""

from __future__ import annotations

import json
import os
import subprocess
import sys
import time
from collections.abc import Callable
from importlib.metadata import version
from typing import Any

import pytest

Command = Callable[..., Any]
COMMANDS = ("run", "check", "draft", "table", "demo", "changes", "shelf")


def test_these_are_the_commands_and_no_others(command: Command) -> None:
    ended = command("--help")
    assert ended.status == 0
    listed = ended.out.split("Commands:")[1].split("\n")
    assert tuple(line.split()[0] for line in listed if line.strip()) == COMMANDS


@pytest.mark.parametrize("name", COMMANDS)
def test_each_command_explains_itself(command: Command, name: str) -> None:
    ended = command(name, "--help")
    assert ended.status == 0
    assert len(ended.out.split()) > 40


def test_the_version(command: Command) -> None:
    ended = command("--version")
    assert ended.status == 0
    assert ended.out == f"oddsmodel {version('oddsmodel')}\n"


def test_an_unknown_command_or_option_ends_in_2(command: Command) -> None:
    assert command("runn").status == 2
    assert command("run").status == 2
    assert command("table", "--colour", "red").status == 2


def test_help_is_quick_and_loads_nothing_heavy() -> None:
    code = (
        "import sys, json\n"
        "from oddsmodel.cli import main\n"
        "try:\n    main()\nexcept SystemExit:\n    pass\n"
        "print(json.dumps(sorted(sys.modules)), file=sys.stderr)"
    )
    took = []
    for _ in range(3):
        begun = time.monotonic()
        done = subprocess.run([sys.executable, "-c", code, "--help"], capture_output=True, text=True, check=True)
        took.append(time.monotonic() - begun)
    assert min(took) < 0.5
    loaded = set(json.loads(done.stderr))
    assert not loaded & {"numpy", "pandas", "scipy", "pydantic", "matplotlib", "rich", "jinja2", "pyarrow", "patsy"}


@pytest.mark.parametrize("environment", [{"NO_COLOR": "1"}, {"PYTHONIOENCODING": "ascii"}, {"TERM": "dumb"}])
def test_output_is_plain_text_everywhere(environment: dict[str, str]) -> None:
    words = [sys.executable, "-m", "oddsmodel.cli", "table", "--exposed", "2000/10000", "--unexposed", "1000/10000"]
    done = subprocess.run(words, capture_output=True, check=True, env=os.environ | environment)
    assert b"\x1b" not in done.stdout
    assert done.stdout.startswith(b" ")
    assert done.stderr == b""


def test_a_reader_that_closes_the_pipe_early_is_no_failure() -> None:
    words = [sys.executable, "-m", "oddsmodel.cli", "table", "--exposed", "20/100", "--unexposed", "10/100"]
    with subprocess.Popen(words, stdout=subprocess.PIPE, stderr=subprocess.PIPE) as process:
        assert process.stdout is not None
        assert process.stderr is not None
        process.stdout.close()
        assert process.stderr.read() == b""
        assert process.wait() == 0
