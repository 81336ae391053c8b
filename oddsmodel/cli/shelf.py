"""`shelf`: an index page of the reports in a folder."""

from __future__ import annotations

from pathlib import Path

from oddsmodel.cli.ending import DONE
from oddsmodel.cli.terminal import tell, write
from oddsmodel.wording import say

INDEX = "index.html"


def shelf_command(folder: Path, into: Path | None) -> int:
    """Write the index, into the folder itself unless told otherwise."""
    from oddsmodel.export.page import write_page
    from oddsmodel.export.shelf import reports_in
    from oddsmodel.report.shelf import COMMAND, render_shelf

    shelf = reports_in(folder)
    page = folder / INDEX if into is None else into
    write_page(page, render_shelf(shelf, page.parent), COMMAND)
    write(say("shelf-written", number=len(shelf.entries), file=str(page)))
    if shelf.left_out:
        tell(f"{say('shelf-left-out')}:")
        for name, reason in shelf.left_out:
            tell(say("shelf-left-out-reason", folder=name, reason=reason), indent=2)
    return DONE
