"""A connection to the workers of a Dask cluster, refused in words where the numbers could not be trusted."""

from __future__ import annotations

import importlib.util
import logging
import os
import platform
import re
import ssl
import warnings
from collections.abc import Iterator
from contextlib import contextmanager
from importlib import metadata
from typing import TYPE_CHECKING

from oddsmodel.errors import InputFault
from oddsmodel.passes.files import ScratchFolder
from oddsmodel.plan.faults import fault

if TYPE_CHECKING:
    from distributed import Client

LOCAL = "local"
WAIT = 10.0
"""Seconds in which a scheduler must answer, and a worker be there."""

ADDRESS = re.compile(r"(?:tcp|tls)://(?:\[[0-9A-Fa-f:.]+\]|[A-Za-z0-9._-]+):(\d{1,5})")
PROGRAMS = ("oddsmodel", "numpy", "pandas", "pyarrow", "distributed")
LOGGERS = ("distributed", "distributed.client", "tornado", "tornado.application", "asyncio")
WHERE = "--workers"


@contextmanager
def connected(address: str) -> Iterator[Client]:
    """A client of the scheduler at an address, tcp://host:port or tls://host:port; "local": of processes started here.

    Whoever runs the scheduler can run code here and on the workers: its address is trusted. tls takes Dask's own
    configuration (distributed.comm.tls). When it is left, all work in progress is taken back and nothing is held on
    the workers any more.

    Raises: InputFault where Dask is not installed, no scheduler or no worker is there, or their versions differ.
    """
    if importlib.util.find_spec("distributed") is None:
        raise InputFault(fault("workers-not-installed", WHERE))
    with quiet():
        if address == LOCAL:
            with _own_processes() as client:
                yield client
            return
        client = _client_of(address)
        try:
            check_workers(client, address)
            yield client
        finally:
            client.close()


@contextmanager
def _own_processes() -> Iterator[Client]:
    """Processes of one thread, as many as cores, two at least. Others on this machine cannot use their ports."""
    import dask
    from distributed import Client, LocalCluster

    nothing_served: dict[str, list[str]] = {f"distributed.{one}.http.routes": [] for one in ("scheduler", "worker")}
    cores = len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else (os.cpu_count() or 1)
    with (
        ScratchFolder() as scratch,
        dask.config.set(nothing_served),
        LocalCluster(
            n_workers=max(2, cores),
            threads_per_worker=1,
            dashboard_address=None,
            scheduler_kwargs={"dashboard_address": "127.0.0.1:0"},
            security=True,
            local_directory=str(scratch.path),
            preload=["oddsmodel.study.streamed.own_process"],
            silence_logs=logging.CRITICAL,
        ) as cluster,
        Client(cluster, set_as_default=False) as client,
    ):
        yield client


def _client_of(address: str) -> Client:
    from distributed import Client

    found = ADDRESS.fullmatch(address)
    if found is None or int(found.group(1)) > 65_535:
        raise InputFault(fault("workers-address", WHERE, address=address))
    try:
        with warnings.catch_warnings():
            # Versions that differ are told in our own words.
            warnings.simplefilter("ignore")
            return Client(address, timeout=WAIT, set_as_default=False)
    except (TypeError, FileNotFoundError, ssl.SSLError) as error:
        raise InputFault(fault("workers-tls", WHERE, address=address)) from error
    except OSError as error:
        raise InputFault(fault("workers-unreachable", WHERE, address=address, seconds=WAIT)) from error


def check_workers(client: Client, address: str) -> None:
    """InputFault where there is no worker, or one whose numbers might differ in their last digits."""
    try:
        client.wait_for_workers(1, timeout=WAIT)
    except TimeoutError as error:
        raise InputFault(fault("workers-none", WHERE, address=address)) from error
    differences: list[tuple[str, str, str, str | None]] = []
    here = _python(platform.python_version())
    for worker, version in client.run(platform.python_version).items():
        if _python(version) != here:
            differences.append(("Python", here, worker, _python(version)))
    for program in PROGRAMS:
        here = metadata.version(program)
        for worker, found in client.run(metadata.version, program, on_error="return").items():
            version = found if isinstance(found, str) else None
            if version != here:
                differences.append((program, here, worker, version))
    if differences:
        raise InputFault(fault("workers-differ", WHERE, differences=differences))


def _python(version: str) -> str:
    return ".".join(version.split(".")[:2])


@contextmanager
def quiet() -> Iterator[None]:
    """What Dask logs about workers that come and go is not for the reader of a report."""
    loggers = [logging.getLogger(name) for name in LOGGERS]
    import distributed  # noqa: F401  (sets the levels of its loggers when it is imported)

    levels = [logger.level for logger in loggers]
    for logger in loggers:
        logger.setLevel(logging.CRITICAL)
    try:
        yield
    finally:
        for logger, level in zip(loggers, levels, strict=True):
            logger.setLevel(level)
