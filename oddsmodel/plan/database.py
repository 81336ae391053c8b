"""Records in a database: where they are and what is asked of it, vetted before anything is opened."""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Literal
from urllib.parse import parse_qsl, unquote, urlsplit

from oddsmodel.errors import Fault
from oddsmodel.plan.faults import fault
from oddsmodel.wording.plain import quoted
from oddsmodel.wording.say import say

SETTINGS = ("host", "port", "sslmode", "sslrootcert")
"""What may follow the question mark of a PostgreSQL address; none of it is a credential."""

MOST_LETTERS_OF_A_QUERY = 20_000

_APART = re.compile(
    r"""'(?:[^']|'')*'|"(?:[^"]|"")*"|(\$(?:[A-Za-z_]\w*)?\$).*?\1|--[^\n]*|/\*.*?\*/""",
    re.DOTALL,
)
"""Texts, names in quotes and comments of SQL: what stands in them is no command."""


@dataclass(frozen=True, slots=True)
class DatabaseAddress:
    """Where a database is, without anybody's credentials. For SQLite `database` is the path of its file."""

    kind: Literal["SQLite", "PostgreSQL"]
    database: str
    host: str | None = None
    port: int | None = None
    settings: tuple[tuple[str, str], ...] = ()


def is_database(source: str) -> bool:
    """Whether a plan's `source` is an address and not a file."""
    return "://" in source


def database_address(source: str) -> DatabaseAddress | str:
    """The address that `source` holds, or the code of the fault in it. Faults never show the address itself."""
    kind, _, rest = source.partition("://")
    if kind not in ("sqlite", "postgresql"):
        return "database-kind"
    if kind == "sqlite":
        file = rest[1:] if rest.startswith("/") else ""
        return DatabaseAddress("SQLite", file) if file and not file.startswith(":") else "database-sqlite-address"
    if "@" in rest:
        return "database-credentials-in-plan"
    try:
        parts = urlsplit(source)
        port, settings = parts.port, parse_qsl(parts.query, keep_blank_values=True)
    except ValueError:
        return "database-postgresql-address"
    if any(name not in SETTINGS for name, _ in settings):
        return "database-settings"
    if parts.fragment or "/" in parts.path[1:]:
        return "database-postgresql-address"
    return DatabaseAddress("PostgreSQL", unquote(parts.path[1:]), parts.hostname, port, tuple(settings))


def without_address(text: str, source: str) -> str:
    """A plan's text without the address of a database server; that of a file stays."""
    if not source.startswith("postgresql://"):
        return text
    if source not in text:
        return say("plan-text-not-shown")
    return text.replace(source, say("database-address-not-shown"))


def faults_of_database(source: str, query: str | None, table: str | None, at_source: str, at: str) -> Iterator[Fault]:
    """What is wrong with the keys of [records] that lead to a database. at_source, at: their places in the plan."""
    if not is_database(source):
        for key in ("query", "table"):
            if (query if key == "query" else table) is not None:
                yield fault("query-without-database", at, key=key)
        return
    found = database_address(source)
    if isinstance(found, str):
        yield fault(found, at_source)
    if (query is None) == (table is None):
        yield fault("database-query-or-table", at, both=query is not None)
    if query is not None:
        yield from _faults_of_query(query, at)


def _faults_of_query(query: str, at: str) -> Iterator[Fault]:
    """Faults of a query that is not one question; that it changes nothing is seen to by the database itself."""
    if len(query) > MOST_LETTERS_OF_A_QUERY:
        yield fault("query-too-long", at, longest=MOST_LETTERS_OF_A_QUERY)
        return
    words = without_texts(query).strip().rstrip(";").strip()
    if ";" in words:
        yield fault("query-of-several", at)
    first = re.match(r"\(*\s*([A-Za-z]+)", words)
    if first is None or first.group(1).lower() not in ("select", "with"):
        yield fault("query-not-a-question", at, first=quoted(first.group(1) if first else words[:20]))


def without_texts(query: str) -> str:
    """A query with a space in place of each text, each name in quotes and each comment."""
    return _APART.sub(" ", query)
