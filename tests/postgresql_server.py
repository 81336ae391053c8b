"""A private PostgreSQL server for the tests: `python postgresql_server.py start FOLDER` prints its address.

It listens on a free port of this machine, asks for a password, and keeps everything in FOLDER until `stop FOLDER`.
"""

from __future__ import annotations

import os
import pwd
import shutil
import socket
import subprocess
import sys
from pathlib import Path

VARIABLE = "ODDSMODEL_TEST_POSTGRESQL"
"""Holds the address of a server that is there already."""

USER, PASSWORD = "keeper", "a long word of 2 parts"
HINT = "This test needs PostgreSQL. On Debian or Ubuntu: apt-get install postgresql"


def programs() -> Path | None:
    """The folder of the newest server that is installed."""
    found = sorted(Path("/usr/lib/postgresql").glob("*/bin/initdb"), key=lambda path: float(path.parts[-3]))
    if found:
        return found[-1].parent
    other = shutil.which("initdb")
    return Path(other).resolve().parent if other else None


def start(folder: Path) -> str:
    """Start a server in an empty folder and return its address, without user and password."""
    home = programs()
    if home is None:
        raise FileNotFoundError(HINT)
    if os.getuid() == 0:
        owner = pwd.getpwnam("postgres")
        os.chown(folder, owner.pw_uid, owner.pw_gid)
    words = folder / "password"
    words.write_text(PASSWORD, encoding="utf-8")
    words.chmod(0o644)
    data = folder / "data"
    _run(
        folder,
        *(home / "initdb", "--pgdata", data, "--username", USER, "--pwfile", words),
        *("--auth", "scram-sha-256", "--encoding", "UTF8", "--locale", "C", "--no-sync"),
    )
    with socket.socket() as one:
        one.bind(("127.0.0.1", 0))
        port = one.getsockname()[1]
    settings = f"-F -h 127.0.0.1 -p {port} -k {folder} -c log_min_messages=fatal"
    _run(folder, home / "pg_ctl", "-D", data, "-l", folder / "log", "-w", "-o", settings, "start")
    return f"postgresql://127.0.0.1:{port}/postgres"


def stop(folder: Path) -> None:
    """Stop the server of a folder and remove the folder."""
    home = programs()
    if home is not None and (folder / "data" / "postmaster.pid").exists():
        _run(folder, home / "pg_ctl", "-D", folder / "data", "-m", "immediate", "-w", "stop")
    shutil.rmtree(folder)


def _run(folder: Path, *command: object) -> None:
    """A server program does not run as root: there it is run as the user that its package made."""
    as_root = os.getuid() == 0
    with (folder / "said").open("a") as said:
        subprocess.run(
            [str(part) for part in command],
            check=True,
            cwd=folder,
            stdin=subprocess.DEVNULL,
            stdout=said,
            stderr=said,
            env={"PATH": os.environ.get("PATH", ""), "LC_ALL": "C"},
            user="postgres" if as_root else None,
            group="postgres" if as_root else None,
            extra_groups=[] if as_root else None,
        )


if __name__ == "__main__":
    if sys.argv[1] == "start":
        print(start(Path(sys.argv[2])))
    else:
        stop(Path(sys.argv[2]))
