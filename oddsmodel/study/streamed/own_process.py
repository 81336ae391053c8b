"""What Dask does in every worker process that is started here for `--workers local`."""

from __future__ import annotations

import signal
from typing import Any


def dask_setup(worker: Any) -> None:
    """Leave an interruption typed at the terminal to the command, which then ends its workers."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)
