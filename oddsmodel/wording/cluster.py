"""Sentences on work that is done by the workers of a cluster, by code; for its faults, under `<code>-remedy`."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from oddsmodel.wording.numbers import plural
from oddsmodel.wording.plain import plain, quoted
from oddsmodel.wording.say import Sentence

MOST_DIFFERENCES = 6


def _differ(facts: Mapping[str, Any]) -> str:
    told = [
        f"{plain(worker, 80)} has {f'{program} {plain(there, 40)}' if there else f'no {program}'}, this machine {here}"
        for program, here, worker, there in facts["differences"][:MOST_DIFFERENCES]
    ]
    return f"The workers do not have the versions that this machine has: {'; '.join(told)}."


def _not_seen(facts: Mapping[str, Any]) -> str:
    workers = [plain(worker, 80) for worker in facts["workers"]]
    more = len(workers) - MOST_DIFFERENCES
    told = ", ".join(workers[:MOST_DIFFERENCES]) + (f" and {more} more" if more > 0 else "")
    return f"{plural(len(workers), 'worker')} ({told}) cannot see these records, or sees others under this name."


FAULTS: dict[str, tuple[Sentence, str]] = {
    "workers-not-installed": (
        "Work on several machines needs Dask, which is not installed.",
        'Install it with: pip install "oddsmodel[cluster]"; or leave --workers out.',
    ),
    "workers-address": (
        lambda facts: f"{quoted(facts['address'])} is not the address of a scheduler.",
        "Write tcp://host:port or tls://host:port, as the scheduler names it when it starts; or local, for processes "
        "on this machine.",
    ),
    "workers-unreachable": (
        lambda facts: f"No scheduler answered at {quoted(facts['address'])} within {facts['seconds']:g} seconds.",
        "Look whether it runs, whether this machine can reach it, and whether it expects tls:// in place of tcp://.",
    ),
    "workers-tls": (
        lambda facts: f"An encrypted connection to {quoted(facts['address'])} could not be set up.",
        "Name the certificates in Dask's configuration: distributed.comm.tls.ca-file, and cert and key under "
        "distributed.comm.tls.client; the scheduler must know the same authority.",
    ),
    "workers-none": (
        lambda facts: f"The scheduler at {quoted(facts['address'])} has no workers.",
        "Start workers that connect to it, then run the plan again.",
    ),
    "workers-differ": (
        _differ,
        "Give every machine the same versions; the last digits of the results depend on them.",
    ),
    "records-not-on-workers": (
        _not_seen,
        "Put the records where every worker reads them under the same path, such as a shared folder.",
    ),
    "needs-one-machine": (
        "This needs all records in one place, and they are spread over workers.",
        "Leave --workers out, or take the line out.",
    ),
}

SENTENCES: dict[str, Sentence] = {
    # Said after "The machine refused: ".
    "workers-killed": lambda facts: (
        f"{plural(facts['times'], 'worker')} died while at the same piece of work, perhaps for want of memory"
    ),
    "no-workers-left": "all workers are gone",
    "scheduler-lost": "the connection to the scheduler was lost",
}
SENTENCES |= {code: what for code, (what, _) in FAULTS.items()}
SENTENCES |= {f"{code}-remedy": remedy for code, (_, remedy) in FAULTS.items()}
