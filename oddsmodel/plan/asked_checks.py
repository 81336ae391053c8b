"""The checks that a plan may ask for beyond those always done; each is a file of its name among the checks."""

from __future__ import annotations

ASKED_CHECKS: tuple[str, ...] = ()
"""In the order in which they are done."""

FOR_PREDICTION: tuple[str, ...] = ()
"""Those of them that are also done where the aim is prediction."""
