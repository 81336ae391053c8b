"""`demo`: the packaged example, copied into a folder and run."""

from __future__ import annotations

from importlib.resources import files
from pathlib import Path

from oddsmodel.cli.run import run_command
from oddsmodel.cli.terminal import write
from oddsmodel.errors import InputFault
from oddsmodel.wording import say
from oddsmodel.wording.plain import plain

EXAMPLE = "readmissions"
COPIED = ("plan.toml", "records.csv")


def demo_command(folder: Path) -> int:
    """Copy the example into a new or empty folder and run its plan there."""
    from oddsmodel.plan.faults import fault

    example = files("oddsmodel.examples") / EXAMPLE
    contents = {name: (example / name).read_bytes() for name in COPIED}
    if folder.is_dir() and any(folder.iterdir()):
        raise InputFault(fault("demo-folder-not-empty", plain(str(folder))))
    try:
        folder.mkdir(parents=True, exist_ok=True)
    except FileExistsError:
        raise InputFault(fault("demo-not-a-folder", plain(str(folder)))) from None
    try:
        for name, content in contents.items():
            (folder / name).write_bytes(content)
    except BaseException:
        for name in contents:
            (folder / name).unlink(missing_ok=True)
        raise

    plan = folder / COPIED[0]
    write(say("demo-copied", plan=str(plan)))
    return run_command(plan, None, None)
