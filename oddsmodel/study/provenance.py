"""What a report was made from."""

from __future__ import annotations

import platform
from importlib.metadata import version

from oddsmodel.plan.database import without_address
from oddsmodel.plan.read import PlanFile
from oddsmodel.results.study import Provenance
from oddsmodel.study.plan_facts import plan_facts

PACKAGES = ("oddsmodel", "numpy", "scipy", "pandas", "pyarrow", "patsy", "statsmodels")


def provenance(plan: PlanFile) -> Provenance:
    """The plan's text and fingerprint, the versions at work and the seed; no time and no machine."""
    versions = {name: version(name) for name in PACKAGES}
    return Provenance(
        plan_name=plan.path.name,
        plan_text=without_address(plan.text, plan.plan.records.source),
        plan_sha256=plan.sha256,
        versions={"Python": platform.python_version(), **versions},
        seed=plan.plan.run.seed,
        plan_facts=plan_facts(plan.plan),
    )
