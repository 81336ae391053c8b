"""Exit statuses, and what is told when a command does not end well."""

from __future__ import annotations

import signal
import sys
from collections.abc import Callable
from typing import Any

import pytest

from oddsmodel.cli.ending import ended
from oddsmodel.cli.terminal import write
from oddsmodel.errors import Fault, InputFault


def raising(error: BaseException) -> Callable[[], int]:
    def work() -> int:
        raise error

    return work


def test_a_status_is_handed_on() -> None:
    assert ended(lambda: 0) == 0
    assert ended(lambda: 3) == 3


def test_an_interruption_before_the_command_has_begun(monkeypatch: pytest.MonkeyPatch) -> None:
    import oddsmodel.cli.app
    from oddsmodel.cli import main

    def interrupted(**_: object) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr(oddsmodel.cli.app, "app", interrupted)
    with pytest.raises(SystemExit) as left:
        main()
    assert left.value.code == 130


def test_faults_are_told_with_place_and_remedy(capsys: pytest.CaptureFixture[str]) -> None:
    faults = [Fault("It is\x1b[31m wrong.\nVery.", "plan.toml, [study] title", "Mend it."), Fault("B.", "b", "")]
    assert ended(raising(InputFault(faults))) == 2
    printed = capsys.readouterr()
    assert printed.out == ""
    assert printed.err == (
        "2 things to put right:\n\nplan.toml, [study] title\n  It is[31m wrong. Very.\n  Mend it.\n\nb\n  B.\n"
    )


def test_an_interruption_ends_in_130(capsys: pytest.CaptureFixture[str]) -> None:
    assert ended(raising(KeyboardInterrupt())) == 130
    assert capsys.readouterr().err.startswith("Interrupted.")


def test_an_interruption_that_a_library_turns_into_its_own_failure(capsys: pytest.CaptureFixture[str]) -> None:
    def work() -> int:
        try:
            signal.raise_signal(signal.SIGINT)
        except KeyboardInterrupt:
            raise ImportError("initialization failed") from None
        return 0

    assert ended(work) == 130
    assert capsys.readouterr().err.startswith("Interrupted.")


def test_a_request_to_end_is_an_interruption() -> None:
    def work() -> int:
        signal.raise_signal(signal.SIGTERM)
        return 0

    assert ended(work) == 130
    assert signal.getsignal(signal.SIGTERM) == signal.SIG_DFL


@pytest.mark.parametrize("closed", ["stdout", "stderr"])
def test_a_stream_that_is_closed(closed: str, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(sys, closed, None)

    def work() -> int:
        write("told")
        return 0

    assert ended(work) == 0
    assert ended(raising(InputFault(Fault("A.", "a", "B.")))) == 2


def test_a_failure_of_the_program_is_one_plain_line(
    capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.delenv("ODDSMODEL_TRACEBACK", raising=False)
    assert ended(raising(ValueError("odd\nthing \x1b[2J"))) == 1
    told = capsys.readouterr().err
    assert told.count("\n") == 1
    assert "The program itself failed (ValueError: odd thing [2J)" in told
    assert "ODDSMODEL_TRACEBACK=1" in told

    monkeypatch.setenv("ODDSMODEL_TRACEBACK", "1")
    assert ended(raising(ValueError("odd"))) == 1
    assert "Traceback" in capsys.readouterr().err


@pytest.mark.parametrize(
    ("error", "told"),
    [
        (MemoryError(), "ran out of memory"),
        (OSError(28, "No space left on device", "out/report.html"), "No space left on device (out/report.html)"),
        (PermissionError(13, "Permission denied"), "Permission denied"),
    ],
)
def test_a_failure_of_the_machine_is_told_as_one(
    error: Exception, told: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert ended(raising(error)) == 1
    assert told in capsys.readouterr().err


def test_warnings_of_libraries_stay_off_the_terminal(recwarn: pytest.WarningsRecorder) -> None:
    import warnings

    def work() -> int:
        warnings.warn("of no interest to an analyst", UserWarning, stacklevel=1)
        return 0

    assert ended(work) == 0
    assert not recwarn.list


def test_a_terminal_that_knows_few_characters(monkeypatch: pytest.MonkeyPatch) -> None:
    import io

    from oddsmodel.cli.terminal import write

    raw = io.BytesIO()
    monkeypatch.setattr(sys, "stdout", io.TextIOWrapper(raw, encoding="ascii"))
    write("4\u202f000 records of Łódź")
    assert raw.getvalue() == b"4?000 records of ??d?\n"


def test_long_lines_are_wrapped_on_a_terminal_only(monkeypatch: pytest.MonkeyPatch) -> None:
    import io

    from oddsmodel.cli.terminal import write

    class Terminal(io.StringIO):
        def isatty(self) -> bool:
            return True

    words = "word " * 60
    piped: Any = io.StringIO()
    monkeypatch.setattr(sys, "stdout", piped)
    write(words, indent=2)
    assert piped.getvalue().count("\n") == 1
    terminal = Terminal()
    monkeypatch.setattr(sys, "stdout", terminal)
    monkeypatch.setenv("COLUMNS", "60")
    write(words, indent=2)
    lines = terminal.getvalue().splitlines()
    assert len(lines) > 4
    assert all(len(line) <= 60 and line.startswith("  word") for line in lines)
