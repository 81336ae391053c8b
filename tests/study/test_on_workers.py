"""A study on the workers of a cluster gives the bytes that it gives in memory, whatever becomes of the workers; what
workers cannot do is refused in words."""

from __future__ import annotations

import datetime
import importlib.util
import ipaddress
import json
import os
import signal
import socket
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import dask
import numpy as np
import pandas as pd
import pytest
from cryptography import x509
from cryptography.hazmat.primitives import hashes, serialization
from cryptography.hazmat.primitives.asymmetric import ec
from distributed import Client, LocalCluster, Security

from oddsmodel.cli.ending import INPUT_AT_FAULT, ended
from oddsmodel.cli.run import run_command
from oddsmodel.disclosure import disclose
from oddsmodel.errors import InputFault
from oddsmodel.export.results_json import results_text
from oddsmodel.model import rows
from oddsmodel.plan.read import read_plan
from oddsmodel.progress import Progress, Silent
from oddsmodel.results.study import StudyResults
from oddsmodel.study.answer import answer
from oddsmodel.study.check import check_plan
from oddsmodel.study.streamed import workers
from oddsmodel.study.streamed.on_workers import opened_on_workers
from oddsmodel.study.streamed.workers import connected, quiet

PEOPLE = 100_000
MEMORY = 300 * 10**6

PLAN = """
[study]
title = "Harbour workers"
question = "Do night shifts go with falls?"
design = "cohort"
[records]
source = "people.parquet"
keep = "age >= 18"
{records}
[outcome]
column = "fell"
event = "yes"
[columns.shift]
kind = "category"
levels = ["day", "night"]
reference = "day"
[columns.quay]
kind = "category"
[columns.age]
kind = "number"
per = 10
[columns.weight]
kind = "number"
[[models]]
name = "main"
formula = "fell ~ shift + quay + rcs(age, 4) + weight"
exposures = ["shift"]
[[models]]
name = "the young"
based_on = "main"
keep = "age < 45"
role = "subgroup"
"""


