"""Commands called in this process, their exit status and what they print."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import pytest

from oddsmodel.cli.app import app


@dataclass(frozen=True)
class Ended:
    status: int
    out: str
    err: str


Command = Callable[..., Ended]


@pytest.fixture
def command(capsys: pytest.CaptureFixture[str]) -> Command:
    def call(*words: object) -> Ended:
        with pytest.raises(SystemExit) as left:
            app([str(word) for word in words], prog_name="oddsmodel")
        printed = capsys.readouterr()
        status = left.value.code
        return Ended(status if isinstance(status, int) else 0, printed.out, printed.err)

    return call
