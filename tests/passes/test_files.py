"""Rows on disk give the same bits as rows in memory, selected or not, and leave nothing behind."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

from oddsmodel.likelihood import BinomialLikelihood
from oddsmodel.passes import MemoryPasses
from oddsmodel.passes.base import TASK_ROWS, Leaf
from oddsmodel.passes.files import ColumnFiles, ColumnWriter, ScratchFolder
from oddsmodel.passes.local import LocalPasses


def arrays(n: int) -> dict[str, np.ndarray]:
    rng = np.random.default_rng(n)
    return {
        "age": rng.normal(50, 12, n),
        "sex": rng.integers(-1, 2, n).astype(np.int8),
        "events": (rng.random(n) < 0.3).astype(float),
        "kept": rng.random(n) < 0.6,
    }


def written(rows: dict[str, np.ndarray], folder: Path, block: int = 50_000) -> ColumnFiles:
    writer = ColumnWriter(folder)
    n = len(rows["age"])
    for first in range(0, n, block):
        writer.write({name: array[first : first + block] for name, array in rows.items()})
    return writer.close()


class Matrix:
    def __call__(self, rows: Leaf) -> Leaf:
        X = np.column_stack([np.ones(len(rows["age"])), (rows["age"] - 50) / 12, rows["sex"] == 1])
        return {"X": X, "events": rows["events"]}


@pytest.mark.parametrize("n", [1, 4096, 70_001, 3 * TASK_ROWS + 5])
def test_same_bits_on_disk_as_in_memory(n: int, tmp_path: Path) -> None:
    rows = arrays(n)
    on_disk = LocalPasses(written(rows, tmp_path / "rows"))
    beta = np.array([[0.1, 0.2, -0.3], [0.0, 0.0, 0.0]])
    mask = rows["kept"].copy()
    mask[0] = True
    chosen = {name: array[mask] for name, array in rows.items() if name != "kept"}
    for passes, there in (
        (MemoryPasses(rows).mapped(Matrix()), on_disk.mapped(Matrix())),
        (
            MemoryPasses({**rows, "kept": mask}).selected("kept").mapped(Matrix()),
            LocalPasses(written({**rows, "kept": mask}, tmp_path / "chosen")).selected("kept").mapped(Matrix()),
        ),
    ):
        one = BinomialLikelihood.over(passes, 3).evaluate(beta)
        other = BinomialLikelihood.over(there, 3).evaluate(beta)
        assert np.array_equal(one.log_likelihood, other.log_likelihood)
        assert np.array_equal(one.score, other.score)
        assert one.information is not None
        assert other.information is not None
        assert np.array_equal(one.information, other.information)
    made = Matrix()(chosen)
    dense = BinomialLikelihood(made["X"], made["events"]).evaluate(beta)
    assert np.array_equal(dense.log_likelihood, one.log_likelihood)


def test_few_rows_are_taken_in_the_order_asked_for(tmp_path: Path) -> None:
    rows = arrays(2 * TASK_ROWS)
    wanted = [TASK_ROWS + 7, 3, TASK_ROWS - 1, 3]
    found = LocalPasses(written(rows, tmp_path / "rows")).taken(wanted)
    assert np.array_equal(found["age"], rows["age"][wanted])
    assert np.array_equal(found["kept"], rows["kept"][wanted])


class Largest:
    def __call__(self, rows: Leaf, first: int, state: None) -> tuple[int, float]:
        at = int(rows["age"].argmax())
        return first + at, float(rows["age"][at])


def test_results_of_tasks_come_in_source_order(tmp_path: Path) -> None:
    rows = arrays(20 * TASK_ROWS + 1)
    found = list(LocalPasses(written(rows, tmp_path / "rows")).each(Largest()))
    assert len(found) == 21
    assert [at // TASK_ROWS for at, _ in found] == list(range(21))
    assert max(value for _, value in found) == rows["age"].max()


def test_a_task_that_fails_ends_the_pass(tmp_path: Path) -> None:
    def fails(rows: Leaf, first: int, state: None) -> None:
        raise ZeroDivisionError

    with pytest.raises(ZeroDivisionError):
        list(LocalPasses(written(arrays(5 * TASK_ROWS), tmp_path / "rows")).each(fails))


@pytest.mark.parametrize("ending", ["", "raise KeyboardInterrupt", "raise ValueError", "import sys; sys.exit(3)"])
def test_scratch_files_are_gone_whatever_the_ending(ending: str, tmp_path: Path) -> None:
    script = (
        "from pathlib import Path\n"
        "from oddsmodel.passes.files import ScratchFolder\n"
        f"folder = ScratchFolder(Path({str(tmp_path)!r}))\n"
        "(folder.path / 'some').write_bytes(b'1')\n"
        f"{ending}\n"
    )
    subprocess.run([sys.executable, "-c", script], capture_output=True, check=False)
    assert list(tmp_path.iterdir()) == []
    with ScratchFolder(tmp_path) as scratch:
        assert scratch.path.is_dir()
    assert list(tmp_path.iterdir()) == []
