"""Progress is drawn where somebody watches, and only there."""

from __future__ import annotations

import io
import sys

import pytest

from oddsmodel.cli.progress import drawn_progress
from oddsmodel.progress import Silent


class Terminal(io.StringIO):
    def isatty(self) -> bool:
        return True


def test_nothing_is_drawn_into_a_file(capsys: pytest.CaptureFixture[str]) -> None:
    with drawn_progress() as progress:
        assert isinstance(progress, Silent)
        progress.stage("reading")
        progress.advance()
    assert capsys.readouterr().err == ""


@pytest.mark.parametrize("colour", [True, False])
def test_stages_are_drawn_on_a_terminal(monkeypatch: pytest.MonkeyPatch, colour: bool) -> None:
    terminal = Terminal()
    monkeypatch.setattr(sys, "stderr", terminal)
    monkeypatch.setenv("TERM", "xterm-256color")
    monkeypatch.delenv("NO_COLOR", raising=False)
    if not colour:
        monkeypatch.setenv("NO_COLOR", "1")
    with drawn_progress() as progress:
        progress.advance()
        progress.stage("reading")
        progress.stage("reading", 3)
        progress.advance()
        progress.stage("fitting", 2)
        progress.advance()
        progress.advance(5)
        progress.stage("counting outcomes", 3)
        progress.advance()
        progress.stage("[red]unforeseen", 0)
    drawn = terminal.getvalue()
    for words in ("Reading the records", "Fitting the models", "Counting outcomes", "[red]unforeseen"):
        assert words in drawn
    assert ("\x1b[38" in drawn) is colour
    last_picture = drawn[drawn.rindex("Reading the records") :]
    assert "Fitting the models" in last_picture


def test_a_terminal_that_cannot_move_its_cursor_stays_quiet(monkeypatch: pytest.MonkeyPatch) -> None:
    terminal = Terminal()
    monkeypatch.setattr(sys, "stderr", terminal)
    monkeypatch.setenv("TERM", "dumb")
    with drawn_progress() as progress:
        progress.stage("reading")
    assert terminal.getvalue() == ""


def test_an_interruption_leaves_the_terminal_as_it_was(monkeypatch: pytest.MonkeyPatch) -> None:
    terminal = Terminal()
    monkeypatch.setattr(sys, "stderr", terminal)
    monkeypatch.setenv("TERM", "xterm-256color")

    def interrupted() -> None:
        with drawn_progress() as progress:
            progress.stage("reading")
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        interrupted()
    assert terminal.getvalue().rfind("\x1b[?25h") > terminal.getvalue().rfind("\x1b[?25l")
