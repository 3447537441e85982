"""Records of calculations that did not come to their own end."""

from __future__ import annotations

import platform
import socket
import time
from dataclasses import dataclass
from datetime import UTC, datetime
from typing import Any

from scission.execution.ledger import record_kind
from scission.records.atomic import UnwritableError
from scission.records.store import Record, Store

RESOURCE_REASONS = frozenset({"time-limit", "memory-limit", "killed"})
"""Reasons that more time or memory, or another try, may cure."""


@dataclass(frozen=True)
class Outcome:
    """How a calculation ended: status, reason (``schema.REASONS``) and one line for a person."""

    status: str
    reason: str
    message: str


def from_message(message: dict[str, Any]) -> Outcome:
    """Turn what the guard saw or the child reported into an outcome.

    Raises:
        UnwritableError: the child could not write its record, which is no way for a calculation to end.
    """
    if "unwritable" in message:
        raise UnwritableError(*message["unwritable"])
    if "raised" in message:
        reason = "memory-limit" if message.get("memory") else "raised"
        return Outcome("failed", reason, message["raised"])
    return Outcome("failed", message["reason"], message["message"])


def write_failure(store: Store, task: dict[str, Any], outcome: Outcome, started: float) -> dict[str, Any]:
    """Write the record of a task that left none; ``started`` in s since 1970.  Return its summary."""
    wall = max(0.0, time.time() - started)
    record = Record(
        key=task["key"],
        kind=record_kind(task),
        status=outcome.status,
        reason=outcome.reason,
        message=outcome.message,
        stage=task.get("stage", task["kind"]),
        attempts=task["attempt"],
        remedy=task.get("remedy", ""),
        scalars={"wall_s": wall},
        inputs=_inputs(task),
        reference_key=task.get("reference_key", ""),
        reference_stamp=task.get("reference_stamp", ""),
        provenance=_provenance(task, started),
    )
    store.write(record)
    return {"key": record.key, "status": record.status, "reason": record.reason, "wall_s": wall}


def _inputs(task: dict[str, Any]) -> dict[str, Any]:
    kept = ("molecule", "spec", "correlation", "frozen_core", "scan", "level", "number", "coordinate")
    return {name: task[name] for name in kept if name in task}


def _provenance(task: dict[str, Any], started: float) -> dict[str, Any]:
    return {
        "physics_version": task.get("physics_version"),
        "python": platform.python_version(),
        "host": socket.gethostname(),
        "started": _iso(started),
        "finished": _iso(time.time()),
    }


def _iso(seconds: float) -> str:
    return datetime.fromtimestamp(seconds, UTC).isoformat(timespec="milliseconds").replace("+00:00", "Z")
