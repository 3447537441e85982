"""A store that never forgets: what an attempt replaces goes into the record's history."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import Any

from scission.records.store import Record, Store


class Ledger(Store):
    """The records of a campaign, written on behalf of one task.

    Every write carries earlier attempts over into ``history``.  A failed retry leaves an earlier
    converged record as it was and only adds to its history: a good number is never lost, unless the
    reference it was computed from has changed since.
    """

    def __init__(self, folder: Path, task: dict[str, Any]) -> None:
        super().__init__(folder)
        self.task = task

    def write(self, record: Record) -> Path:
        """Put the record in its place together with what came before it.

        Raises:
            ValueError: see ``Store.write``.
            OSError: see ``Store.write``.
        """
        if record.key == self.task.get("key"):
            record = self._signed(record)
        previous = self.read(record.kind, record.key)
        return super().write(record if previous is None else merge(previous, record))

    def _signed(self, record: Record) -> Record:
        marks: dict[str, Any] = {"job_attempt": self.task.get("job_attempt", 1)}
        if self.task.get("request"):
            marks["request"] = self.task["request"]
        stamp = record.reference_stamp or self.task.get("reference_stamp", "")
        return replace(record, provenance={**record.provenance, **marks}, reference_stamp=stamp)


def record_kind(task: dict[str, Any]) -> str:
    """Return the kind of record a task writes: correlated calculations make points, fragments their own."""
    return {"correlate": "point", "fragment": "fragment"}.get(task["kind"], "reference")


def merge(previous: Record, new: Record) -> Record:
    """Return what to keep of an earlier record and a new attempt at the same key."""
    if previous.attempts == new.attempts:  # one attempt, written twice: its good end counts
        lost = previous.status == "converged" and new.status != "converged"
        return previous if lost else replace(new, history=previous.history)
    same_reference = previous.reference_stamp == new.reference_stamp
    if previous.status == "converged" and new.status != "converged" and same_reference:
        return replace(previous, attempts=new.attempts, history=[*previous.history, history_entry(new)])
    return replace(new, history=[*previous.history, history_entry(previous)])


def history_entry(record: Record) -> dict[str, Any]:
    """Return the short form of an attempt that a history keeps (energy in hartree, wall time in s)."""
    return {
        "attempt": record.attempts,
        "status": record.status,
        "reason": record.reason,
        "message": record.message,
        "remedy": record.remedy,
        "started": record.provenance.get("started", ""),
        "wall_s": record.scalars.get("wall_s"),
        "energy": record.scalars.get("energy") if record.status == "converged" else None,
        "request": record.provenance.get("request", ""),
    }


def fulfilled(record: Record, request: str) -> bool:
    """Whether the record comes from, or its history contains, the attempt that ``request`` asked for."""
    return request in {record.provenance.get("request"), *(entry.get("request") for entry in record.history)}
