"""The command line: commands and what they print; no statistics."""

from __future__ import annotations

import sys

INTERRUPTED = 130


def main() -> None:
    """Run the command line and leave with its exit status (0, 1, 2, 3 or 130)."""
    try:
        from oddsmodel.cli.app import app

        app(prog_name="oddsmodel")
    except KeyboardInterrupt:
        sys.exit(INTERRUPTED)
