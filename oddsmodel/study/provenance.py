"""What a report was made from."""

from __future__ import annotations

import platform
from importlib.metadata import version

from oddsmodel.plan.read import PlanFile
from oddsmodel.results.study import Provenance

PACKAGES = ("oddsmodel", "numpy", "scipy", "pandas", "pyarrow", "patsy", "statsmodels", "matplotlib")


def provenance(plan: PlanFile) -> Provenance:
    """The plan's text and fingerprint, the versions at work and the seed; no time and no machine."""
    versions = {name: version(name) for name in PACKAGES}
    return Provenance(
        plan_name=plan.path.name,
        plan_text=plan.text,
        plan_sha256=plan.sha256,
        versions={"Python": platform.python_version(), **versions},
        seed=plan.plan.run.seed,
    )
