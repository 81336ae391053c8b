"""Look a sentence up by its code and fill in the facts.

Each floor keeps its sentences in one module of this package, in a dictionary `SENTENCES` from a code to a
text with `{fact}` fields or to a function of the facts. Codes are unique over all modules.
"""

from __future__ import annotations

import importlib
from collections.abc import Callable, Mapping
from functools import cache
from typing import Any

from oddsmodel.findings import Finding, Severity

Sentence = str | Callable[[Mapping[str, Any]], str]
MODULES = (
    "plan",
    "records",
    "records_stream",
    "design",
    "inference",
    "measures",
    "checks",
    "checks_asked_form",
    "checks_prediction",
    "disclosure",
    "study",
    "study_methods",
    "grouped",
    "report",
    "cli",
    "cluster",
    "changes",
)


@cache
def _sentences() -> dict[str, Sentence]:
    found: dict[str, Sentence] = {}
    for module in MODULES:
        sentences: dict[str, Sentence] = importlib.import_module(f"oddsmodel.wording.{module}").SENTENCES
        repeated = found.keys() & sentences.keys()
        if repeated:
            raise KeyError(f"codes said twice: {sorted(repeated)}")
        found.update(sentences)
    return found


def say(code: str, **facts: Any) -> str:
    """The sentence of `code` with its facts filled in. An unknown code is a KeyError."""
    sentence = _sentences()[code]
    return sentence.format(**facts) if isinstance(sentence, str) else sentence(facts)


def finding(severity: Severity, code: str, **facts: Any) -> Finding:
    """A finding with its message in words."""
    return Finding(severity=severity, code=code, message=say(code, **facts), facts=facts)
