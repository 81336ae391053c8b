"""What tests of several floors share: a PostgreSQL server."""

from __future__ import annotations

import importlib.util
import os
import shutil
import tempfile
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from types import ModuleType
from typing import Any

import pytest


@dataclass(frozen=True)
class Database:
    """An empty database of the tests' own; `address` is what a plan says, `connect` writes into it."""

    address: str
    user: str
    password: str

    def connect(self) -> Any:
        import psycopg

        return psycopg.connect(self.address, user=self.user, password=self.password, autocommit=True)


def _server() -> ModuleType:
    spec = importlib.util.spec_from_file_location("postgresql_server", Path(__file__).with_name("postgresql_server.py"))
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


@pytest.fixture(scope="session")
def postgresql_address() -> Iterator[str]:
    """The address of the server named in the environment, or of one that is started for these tests."""
    server = _server()
    known = os.environ.get(server.VARIABLE)
    if known:
        yield known
        return
    if server.programs() is None:
        pytest.fail(server.HINT)
    folder = Path(tempfile.mkdtemp(prefix="oddsmodel-postgresql-"))
    try:
        yield server.start(folder)
    finally:
        server.stop(folder)
        shutil.rmtree(folder, ignore_errors=True)


@pytest.fixture
def postgresql(postgresql_address: str, monkeypatch: pytest.MonkeyPatch) -> Iterator[Database]:
    """A database of this test alone, with the credentials to read it in the environment."""
    server = _server()
    name = f"test_{os.urandom(6).hex()}"
    main = Database(postgresql_address, server.USER, server.PASSWORD)
    with main.connect() as connection:
        connection.execute(f"create database {name}")
    for variable in ("PGUSER", "PGPASSWORD", "PGHOST", "PGPORT", "PGDATABASE", "PGSERVICE"):
        monkeypatch.delenv(variable, raising=False)
    monkeypatch.setenv("ODDSMODEL_DATABASE_USER", server.USER)
    monkeypatch.setenv("ODDSMODEL_DATABASE_PASSWORD", server.PASSWORD)
    yield Database(f"{postgresql_address.rpartition('/')[0]}/{name}", server.USER, server.PASSWORD)
    with main.connect() as connection:
        connection.execute(f"drop database {name} with (force)")
