"""Rows of a SQLite or PostgreSQL database as a raw table, read in batches inside a transaction that cannot write."""

from __future__ import annotations

import hashlib
import os
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING, Any
from urllib.parse import quote

import numpy as np
import pandas as pd

from oddsmodel.errors import InputFault
from oddsmodel.findings import Finding
from oddsmodel.plan.database import DatabaseAddress, database_address, without_texts
from oddsmodel.plan.nearest import nearest
from oddsmodel.plan.schema import RecordsSection
from oddsmodel.progress import Progress
from oddsmodel.records.database_columns import BatchedColumn
from oddsmodel.records.faults import fault
from oddsmodel.records.header import vetted_names
from oddsmodel.records.raw import RawColumn, RawTable
from oddsmodel.records.source import assembled
from oddsmodel.wording import finding, say
from oddsmodel.wording.plain import plain, quoted

if TYPE_CHECKING:
    from sqlalchemy import Connection, Engine

ROWS_AT_ONCE = 20_000
SECONDS_TO_CONNECT = "15"
UNORDERED = ("json", "xml", "point", "line", "lseg", "box", "path", "polygon", "circle")
"""Types of PostgreSQL that have no order."""

USER, PASSWORD = "ODDSMODEL_DATABASE_USER", "ODDSMODEL_DATABASE_PASSWORD"


def read_database(section: RecordsSection, folder: Path, progress: Progress) -> RawTable:
    """The rows of the table or the query that [records] names. folder: that of the plan, for a SQLite file.

    A table is read in the order of its primary key, or of all its columns; a query in the order it asks for. The
    checksum is that of names and values in the order read. Times with a zone are read in UTC.

    Raises: InputFault where packages are missing, the database is not reached or refuses, the table or a column of
        the query does not exist, or there are no rows. No message holds an address, a user or a password.
    """
    address = database_address(section.source)
    if isinstance(address, str):
        raise InputFault(fault(address, "the plan, [records] source"))
    try:
        import sqlalchemy
        from sqlalchemy.exc import SQLAlchemyError

        engine = _engine(address, folder)
    except ImportError as error:
        raise InputFault(fault("database-needs-packages", "the plan, [records] source")) from error
    shown = "query" if section.table is None else "table"
    source = say(f"database-source-{shown}", kind=address.kind, table=plain(section.table or "", 120))
    try:
        with _connection(engine, address) as connection:
            try:
                statement, notes = _statement(sqlalchemy.inspect(connection), section, source)
                columns = _columns(connection, statement, source, progress)
            except SQLAlchemyError as error:
                raise InputFault(_refusal(error, source)) from None
    finally:
        engine.dispose()
    return assembled(columns.items(), source, fingerprint(columns), notes, first_row=1)


def _engine(address: DatabaseAddress, folder: Path) -> Engine:
    import sqlalchemy
    from sqlalchemy.pool import NullPool

    if address.kind == "SQLite":
        path = (folder / address.database).absolute()
        if not path.is_file():
            raise InputFault(fault("file-missing" if not path.exists() else "file-not-regular", address.database))
        return sqlalchemy.create_engine("sqlite://", creator=lambda: _sqlite(path), poolclass=NullPool)
    import psycopg  # noqa: F401  (told here, not at the first question)

    given: dict[str, Any] = {"username": os.environ.get(USER), "password": os.environ.get(PASSWORD)}
    url = sqlalchemy.URL.create(
        "postgresql+psycopg",
        host=address.host,
        port=address.port,
        database=address.database or None,
        query=dict(address.settings),
        **given,
    )
    # The password comes from the environment alone, never from a file in somebody's home.
    settings = {
        "connect_timeout": os.environ.get("PGCONNECT_TIMEOUT", SECONDS_TO_CONNECT),
        "passfile": os.environ.get("PGPASSFILE", os.devnull),
    }
    return sqlalchemy.create_engine(url, poolclass=NullPool, connect_args=settings, hide_parameters=True)


def _sqlite(path: Path) -> Any:
    """A connection to a SQLite file that cannot write, and to which the file's own schema is not to be trusted."""
    import sqlite3

    connection = sqlite3.connect(f"file:{quote(str(path))}?mode=ro", uri=True)
    connection.execute("pragma query_only = on")
    connection.execute("pragma trusted_schema = off")
    return connection


@contextmanager
def _connection(engine: Engine, address: DatabaseAddress) -> Iterator[Connection]:
    """A connection in one transaction that reads only, sees one state of the data, and is rolled back at the end."""
    from sqlalchemy.exc import SQLAlchemyError

    where = "the plan, [records] source"
    try:
        connection = engine.connect()
        if address.kind == "PostgreSQL":
            connection = connection.execution_options(isolation_level="REPEATABLE READ", postgresql_readonly=True)
            connection.exec_driver_sql("set local time zone 'UTC'")
        else:
            connection.exec_driver_sql("select count(*) from sqlite_master")
    except SQLAlchemyError as error:
        raise InputFault(_no_connection(error, address, where)) from None
    try:
        yield connection
    finally:
        connection.close()


