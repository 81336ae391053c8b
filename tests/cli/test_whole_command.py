"""The command as a user calls it, with nothing stood in: the demo runs, an interrupted one leaves nothing half-done."""

from __future__ import annotations

import json
import signal
import subprocess
import sys
from pathlib import Path

COMMAND = [sys.executable, "-m", "oddsmodel.cli"]


def test_the_demo_runs_and_can_be_run_again(tmp_path: Path) -> None:
    done = subprocess.run([*COMMAND, "demo", "study"], cwd=tmp_path, capture_output=True, text=True, check=False)
    assert (done.returncode, done.stderr) == (0, "")
    assert "\x1b" not in done.stdout
    assert "The report is in study/plan-report/report.html" in done.stdout
    assert "95% interval" in done.stdout
    report = tmp_path / "study" / "plan-report"
    assert "<html" in (report / "report.html").read_text(encoding="utf-8")
    assert json.loads((report / "results.json").read_text(encoding="utf-8"))["models"]


def test_an_interrupted_run_ends_in_130_and_leaves_nothing_half_done(tmp_path: Path) -> None:
    words = [*COMMAND, "demo", "study"]
    with subprocess.Popen(words, cwd=tmp_path, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True) as process:
        assert process.stdout is not None
        assert process.stderr is not None
        assert "invented study" in process.stdout.readline()
        process.send_signal(signal.SIGINT)
        told = process.stderr.read()
        assert process.wait() == 130
    assert told == "Interrupted. Nothing half-done is left.\n"
    assert sorted(path.name for path in (tmp_path / "study").iterdir()) == ["plan.toml", "records.csv"]


def test_a_draft_can_be_checked_as_it_is(tmp_path: Path) -> None:
    records = Path(__file__).parents[2] / "examples" / "readmissions" / "records.csv"
    plan = tmp_path / "plan.toml"
    words = [*COMMAND, "draft", str(records), "--outcome", "readmitted", "--into", str(plan)]
    assert subprocess.run(words, capture_output=True, check=False).returncode == 0
    done = subprocess.run([*COMMAND, "check", str(plan)], capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr
    assert "nothing was fitted" in done.stdout
    assert sorted(path.name for path in tmp_path.iterdir()) == ["plan.toml"]


def test_a_hostile_plan_is_told_without_a_traceback(tmp_path: Path) -> None:
    plan = tmp_path / "plan.toml"
    plan.write_text(
        '[study]\ntitle = "\\u001b[2J"\nper = true\n[[models]]\nname = "\\u202e"\nformula = "__import__(\'os\')"\n'
    )
    done = subprocess.run([*COMMAND, "run", str(plan)], capture_output=True, text=True, check=False)
    assert done.returncode == 2
    assert done.stdout == ""
    assert "Traceback" not in done.stderr
    assert "\x1b" not in done.stderr
    assert "[study]" in done.stderr
    assert sorted(path.name for path in tmp_path.iterdir()) == ["plan.toml"]
