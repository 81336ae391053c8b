"""Rows on the workers of a cluster give the same bits as rows in memory, whatever becomes of the workers."""

from __future__ import annotations

import importlib
import os
import signal
import sys
import threading
import time
from collections.abc import Callable, Iterator
from concurrent.futures import ThreadPoolExecutor
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from distributed import Client, LocalCluster, wait

from oddsmodel.errors import InputFault
from oddsmodel.inference import maximise, profile_intervals
from oddsmodel.likelihood import BinomialLikelihood
from oddsmodel.likelihood.kernels import ValueKernel
from oddsmodel.passes import Passes, cluster
from oddsmodel.passes.base import TASK_ROWS
from oddsmodel.passes.cluster import ClusterPasses, Kept, tasks_of
from oddsmodel.passes.on_worker import one_thread
from oddsmodel.passes.work import products
from oddsmodel.study.streamed.workers import connected, quiet

sys.path.insert(0, str(Path(__file__).parent))
blocks = importlib.import_module("blocks_for_workers")

BETA = np.array([[0.1, 0.2, -0.3], [0.0, 0.0, 0.0]])
FEW, MANY = 6, 24


@contextmanager
def threads_here(workers: int, of: int) -> Iterator[Client]:
    """Workers of so many threads in this process."""
    with (
        quiet(),
        LocalCluster(
            n_workers=workers,
            threads_per_worker=of,
            processes=False,
            dashboard_address=None,
            scheduler_kwargs={"dashboard_address": "127.0.0.1:0"},
        ) as here,
        Client(here, set_as_default=False) as client,
    ):
        yield client


@pytest.fixture(scope="module")
def threads() -> Iterator[Client]:
    with threads_here(3, 2) as client:
        yield client


@pytest.fixture(scope="module")
def processes() -> Iterator[Client]:
    """Workers in processes of their own, which are started again when they die."""
    with connected("local") as client:
        yield client


def on_workers(client: Client, number: int = FEW) -> ClusterPasses:
    return ClusterPasses.over(client, client.map(blocks.block, range(number), pure=False))


def values(passes: Passes, beta: np.ndarray = BETA) -> tuple[np.ndarray, ...]:
    return passes.reduce([ValueKernel(True, len(beta))], beta)[0]


def same_bits(one: tuple[np.ndarray, ...], other: tuple[np.ndarray, ...]) -> bool:
    return all(np.array_equal(x, y) for x, y in zip(one, other, strict=True))