def _no_connection(error: Exception, address: DatabaseAddress, where: str) -> Any:
    """Why there is no connection. What the server says is looked at and not passed on: it names user and host."""
    said = str(error).lower()
    if address.kind == "SQLite":
        return fault("database-not-sqlite" if "not a database" in said else "database-not-opened", where)
    if "password" in said or "authentication" in said or 'role "' in said:
        return fault("database-login-refused", where)
    if f'database "{address.database.lower()}"' in said:
        return fault("database-missing", where, database=quoted(address.database))
    return fault("database-not-reached", where)


def _refusal(error: Exception, source: str) -> Any:
    """Why the database did not answer, in the first line of its own words."""
    original = getattr(error, "orig", None) or error
    diagnosis = getattr(original, "diag", None)
    words = getattr(diagnosis, "message_primary", None) or next(iter(str(original).splitlines()), "")
    if getattr(original, "sqlstate", None) == "25006" or "readonly database" in words:
        return fault("query-writes", source)
    return fault("query-failed", source, reason=plain(words, 200).rstrip("."))


def _statement(inspector: Any, section: RecordsSection, source: str) -> tuple[str, tuple[Finding, ...]]:
    """What is asked, and what is to be said of the order of its rows."""
    if section.query is not None:
        ordered = "order by" in " ".join(without_texts(section.query).lower().split())
        query = section.query.strip().rstrip(";")
        return query, () if ordered else (finding("note", "query-without-order"),)
    name = section.table or ""
    schema, table = _found(inspector, name, source)
    written = inspector.bind.dialect.identifier_preparer.quote_identifier
    key = list(inspector.get_pk_constraint(table, schema=schema).get("constrained_columns") or ())
    by = key or [
        column["name"]
        for column in inspector.get_columns(table, schema=schema)
        if str(getattr(column["type"], "__visit_name__", "")).lower() not in UNORDERED
    ]
    whole = ".".join(written(part) for part in (schema, table) if part)
    order = f" order by {', '.join(written(column) for column in by)}" if by else ""
    told = "its primary key" if key else "its columns"
    return f"select * from {whole}{order}", (finding("note", "table-in-order", table=name, by=told),)


def _found(inspector: Any, name: str, source: str) -> tuple[str | None, str]:
    """Schema and name of a table or view; the whole name first, then as schema.table."""
    if inspector.has_table(name):
        return None, name
    schema, _, table = name.rpartition(".")
    if schema and schema in inspector.get_schema_names() and inspector.has_table(table, schema=schema):
        return schema, table
    near = nearest(name, [*inspector.get_table_names(), *inspector.get_view_names()])
    facts = {"table": quoted(name), "nearest": "" if near is None else quoted(near)}
    raise InputFault(fault("table-not-in-database", source, **facts))


def _columns(connection: Connection, statement: str, source: str, progress: Progress) -> dict[str, RawColumn | str]:
    """All rows of an answer, in batches that are turned into columns one after another."""
    options = {"stream_results": True, "no_parameters": True, "yield_per": ROWS_AT_ONCE}
    with connection.exec_driver_sql(statement, execution_options=options) as answer:
        given = list(answer.keys())
        names = vetted_names([str(name) for name in given], source)
        columns = [BatchedColumn() for _ in names]
        rows = 0
        for batch in answer.partitions(ROWS_AT_ONCE):
            for column, values in zip(columns, zip(*batch, strict=True), strict=True):
                column.add(values)
            rows += len(batch)
    if rows == 0:
        raise InputFault(fault("no-rows", source))
    return {name: column.raw() for name, column in zip(names, columns, strict=True)}


def fingerprint(columns: dict[str, RawColumn | str]) -> str:
    """SHA-256 of names, types and values, column by column, rows in the order read."""
    digest = hashlib.sha256()
    for name, column in columns.items():
        digest.update(name.encode("utf-8") + b"\0")
        if isinstance(column, str):
            digest.update(column.encode("utf-8") + b"\0")
            continue
        digest.update(column.type.encode("ascii") + b"\0")
        if isinstance(column.values.dtype, pd.CategoricalDtype):
            for text in column.values.cat.categories:
                digest.update(str(text).encode("utf-8") + b"\0")
            digest.update(column.values.cat.codes.to_numpy().astype("<i8").tobytes())
        else:
            numbers = column.values.to_numpy(dtype=np.float64)
            digest.update(np.where(np.isnan(numbers), np.nan, numbers).astype("<f8").tobytes())
    return digest.hexdigest()
