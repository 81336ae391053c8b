"""A page of one file that a command writes where the user says: it replaces only what the same command wrote."""

from __future__ import annotations

import os
from pathlib import Path
from typing import Any

from oddsmodel.errors import Fault, InputFault
from oddsmodel.export.files import write_text
from oddsmodel.wording import say
from oddsmodel.wording.plain import plain

ENDINGS = (".html", ".htm")
READ = 2000
"""The bytes of a page's beginning that hold who wrote it."""


def check_page(path: Path, command: str) -> None:
    """Whether a page can be written; InputFault where it cannot, or where another hand's file would be lost."""
    where = plain(str(path))
    if path.suffix.lower() not in ENDINGS:
        raise InputFault(_fault("page-not-html", where, name=f"{command}.html"))
    if not path.parent.is_dir():
        raise InputFault(_fault("page-no-folder", where))
    if os.path.lexists(path) and not _is_ours(path, command):
        raise InputFault(_fault("page-not-ours", where))


def write_page(path: Path, text: str, command: str) -> None:
    """Write the page whole or not at all. Raises InputFault as `check_page` does."""
    check_page(path, command)
    write_text(path, text)


def mark(command: str) -> str:
    """What stands in the content of the page's element meta "generator"."""
    return f"oddsmodel {command}"


def _is_ours(path: Path, command: str) -> bool:
    """Whether a file, not a link to one, says in its head that this command wrote it."""
    if path.is_symlink() or not path.is_file():
        return False
    try:
        with path.open("rb") as file:
            beginning = file.read(READ)
    except OSError:
        return False
    return f'<meta name="generator" content="{mark(command)}">'.encode() in beginning


def _fault(code: str, where: str, **facts: Any) -> Fault:
    return Fault(what=say(code, **facts), where=where, remedy=say(f"{code}-remedy", **facts))
