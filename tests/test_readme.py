"""The README keeps its promises: its commands are the ones that are run and its plan is one that is read."""

from __future__ import annotations

import re
from pathlib import Path

from oddsmodel.plan.read import read_plan

ROOT = Path(__file__).resolve().parent.parent
README = (ROOT / "README.md").read_text(encoding="utf-8")


def test_ci_runs_the_test_command_of_the_readme() -> None:
    command = "python3 -m venv .venv && .venv/bin/pip install -q -e '.[test]' && .venv/bin/pytest"
    assert f"```\n{command}\n```" in README
    assert f"\n{command}\n" in (ROOT / ".ci" / "run").read_text(encoding="utf-8")


def test_the_plan_of_the_readme_is_valid(tmp_path: Path) -> None:
    plan = re.search(r"```toml\n(.*?)```", README, re.DOTALL)
    assert plan is not None
    path = tmp_path / "plan.toml"
    path.write_text(plan.group(1), encoding="utf-8")
    assert read_plan(path).plan.models[0].name == "fully adjusted"


def test_what_the_readme_links_to_is_there() -> None:
    for target in re.findall(r"\]\(([^)#]+)\)", README):
        assert (ROOT / target).exists(), target
