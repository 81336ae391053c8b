"""Which columns a condition or a formula may mean, before it is read."""

from __future__ import annotations

import re
from collections.abc import Iterable


def mentioned(names: Iterable[str], text: str | None) -> list[str]:
    """The names that stand in a text as a word, and not as a function."""
    return [name for name in names if text is not None and is_mentioned(name, text)]


def is_mentioned(name: str, text: str) -> bool:
    """Whether a name stands in a text; one that is no plain word wherever its characters do."""
    if not name.isidentifier():
        return name in text
    return re.search(rf"(?<![\w.]){re.escape(name)}(?!\w|\s*\()", text) is not None