@pytest.mark.parametrize("most_tasks", [1, 2, 4])
@pytest.mark.parametrize("mask", [None, "belongs"])
def test_same_bits_as_in_memory(
    threads: Client, most_tasks: int, mask: str | None, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(cluster, "MOST_TASKS", most_tasks)
    monkeypatch.setattr(cluster, "PARTITIONS", 0)
    passes: Any = on_workers(threads, MANY)
    here: Any = blocks.in_memory(MANY)
    if mask is not None:
        passes = passes.only(["age", "sex", "events", mask]).selected(mask)
        here = here.only(["age", "sex", "events", mask]).selected(mask)
    passes, here = passes.mapped(blocks.Matrix()), here.mapped(blocks.Matrix())
    kept = passes.kept()
    assert passes.rows == kept.rows == here.rows
    assert kept.held.tasks == most_tasks
    assert (mask is None and most_tasks == 1) == (len(kept.held.partitions) > cluster.TOGETHER)
    assert same_bits(values(passes), values(here))
    assert same_bits(values(kept), values(here))


def test_fit_and_profile_limits_have_the_bits_of_memory(threads: Client) -> None:
    fit = maximise(BinomialLikelihood.over(on_workers(threads).mapped(blocks.Matrix()).kept(), 3))
    here = maximise(BinomialLikelihood.over(blocks.in_memory(FEW).mapped(blocks.Matrix()), 3))
    assert np.array_equal(fit.coefficients, here.coefficients)
    assert np.array_equal(profile_intervals(fit), profile_intervals(here))


def test_results_of_tasks_come_in_source_order(threads: Client) -> None:
    passes = on_workers(threads)
    found = list(passes.each(blocks.oldest, 1.0))
    assert found == list(blocks.in_memory(FEW).each(blocks.oldest, 1.0))
    assert [at // TASK_ROWS for at, _ in found] == list(range(len(found)))
    assert list(passes.mapped(blocks.Matrix()).kept().each(blocks.steepest)) == list(
        blocks.in_memory(FEW).mapped(blocks.Matrix()).each(blocks.steepest)
    )


def test_whoever_has_seen_enough_leaves_no_work_behind(threads: Client) -> None:
    results = on_workers(threads, MANY).each(blocks.oldest, 0.0)
    next(results)
    results.close()
    assert settles(lambda: not any(threads.processing().values()))


def test_a_few_rows_and_leaves_are_brought_here(threads: Client) -> None:
    passes, here = on_workers(threads), blocks.in_memory(FEW)
    wanted = [TASK_ROWS + 7, 3, FEW * blocks.BLOCK - 1, 3]
    for there, local in (
        (passes, here),
        (passes.selected("belongs"), here.selected("belongs")),
        (passes.mapped(blocks.Matrix()).kept(), here.mapped(blocks.Matrix())),
    ):
        chosen = [min(one, local.rows - 1) for one in wanted]
        found, known = there.taken(chosen), local.taken(chosen)
        assert list(found) == list(known)
        assert all(np.array_equal(found[name], known[name]) for name in known)
        assert not len(next(iter(there.taken([]).values())))
    made, local = passes.mapped(blocks.Matrix()), here.mapped(blocks.Matrix())
    assert same_bits(values(made.thinned(5)), values(local.thinned(5)))
    assert same_bits(values(made.thinned(1000)), values(local))


def test_no_row_at_all(threads: Client) -> None:
    passes, here = (one.selected("nobody") for one in (on_workers(threads), blocks.in_memory(FEW)))
    assert passes.rows == 0
    made, local = passes.mapped(blocks.Matrix()).kept(), here.mapped(blocks.Matrix())
    assert same_bits(values(made), values(local))


def test_rows_are_chosen_before_anything_is_made_of_them(threads: Client) -> None:
    passes = on_workers(threads, 1)
    with pytest.raises(TypeError):
        passes.mapped(blocks.Matrix()).selected("belongs")
    with pytest.raises(TypeError):
        passes.selected("belongs").only(["age"])
    with pytest.raises(TypeError):
        passes.selected("belongs").selected("nobody")


def test_kept_rows_are_made_once_and_let_go_with_their_passes(threads: Client) -> None:
    passes = on_workers(threads).mapped(blocks.Matrix()).kept()
    assert isinstance(passes.held, Kept)
    assert passes.kept() is passes
    assert passes.mapped(blocks.Same()).kept().held.tasks == passes.held.tasks
    keys = {future.key for future in passes.held.partitions}
    values(passes)
    assert keys <= set(threads.who_has())
    del passes
    assert settles(lambda: not keys & set(threads.who_has()))


def test_faults_found_by_a_worker_are_told_as_they_are(threads: Client) -> None:
    with pytest.raises(InputFault) as found:
        list(on_workers(threads).each(blocks.refuses))
    assert [fault.where for fault in found.value.faults] == ["row 1", "here"]
    assert "Put it right." in str(found.value)


def test_an_interruption_takes_the_work_back(threads: Client) -> None:
    passes = on_workers(threads, MANY).mapped(blocks.Matrix())
    threading.Timer(0.5, signal.raise_signal, [signal.SIGINT]).start()
    with pytest.raises(KeyboardInterrupt):
        passes.reduce([blocks.Slow(2, 0.02)], BETA)
    assert settles(lambda: not any(threads.processing().values()))


@pytest.mark.parametrize(
    ("rows", "width", "threads", "tasks"),
    [
        (10, 8, 2, 1),
        (10**6, 160, 2, 2),
        (10**7, 160, 2, 8),
        (10**8, 160, 2, 8),
        (10**8, 80, 2, 16),
        (10**8, 10**4, 2, 1),
        (10**8, 8, 1000, 1),
    ],
)
def test_partitions_are_subtrees_of_bearable_size(rows: int, width: int, threads: int, tasks: int) -> None:
    assert tasks_of(rows, width, threads) == tasks
    assert tasks == 1 or tasks * TASK_ROWS * width <= cluster.MOST_BYTES


def test_products_keep_to_one_thread_until_the_last_task_is_done() -> None:
    def most() -> int:
        return max((one["num_threads"] for one in products().info() if one["user_api"] == "blas"), default=1)

    def task(seconds: float) -> int:
        with one_thread():
            time.sleep(seconds)
            return most()

    before = most()
    for _ in range(2):
        with ThreadPoolExecutor(3) as pool:
            assert list(pool.map(task, [0.05, 0.1, 0.0])) == [1, 1, 1]
        assert most() == before


def test_killed_workers_change_nothing(processes: Client) -> None:
    here = blocks.in_memory(FEW).mapped(blocks.Matrix())
    passes = on_workers(processes).mapped(blocks.Matrix()).kept()
    with processes.as_current():
        wait(passes.held.partitions)
    lost, other = workers(processes)

    os.kill(lost, signal.SIGKILL)
    fit = maximise(BinomialLikelihood.over(passes, 3))
    known = maximise(BinomialLikelihood.over(here, 3))
    assert np.array_equal(fit.coefficients, known.coefficients)

    began = time.monotonic()
    killed: list[float] = []
    threading.Timer(0.3, lambda: (os.kill(other, signal.SIGKILL), killed.append(time.monotonic()))).start()
    found = passes.reduce([blocks.Slow(2, 0.01)], BETA)[0]
    assert began < killed[0] < time.monotonic()
    assert same_bits(found, values(here))
    assert np.array_equal(profile_intervals(fit), profile_intervals(known))
    assert not {lost, other} & set(workers(processes))


def test_work_that_kills_workers_ends_in_words(processes: Client) -> None:
    scheduler = processes.cluster.scheduler
    allowed, scheduler.allowed_failures = scheduler.allowed_failures, 0
    try:
        with pytest.raises(OSError, match="1 worker died while at the same piece of work"):
            on_workers(processes, 1).reduce([blocks.Deadly()], None)
    finally:
        scheduler.allowed_failures = allowed


def test_a_scheduler_that_is_gone_is_told() -> None:
    with threads_here(1, 1) as client:
        passes = on_workers(client, 1).mapped(blocks.Matrix())
        threading.Timer(0.5, client.cluster.close).start()
        with pytest.raises(OSError, match="the connection to the scheduler was lost"):
            passes.reduce([blocks.Slow(2, 0.2)], BETA)


def test_workers_that_are_gone_are_waited_for_and_told(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(cluster, "LOOK", 0.1)
    monkeypatch.setattr(cluster, "PATIENCE", 0.3)
    with threads_here(1, 1) as client:
        passes = on_workers(client, 1)
        client.cluster.scale(0)
        assert settles(lambda: not client.nthreads())
        with pytest.raises(OSError, match="all workers are gone"):
            passes.taken([0])


def workers(client: Client) -> list[int]:
    client.wait_for_workers(2)
    return list(client.run(os.getpid).values())


def settles(true: Callable[[], bool], seconds: float = 10.0) -> bool:
    until = time.monotonic() + seconds
    while time.monotonic() < until:
        if true():
            return True
        time.sleep(0.05)
    return False
