"""What is wrong with records in a database, and what to do: (sentence, remedy) by code, and notes on them."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from oddsmodel.wording.numbers import count
from oddsmodel.wording.plain import quoted
from oddsmodel.wording.say import Sentence

Facts = Mapping[str, Any]

ADDRESSES = "Write sqlite:///registry.db (a file beside the plan) or postgresql://host/database."
CREDENTIALS = (
    "Take it out of the plan, and set ODDSMODEL_DATABASE_USER and ODDSMODEL_DATABASE_PASSWORD (or PGUSER and "
    "PGPASSWORD) in the environment."
)


def _nearest(facts: Facts) -> str:
    meant = f"Did you mean {facts['nearest']}? " if facts["nearest"] else ""
    return f"{meant}A table of another schema is written schema.table."


DATABASE_FAULTS: dict[str, tuple[Sentence, Sentence]] = {
    "database-kind": ("This is an address of a kind that is not read.", ADDRESSES),
    "database-sqlite-address": ("The address of the SQLite file is not complete.", ADDRESSES),
    "database-postgresql-address": ("The address of the PostgreSQL database cannot be read.", ADDRESSES),
    "database-credentials-in-plan": ("The address holds a user or a password.", CREDENTIALS),
    "database-settings": (
        "After the question mark of the address only host, port, sslmode and sslrootcert may stand.",
        "Take the others out. A user or a password belongs into the environment: ODDSMODEL_DATABASE_USER, "
        "ODDSMODEL_DATABASE_PASSWORD.",
    ),
    "database-query-or-table": (
        lambda facts: (
            f"The plan gives {'both a query and a table' if facts['both'] else 'neither a query nor a table'}."
        ),
        'Give one of them: table = "admissions", or query = "select …".',
    ),
    "query-without-database": (
        "{key} asks a database, but source is a file.",
        f"Take it out, or name a database as source. {ADDRESSES}",
    ),
    "query-too-long": (
        lambda facts: f"The query is longer than {count(facts['longest'])} letters.",
        "Make it a view in the database, and name that as table.",
    ),
    "query-of-several": ("The query holds a semicolon, so it would be several.", "Ask one question: a single select."),
    "query-not-a-question": (
        "The query begins with {first}; only a question is asked of a database, nothing is changed in it.",
        "Begin with select or with.",
    ),
    "database-needs-packages": (
        "Reading a database needs a part that is not installed.",
        'Install it with: pip install "oddsmodel[database]"; or save the rows as a CSV or Parquet file.',
    ),
    "database-not-sqlite": (
        "The file cannot be read as a SQLite database: it is damaged, or of another kind.",
        "Check that source names the right file.",
    ),
    "database-not-opened": ("The SQLite file could not be opened.", "Check that you may read it and its folder."),
    "database-not-reached": (
        "The PostgreSQL server was not reached, or it did not accept the connection.",
        "Check host, port and database in source, that the server runs, and the user and password in the environment.",
    ),
    "database-login-refused": (
        "The PostgreSQL server refused the login.",
        "Check ODDSMODEL_DATABASE_USER and ODDSMODEL_DATABASE_PASSWORD (or PGUSER and PGPASSWORD) in the environment.",
    ),
    "database-missing": (
        "The PostgreSQL server has no database {database}.",
        "Check the name after the host in source.",
    ),
    "table-not-in-database": ("The database has no table or view {table}.", _nearest),
    "query-failed": ("The database could not answer: {reason}.", "Try the query where you usually ask the database."),
    "query-writes": (
        "The query would change the database, which was opened for reading only.",
        "Ask a question that changes nothing.",
    ),
    "database-read-broken": (
        "The rows could not be read to the end: {reason}.",
        "Run again; if it happens again, save the rows as a CSV or Parquet file.",
    ),
}

DATABASE_FINDINGS: dict[str, Sentence] = {
    "query-without-order": (
        "The query has no order by, so the database gives its rows in any order. The numbers do not depend on it, but "
        "the fingerprint of the records and the last digits do."
    ),
    "table-in-order": lambda facts: (
        f"The rows of {quoted(facts['table'])} were read in the order of {facts['by']}, so that the same rows have the "
        "same fingerprint."
    ),
    "database-source-table": "{kind} database, table {table}",
    "database-source-query": "{kind} database, a query",
    "database-address-not-shown": "postgresql://… (the address is not shown)",
    "plan-text-not-shown": "The text of the plan is not shown, because the address of a database is spelled out in it.",
}