@pytest.fixture(scope="module")
def plan(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The plan of an invented study beside its records, some of which are not recorded."""
    folder = tmp_path_factory.mktemp("harbour")
    rng = np.random.default_rng(7)
    shift, age = rng.choice(["day", "night"], PEOPLE, p=[0.6, 0.4]), rng.uniform(15.0, 70.0, PEOPLE)
    linear = -2.0 + 0.5 * (shift == "night") + 0.02 * (age - 45.0)
    people = pd.DataFrame(
        {
            "shift": shift,
            "quay": rng.choice(["east", "north", "west"], PEOPLE),
            "age": np.round(age, 2),
            "weight": np.round(rng.normal(78.0, 12.0, PEOPLE), 1),
            "fell": np.where(rng.random(PEOPLE) < 1.0 / (1.0 + np.exp(-linear)), "yes", "no"),
        }
    )
    for name in people:
        people.loc[rng.random(PEOPLE) < 0.01, name] = None
    people.to_parquet(folder / "people.parquet", index=False, row_group_size=40_000)
    (folder / "plan.toml").write_text(PLAN.format(records=""), encoding="utf-8")
    return folder / "plan.toml"


@pytest.fixture(scope="module")
def client() -> Iterator[Client]:
    with connected("local") as client:
        yield client


class Killing(Silent):
    """Kills a worker, another one each time, when some stages begin for the first time."""

    def __init__(self, client: Client, *stages: str) -> None:
        self.client, self.stages = client, list(stages)
        self.killed: list[int] = []

    def stage(self, name: str, total: int | None = None) -> None:
        if name in self.stages:
            self.stages.remove(name)
            self.client.wait_for_workers(2)
            self.killed.append(min(set(self.client.run(os.getpid).values()) - set(self.killed)))
            os.kill(self.killed[-1], signal.SIGKILL)


def in_memory(plan: Path) -> str:
    return told(answer(check_plan(plan), Silent())[0])


def on_workers(plan: Path, client: Client, progress: Progress) -> str:
    with opened_on_workers(read_plan(plan), plan.parent / "people.parquet", MEMORY, client, progress) as opened:
        return told(answer(opened, progress)[0])


def told(study: StudyResults) -> str:
    return results_text(disclose(study, audience="internal", hide_counts_below=0))


def refused(client: Client, plan: Path, path: Path) -> InputFault:
    with (
        pytest.raises(InputFault) as found,
        opened_on_workers(read_plan(plan), path, MEMORY, client, Silent()),
    ):
        pass
    return found.value


def no_connection(address: str) -> str:
    with pytest.raises(InputFault) as found, connected(address):
        pass
    assert found.value.faults[0].where == "--workers"
    return str(found.value)


def test_the_study_is_that_of_memory_even_where_workers_die(
    plan: Path, client: Client, monkeypatch: pytest.MonkeyPatch
) -> None:
    # Also few records are then taken one by one, so that they stay on the workers.
    monkeypatch.setattr(rows, "MOST_PATTERNS", 100)
    known = in_memory(plan)
    assert [model["status"] for model in json.loads(known)["models"]] == ["converged", "converged"]
    killing = Killing(client, "gathering", "profiling")
    assert on_workers(plan, client, killing) == known
    assert len(set(killing.killed)) == 2


def test_records_that_a_worker_cannot_see_are_refused(
    plan: Path, client: Client, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(plan.parent)
    found = refused(client, plan, Path("/proc/self/cwd/people.parquet"))
    assert found.faults[0].where == "/proc/self/cwd/people.parquet"
    assert "cannot see these records" in str(found)
    assert "same path" in str(found)


def test_what_needs_all_records_in_one_place_is_refused(plan: Path, client: Client, tmp_path: Path) -> None:
    grouped = tmp_path / "plan.toml"
    grouped.write_text(PLAN.format(records='grouped_by = "quay"'), encoding="utf-8")
    found = refused(client, grouped, plan.parent / "people.parquet")
    assert found.faults[0].where == "the plan, [records] grouped_by"
    assert "spread over workers" in str(found)


@pytest.mark.parametrize(
    "address", ["", "harbour", "http://harbour:80", "tcp://harbour", "tcp://a b:1", "tcp://x:70000"]
)
def test_what_is_no_address(address: str) -> None:
    assert "is not the address of a scheduler" in no_connection(address)


def test_where_nobody_answers(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(workers, "WAIT", 0.5)
    with socket.socket() as free:
        free.bind(("127.0.0.1", 0))
        address = f"tcp://127.0.0.1:{free.getsockname()[1]}"
        assert "within 0.5 seconds" in no_connection(address)


def test_without_dask(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(importlib.util, "find_spec", lambda name: None)
    assert 'pip install "oddsmodel[cluster]"' in no_connection("local")


def test_the_command_tells_it_in_words(plan: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert ended(lambda: run_command(plan, tmp_path / "report", None, "harbour")) == INPUT_AT_FAULT
    told = capsys.readouterr().err
    assert "--workers" in told
    assert "tcp://host:port" in told
    assert not (tmp_path / "report").exists()


@contextmanager
def scheduler(number: int, security: Security | None = None) -> Iterator[str]:
    """The address of a scheduler in this process with so many workers, encrypted or not."""
    with (
        quiet(),
        LocalCluster(
            n_workers=number,
            threads_per_worker=1,
            processes=False,
            protocol="tcp://" if security is None else "tls://",
            security=security or Security(),
            dashboard_address=None,
            scheduler_kwargs={"dashboard_address": "127.0.0.1:0"},
        ) as here,
    ):
        yield here.scheduler_address


def test_a_scheduler_without_workers(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(workers, "WAIT", 2.0)
    with scheduler(0) as address:
        assert "has no workers" in no_connection(address)


def test_other_versions_are_refused(client: Client, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    for name, version in (("numpy", "0.1"), ("harbour", "1.2")):
        folder = tmp_path / f"{name}-{version}.dist-info"
        folder.mkdir()
        (folder / "METADATA").write_text(f"Metadata-Version: 2.1\nName: {name}\nVersion: {version}\n", encoding="utf-8")
    monkeypatch.syspath_prepend(tmp_path)
    monkeypatch.setattr(workers, "PROGRAMS", ("oddsmodel", "numpy", "harbour"))
    with pytest.raises(InputFault) as found:
        workers.check_workers(client, "tls://127.0.0.1:1")
    told = str(found.value)
    assert f"has numpy {np.__version__}, this machine 0.1" in told
    assert "has no harbour, this machine 1.2" in told
    assert "oddsmodel" not in told


def certificate(folder: Path) -> dict[str, str]:
    """Dask's configuration of a certificate that is its own authority and serves all sides."""
    key = ec.generate_private_key(ec.SECP256R1())
    name = x509.Name([x509.NameAttribute(x509.NameOID.COMMON_NAME, "harbour")])
    now = datetime.datetime.now(datetime.UTC)
    made = (
        x509.CertificateBuilder()
        .subject_name(name)
        .issuer_name(name)
        .public_key(key.public_key())
        .serial_number(x509.random_serial_number())
        .not_valid_before(now - datetime.timedelta(days=1))
        .not_valid_after(now + datetime.timedelta(days=1))
        .add_extension(x509.SubjectAlternativeName([x509.IPAddress(ipaddress.ip_address("127.0.0.1"))]), critical=False)
        .sign(key, hashes.SHA256())
    )
    certificate, secret = folder / "certificate.pem", folder / "key.pem"
    certificate.write_bytes(made.public_bytes(serialization.Encoding.PEM))
    secret.write_bytes(
        key.private_bytes(serialization.Encoding.PEM, serialization.PrivateFormat.PKCS8, serialization.NoEncryption())
    )
    sides = {
        f"distributed.comm.tls.{side}.{kind}": str(file)
        for side in ("client", "scheduler", "worker")
        for kind, file in (("cert", certificate), ("key", secret))
    }
    return {"distributed.comm.tls.ca-file": str(certificate), **sides}


def test_an_encrypted_connection_takes_the_configuration_of_dask(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(workers, "WAIT", 3.0)
    configured = certificate(tmp_path)
    with dask.config.set({**configured, "distributed.comm.require-encryption": True}):
        security = Security()
    with scheduler(1, security) as address:
        assert address.startswith("tls://")
        with dask.config.set(configured), connected(address) as client:
            assert client.submit(sum, [1, 2]).result() == 3
        assert "Dask's configuration" in no_connection(address)
        assert "tls:// in place of tcp://" in no_connection(address.replace("tls://", "tcp://"))
