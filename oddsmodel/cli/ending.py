"""How a command ends: its exit status, and what is told when it does not end well."""

from __future__ import annotations

import os
import signal
import sys
import threading
import traceback
import warnings
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from types import FrameType
from typing import Any

from oddsmodel.cli import INTERRUPTED
from oddsmodel.cli.terminal import tell
from oddsmodel.errors import InputFault
from oddsmodel.wording import say
from oddsmodel.wording.plain import plain

DONE = 0
PROGRAM_AT_FAULT = 1
INPUT_AT_FAULT = 2
NOT_ESTIMATED = 3
TRACEBACK = "ODDSMODEL_TRACEBACK"


def ended(work: Callable[[], int]) -> int:
    """The exit status of a command's work, whatever becomes of it.

    Faults of the input are told on standard error and end in 2, failures of the program or the machine in 1, both
    without a traceback unless the environment variable ODDSMODEL_TRACEBACK is 1; an interruption ends in 130. A
    reader that has closed the pipe has read enough: 0.
    """
    with warnings.catch_warnings():
        if not _wants_traceback():
            warnings.simplefilter("ignore")
        interruptions: list[int] = []
        try:
            with _noted(interruptions):
                status = work()
            if sys.stdout is not None:
                sys.stdout.flush()
        except InputFault as fault:
            _tell_faults(fault)
            return INPUT_AT_FAULT
        except KeyboardInterrupt:
            tell(say("interrupted"))
            return INTERRUPTED
        except BrokenPipeError:
            # The interpreter would complain again when it flushes standard output on its way out.
            os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
            return DONE
        except Exception as error:
            # An interruption while a compiled library is being loaded comes out as that library's failure.
            if interruptions:
                tell(say("interrupted"))
                return INTERRUPTED
            _tell_failure(error)
            return PROGRAM_AT_FAULT
        return status


@contextmanager
def _noted(interruptions: list[int]) -> Iterator[None]:
    """While work goes on, note the signals that interrupt it: Ctrl-C, and a polite request to end."""

    def interrupt(number: int, frame: FrameType | None) -> None:
        interruptions.append(number)
        signal.default_int_handler(number, frame)

    earlier: dict[int, Any] = {}
    if threading.current_thread() is threading.main_thread():
        usual = {signal.SIGINT: signal.default_int_handler, signal.SIGTERM: signal.SIG_DFL}
        earlier = {number: way for number, way in usual.items() if signal.getsignal(number) == way}
    for number in earlier:
        signal.signal(number, interrupt)
    try:
        yield
    finally:
        for number, way in earlier.items():
            signal.signal(number, way)


def _tell_faults(found: InputFault) -> None:
    tell(say("to-put-right", faults=len(found.faults)))
    for fault in found.faults:
        tell()
        tell(fault.where)
        tell(fault.what, indent=2)
        if fault.remedy:
            tell(fault.remedy, indent=2)


def _tell_failure(error: Exception) -> None:
    if _wants_traceback():
        traceback.print_exception(error)
    if isinstance(error, MemoryError):
        tell(say("out-of-memory"))
    elif isinstance(error, OSError):
        tell(say("machine-failed", reason=error.strerror or type(error).__name__, file=_file(error)))
    else:
        tell(say("program-failed", kind=type(error).__name__, reason=plain(str(error), 200), variable=TRACEBACK))


def _file(error: OSError) -> str:
    return "" if error.filename is None else plain(str(error.filename), 300)


def _wants_traceback() -> bool:
    return os.environ.get(TRACEBACK) == "1"
