"""FAULT DRILLS: tasks that misbehave on purpose, for tests of the guard and of whole runs.

None of this is reached in normal work.  ``RUNNERS`` holds task runners that take no chemistry; the
variable SCISSION_DRILL, ``{"<key>": "raise" | "kill" | "hang" | "allocate" | "pause"}`` as JSON, makes the
listed calculations misbehave in an otherwise normal run; ``pause:SECONDS`` says how long the pause is.
SCISSION_DRILL_JOURNAL names a file in which every calculation then notes its start and its end, so that
nothing that is computed twice goes unseen.
"""

from __future__ import annotations

import json
import os
import signal
import time
from collections.abc import Callable
from typing import Any

from scission.execution.ledger import record_kind
from scission.records.store import Record, Store

Runner = Callable[[dict[str, Any], Store], dict[str, Any]]

VARIABLE = "SCISSION_DRILL"
JOURNAL = "SCISSION_DRILL_JOURNAL"
PAUSE_S = 4.0


class DrillError(Exception):
    """What a drill raises."""


def misbehave(how: str) -> None:
    """Raise, kill the own process, hang, take memory without end, or only pause (to be caught at work)."""
    if how == "raise":
        raise DrillError("a drill\nraised this")
    if how == "kill":
        os.kill(os.getpid(), signal.SIGKILL)
    if how.startswith("pause"):
        time.sleep(float(how.partition(":")[2] or PAUSE_S))
    if how == "hang":
        time.sleep(3600.0)
    if how == "allocate":
        held = []
        while True:
            held.append(bytearray(20_000_000))
            time.sleep(0.01)


def run_drill(task: dict[str, Any], store: Store) -> dict[str, Any]:
    """Do what ``task["drill"]`` says after ``task["sleep_s"]``, else write a converged record."""
    time.sleep(task.get("sleep_s", 0.0))
    if task.get("shout"):
        print("words of a calculation on its standard output", flush=True)
    misbehave(task.get("drill", ""))
    energy = task.get("energy", -1.0)
    kind = record_kind(task)
    store.write(
        Record(
            key=task["key"],
            kind=kind,
            status="converged",
            stage=task["kind"],
            attempts=task["attempt"],
            remedy=task.get("remedy", ""),
            scalars={"energy": energy, "wall_s": 0.0},
            reference_key=task.get("reference_key", ""),
            reference_stamp=task.get("reference_stamp", ""),
            stamp=f"stamp-{task['key']}-{task['attempt']}",
        )
    )
    return {"key": task["key"], "status": "converged", "energy": energy, "wall_s": 0.0, "pid": os.getpid()}


RUNNERS: dict[str, Runner] = {"drill": run_drill}


def requested(task: dict[str, Any]) -> str:
    """Return how the task shall misbehave according to SCISSION_DRILL, "" if not at all."""
    text = os.environ.get(VARIABLE, "")
    return json.loads(text).get(task.get("key"), "") if text else ""


def journal(task: dict[str, Any], status: str) -> None:
    """Add a line (kind, key, attempt, status) to the file that SCISSION_DRILL_JOURNAL names, if any.

    The kind of a reference that is only tried to be improved says so: ``reference-lower`` and the like.
    """
    path = os.environ.get(JOURNAL)
    if path:
        kind = "-".join(filter(None, (task.get("kind"), task.get("replace"))))
        with open(
            path, "a", encoding="utf-8"
        ) as handle:  # one short write: lines of several processes stay whole
            handle.write(f"{kind} {task.get('key')} {task.get('attempt')} {status}\n")
