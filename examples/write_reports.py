"""Run every example and write its report into reports/, for a reader of the repository.

Run: python examples/write_reports.py
"""

from __future__ import annotations

import shutil
from pathlib import Path

from oddsmodel.study.run import run_plan

ROOT = Path(__file__).resolve().parent.parent


def main() -> None:
    for plan in sorted((ROOT / "examples").glob("*/plan.toml")):
        folder = ROOT / "reports" / plan.parent.name
        picture = folder / "first-screen.png"
        kept = picture.read_bytes() if picture.exists() else None
        if folder.exists():
            shutil.rmtree(folder)
        outcome = run_plan(plan, into=folder)
        if kept is not None:
            picture.write_bytes(kept)
        print(f"{plan.parent.name}: {len(outcome.files)} files")


if __name__ == "__main__":
    main()
