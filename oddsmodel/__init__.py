"""oddsmodel: from records and a study plan to adjusted odds ratios, checks of fit and a report that can be sent."""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from oddsmodel.api import Model, fit
    from oddsmodel.errors import InputFault

__all__ = ["InputFault", "Model", "fit"]

_HOMES = {"fit": "oddsmodel.api", "Model": "oddsmodel.api", "InputFault": "oddsmodel.errors"}


def __getattr__(name: str) -> Any:
    if name in _HOMES:
        return getattr(import_module(_HOMES[name]), name)
    raise AttributeError(f"module 'oddsmodel' has no attribute {name!r}")
